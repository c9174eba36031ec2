/* The plane under hand: wheel, drag, pinch and keys move its window; the server draws the new one. Without this file the
   links below the field do the same. A window stands in the address, so that going back and sharing work. */

const part = document.getElementById("plane-part");
const state = { moving: null, pointers: new Map(), dragged: false, timer: 0, request: null };

const field = () => part.querySelector(".plane-field");
const plane = () => part.querySelector(".plane");
const items = () => [...field().querySelectorAll(".moving a")];

/* The window as shares: two ends a side, linear in what the axis is linear in. */
function sides() {
  const { cold, warm, bottom, top, log } = plane().dataset;
  return [
    { low: Number(cold), high: Number(warm), log: log[0] === "1" },
    { low: Number(bottom), high: Number(top), log: log[1] === "1" },
  ];
}

function at(side, share) {
  return side.log ? side.low * (side.high / side.low) ** share : side.low + share * (side.high - side.low);
}

/* state.moving: what part of the present window the next one shows, as begin and length of either side. */
function moved() {
  return state.moving ?? { x: 0, y: 0, width: 1, height: 1 };
}

function preview() {
  const now = moved();
  const box = field().getBoundingClientRect();
  const across = 1 / now.width;
  const upright = 1 / now.height;
  const group = field().querySelector(".moving");
  group.style.transformOrigin = "0 0";
  group.style.transform =
    `matrix(${across}, 0, 0, ${upright}, ${-now.x * across * box.width}, ${(now.height + now.y - 1) * upright * box.height})`;
}

function change(factor, share) {
  const now = moved();
  const width = now.width * factor;
  const height = now.height * factor;
  state.moving = {
    x: now.x + share.x * (now.width - width), y: now.y + share.y * (now.height - height), width, height,
  };
  preview();
  settle(160);
}

function shift(x, y, wait) {
  const now = moved();
  state.moving = { ...now, x: now.x + x * now.width, y: now.y + y * now.height };
  preview();
  settle(wait);
}

function settle(wait) {
  clearTimeout(state.timer);
  state.timer = setTimeout(ask, wait);
}

const digits = (number) => String(Number(number.toPrecision(8)));

function ask() {
  if (!state.moving) return;
  const [x, y] = sides();
  const { axis, unit } = plane().dataset;
  const now = state.moving;
  const query = new URLSearchParams(location.search);
  const height = axis === "cell" ? "lanes" : axis;
  query.delete("everything");
  query.set("temperature", `${digits(at(x, now.x))}:${digits(at(x, now.x + now.width))} K`);
  query.set(height, `${digits(at(y, now.y))}:${digits(at(y, now.y + now.height))} ${unit}`.trim());
  go(`/?${query}`, true);
}

async function go(way, push) {
  const address = new URL(way, location.href);
  const held = document.activeElement?.closest?.(".moving a")?.getAttribute("href");
  state.request?.abort();
  const request = new AbortController();
  state.request = request;
  try {
    const answer = await fetch(`/plane/part${address.search}`, { signal: request.signal });
    if (!answer.ok) { still(); return; }
    const drawn = new DOMParser().parseFromString(await answer.text(), "text/html");
    if (request.signal.aborted) return;
    part.replaceChildren(...drawn.body.childNodes);
    state.moving = null;
    if (push) history.pushState(null, "", address);
    ready(held);
  } catch (fault) {
    if (fault.name !== "AbortError") still();
  }
}

/* The server would not draw it: the field goes back to what it shows. */
function still() {
  state.moving = null;
  const group = field().querySelector(".moving");
  group.style.transform = "";
}

/* One stop for the tabulator; the arrows walk from there. */
function ready(href) {
  const all = items();
  for (const each of all) each.setAttribute("tabindex", "-1");
  const first = all.find((each) => each.getAttribute("href") === href) ?? all[0];
  first?.setAttribute("tabindex", "0");
  if (href) {
    if (first?.getAttribute("href") === href) first.focus({ preventScroll: true });
    else field().focus({ preventScroll: true });
  }
  field().setAttribute("tabindex", all.length ? "-1" : "0");
}

function read(item) {
  for (const each of field().querySelectorAll("a.read")) each.classList.remove("read");
  if (!item) return;
  item.classList.add("read");
  part.querySelector("#plane-reading").textContent = item.getAttribute("aria-label");
}

function middle(item) {
  const box = item.getBoundingClientRect();
  return { x: box.x + box.width / 2, y: box.y + box.height / 2 };
}

/* Up and down go by height, left and right along the temperature; the nearest in that direction is next. */
function step(from, x, y) {
  const here = middle(from);
  let best = null;
  let least = Infinity;
  for (const each of items()) {
    if (each === from) continue;
    const there = middle(each);
    const forward = (there.x - here.x) * x + (there.y - here.y) * y;
    const aside = Math.abs((there.x - here.x) * y) + Math.abs((there.y - here.y) * x);
    if (forward < 0.5) continue;
    const far = y ? forward + aside / 50 : forward + aside * 2;
    if (far < least) { least = far; best = each; }
  }
  return best;
}

const ARROWS = { ArrowLeft: [-1, 0], ArrowRight: [1, 0], ArrowUp: [0, -1], ArrowDown: [0, 1] };

function key(event) {
  if (event.ctrlKey || event.altKey || event.metaKey) return;
  const arrow = ARROWS[event.key];
  const centre = { x: 0.5, y: 0.5 };
  if (arrow && event.shiftKey) shift(arrow[0] * 0.15, -arrow[1] * 0.15, 160);
  else if (arrow) {
    const from = event.target.closest(".moving a") ?? items()[0];
    const next = from && (event.target === field() ? from : step(from, ...arrow));
    if (next) {
      for (const each of items()) each.setAttribute("tabindex", "-1");
      next.setAttribute("tabindex", "0");
      next.focus({ preventScroll: true });
    }
  } else if (event.key === "+" || event.key === "=") change(0.7, centre);
  else if (event.key === "-") change(1 / 0.7, centre);
  else if (event.key === "0") go(part.querySelector("[data-first]").href, true);
  else return;
  event.preventDefault();
}

function share(event) {
  const box = field().getBoundingClientRect();
  return { x: (event.clientX - box.x) / box.width, y: 1 - (event.clientY - box.y) / box.height };
}

function wheel(event) {
  event.preventDefault();
  change(Math.exp(Math.max(-1, Math.min(1, event.deltaY / 240))), share(event));
}

function down(event) {
  if (event.button !== 0) return;
  state.pointers.set(event.pointerId, share(event));
  state.dragged = false;
}

function move(event) {
  const before = state.pointers.get(event.pointerId);
  if (!before) {
    read(event.target.closest?.(".moving a"));
    return;
  }
  const now = share(event);
  if (state.pointers.size === 1) {
    if (!state.dragged && Math.hypot(now.x - before.x, now.y - before.y) < 0.008) return;
    state.dragged = true;
    field().setPointerCapture(event.pointerId);
    shift(before.x - now.x, before.y - now.y, 200);
  } else {
    const [other] = [...state.pointers].filter(([id]) => id !== event.pointerId).map(([, place]) => place);
    const apart = (a, b) => Math.max(Math.hypot(a.x - b.x, a.y - b.y), 0.01);
    state.dragged = true;
    change(apart(before, other) / apart(now, other), other);
  }
  state.pointers.set(event.pointerId, now);
}

function up(event) {
  state.pointers.delete(event.pointerId);
}

/* The end of a drag is no click. */
function click(event) {
  if (state.dragged) event.preventDefault();
  state.dragged = false;
}

function on(kind, answer, options) {
  part.addEventListener(kind, (event) => { if (event.target.closest?.(".plane-field")) answer(event); }, options);
}

if (part?.querySelector(".plane-field")) {
  part.classList.add("scripted");
  on("wheel", wheel, { passive: false });
  on("pointerdown", down);
  on("pointermove", move);
  on("pointerup", up);
  on("pointercancel", up);
  on("click", click, true);
  on("dragstart", (event) => event.preventDefault());
  on("keydown", key);
  on("focusin", (event) => read(event.target.closest(".moving a")));
  addEventListener("popstate", () => go(location.href, false));
  ready();
}

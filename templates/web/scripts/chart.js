// A chart that can be drawn closer: the server's picture gives way to strips of the same height, made from points that the
// server thinned without losing an extreme; a closer view asks for the points of that view alone.

const MARKS = ["circle", "triangle", "down", "diamond", "cross", "plus", "square"];
const DASHES = [[], [9, 3, 2, 3], [2, 3], [12, 3], [5, 2], [9, 2, 2, 2, 2, 2], [7, 3]];
const MOST_MARKS = 400, MOST_BARS = 120, WAIT_MS = 90;

const style = name => getComputedStyle(document.documentElement).getPropertyValue(name).trim();
const colour = look => style(`--look-${look % MARKS.length}`);

// Places after the point in which every multiple of a step can be told, 0.25 as 0.25.
export function digits(step) {
  let places = Math.max(0, -Math.floor(Math.log10(step) + 1e-9));
  while (places < 12 && Math.abs(step * 10 ** places - Math.round(step * 10 ** places)) > 1e-6) places++;
  return Math.min(12, places);
}

// Texts grow with those of the page.
const size = () => parseFloat(getComputedStyle(document.documentElement).fontSize) / 16 || 1;

function tickTexts(values, step) {
  const places = digits(step);
  return values.map(value => value === null ? "" : (Math.abs(value) < step * 1e-6 ? 0 : value).toFixed(places).replace("-", "\u2212"));
}

function outline(path, mark, x, y, r) {
  switch (mark) {
    case "circle": path.moveTo(x + r, y); path.arc(x, y, r, 0, 7); break;
    case "square": path.rect(x - r, y - r, 2 * r, 2 * r); break;
    case "triangle": path.moveTo(x, y - 1.2 * r); path.lineTo(x + 1.1 * r, y + 0.8 * r); path.lineTo(x - 1.1 * r, y + 0.8 * r); path.closePath(); break;
    case "down": path.moveTo(x, y + 1.2 * r); path.lineTo(x + 1.1 * r, y - 0.8 * r); path.lineTo(x - 1.1 * r, y - 0.8 * r); path.closePath(); break;
    case "diamond": path.moveTo(x, y - 1.3 * r); path.lineTo(x + r, y); path.lineTo(x, y + 1.3 * r); path.lineTo(x - r, y); path.closePath(); break;
    case "cross": path.moveTo(x - r, y - r); path.lineTo(x + r, y + r); path.moveTo(x - r, y + r); path.lineTo(x + r, y - r); break;
    case "plus": path.moveTo(x - r, y); path.lineTo(x + r, y); path.moveTo(x, y - r); path.lineTo(x, y + r); break;
  }
}

// What is laid over leaves what lies below in sight.
const filled = mark => mark === "circle";

// Ends of what is seen along y, with a margin.
function reach(curves, low, high, log) {
  let least = Infinity, most = -Infinity;
  for (const { x, y } of curves) {
    for (let k = 0; k < x.length; k++) {
      const value = y[k];
      if (value === null || x[k] < low || x[k] > high || (log && value <= 0)) continue;
      if (value < least) least = value;
      if (value > most) most = value;
    }
  }
  if (least > most) return log ? [0.1, 1] : [0, 1];
  if (log) return [least * 0.8, most * 1.25];
  const margin = most > least ? 0.07 * (most - least) : Math.max(Math.abs(most) * 0.05, 1e-12);
  return [least - margin, most + margin];
}

function drawCurve(u, curve) {
  const { ctx } = u, ratio = devicePixelRatio || 1, look = curve.look % MARKS.length, ink = colour(look);
  const X = new Float64Array(curve.x.length), Y = new Float64Array(curve.x.length);
  const far = 4 * Math.max(u.bbox.width, u.bbox.height), hold = value => Math.max(-far, Math.min(2 * far, value));
  let known = 0;
  for (let k = 0; k < X.length; k++) {
    const value = curve.y[k];
    X[k] = hold(u.valToPos(curve.x[k], "x", true));
    Y[k] = value === null || (u.scales.y.distr === 3 && value <= 0) ? NaN : hold(u.valToPos(value, "y", true));
    if (Y[k] === Y[k] && X[k] >= u.bbox.left && X[k] <= u.bbox.left + u.bbox.width) known++;
  }
  ctx.strokeStyle = ctx.fillStyle = ink;
  if (curve.u) drawSpread(u, curve, X, Y, known, hold);
  ctx.lineWidth = 1.1 * ratio;
  if (known > MOST_MARKS && curve.line) {
    ctx.setLineDash(DASHES[look].map(each => each * ratio));
    ctx.beginPath();
    for (let k = 0, down = false; k < X.length; k++) {
      if (Y[k] !== Y[k]) { down = false; continue; }
      if (down) ctx.lineTo(X[k], Y[k]); else ctx.moveTo(X[k], Y[k]);
      down = true;
    }
    ctx.stroke();
    ctx.setLineDash([]);
    return;
  }
  const path = new Path2D(), r = (known > MOST_MARKS ? 1.6 : 3) * ratio;
  for (let k = 0; k < X.length; k++) if (Y[k] === Y[k]) outline(path, MARKS[look], X[k], Y[k], r);
  ctx.lineWidth = 0.9 * ratio;
  if (filled(MARKS[look])) ctx.fill(path);
  ctx.stroke(path);
}

function drawSpread(u, curve, X, Y, known, hold) {
  const { ctx } = u, ratio = devicePixelRatio || 1;
  const at = (k, side) => hold(u.valToPos(curve.y[k] + side * curve.u[k], "y", true));
  const has = k => Y[k] === Y[k] && curve.u[k] > 0 && (u.scales.y.distr !== 3 || curve.y[k] > curve.u[k]);
  if (known > MOST_BARS && curve.line) {
    ctx.globalAlpha = 0.2;
    for (let k = 0; k < X.length; k++) {
      if (!has(k)) continue;
      const first = k;
      while (k + 1 < X.length && has(k + 1)) k++;
      ctx.beginPath();
      for (let j = first; j <= k; j++) ctx.lineTo(X[j], at(j, 1));
      for (let j = k; j >= first; j--) ctx.lineTo(X[j], at(j, -1));
      ctx.fill();
    }
    ctx.globalAlpha = 1;
    return;
  }
  ctx.beginPath();
  for (let k = 0; k < X.length; k++) if (has(k)) { ctx.moveTo(X[k], at(k, 1)); ctx.lineTo(X[k], at(k, -1)); }
  ctx.lineWidth = 0.8 * ratio;
  ctx.stroke();
}

class Chart {
  constructor(figure) {
    this.figure = figure;
    this.names = figure.dataset.names.split(" ");
    this.reading = figure.querySelector(".reading");
    this.heard = figure.querySelector("[role=status]");
    this.picture = figure.querySelector("picture");
    this.strips = [];
    this.view = null;
    this.asked = 0;
    this.stop = null;
  }

  async begin() {
    const { from, to } = this.figure.dataset;
    const given = from || to ? [from ? Number(from) : null, to ? Number(to) : null] : null;
    const found = await Promise.all(this.names.map(name => this.points(name, given)));
    this.whole = [found[0].low, found[0].high];
    if (this.whole.includes(null)) return;
    const margin = 0.02 * (this.whole[1] - this.whole[0]) || Math.max(Math.abs(this.whole[1]) * 0.05, 1);
    this.whole = [this.whole[0] - margin, this.whole[1] + margin];
    this.view = given ? [given[0] ?? this.whole[0], given[1] ?? this.whole[1]] : [...this.whole];
    if (!(this.view[1] > this.view[0])) this.view = [...this.whole]; // one end alone, beyond all rows
    this.across = found[0].across;
    const unit = document.getElementById("in-unit");
    if (unit) unit.textContent = `as ${this.across}`;
    this.lay(found.map(each => each.panels[0]));
  }

  get width() { return Math.max(260, Math.floor(this.live ? this.live.clientWidth : this.picture.clientWidth)); }

  address(name, view) {
    const url = new URL(this.figure.dataset.points, location.href);
    url.searchParams.append("y", name);
    if (view && view[0] !== null) url.searchParams.set("from", String(view[0]));
    if (view && view[1] !== null) url.searchParams.set("to", String(view[1]));
    url.searchParams.set("width", String(Math.min(2400, Math.max(300, Math.round(this.picture.clientWidth || this.width)))));
    return url;
  }

  async points(name, view, signal) {
    const answer = await fetch(this.address(name, view), { signal });
    if (!answer.ok) throw new Error(`the points of ${name} could not be fetched: ${answer.status}`);
    return answer.json();
  }

  lay(panels) {
    const height = this.picture.clientHeight;
    const live = document.createElement("div");
    live.className = "live";
    live.tabIndex = 0;
    live.setAttribute("role", "group");
    live.setAttribute("aria-label", "Chart. Plus and minus draw it closer and wider, arrow keys move along it, 0 shows all rows.");
    live.style.height = `${height}px`;
    const owners = [...new Map(panels.flatMap(panel => panel.curves.map(curve => [curve.look, curve.owner])))];
    owners.sort((one, two) => one[0] - two[0]);
    if (owners.length > 1) live.append(this.key(owners));
    this.picture.hidden = true;
    this.picture.style.display = "none";
    this.picture.after(live);
    this.live = live;
    const left = height - (live.firstChild ? live.firstChild.offsetHeight : 0);
    this.strips = panels.map((panel, number) => this.strip(panel, Math.floor((left - 38 * size()) / panels.length) + (number === panels.length - 1 ? Math.floor(38 * size()) : 0), number === panels.length - 1));
    this.fill(this.figure.querySelector(".move"));
    live.addEventListener("keydown", event => this.pressed(event));
    live.addEventListener("wheel", event => this.turned(event), { passive: false });
    matchMedia("(prefers-color-scheme: dark)").addEventListener("change", () => this.redraw());
    new ResizeObserver(() => this.resized()).observe(live);
    this.figure.dataset.ready = "yes";
  }

  key(owners) {
    const list = document.createElement("ul");
    list.className = "key";
    for (const [look, owner] of owners) {
      const item = document.createElement("li");
      const canvas = document.createElement("canvas");
      canvas.width = 44; canvas.height = 12;
      canvas.dataset.look = look;
      this.mark(canvas, look);
      item.append(canvas, ` ${owner}`);
      list.append(item);
    }
    return list;
  }

  mark(canvas, look) {
    const ctx = canvas.getContext("2d"), path = new Path2D(), kind = look % MARKS.length;
    ctx.clearRect(0, 0, canvas.width, canvas.height);
    ctx.strokeStyle = ctx.fillStyle = colour(kind);
    ctx.setLineDash(DASHES[kind]);
    ctx.beginPath(); ctx.moveTo(0, 6); ctx.lineTo(44, 6); ctx.stroke();
    ctx.setLineDash([]);
    outline(path, MARKS[kind], 22, 6, 3.4);
    if (filled(MARKS[kind])) ctx.fill(path);
    ctx.stroke(path);
  }

  strip(panel, height, last) {
    const box = document.createElement("div");
    box.className = "strip";
    const of = document.createElement("div");
    of.className = "of";
    of.textContent = panel.words;
    box.append(of);
    this.live.append(box);
    const strip = { panel, plot: null, box };
    const ink = () => style("--ink"), rule = () => style("--rule");
    const grown = size(), wide = (this.width >= 600 ? 84 : 66) * grown;
    of.style.left = `${wide}px`;
    const axis = { stroke: ink, font: `${13 * grown}px Georgia, serif`, labelFont: `${13 * grown}px Georgia, serif`, grid: { stroke: rule, width: 0.7 }, ticks: { show: false } };
    strip.plot = new uPlot({
      width: this.width, height, padding: [22 * grown, 14, 0, 0],
      legend: { show: false },
      cursor: { sync: { key: this.figure.dataset.points, setSeries: false }, drag: { x: true, y: false, dist: 6 }, points: { show: false } },
      scales: {
        x: { time: false, range: () => this.view },
        y: { distr: panel.log ? 3 : 1, range: () => reach(strip.panel.curves, this.view[0], this.view[1], panel.log) },
      },
      axes: [
        { ...axis, size: last ? 24 * grown : 8, label: last ? this.across : undefined, labelSize: last ? 22 * grown : 0, labelGap: 0, space: 90 * grown, values: last ? (u, splits, _a, _s, step) => tickTexts(splits, step) : (u, splits) => splits.map(() => "") },
        { ...axis, size: wide - 22 * grown, label: panel.axis, labelSize: 22 * grown, space: 36 * grown, ...(panel.log ? {} : { values: (u, splits, _a, _s, step) => tickTexts(splits, step) }) },
      ],
      series: [{}, { show: true, paths: () => null, points: { show: false } }],
      hooks: {
        draw: [u => { const { ctx, bbox } = u; ctx.save(); ctx.beginPath(); ctx.rect(bbox.left, bbox.top, bbox.width, bbox.height); ctx.clip(); for (const curve of strip.panel.curves) drawCurve(u, curve); ctx.restore(); ctx.save(); ctx.strokeStyle = style("--ink"); ctx.lineWidth = devicePixelRatio || 1; ctx.strokeRect(bbox.left, bbox.top, bbox.width, bbox.height); ctx.restore(); }],
        setSelect: [u => { if (u.select.width > 5) this.show(u.posToVal(u.select.left, "x"), u.posToVal(u.select.left + u.select.width, "x")); u.setSelect({ left: 0, width: 0, top: 0, height: 0 }, false); }],
        setCursor: [u => { if (u.cursor.event || u.cursor.left >= 0) this.read(strip); }],
      },
    }, [[this.view[0], this.view[1]], [null, null]], box);
    this.underFingers(strip.plot.over);
    strip.plot.over.addEventListener("dblclick", () => this.show(...this.whole));
    return strip;
  }

  fill(list) {
    for (const [words, act] of [["closer", () => this.zoom(0.5)], ["wider", () => this.zoom(2)], ["\u2190", () => this.pan(-0.4)], ["\u2192", () => this.pan(0.4)], ["all rows", () => this.show(...this.whole)]]) {
      const button = document.createElement("button");
      button.type = "button";
      button.textContent = words;
      if (words.length === 1) button.setAttribute("aria-label", words === "\u2190" ? "earlier along the axis" : "later along the axis");
      button.addEventListener("click", act);
      list.append(button);
    }
  }

  pressed(event) {
    if (event.ctrlKey || event.metaKey || event.altKey) return;
    const act = { "+": () => this.zoom(0.5), "=": () => this.zoom(0.5), "-": () => this.zoom(2), ArrowLeft: () => this.pan(-0.2), ArrowRight: () => this.pan(0.2), "0": () => this.show(...this.whole) }[event.key];
    if (!act) return;
    event.preventDefault();
    act();
  }

  turned(event) {
    // A wheel alone goes on scrolling the page.
    if (!event.ctrlKey) return;
    event.preventDefault();
    const plot = this.strips[0].plot, box = plot.over.getBoundingClientRect();
    this.zoom(event.deltaY < 0 ? 0.8 : 1.25, (event.clientX - box.left) / box.width);
  }

  // One finger moves along the axis, two hold what is under them; up and down still scroll the page.
  underFingers(over) {
    const fingers = new Map();
    let begun = null;
    const share = event => { const box = over.getBoundingClientRect(); return (event.clientX - box.left) / box.width; };
    const grip = () => { begun = { view: [...this.view], at: [...fingers.values()] }; };
    const moved = () => {
      const [low, high] = begun.view, under = begun.at.map(at => low + at * (high - low)), [one, two] = fingers.values();
      if (fingers.size === 1) this.move(under[0] - one * (high - low), high - low);
      if (fingers.size !== 2 || Math.abs(two - one) < 0.02 || (two > one) !== (under[1] > under[0])) return;
      const width = (under[1] - under[0]) / (two - one);
      this.show(under[0] - one * width, under[0] - one * width + width);
    };
    over.addEventListener("pointerdown", event => {
      if (event.pointerType !== "touch") return;
      fingers.set(event.pointerId, share(event));
      over.setPointerCapture(event.pointerId);
      grip();
    });
    over.addEventListener("pointermove", event => { if (fingers.has(event.pointerId)) { fingers.set(event.pointerId, share(event)); moved(); } });
    for (const end of ["pointerup", "pointercancel"]) over.addEventListener(end, event => { if (fingers.delete(event.pointerId)) grip(); });
  }

  zoom(factor, about = 0.5) {
    const [low, high] = this.view, middle = low + about * (high - low);
    this.show(middle - (middle - low) * factor, middle + (high - middle) * factor);
  }

  pan(share) {
    const width = this.view[1] - this.view[0];
    this.move(this.view[0] + share * width, width);
  }

  // Show a part of this width, as far as there are rows.
  move(begin, width) {
    const low = Math.min(Math.max(begin, this.whole[0]), this.whole[1] - width);
    if (low !== this.view[0]) this.show(low, low + width);
  }

  show(low, high) {
    const least = Math.max(low, this.whole[0]), most = Math.min(high, this.whole[1]);
    if (!(most > least) || (most - least) < 1e-9 * (this.whole[1] - this.whole[0])) return;
    this.view = [Number(least.toPrecision(10)), Number(most.toPrecision(10))];
    this.redraw();
    clearTimeout(this.asked);
    this.figure.dataset.ready = "no";
    this.asked = setTimeout(() => this.refine(), WAIT_MS);
  }

  isWhole() { return this.view[0] <= this.whole[0] && this.view[1] >= this.whole[1]; }

  async refine() {
    this.stop?.abort();
    this.stop = new AbortController();
    const view = this.isWhole() ? null : [...this.view];
    this.told(view);
    try {
      await Promise.all(this.strips.map(async strip => {
        const found = await this.points(strip.panel.name, view, this.stop.signal);
        strip.panel = found.panels[0];
        strip.plot.redraw(true, true);
        this.rescale(strip);
      }));
      this.figure.dataset.ready = "yes";
    } catch (problem) {
      if (problem.name !== "AbortError") this.reading.textContent = problem.message;
    }
  }

  // The address of the page and of what can be taken away follow the view.
  told(view) {
    const follow = url => {
      url.searchParams.delete("from"); url.searchParams.delete("to");
      if (view) { url.searchParams.set("from", String(view[0])); url.searchParams.set("to", String(view[1])); }
      return url;
    };
    history.replaceState(null, "", follow(new URL(location.href)));
    for (const link of document.querySelectorAll("a[data-file]")) link.href = follow(new URL(link.href));
    const [from, to] = [document.getElementById("from"), document.getElementById("to")];
    this.heard.textContent = view ? `${this.across} from ${view[0]} to ${view[1]}` : "all rows";
    from.value = view ? view[0] : "";
    to.value = view ? view[1] : "";
  }

  rescale(strip) { strip.plot.setData([[this.view[0], this.view[1]], [null, null]]); }

  redraw() {
    for (const strip of this.strips) this.rescale(strip);
    for (const canvas of this.figure.querySelectorAll(".key canvas")) this.mark(canvas, Number(canvas.dataset.look));
  }

  resized() {
    for (const strip of this.strips) if (strip.plot.width !== this.width) strip.plot.setSize({ width: this.width, height: strip.plot.height });
  }

  // The nearest point of a strip under the pointer, in words.
  read(strip) {
    const u = strip.plot, { left, top } = u.cursor;
    if (left < 0 || !u.over.matches(":hover")) return;
    let best = null, least = 30 * 30;
    for (const curve of strip.panel.curves) {
      for (let k = 0; k < curve.x.length; k++) {
        if (curve.y[k] === null) continue;
        const apart = (u.valToPos(curve.x[k], "x") - left) ** 2 + (u.valToPos(curve.y[k], "y") - top) ** 2;
        if (apart < least) { least = apart; best = [curve, k]; }
      }
    }
    if (best === null) { this.reading.textContent = ""; return; }
    const [curve, k] = best, said = value => String(Number(value.toPrecision(7))).replace("-", "\u2212");
    const spread = curve.u && curve.u[k] ? ` \u00b1 ${String(Number(curve.u[k].toPrecision(2)))}` : "";
    this.reading.textContent = `${curve.owner}: ${this.across} = ${said(curve.x[k])}, ${strip.panel.axis} = ${said(curve.y[k])}${spread}`;
  }
}

for (const figure of document.querySelectorAll(".chart[data-points]")) {
  const chart = new Chart(figure);
  // Where points cannot be had, the picture stays.
  const begin = () => chart.begin().catch(problem => { figure.querySelector(".reading").textContent = problem.message; });
  const image = figure.querySelector("img");
  if (image.complete || image.clientHeight) begin(); else image.addEventListener("load", begin, { once: true });
}

"""Charts in a real browser: drawn without a script, drawn closer with one, laid over one another, taken away, by keys alone."""

from __future__ import annotations

from pathlib import Path

import pandas as pd
import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Browser, Page

from tests.filled_archive import HOSTILE, PLAIN

pytestmark = pytest.mark.browser

SWEEP = f"/at/{PLAIN}/s002"
PAGES = (
    SWEEP,
    f"/at/{PLAIN}/s001@empty-cell.1/temperature",
    f"/lineage/{PLAIN}/s001@empty-cell.1",
    f"/at/{HOSTILE}/s001",
)

_SHIFT = """() => new Promise(done => {
  let sum = 0;
  new PerformanceObserver(list => { for (const each of list.getEntries()) sum += each.value; })
    .observe({type: "layout-shift", buffered: true});
  requestAnimationFrame(() => setTimeout(() => done(sum), 100));
})"""
_OVERFLOW = "() => document.documentElement.scrollWidth - document.documentElement.clientWidth"
_READY = ".chart[data-ready=yes]"
# How many pixels of the first strip have the colour of the first curve.
_INKED = """() => {
  const canvas = document.querySelector(".strip canvas"), data = canvas.getContext("2d").getImageData(0, 0, canvas.width, canvas.height).data;
  let count = 0;
  for (let k = 0; k < data.length; k += 4) if (data[k + 3] > 200 && data[k] < 60 && data[k + 1] < 60 && data[k + 2] < 60) count++;
  return count;
}"""


def _view(page: Page) -> list[str]:
    return [page.locator(f"#{name}").input_value() for name in ("from", "to")]


def test_a_drag_draws_closer_and_everything_follows(page: Page, tmp_path: Path) -> None:
    page.goto(f"{SWEEP}?against=temperature&y=period")
    page.wait_for_selector(_READY)
    assert page.evaluate(_INKED) > 500
    box = page.locator(".strip .u-over").first.bounding_box()
    assert box is not None
    middle = box["y"] + box["height"] / 2
    page.mouse.move(box["x"] + 0.25 * box["width"], middle)
    page.mouse.down()
    page.mouse.move(box["x"] + 0.5 * box["width"], middle, steps=4)
    page.mouse.up()
    page.wait_for_url("**from=*")
    page.wait_for_selector(_READY)
    assert page.locator("#in-unit").inner_text() == "as T / mK (ITS-90)"
    low, high = map(float, _view(page))
    # 200 to 790 mK with 2 % to spare on both sides.
    assert low == pytest.approx(200 - 11.8 + 0.25 * 613.6, abs=3)
    assert high == pytest.approx(200 - 11.8 + 0.5 * 613.6, abs=3)
    with page.expect_download() as taken:
        page.get_by_role("link", name="CSV", exact=True).click()
    taken.value.save_as(tmp_path / "shown.csv")
    shown = pd.read_csv(tmp_path / "shown.csv", comment="#")
    assert list(shown) == ["temperature/K", "temperature_uncertainty/K", "period/ms", "period_uncertainty/ms"]
    assert low / 1e3 <= shown["temperature/K"].min() < shown["temperature/K"].max() <= high / 1e3
    assert len(shown) > 10
    page.reload()
    page.wait_for_selector(_READY)
    assert list(map(float, _view(page))) == pytest.approx([low, high])


def test_keys_alone_draw_closer_move_and_go_back(page: Page) -> None:
    page.goto(f"{SWEEP}?against=temperature&y=period")
    page.wait_for_selector(_READY)
    page.locator(".live").focus()
    page.keyboard.press("+")
    page.wait_for_url("**from=*")
    closer = list(map(float, _view(page)))
    assert closer[1] - closer[0] == pytest.approx(613.6 / 2, rel=0.01)
    assert page.get_by_role("status").inner_text().startswith("T / mK (ITS-90) from 3")
    page.wait_for_selector(_READY)
    page.keyboard.press("ArrowRight")
    page.wait_for_function("low => Number(document.getElementById('from').value) > low", arg=closer[0])
    page.wait_for_selector(_READY)
    page.keyboard.press("0")
    page.wait_for_function("() => document.getElementById('from').value === ''")
    assert "from=" not in page.url


def test_two_fingers_draw_closer_and_one_moves_along(browser: Browser, server: str) -> None:
    context = browser.new_context(base_url=server, viewport={"width": 400, "height": 800}, has_touch=True)
    page = context.new_page()
    page.goto(f"{SWEEP}?against=temperature&y=period")
    page.wait_for_selector(_READY)
    box = page.locator(".strip .u-over").first.bounding_box()
    assert box is not None
    hand = context.new_cdp_session(page)

    def touch(kind: str, *shares: float) -> None:
        points = [
            {"x": box["x"] + share * box["width"], "y": box["y"] + 0.5 * box["height"], "id": number}
            for number, share in enumerate(shares)
        ]
        hand.send("Input.dispatchTouchEvent", {"type": kind, "touchPoints": points})

    touch("touchStart", 0.4, 0.6)
    touch("touchMove", 0.3, 0.7)
    touch("touchMove", 0.2, 0.8)
    touch("touchEnd")
    page.wait_for_url("**from=*")
    page.wait_for_selector(_READY)
    # 188.2 to 801.8 mK were in view; what was a fifth of it is now three fifths, about the same middle.
    low, high = map(float, _view(page))
    assert [low, high] == pytest.approx([495 - 613.6 / 6, 495 + 613.6 / 6], abs=3)
    touch("touchStart", 0.5)
    touch("touchMove", 0.6)
    touch("touchMove", 0.75)
    touch("touchEnd")
    page.wait_for_function("low => Number(document.getElementById('from').value) < low - 1", arg=low)
    page.wait_for_selector(_READY)
    before, (low, high) = low, map(float, _view(page))
    assert high - low == pytest.approx(613.6 / 3, abs=3)
    assert low == pytest.approx(before - 613.6 / 12, abs=6)
    context.close()


def test_a_pointer_is_told_the_nearest_point(page: Page) -> None:
    page.goto(f"{SWEEP}?against=row&y=temperature")
    page.wait_for_selector(_READY)
    box = page.locator(".strip .u-over").first.bounding_box()
    assert box is not None
    page.mouse.move(box["x"] + 5, box["y"] + 5)
    # Row and temperature rise together: the middle of the strip is on the curve.
    page.mouse.move(box["x"] + box["width"] / 2, box["y"] + box["height"] / 2)
    said = page.locator(".reading").inner_text()
    assert said.startswith(f"{PLAIN}/s002: number of the row = ")
    row = float(said.split(" = ")[1].split(",")[0])
    assert f"T / mK (ITS-90) = {200 + 10 * (row - 1):g}" in said
    assert " ± 0.1" in said


def test_ticks_say_what_they_stand_at(page: Page) -> None:
    """A step of a quarter has two places: rounded to one, 0.25 would be told as 0.3."""
    page.goto(f"{SWEEP}?against=temperature&y=period")
    page.wait_for_selector(_READY)
    script = page.locator("script[type=module]").get_attribute("src")
    told = "async script => { const { digits } = await import(script); return [0.25, 0.5, 1, 2.5, 20, 0.002, 2.5e-7].map(digits); }"
    assert page.evaluate(told, script) == [2, 1, 0, 1, 0, 3, 8]


def test_two_sweeps_are_laid_over_and_one_taken_off(page: Page) -> None:
    page.goto(f"{SWEEP}?against=temperature&y=period")
    page.get_by_label("lay over").fill(f"{PLAIN}/s001")
    page.get_by_role("button", name="draw").click()
    page.wait_for_url("**with=*")
    page.wait_for_selector(_READY)
    assert [each.strip() for each in page.locator(".key li").all_inner_texts()] == [
        f"{PLAIN}/s002",
        f"{PLAIN}/s001",
    ]
    page.get_by_label("lay over").fill("<img src=x onerror=alert(1)>")
    page.get_by_role("button", name="draw").click()
    page.wait_for_selector(_READY)
    assert "is not laid over" in page.locator(".told").inner_text()
    assert page.locator("main img[src=x]").count() == 0
    page.get_by_role("link", name=f"take off {PLAIN}/s001").click()
    page.wait_for_selector(_READY)
    assert page.locator(".key li").count() == 0


def test_without_a_script_there_is_a_picture(browser: Browser, server: str) -> None:
    context = browser.new_context(base_url=server, java_script_enabled=False)
    page = context.new_page()
    page.goto(f"{SWEEP}?against=temperature&y=period&from=300&to=400")
    image = page.locator(".chart img")
    assert image.is_visible()
    box = image.bounding_box()
    assert box is not None
    assert box["width"] > 900
    page.get_by_text("Which columns").click()
    page.get_by_role("checkbox", name="time").check()
    page.get_by_role("button", name="draw").click()
    assert "y=time" in page.url
    assert "from=300" in page.url
    context.close()


def test_everybody_can_read_charts(browser: Browser, server: str) -> None:
    everything = {"runOnly": ["wcag2a", "wcag2aa", "wcag21a", "wcag21aa", "wcag22aa", "best-practice"]}
    for scheme, rules in (("light", everything), ("dark", {"runOnly": ["color-contrast"]})):
        context = browser.new_context(base_url=server, color_scheme=scheme)
        page = context.new_page()
        for path in PAGES:
            page.goto(path)
            if not path.startswith("/lineage"):
                page.wait_for_selector(_READY)
            found = Axe().run(page, options=rules)
            assert found.violations_count == 0, f"{path} {scheme}: {found.generate_report()}"
        context.close()


def test_nothing_jumps_when_a_script_takes_over_and_a_small_screen_is_enough(page: Page) -> None:
    for width in (1280, 320):
        page.set_viewport_size({"width": width, "height": 800})
        for path in PAGES:
            page.goto(path)
            if not path.startswith("/lineage"):
                page.wait_for_selector(_READY)
            page.wait_for_load_state("networkidle")
            assert page.evaluate(_SHIFT) == 0, (path, width)
            assert page.evaluate(_OVERFLOW) <= 0, (path, width)

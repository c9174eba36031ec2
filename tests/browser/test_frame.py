"""The frame of every page in a real browser: keys, names that try something, contrast and labels, no jumping, no overflow."""

from __future__ import annotations

import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Browser, Page

from tests.filled_archive import HOSTILE, NAME, PLAIN

pytestmark = pytest.mark.browser

PAGES = (
    "/", "/search", "/search?coverage=20", "/cooldowns", "/cells", "/thermometers", "/state", f"/at/{PLAIN}", f"/at/{HOSTILE}", "/at/nowhere",
    "/at/TO-1", "/at/SALT-1", "/at/empty-cell.r1", f"/at/{PLAIN}/s001@empty-cell.1/empty_period",
)  # fmt: skip

_SHIFT = """() => new Promise(done => {
  let sum = 0;
  new PerformanceObserver(list => { for (const each of list.getEntries()) sum += each.value; })
    .observe({type: "layout-shift", buffered: true});
  requestAnimationFrame(() => setTimeout(() => done(sum), 100));
})"""
_OVERFLOW = "() => document.documentElement.scrollWidth - document.documentElement.clientWidth"


def test_everybody_can_read_every_page(browser: Browser, server: str) -> None:
    """Between light and dark nothing differs but colours."""
    everything = {"runOnly": ["wcag2a", "wcag2aa", "wcag21a", "wcag21aa", "wcag22aa", "best-practice"]}
    dark = ("/search?coverage=20", "/state", f"/at/{PLAIN}", f"/at/{HOSTILE}")
    colours = {"runOnly": ["color-contrast"]}
    for scheme, rules, paths in (("light", everything, PAGES), ("dark", colours, dark)):
        context = browser.new_context(base_url=server, color_scheme=scheme)
        page = context.new_page()
        for path in paths:
            page.goto(path)
            found = Axe().run(page, options=rules)
            assert found.violations_count == 0, f"{path} {scheme}: {found.generate_report()}"
        context.close()


def test_nothing_jumps_and_a_small_screen_is_enough(page: Page) -> None:
    for path in PAGES:
        page.goto(path)
        assert page.evaluate(_SHIFT) == 0, path
    page.set_viewport_size({"width": 320, "height": 740})
    for path in PAGES:
        page.goto(path)
        assert page.evaluate(_OVERFLOW) <= 0, path


def test_keys_alone_lead_to_a_cooldown(page: Page) -> None:
    page.goto("/cooldowns")
    page.keyboard.press("Tab")
    assert page.evaluate("document.activeElement.className") == "skip"
    page.keyboard.press("Enter")
    assert page.evaluate("document.activeElement.id") == "main"
    for _ in range(30):
        page.keyboard.press("Tab")
        if page.evaluate("document.activeElement.textContent") == PLAIN:
            break
    page.keyboard.press("Enter")
    page.wait_for_url(f"**/at/{PLAIN}")
    page.get_by_label("address", exact=True).focus()
    page.keyboard.type(f"{PLAIN}/s002")
    page.keyboard.press("Enter")
    page.wait_for_url(f"**/at/{PLAIN}/s002")


def test_a_search_is_written_found_and_opened(page: Page) -> None:
    page.goto("/search")
    page.get_by_label("coverage").fill("20:40 umol/m^2")
    page.get_by_label("cell", exact=True).fill("TO-1")
    page.get_by_role("button", name="find").click()
    assert "coverage=20" in page.url
    pictures = page.locator("img.thumb")
    assert pictures.count() == 1
    pictures.first.scroll_into_view_if_needed()
    page.wait_for_function("document.querySelector('img.thumb').naturalWidth === 132")
    page.get_by_role("link", name=f"{PLAIN}/s002").click()
    page.wait_for_url(f"**/at/{PLAIN}/s002")
    page.go_back()
    assert page.get_by_label("coverage").input_value() == "20:40 umol/m^2"


def test_a_stroke_of_the_time_line_opens_its_sweep(page: Page) -> None:
    page.goto(f"/at/{PLAIN}")
    stroke = page.locator(f'.timeline a[href="/at/{PLAIN}/s002"]')
    assert "temperature sweep" in (stroke.locator("title").text_content() or "")
    stroke.focus()
    page.keyboard.press("Enter")
    page.wait_for_url(f"**/at/{PLAIN}/s002")


def test_a_run_sheet_opens_as_a_page_with_its_style(page: Page) -> None:
    page.goto(f"/at/{PLAIN}")
    page.get_by_role("link", name="page", exact=True).click()
    page.wait_for_url(f"**/run-sheet/{PLAIN}.html")
    assert page.evaluate("document.styleSheets[0].cssRules.length") > 5


def test_a_point_of_a_life_story_opens_its_result(page: Page) -> None:
    page.goto("/at/TO-1")
    point = page.locator(".timeline a[href$='/empty_period']")
    point.focus()
    page.keyboard.press("Enter")
    page.wait_for_url(f"**/at/{PLAIN}/s001@empty-cell.1/empty_period")


def test_hostile_names_are_text(page: Page) -> None:
    page.on("dialog", lambda _: pytest.fail("a name opened a dialog"))
    page.goto("/cooldowns")
    assert page.locator(".lab").inner_text() == NAME
    page.goto(f"/at/{HOSTILE}")
    body = page.locator("main")
    assert "<script>alert(1)</script>" in body.inner_text()
    assert (
        page.evaluate("document.querySelectorAll('main script, main img:not(.thumb), main [onload]').length")
        == 0
    )


def test_what_is_not_there_says_where_else_to_look(page: Page) -> None:
    answer = page.goto("/at/2025-12")
    assert answer is not None
    assert answer.status == 404
    page.get_by_role("link", name=PLAIN).click()
    page.wait_for_url(f"**/at/{PLAIN}")

"""The plane in a real browser: pointing, opening, filtering, moving it by wheel, hand and keys, and reading it without any of these."""

from __future__ import annotations

import re
from collections.abc import Iterator

import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Browser, Locator, Page, expect

from tests.browser.served import served
from tests.plane_archive import planed

pytestmark = pytest.mark.browser


@pytest.fixture(scope="module")
def server(tmp_path_factory: pytest.TempPathFactory) -> Iterator[str]:
    """Give the address of a server of an archive whose plane is known."""
    with served(planed(tmp_path_factory.mktemp("plane") / "lab")) as address:
        yield address


def _bar(page: Page, name: str) -> Locator:
    return page.locator(f'.plane-field a.bar[href$="/{name}"]')


def _window(page: Page) -> list[float]:
    plane = page.locator(".plane")
    return [float(plane.get_attribute(f"data-{end}") or "nan") for end in ("cold", "warm", "bottom", "top")]


def _place(page: Page, x: float, y: float) -> tuple[float, float]:
    """Return the pixel at shares of the field, from its lower left corner."""
    box = page.locator(".plane-field").bounding_box()
    assert box is not None
    return box["x"] + x * box["width"], box["y"] + (1 - y) * box["height"]


def _moved(page: Page, before: list[float]) -> list[float]:
    expect(page.locator(".plane")).not_to_have_attribute("data-warm", str(before[1]))
    return _window(page)


def test_pointing_tells_and_a_click_opens(page: Page) -> None:
    page.goto("/?temperature=0:1 K&coverage=0:60 umol/m^2")
    page.mouse.move(*_place(page, 0.2, 0.5))
    expect(page.locator(".reading")).to_contain_text("2025-01/s1: temperature-sweep, TO-4; 30.00(50)")
    page.mouse.move(*_place(page, 0.41, 0.5))
    expect(page.locator(".reading")).to_contain_text("film-transition.2#T_KT: 410.0(2.0)")
    shades = page.evaluate("""() => ["a.bar[href$='/s1'] .ink", "a.point[href*='/s1@'] path"]
        .map(each => getComputedStyle(document.querySelector(".plane-field " + each)).stroke)""")
    assert shades[0] == shades[1], "a transition has the shade of its cell"
    page.mouse.click(*_place(page, 0.2, 0.5))
    page.wait_for_url("**/at/2025-01/s1")


def test_a_filter_leaves_its_cell_and_its_shade(page: Page) -> None:
    page.goto("/")
    shade = _bar(page, "s3").get_attribute("class")
    page.get_by_label("cell", exact=True).select_option("PG-2")
    page.get_by_role("button", name="show").click()
    page.wait_for_url(re.compile("cell=PG-2"))
    expect(page.locator("a.bar")).to_have_count(1)
    assert _bar(page, "s3").get_attribute("class") == shade
    page.get_by_role("link", name="as a table").click()
    expect(page.locator("tbody tr")).to_have_count(1)


def test_the_wheel_looks_closer_about_the_pointer_and_back_goes_back(page: Page) -> None:
    page.goto("/")
    before = _window(page)
    page.mouse.move(*_place(page, 0.25, 0.5))
    page.mouse.wheel(0, -240)
    cold, warm, bottom, top = _moved(page, before)
    assert warm - cold == pytest.approx((before[1] - before[0]) / 2.718, rel=0.01)
    kept = before[0] + 0.25 * (before[1] - before[0])
    assert cold + 0.25 * (warm - cold) == pytest.approx(kept, rel=0.01)
    assert bottom + 0.5 * (top - bottom) == pytest.approx((before[2] + before[3]) / 2, rel=0.01)
    assert "temperature=" in page.url
    assert "coverage=" in page.url
    page.go_back()
    assert _moved(page, [cold, warm, bottom, top]) == before


def test_a_drag_moves_the_paper_and_opens_nothing(page: Page) -> None:
    page.goto("/?temperature=0:1 K&coverage=0:60 umol/m^2")
    before = _window(page)
    page.mouse.move(*_place(page, 0.4, 0.5))  # on a bar
    page.mouse.down()
    page.mouse.move(*_place(page, 0.3, 0.6), steps=5)
    page.mouse.move(*_place(page, 0.2, 0.6), steps=5)
    page.mouse.up()
    cold, warm, bottom, top = _moved(page, before)
    assert (cold, warm, bottom, top) == pytest.approx((0.2, 1.2, -6.0, 54.0), abs=0.4)
    assert "/at/" not in page.url


def test_keys_alone_walk_look_closer_and_open(page: Page) -> None:
    page.goto("/")
    first = page.locator(".plane-field a[tabindex='0']")
    expect(first).to_have_count(1)
    first.focus()
    seen = {page.evaluate("document.activeElement.getAttribute('href')")}
    for _ in range(3):
        page.keyboard.press("ArrowUp")
        seen.add(page.evaluate("document.activeElement.getAttribute('href')"))
    assert len(seen) == 4, "each press another one"
    assert all(each.startswith("/at/2025-01/") for each in seen)
    said = page.evaluate("document.activeElement.getAttribute('aria-label')")
    expect(page.locator(".reading")).to_have_text(said)
    before = _window(page)
    page.keyboard.press("+")
    closer = _moved(page, before)
    assert closer[1] - closer[0] == pytest.approx(0.7 * (before[1] - before[0]), rel=0.01)
    page.keyboard.press("Shift+ArrowRight")
    aside = _moved(page, closer)
    assert aside[0] == pytest.approx(closer[0] + 0.15 * (closer[1] - closer[0]), rel=0.01)
    page.keyboard.press("0")
    assert _moved(page, aside) == before
    _bar(page, "s2").focus()
    page.keyboard.press("Enter")
    page.wait_for_url("**/at/2025-01/s2")


def test_a_window_that_cannot_be_is_not_gone_to(page: Page) -> None:
    """Looked at closer than numbers can tell apart, the field stays where it is and says nothing wrong."""
    page.goto("/?temperature=0.41:0.4100000005 K&coverage=20:40 umol/m^2")
    before = _window(page)
    page.locator(".plane-field").focus()
    with page.expect_response(re.compile("/plane/part")) as answer:
        page.keyboard.press("+")
    assert answer.value.status == 400
    expect(page.locator(".moving")).to_have_attribute("style", "transform-origin: 0px 0px;")
    assert _window(page) == before


def test_every_form_of_it_can_be_read_by_everybody(page: Page) -> None:
    rules = {"runOnly": ["wcag2a", "wcag2aa", "wcag21a", "wcag21aa", "wcag22aa", "best-practice"]}
    for way in ("/?state=withdrawn", "/?axis=pressure", "/?axis=cell", "/?view=table", "/?cell=nobody"):
        page.goto(way)
        found = Axe().run(page, options=rules)
        assert found.violations_count == 0, f"{way}: {found.generate_report()}"


def test_without_a_script_the_same_is_there(browser: Browser, server: str) -> None:
    context = browser.new_context(base_url=server, java_script_enabled=False)
    page = context.new_page()
    page.goto("/?temperature=0:1 K&coverage=0:60 umol/m^2")
    expect(page.locator("a.bar")).to_have_count(7)
    page.get_by_role("link", name="closer").click()
    assert _window(page) == pytest.approx([0.25, 0.75, 15.0, 45.0])
    context.close()

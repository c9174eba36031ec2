"""The plane as a page: what it draws is what the archive holds, in every form of it, and every question is checked."""

from __future__ import annotations

import contextlib
import math
import re
from collections.abc import Iterator
from pathlib import Path
from xml.etree import ElementTree as ET

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from starlette.testclient import TestClient

from archive import Archive
from archive.errors import BadRequest
from archive.lab.plane_asking import plane_window, window_fields
from archive.reports.plane_view import PlaneAxis, PlaneView
from archive.web import application
from archive.web.plane_drawing import drawing
from tests.plane_archive import planed


@pytest.fixture(scope="module")
def root(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give an archive whose plane is known."""
    return planed(tmp_path_factory.mktemp("plane") / "lab")


@pytest.fixture(scope="module")
def client(root: Path) -> Iterator[TestClient]:
    """Give a client of its pages."""
    with TestClient(application(root), base_url="http://localhost:8321") as client:
        yield client


def _field(text: str) -> ET.Element:
    found = re.search(r'<svg class="plane-field".*?(?=<svg class="plane-below")', text, re.DOTALL)
    assert found is not None
    return ET.fromstring(found[0])  # noqa: S314 - our own page


def _percent(element: ET.Element, name: str) -> float:
    return float(element.attrib[name].rstrip("%")) / 100


def _links(field: ET.Element, kind: str) -> list[ET.Element]:
    return [each for each in field.iter("a") if kind in each.attrib["class"].split()]


WINDOW = "/?temperature=0:1+K&coverage=0:60+umol/m^2"


def test_the_picture_is_what_the_archive_holds(root: Path, client: TestClient) -> None:
    """Bars, transitions and their spreads stand at the numbers of the view, to the digits of a percentage."""
    with Archive.open(root) as lab:
        view = lab.plane()
    field = _field(client.get(WINDOW).text)
    bars = {link.attrib["href"].removeprefix("/at/"): link for link in _links(field, "bar")}
    assert sorted(bars) == sorted(bar.address for bar in view.bars)
    for bar in view.bars:
        ink = [each for each in bars[bar.address].iter("line") if each.attrib["class"] == "ink"]
        if bar.cold == bar.warm and bar.bottom == bar.top:
            assert ink == []
            continue
        (line,) = ink
        ends = [_percent(line, name) for name in ("x1", "x2", "y1", "y2")]
        expected = [bar.cold, bar.warm, 1 - bar.bottom / 60e-6, 1 - bar.top / 60e-6]
        assert ends == pytest.approx(expected, abs=2e-5), bar.address
    points = {link.attrib["href"]: link for link in _links(field, "point")}
    assert set(points) == {
        "/at/2025-01/s1@film-transition.2/T_KT",
        "/at/2025-01/s3@porous-film.1/T_c",
        "/at/2025-01/t1@third-sound.1/transition_coverage",
    }
    film = points["/at/2025-01/s1@film-transition.2/T_KT"]
    (mark,) = film.iter("svg")
    assert (_percent(mark, "x"), _percent(mark, "y")) == pytest.approx((0.41, 0.5), abs=2e-5)
    across, upright = (each for each in film.iter("line") if each.attrib["class"] == "spread")
    assert (_percent(across, "x1"), _percent(across, "x2")) == pytest.approx((0.408, 0.412), abs=2e-5)
    assert _percent(upright, "y1") - _percent(upright, "y2") == pytest.approx(1 / 60, abs=4e-5)


def test_the_line_rises_by_the_universal_jump(client: TestClient) -> None:
    """8.72272 umol/m^2 a kelvin, from 2 m^2 k/(pi hbar^2) over the molar mass (Nelson and Kosterlitz, Phys. Rev. Lett. 39, 1201, 1977)."""
    field = _field(client.get(WINDOW).text)
    drawn = {
        (each.findtext("title") or "").partition(", ")[2].partition(":")[0]: each
        for each in field.iter("g")
        if "universal" in each.attrib.get("class", "")
    }
    assert set(drawn) == {"TO-4", "TS-1", "NEW-1"}
    for cell, inert in (("TO-4", 24.0), ("TS-1", 29.0 - 0.6 * 8.72272), ("NEW-1", 0.0)):
        line = next(each for each in drawn[cell].iter("line") if each.attrib["class"] == "dashes")
        begin, end = (60 * (1 - _percent(line, name)) for name in ("y1", "y2"))
        assert (begin, end) == pytest.approx((inert, inert + 8.72272), abs=2e-3)


def test_every_bar_says_what_it_is_and_leads_to_its_sweep(client: TestClient) -> None:
    text = client.get("/").text.replace("\N{NO-BREAK SPACE}", " ")
    said = "2025-01/s1: temperature-sweep, TO-4; 30.00(50) µmol·m⁻²; 50–600 mK; T_KT = 0.4100(20) K; "
    assert f'aria-label="{said}' in text
    assert f"<title>{said}" in text
    assert 'href="/at/2025-01/s1"' in text
    assert "2025-01/s1@film-transition.2#T_KT: 410.0(2.0) mK at 30.00(50) µmol·m⁻², TO-4" in text
    assert " style=" not in text, "the content policy forbids it"
    assert "9 sweeps, 7 of them shown. 1 sweep without a place on this axis. 1 sweep without a temperature." in text  # fmt: skip


@pytest.mark.parametrize(
    ("query", "shown"),
    [
        pytest.param("?cell=PG-2", ["s3"], id="cell"),
        pytest.param("?substrate=glass", ["s3"], id="substrate"),
        pytest.param("?kind=dose-run&until=", ["d1", "t1"], id="kind, an empty field"),
        pytest.param("?state=not+reduced&kind=temperature-sweep", ["e1", "s2", "s4"], id="state"),
        pytest.param("?state=withdrawn", ["w1"], id="withdrawn"),
        pytest.param("?since=2026-03-05", [], id="since"),
        pytest.param("?temperature=0.65:0.8+K&coverage=29:34+umol/m^2", ["s2", "s3"], id="window"),
        pytest.param("?axis=pressure", ["i1"], id="pressure"),
        pytest.param(
            "?axis=cell&cell=TO-4&temperature=10:700+mK&lanes=0:1", ["d1", "e1", "s1", "s2"], id="lanes"
        ),
    ],
)
def test_filters_choose_in_picture_part_and_table_alike(
    client: TestClient, query: str, shown: list[str]
) -> None:
    for page in (f"/{query}", f"/plane/part{query}"):
        links = _links(_field(client.get(page).text), "bar")
        assert sorted(link.attrib["href"].rpartition("/")[2] for link in links) == shown
    table = client.get(f"/{query}&view=table").text
    assert sorted(re.findall(r'<th scope="row"><a class="address" href="/at/2025-01/(\w+)"', table)) == shown


def test_the_table_is_sorted_by_its_links(client: TestClient) -> None:
    def rows(way: str) -> list[str]:
        return re.findall(r'<th scope="row">.*?>2025-01/(\w+)</a>', client.get(way).text)

    assert rows("/?view=table")[:2] == ["e1", "d1"]
    text = client.get("/?view=table&kind=temperature-sweep").text
    (way,) = re.findall(r'href="(/[^"]*sort=temperature[^"]*)"', text)
    once = way.replace("&amp;", "&")
    assert rows(once) == ["e1", "s1", "s2", "s4", "s3"], "s4 ends first"
    again = re.findall(r'aria-sort="ascending"><a href="([^"]*)"', client.get(once).text)
    assert rows(again[0].replace("&amp;", "&"))[0] == "s3"


@pytest.mark.parametrize(
    ("query", "field"),
    [
        ("?axis=colour", "axis"),
        ("?colour=red", "colour"),
        ("?temperature=0:1+K", "coverage"),
        ("?coverage=0:1+umol/m^2", "temperature"),
        ("?temperature=0:+K&coverage=0:1+umol/m^2", "temperature"),
        ("?temperature=1:1+K&coverage=0:1+umol/m^2", "temperature"),
        ("?temperature=0:1+K&coverage=0:1+K", "coverage"),
        ("?axis=pressure&temperature=0:1+K&pressure=1:2+Pa", "temperature"),
        ("?axis=cell&temperature=1:2+K&lanes=0:1+K", "lanes"),
        ("?since=yesterday", "since"),
        ("?page=0", "page"),
        ("?cell=a&cell=b", "cell"),
    ],
)
def test_what_cannot_be_asked_is_told_with_its_field(client: TestClient, query: str, field: str) -> None:
    answer = client.get(f"/{query}")
    assert answer.status_code == 400
    assert re.search(rf"\b{field}\b", answer.text)


def test_hostile_filters_are_text(client: TestClient) -> None:
    answer = client.get("/", params={"cell": "\"><script>alert(1)</script>' OR 1=1", "cooldown": "<b>"})
    assert answer.status_code == 200
    assert "<script>alert" not in answer.text
    assert "<b>" not in answer.text
    assert "take the filters away" in answer.text


def test_the_steps_move_the_window_without_a_script(client: TestClient) -> None:
    text = client.get(WINDOW).text
    ways = {
        words: way.replace("&amp;", "&")
        for way, words in re.findall(r'<a href="(/[^"]*)"[^>]*>(closer|wider|everything|as at first)</a>', text)
    }  # fmt: skip
    assert ways["as at first"] == "/"
    closer = client.get(ways["closer"]).text
    cold, warm = (float(re.search(rf'data-{end}="([^"]*)"', closer)[1]) for end in ("cold", "warm"))  # type: ignore[index]
    assert (cold, warm) == pytest.approx((0.25, 0.75))
    assert client.get(ways["wider"]).status_code == client.get(ways["everything"]).status_code == 200
    pressure = client.get("/?axis=pressure").text
    (way,) = re.findall(r'<a href="(/[^"]*)">closer</a>', pressure)
    narrower = client.get(way.replace("&amp;", "&")).text
    assert 'data-log="11"' in narrower
    spans = [
        math.log(float(re.search(r'data-warm="([^"]*)"', each)[1]) / float(re.search(r'data-cold="([^"]*)"', each)[1]))  # type: ignore[index]
        for each in (pressure, narrower)
    ]  # fmt: skip
    assert spans[1] == pytest.approx(spans[0] / 2)


def test_the_figures_can_be_taken_along(client: TestClient) -> None:
    svg = client.get("/plane.svg?cell=TO-4")
    assert svg.headers["content-type"] == "image/svg+xml"
    assert "attachment" in svg.headers["content-disposition"]
    assert ET.fromstring(svg.content).tag.endswith("svg")  # noqa: S314 - our own figure
    assert client.get("/plane.pdf").content.startswith(b"%PDF-")


def test_an_empty_archive_says_what_to_do_next(tmp_path: Path) -> None:
    Archive.create(tmp_path / "new").close()
    with TestClient(application(tmp_path / "new"), base_url="http://localhost:8321") as client:
        text = client.get("/").text
        assert "stillroom ingest" in text
        assert "plane-field" not in text
        assert client.get("/plane.svg").status_code == 200
        assert "stillroom ingest" in client.get("/?state=stale").text


def test_a_part_where_nothing_is_still_shows_the_way_out(client: TestClient) -> None:
    text = client.get("/?temperature=0.3:0.4+K&coverage=50:60+umol/m^2").text
    assert "No sweep has a place here" in text
    assert ">as at first</a>" in text
    assert "0 sweeps in this part of the plane." in text


_ends = st.tuples(
    st.floats(allow_nan=False, allow_infinity=False), st.floats(allow_nan=False, allow_infinity=False)
)
_axes = st.sampled_from(["coverage", "pressure", "cell"])


@settings(max_examples=300)
@given(axis=_axes, warm=_ends, height=_ends)
def test_every_part_that_can_be_asked_for_can_be_drawn(
    *, axis: PlaneAxis, warm: tuple[float, float], height: tuple[float, float]
) -> None:
    """However far or close two ends are, they are refused with a sentence, or the sides get their ticks."""
    unit = {"coverage": "mol/m^2", "pressure": "Pa", "cell": ""}[axis]
    texts = [f"{min(ends)!r}:{max(ends)!r}" for ends in (warm, height)]
    try:
        window = plane_window(axis, temperature=f"{texts[0]} K", height=f"{texts[1]} {unit}".strip())
    except BadRequest:
        return
    assert window is not None
    view = PlaneView(axis=axis, cells=(), window=window, lanes=(("C", 0),) if axis == "cell" else ())
    drawn = drawing(view, lambda _: "")
    assert len(drawn.across) < 20
    assert len(drawn.upright) < 20
    assert plane_window(axis, **{"temperature" if name == "temperature" else "height": text for name, text in window_fields(window, axis).items()}) is not None  # fmt: skip


@settings(max_examples=300)
@given(axis=_axes, temperature=st.text(max_size=30), height=st.text(max_size=30))
def test_any_text_for_a_part_is_answered(*, axis: PlaneAxis, temperature: str, height: str) -> None:
    with contextlib.suppress(BadRequest):
        assert plane_window(axis, temperature=temperature, height=height) is not None

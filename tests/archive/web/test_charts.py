"""Pages of sweeps and reductions: what they show is what is stored, every link leads somewhere, and nonsense is told as such."""

from __future__ import annotations

import io
import json
import re
import xml.etree.ElementTree as ET
from collections.abc import Iterator
from html.parser import HTMLParser
from pathlib import Path
from urllib.parse import parse_qs, urlsplit

import h5py
import numpy as np
import pandas as pd
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from starlette.testclient import TestClient

from archive import Archive
from archive.web import application
from tests.filled_archive import HOSTILE, PLAIN
from tests.revisable_cooldown import calibration, write_calibrated

SWEEP, REDUCTION = f"{PLAIN}/s002", f"{PLAIN}/s001@empty-cell.1"


class Seen(HTMLParser):
    """Elements of a page, as (name, attributes)."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.elements: list[tuple[str, dict[str, str]]] = []
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        """Note an element."""
        self.elements.append((tag, {name: value or "" for name, value in attrs}))

    def all(self, tag: str) -> list[dict[str, str]]:
        """Attributes of all elements of a name."""
        return [attributes for name, attributes in self.elements if name == tag]


@pytest.fixture(scope="module")
def lab(root: Path) -> Iterator[Archive]:
    """Give the archive itself."""
    with Archive.open(root, read_only=True) as lab:
        yield lab


def test_points_are_the_stored_numbers(client: TestClient, lab: Archive) -> None:
    found = client.get(f"/points/{SWEEP}", params={"y": "period", "against": "temperature"}).json()
    stored = lab.sweep(SWEEP)
    assert (found["across"], found["unit"]) == ("T / mK (ITS-90)", "mK")
    curve = found["panels"][0]["curves"][0]
    np.testing.assert_allclose(np.array(curve["x"]) / 1e3, stored["temperature"], rtol=1e-12)
    offset = float(re.search(r"\(P \u2212 ([0-9.]+) ms\) / ps", found["panels"][0]["axis"])[1])
    np.testing.assert_allclose(np.array(curve["y"]) * 1e-9 + offset, stored["period"], rtol=1e-12)
    np.testing.assert_allclose(curve["u"], 2.0, rtol=1e-9)
    assert (curve["thinned"], curve["line"]) == (False, True)
    near = client.get(f"/points/{SWEEP}", params={"y": "period", "from": "300", "to": "320"}).json()
    assert near["panels"][0]["curves"][0]["x"] == [290.0, 300.0, 310.0, 320.0, 330.0]


def test_the_picture_has_the_size_that_the_page_says(client: TestClient) -> None:
    seen = Seen(client.get(f"/at/{SWEEP}").text)
    images = [*seen.all("img"), *seen.all("source")]
    assert len(images) == 4
    for each in images:
        answer = client.get(each.get("src") or each["srcset"])
        assert answer.headers["content-type"] == "image/svg+xml"
        root = ET.fromstring(answer.text)  # noqa: S314 - our own
        assert (root.get("width"), root.get("height")) == (each["width"], each["height"])


@pytest.mark.parametrize(
    "address", [SWEEP, f"{SWEEP}/period", REDUCTION, f"{REDUCTION}/temperature", f"{HOSTILE}/s001"]
)
def test_every_link_leads_somewhere_and_nothing_is_styled_in_place(client: TestClient, address: str) -> None:
    answer = client.get(f"/at/{address}")
    assert answer.status_code == 200
    seen = Seen(answer.text)
    assert not [name for name, attributes in seen.elements if "style" in attributes or name == "style"]
    assert not [
        name for name, attributes in seen.elements if any(each.startswith("on") for each in attributes)
    ]
    scripts = seen.all("script")
    assert scripts
    assert all(each.get("src") for each in scripts)
    own = {attributes["id"] for _, attributes in seen.elements if "id" in attributes}
    links = {each["href"] for each in [*seen.all("a"), *seen.all("link")]} | {each["src"] for each in scripts}
    for link in sorted(links):
        path, _, part = link.partition("#")
        if not path:
            assert part in own, link
        elif path not in ("/search", "/cells", "/thermometers", "/state", "/"):
            assert client.get(path).status_code == 200, link


def test_a_sweep_shows_its_channels_with_units_and_what_was_stated(client: TestClient) -> None:
    text = client.get(f"/at/{SWEEP}").text
    for said in ("2 ps", "0.1 mK", "ITS-90", "plastic", "film.csv", "Nothing is reduced yet"):
        assert (said.replace("plastic", "PI-1")) in text, said


def test_a_reduction_tells_steps_results_and_how_to_repeat_it(client: TestClient, lab: Archive) -> None:
    text = client.get(f"/at/{REDUCTION}").text
    document = lab.reduction_document(REDUCTION)
    assert f"stillroom replay {REDUCTION}" in text
    for step in document.steps:
        assert f'id="step-{step.number}"' in text
    seen = Seen(text)
    links = {each["href"] for each in seen.all("a")}
    for each in document.outputs:
        assert f"/at/{REDUCTION}/{each.name}" in links
    for each in document.inputs:
        assert any(link.startswith("/at/" + each.address.split("#")[0]) for link in links), each.address
    figure = client.get(f"/figure/{REDUCTION}")
    assert figure.headers["content-type"] == "image/svg+xml"
    ET.fromstring(figure.text)  # noqa: S314 - our own


def test_what_is_stale_superseded_or_withdrawn_says_so_first(tmp_path: Path) -> None:
    first, second = "2026-03/s001@empty-cell.1", "2026-03/s001@empty-cell.2"
    sheet = tmp_path / "calibration.toml"
    head = 'format = "stillroom-revision/1"\nby = "data steward"\nbecause = "measured again"\n'
    sheet.write_text(head + calibration(2, first=3.01), encoding="utf-8")
    with Archive.create(tmp_path / "lab", name="Test laboratory") as lab:
        lab.ingest(write_calibrated(tmp_path / "2026-03"))
        lab.reduce("2026-03", plan="empty-cell")
        lab.revise(sheet)
    stale = _text(tmp_path, first)
    with Archive.open(tmp_path / "lab") as lab:
        lab.reduce_stale()
    superseded = _text(tmp_path, first)
    with Archive.open(tmp_path / "lab") as lab:
        lab.withdraw(second, why="the relation was copied wrongly", by="postdoc")
    withdrawn, sweep = _text(tmp_path, second), _text(tmp_path, "2026-03/s001")
    for text, said in (
        (stale, "<strong>stale</strong>: RX-cal.r2 is the newest"),
        (superseded, f'<strong>superseded by</strong>: <a class="address" href="/at/{second}">'),
        (withdrawn, "<strong>withdrawn</strong>: the relation was copied wrongly"),
    ):
        assert text.count("<strong>", 0, text.index("<h2")) == 1
        assert text.index(said) < text.index("<h2")
    # The second one is withdrawn, so that the first counts again.
    assert re.search(rf"{first}</a>.*?<td>current</td>", sweep, flags=re.DOTALL)
    assert re.search(rf"{second}</a>.*?<td>withdrawn</td>", sweep, flags=re.DOTALL)


def _text(folder: Path, address: str) -> str:
    """A page of the archive in a folder as it is now."""
    with TestClient(application(folder / "lab"), base_url="http://localhost") as client:
        return client.get(f"/at/{address}").text


@pytest.mark.parametrize(
    ("form", "kind"),
    [
        ("csv", "text/csv; charset=utf-8"),
        ("hdf5", "application/x-hdf5"),
        ("svg", "image/svg+xml"),
        ("pdf", "application/pdf"),
    ],
)
def test_what_is_shown_can_be_taken_away(client: TestClient, lab: Archive, form: str, kind: str) -> None:
    question = {"as": form, "y": "period", "against": "temperature", "from": "300", "to": "320"}
    answer = client.get(f"/download/{SWEEP}", params=question)
    assert answer.headers["content-type"] == kind
    assert re.fullmatch(
        r'attachment; filename="2025-11-s002\.(csv|h5|svg|pdf)"', answer.headers["content-disposition"]
    )
    stored = lab.sweep(SWEEP)
    inside = (stored["temperature"] >= 0.3) & (stored["temperature"] <= 0.32)
    if form == "csv":
        table = pd.read_csv(io.StringIO(answer.text), comment="#")
        np.testing.assert_allclose(table["period/ms"], stored["period"][inside], rtol=1e-15)
    elif form == "hdf5":
        with h5py.File(io.BytesIO(answer.content)) as file:
            np.testing.assert_array_equal(file["shown/01/period"][()], stored["period"][inside])
    elif form == "svg":
        assert ">period</text>" in answer.text
    else:
        assert answer.content.startswith(b"%PDF-")


@pytest.mark.parametrize(
    ("path", "status", "said"),
    [
        (f"/points/{SWEEP}?y=pressure", 404, "one of: time, temperature, period, row"),
        (f"/points/{SWEEP}?from=3&to=2", 400, "is empty"),
        (f"/points/{SWEEP}?from=nan", 400, "from"),
        (f"/points/{SWEEP}?width=9999", 400, "2400"),
        (f"/at/{SWEEP}?y=%3Cscript%3E", 404, "no column &lt;script&gt;"),
        (f"/at/{SWEEP}?colour=red", 400, "one of: against, y, with, from, to"),
        (f"/download/{SWEEP}?as=exe", 400, "csv"),
        (f"/download/{SWEEP}", 400, "as"),
        (f"/picture/{PLAIN}", 404, "has no curves"),
        (f"/lineage/{SWEEP}?way=up", 400, "way"),
        ("/figure/2025-11/s009@empty-cell.1", 404, "no reduction"),
        ("/at/2025-11/s009", 404, "2025-11/s009"),
        (f"/at/{SWEEP}?" + "&".join(f"with=2025-11/s{n:03d}" for n in range(20)), 400, "at most 12"),
    ],
)
def test_nonsense_is_told_as_a_page(client: TestClient, path: str, status: int, said: str) -> None:
    answer = client.get(path)
    assert answer.status_code == status
    assert said in answer.text
    assert "Traceback" not in answer.text


NAMES = st.one_of(
    st.sampled_from(["time", "temperature", "period", "row", "temperature@empty-cell.1", "", "@", "=1+1"]),
    st.text(max_size=12),
)
OVER = st.one_of(
    st.sampled_from(
        [f"{PLAIN}/s001", REDUCTION, f"{HOSTILE}/s001", "TO-1.r1", f"{PLAIN}/s002#period", PLAIN]
    ),
    st.text(max_size=12),
)
NUMBERS = st.one_of(
    st.sampled_from(["300", "-1e308", "1e308", "inf", "nan", "1e-320", "0x10", "\u0663"]),
    st.floats().map(str),
)


@settings(max_examples=40, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    st.sampled_from(["points", "picture", "at", "download"]),
    st.sampled_from([SWEEP, REDUCTION, f"{HOSTILE}/s001", f"{SWEEP}/period"]),
    st.lists(
        st.one_of(
            st.tuples(st.just("y"), NAMES),
            st.tuples(st.just("against"), NAMES),
            st.tuples(st.just("with"), OVER),
            st.tuples(st.sampled_from(["from", "to", "width"]), NUMBERS),
        ),
        max_size=6,
    ),
)
def test_no_question_is_a_fault_of_the_server(
    client: TestClient, page: str, address: str, question: list[tuple[str, str]]
) -> None:
    asked = [*question, ("as", "csv")] if page == "download" else question
    answer = client.get(f"/{page}/{address}", params=asked)
    assert answer.status_code in (200, 400, 404), answer.text


def test_what_cannot_be_laid_over_is_told_on_the_page(client: TestClient) -> None:
    answer = client.get(f"/at/{SWEEP}", params={"with": ["TO-1.r1", "\u202e<b>2025-11"]})
    assert answer.status_code == 200
    assert "TO-1.r1 is not laid over" in answer.text
    assert "&lt;b&gt;2025-11" in answer.text
    assert "\u202e" not in answer.text


def test_points_of_a_hostile_archive_are_json_and_its_picture_is_xml(client: TestClient) -> None:
    assert json.loads(client.get(f"/points/{HOSTILE}/s001").text)["panels"]
    ET.fromstring(client.get(f"/picture/{HOSTILE}/s001").text)  # noqa: S314 - our own


def test_a_sweep_leads_to_those_of_a_like_coverage(client: TestClient) -> None:
    said = re.search(r'href="(/search\?[^"]*coverage=[^"]*)"', client.get(f"/at/{SWEEP}").text)
    assert said is not None
    path = said[1].replace("&amp;", "&")
    # 48.0 umol over 1.60 m^2 are 30 umol/m^2.
    assert parse_qs(urlsplit(path).query)["coverage"] == ["27:33 umol/m^2"]
    assert f'href="/at/{SWEEP}"' in client.get(path).text


def test_what_is_ticked_in_a_list_is_laid_over_on_the_page_of_the_first(client: TestClient) -> None:
    ticks = [
        each["value"] for each in Seen(client.get("/search").text).all("input") if each.get("name") == "with"
    ]
    assert f"{PLAIN}/s001" in ticks
    answer = client.get("/over", params={"with": [f"{PLAIN}/s002", f"{PLAIN}/s001"]})
    assert answer.status_code == 200
    assert answer.url.path == f"/at/{PLAIN}/s002"
    assert answer.url.query == f"with={PLAIN}%2Fs001".encode()
    assert "with 2025-11/s001 laid over" in answer.text
    assert client.get("/over").status_code == 400
    for elsewhere in ("//elsewhere.example/", "https://elsewhere.example", "\\\\elsewhere.example"):
        led = client.get("/over", params={"with": elsewhere}, follow_redirects=False).headers["location"]
        assert led.startswith("/at/")

"""Every page: there, valid, without a style or script of its own, and with hostile text as text."""

from __future__ import annotations

import re
import warnings
from datetime import date
from itertools import pairwise
from pathlib import Path

import pytest
from starlette.testclient import TestClient

from archive import Archive
from archive.web import application
from archive.web.finding_groups import finding_groups
from schemas.finding import Finding, Waiver
from schemas.search_fields import SEARCH_FIELDS
from tests.filled_archive import HOSTILE, NAME, PLAIN

with warnings.catch_warnings():
    warnings.simplefilter("ignore")
    import html5lib

PAGES = (
    "/", "/search", "/search?cell=TO-1&sort=coverage&descending=true", "/search?words=nothing-like-it", "/search?coverage=20", "/cooldowns",
    "/cells", "/thermometers", "/state", f"/at/{PLAIN}", f"/at/{HOSTILE}", f"/at/{PLAIN}/s002", f"/at/{PLAIN}/s001@empty-cell.1",
    f"/at/{PLAIN}/s001@empty-cell.1/period_low", f"/at/{PLAIN}/s002/period", f"/at/{PLAIN}/d01", f"/at/{PLAIN}.a1", f"/at/{HOSTILE}.a1",
    f"/at/{PLAIN}.a1:film.csv", "/at/TO-1", "/at/TO-1.r1", "/at/bob", "/at/PI-1", "/at/W-4", "/at/TO-1.r2", "/at/SALT-1", "/at/SALT-1-cal", "/at/DR-1", "/at/empty-cell.r1", "/at/2025-12", "/at/x y", "/nowhere",
)  # fmt: skip
_HANDLERS = re.compile(r"<[^>]*\s(?:on[a-z]+|style)\s*=", re.IGNORECASE)


@pytest.mark.parametrize("path", PAGES)
def test_every_page_is_what_a_browser_and_a_reader_expect(client: TestClient, path: str) -> None:
    answer = client.get(path)
    assert answer.status_code == (
        404 if path in ("/at/2025-12", "/at/x y", "/nowhere") else 400 if path.endswith("=20") else 200
    )
    assert answer.headers["content-type"] == "text/html; charset=utf-8"
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # of the parser's own making
        parser = html5lib.HTMLParser(namespaceHTMLElements=False)
        tree = parser.parse(answer.text)
    assert parser.errors == []
    assert tree.get("lang") == "en"
    assert (tree.findtext("head/title") or "").strip()
    assert tree.find("head/meta[@name='description']") is not None
    assert len(tree.findall(".//main")) == len(tree.findall(".//h1")) == 1
    levels = [int(each.tag[1]) for each in tree.iter() if re.fullmatch("h[1-6]", str(each.tag))]
    assert all(after <= before + 1 for before, after in pairwise(levels)), levels
    ids = [each.get("id") for each in tree.iter() if each.get("id")]
    assert len(ids) == len(set(ids))
    for table in tree.iter("table"):
        assert table.find("caption") is not None
        assert all(each.get("scope") for each in table.iter("th"))
    for image in tree.iter("img"):
        assert image.get("alt") is not None
        assert image.get("width")
        assert image.get("height")
    # What the policy of every answer would refuse is not there in the first place.
    assert tree.find(".//style") is None
    assert all(each.get("src") and not each.text for each in tree.iter("script"))
    assert _HANDLERS.findall(re.sub(r'"[^"]*"', '""', answer.text)) == []


@pytest.mark.parametrize(
    "path", [f"/at/{HOSTILE}", "/search", "/cells", f"/at/{HOSTILE}.a1", "/state", "/at/bob.r1"]
)
def test_hostile_text_is_text(client: TestClient, path: str) -> None:
    text = client.get(path).text
    assert "<script>alert" not in text
    assert "<img src=x" not in text
    assert "\x1b" not in text
    assert "\u202e" not in text
    assert "49" not in re.findall(r"\{\{7\*7\}\}|>49<", text)
    assert NAME.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;") in text


def test_every_field_of_the_command_is_a_field_of_the_page(client: TestClient) -> None:
    text = client.get("/search").text
    assert all(f'name="{field.name}"' in text for field in SEARCH_FIELDS)


@pytest.mark.parametrize(
    ("query", "sweeps"),
    [
        ("cell=TO-1", {"s001", "s002"}),
        ("cell=TO-1&empty_cell=with-gas", {"s002"}),
        ("cell=TO-1.r1&empty_cell=empty-cell&kind=", {"s001"}),
        ("coverage=25:35+umol/m^2&sample=W-4", {"s002"}),
        ("result=period_low&cell=TO-1", {"s001"}),
        ("result=period_low%3D0.1:0.3+K&result=period_high&cell=TO-1", {"s001"}),
        ("cell=TO-1&until=2020-01-01", set()),
    ],
)
def test_a_search_is_the_address(client: TestClient, query: str, sweeps: set[str]) -> None:
    found = re.findall(rf'href="/at/{PLAIN}/(s[0-9]+)"', client.get(f"/search?{query}").text)
    assert set(found) == sweeps


@pytest.mark.parametrize(
    ("query", "field", "kept"),
    [
        ("coverage=20:35", "coverage", 'value="20:35"'),
        ("coverage=2:3+layers", "coverage", "layers"),
        ("result=T_X%3D1:2+K", "result", "T_X=1:2 K"),
        ("since=yesterday&cell=TO-1", "since", 'value="TO-1"'),
        ("kind=nothing", "kind", "temperature-sweep"),
        ("colour=red", "colour", "coverage"),
        ("cell=a&cell=b", "cell", "once"),
        ("after=2020-01/s001", "after", "begin the list anew"),
    ],
)
def test_what_cannot_be_read_is_told_and_kept(client: TestClient, query: str, field: str, kept: str) -> None:
    answer = client.get(f"/search?{query}")
    assert answer.status_code == 400
    said = re.search(r'role="alert">([^<]*)<', answer.text)
    assert said is not None
    assert said[1].startswith(f"{field}: ")
    assert kept in answer.text.replace("&#34;", '"')


def test_a_long_list_goes_on(client: TestClient, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("archive.web.search.ROWS", 1)
    path, seen = "/search?cell=TO-1&sort=name&descending=true", []
    while path:
        text = client.get(path).text
        seen += re.findall(rf'href="/at/{PLAIN}/(s[0-9]+)"', text)
        following = re.search(r'href="([^"]*)">the next ones', text)
        path = following[1].replace("&amp;", "&") if following else ""
    assert seen == ["s002", "s001"]


def test_a_list_of_cooldowns_goes_on(client: TestClient, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("archive.web.cooldowns.ROWS", 1)
    first = client.get("/cooldowns").text
    assert re.findall(r'<th scope="row"><a class="address" href="/at/([^"]*)"', first) == [HOSTILE]
    following = re.search(r'href="([^"]*)">the earlier ones', first)
    assert following is not None
    second = client.get(following[1]).text
    assert re.findall(r'<th scope="row"><a class="address" href="/at/([^"]*)"', second) == [PLAIN]
    assert "the earlier ones" not in second
    assert client.get("/cooldowns?after=2020-01").status_code == 400


def test_a_picture_of_a_sweep_may_be_kept_as_long_as_it_holds(client: TestClient) -> None:
    page = client.get("/search?cell=TO-1").text
    path = re.findall(r'src="(/thumb/[^"]*)"', page)[1]
    answer = client.get(path)
    assert answer.headers["content-type"] == "image/svg+xml"
    assert "immutable" in answer.headers["cache-control"]
    # 60 rows rise without a gap: one line of that many points.
    (line,) = re.findall(r'd="(M[^"]*)" fill="none" stroke="#000" stroke-width', answer.text)
    assert line.count("L") == 59
    assert client.get(path.replace(".a1", ".a2")).headers["cache-control"] == "no-cache"
    assert client.get("/thumb/2025-11/s999").status_code == 404


def test_the_run_in_time_shows_sweeps_and_doses_as_links(client: TestClient) -> None:
    text = client.get(f"/at/{PLAIN}").text
    drawing = text[text.index("<svg") : text.index("</svg>")]
    assert [*dict.fromkeys(re.findall(r'href="/at/([^"]*)"', drawing))] == [
        f"{PLAIN}/{name}" for name in ("s001", "s002", "d01", "d02")
    ]
    # 40.0 umol and 8.0 umol over 1.60 m^2 are 25 and 30 umol/m^2.
    assert "25 µmol/m² in all" in drawing
    assert "30 µmol/m² in all" in drawing
    assert "nothing recorded for" in text


def test_an_archive_tells_of_its_last_fixity_pass(tmp_path: Path) -> None:
    with Archive.create(tmp_path / "lab") as lab:
        root = lab.root
        with TestClient(application(root), base_url="http://localhost") as visitor:
            assert "No fixity pass is on record" in visitor.get("/state").text
            lab.fixity(enter=True)
            text = visitor.get("/state").text
            assert "0 sealed files read, 0 faults" in text
            assert re.search(r"read again at \d{4}-\d\d-\d\d \d\d:\d\d \+00:", text)


def test_what_one_check_says_of_several_sweeps_is_one_entry() -> None:
    accepted = Waiver(
        check="cold", place="s001", reason="it was meant", role="postdoc", date=date(2026, 3, 1)
    )
    findings = [
        Finding(code=code, severity="warning", what=f"{place} is cold", place=place, waived=waiver)
        for code, place, waiver in (
            ("cold", "s001", accepted),
            ("warm", "s001", None),
            ("cold", "s002", accepted.model_copy(update={"place": "s002"})),
            ("cold", "s003", None),
            ("cold", "s002", accepted),
        )
    ]
    groups = finding_groups(findings)
    assert [(each.first["code"], each.places, len(each.others)) for each in groups] == [
        ("cold", ["s001", "s002"], 2),
        ("warm", ["s001"], 0),
        ("cold", ["s003"], 0),
    ]


def test_run_sheets_are_handed_over(client: TestClient) -> None:
    sheet = client.get(f"/run-sheet/{PLAIN}.json")
    assert sheet.json()["format"] == "stillroom-run-sheet/1"
    assert sheet.headers["content-disposition"] == f'attachment; filename="run-sheet-{PLAIN}.json"'
    page = client.get(f"/run-sheet/{PLAIN}.html")
    policy = page.headers.get_list("content-security-policy")
    assert len(policy) == 1
    assert "script" not in policy[0]
    assert "unsafe" not in policy[0]
    assert page.headers["content-disposition"].startswith("inline")
    assert client.get(f"/run-sheet/{PLAIN}.exe").status_code == 404
    assert client.get("/run-sheet/2025-12.pdf").status_code == 404


def test_a_fault_of_ours_is_a_page_without_a_traceback(
    client: TestClient, monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    monkeypatch.setattr("tempfile.tempdir", str(tmp_path))

    def broken(_: Archive) -> None:
        raise RuntimeError("a secret of the machine")

    monkeypatch.setattr(Archive, "statistics", broken)
    answer = client.get("/state")
    assert answer.status_code == 500
    assert "fault of Stillroom" in answer.text
    assert "secret" not in answer.text
    (kept,) = tmp_path.glob("stillroom-traceback-*.txt")
    assert "a secret of the machine" in kept.read_text()
    assert client.get("/cooldowns").status_code == 200


def test_a_busy_index_says_when_to_come_again(client: TestClient, monkeypatch: pytest.MonkeyPatch) -> None:
    from archive.errors import ArchiveBusy

    def busy(_: Archive) -> None:
        raise ArchiveBusy("another process is writing to the index")

    monkeypatch.setattr(Archive, "cooldowns", busy)
    answer = client.get("/cooldowns")
    assert (answer.status_code, answer.headers["retry-after"]) == (503, "5")
    assert "in a moment" in answer.text


@pytest.mark.parametrize(
    "begin",
    [
        "/at/",
        "/thumb/",
        "/run-sheet/",
        "/style/0/",
        "/to?address=",
        "/search?words=",
        "/search?coverage=",
        "/search?result=",
        "/search?since=",
        "/search?after=",
        "/cooldowns?after=",
        "/search?",
    ],
)
def test_nothing_that_is_asked_is_a_fault_of_ours(client: TestClient, begin: str) -> None:
    for end in (
        "%00",
        "%ff%fe",
        "%ed%a0%80",
        "..%2f..%2f",
        "%0d%0aSet-Cookie:x",
        "a" * 3000,
        "%25s%7B%7B7*7%7D%7D",
        "'%20OR%201=1--",
        "1:2:3",
        "9e999:%20K",
        ":%20:",
        "=",
        "%5B",
        "2025-11/s001@x.9/y",
    ):
        answer = client.get(begin + end)
        assert answer.status_code < 500, begin + end
        assert "set-cookie" not in answer.headers


def test_what_was_said_afterwards_is_told(client: TestClient) -> None:
    text = client.get(f"/at/{HOSTILE}").text
    assert "Said after it was sealed" in text
    assert f"<b>{HOSTILE}/s001 is withdrawn:</b>" in text
    assert "withdrawn: =HYPERLINK(" in text
    assert f'href="/at/{HOSTILE}/s001"' not in client.get("/search?cell=bob").text
    assert f'href="/at/{HOSTILE}/s001"' in client.get("/search?cell=bob&withdrawn=true").text

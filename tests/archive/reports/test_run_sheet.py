"""The run sheet: order, honesty about what is absent, draft or final, many sweeps, hostile text, sameness."""

from __future__ import annotations

import inspect
import json
import re

import pytest

from archive.reports import run_sheet_html, run_sheet_json, run_sheet_pdf
from tests.archive.reports.factories import accession, film_view, finding, reduction, sheet, view_of

HOSTILE = '50 % of \\input{/etc/passwd} <script>alert(1)</script> & #let x = $y$ _z_ ^^5c "quoted" مرحبا 氦'


def plain(html):
    """Return the text of a page."""
    return re.sub(r"\s+", " ", re.sub(r"<[^>]+>", " ", html))


def test_the_blocks_stand_in_order_and_cautions_above_the_set_up():
    page = run_sheet_html(film_view())
    order = ["<h1>2026-03", 'class="results"', "Mind this", "trapped gas in TO-4.r2", ">Set-up<", "The run in time", ">Sweeps<", ">Origin<", ">Plots of sweeps and reductions<", ">Doses<", ">Findings in full<", ">Replaced results<", ">Known effects<", ">Reductions<"]  # fmt: skip
    places = [page.index(each) for each in order]
    assert places == sorted(places)
    assert "0.7312(12)" in page or "731.2(1.2)" in page
    assert "they prevail" in page


def test_a_clean_run_is_final_and_each_doubt_makes_a_draft():
    assert "DRAFT" not in run_sheet_html(film_view())
    cases = {
        "1 warning is open": film_view(findings=[finding()]),
        "the gas balance at the end is unknown": film_view(
            said={"gas_end": {"state": "unknown", "valve": "V7"}}
        ),
        "the state of the cell&#39;s valve is not recorded": film_view(
            said={"gas_end": {"state": "recovered"}}
        ),
        "the run is still open": film_view(said={"outcome": "open"}),
    }
    for reason, view in cases.items():
        page = run_sheet_html(view)
        assert "DRAFT" in page, reason
        assert reason in page


def test_a_missing_digest_makes_a_draft():
    view = view_of(accession())
    view = type(view)(view.archive_name, view.accessions, {}, (), view.values, {})
    assert "no digest is known of 2026-03/2026-03.a1" in run_sheet_html(view)


def test_an_open_warning_shows_open_as_the_end_state():
    page = run_sheet_html(film_view(findings=[finding()]))
    assert re.search(r'class="state">DRAFT: OPEN<small>run complete, 1 warning open', page)


def test_a_waived_warning_stands_in_every_form_and_no_option_hides_it(text_of):
    view = film_view(findings=[finding(waived=True)])
    reason = "The drive sweeps show no dependence."
    assert reason in run_sheet_html(view)
    assert reason in run_sheet_json(view)
    for paper in ("a4", "us-letter"):
        first = " ".join(text_of(run_sheet_pdf(view, paper=paper), layout=False)[0].split())
        assert "W1" in first
        assert "Waived on 2026-04-22" in first
    assert list(inspect.signature(run_sheet_html).parameters) == ["view"]
    assert list(inspect.signature(run_sheet_pdf).parameters) == ["view", "paper"]


def test_the_count_of_waived_warnings_is_printed_when_it_is_zero():
    assert "No warnings were waived." in run_sheet_html(film_view())


def test_what_is_not_recorded_has_its_code_and_never_a_blank():
    said = sheet(1, begin=None, end=None, undated="the files carry no dates", cell=None, sample=None, detection=None, dose=[], doser=[], gauge=[], effect=[], licence=None, next_step=None)  # fmt: skip
    said["sweep"][0].pop("after_dose")
    document = accession(said, records=[], doses=[], cautions=[], sweeps=[])
    page = run_sheet_html(view_of(document))
    assert "[nr]: the files carry no dates" in page
    assert not re.search(
        r"<td[^>]*>\s*</td>",
        page.split(">Sweeps<")[1].split(">Origin<")[0].replace("<td></td><td><code>", ""),
    )
    assert page.count("not examined") >= 19
    assert run_sheet_pdf(view_of(document)).startswith(b"%PDF")


def test_every_known_effect_has_exactly_one_state():
    shown = json.loads(run_sheet_json(film_view()))["shown"]["effects"]
    states = {each["effect"]: each["state"] for each in shown}
    assert len(shown) == len(states) == 19
    assert states["self-heating"] == "bounded"
    assert states["remounting shift"] == "applied"
    assert states["crossing modes"] == "not examined"


def test_a_replaced_result_keeps_both_values_and_the_reason():
    old, new = reduction(number_=1), reduction(number_=2, value=0.74, plan_digest="0" * 64)
    page = plain(run_sheet_html(view_of(accession(), reductions=(new, old))))
    assert re.search(r"T KT 731\.2\(1\.2\) mK on PLTS-2000 740\.0\(1\.2\)", page)
    assert "film-transition.1" in page


def test_the_same_view_gives_the_same_bytes():
    one, two = film_view(), film_view()
    assert run_sheet_html(one) == run_sheet_html(two)
    assert run_sheet_json(one) == run_sheet_json(two)
    assert run_sheet_pdf(one) == run_sheet_pdf(two)


def test_text_of_persons_is_text_in_every_form(text_of):
    note = {"text": HOSTILE, "role": "x" * 300}
    view = film_view(
        said={"purpose": HOSTILE, "note": [note]},
        record={"cell": {"description": HOSTILE, "mode": "y" * 300}},
    )
    page = run_sheet_html(view)
    assert "<script" not in page
    assert "&lt;script&gt;alert(1)&lt;/script&gt;" in page
    pages = text_of(run_sheet_pdf(view))
    assert "\\input{/etc/passwd}" in "".join("".join(pages).split()).replace("\u200b", "")
    assert json.loads(run_sheet_json(view))["shown"]["band"]["purpose"] == HOSTILE


def test_the_page_is_self_contained_and_has_no_script():
    page = run_sheet_html(film_view())
    assert "<script" not in page
    assert not re.search(r"(?:src|href)\s*=\s*[\"'](?!#)", page)
    assert not re.search(r"url\(|@import", page)
    assert page.count("<h1") == 1
    assert '<html lang="en">' in page
    assert all("<title>" in drawing for drawing in re.findall(r"<svg.*?</svg>", page, flags=re.DOTALL))


def test_meaning_needs_no_colour():
    page = run_sheet_html(film_view(findings=[finding(), finding(place="s002", waived=True)]))
    greys = re.findall(r"#([0-9a-f]{3}|[0-9a-f]{6})\b(?=[;\"\s])", page)
    assert greys
    assert all(
        len({grey[k : k + len(grey) // 3] for k in range(0, len(grey), len(grey) // 3)}) == 1
        for grey in greys
    )
    assert not re.search(r"(?:color|fill|stroke)[:=]\s*[\"']?(?:red|green|blue|orange)", page)


@pytest.mark.parametrize("count", [1, 16, 17, pytest.param(400, marks=pytest.mark.slow)])
def test_the_page_plan_holds_for_any_number_of_sweeps(count, text_of):
    pages = text_of(run_sheet_pdf(film_view(count)))
    of = f"of {len(pages)}"
    assert all(f"page {number} {of}" in " ".join(text.split()) for number, text in enumerate(pages, 1))
    assert all("2026-03" in text for text in pages)
    lines = [re.findall(r"^\s*(s\d{3})\s+warm", text, flags=re.MULTILINE) for text in pages]
    assert sum(map(len, lines)) == count
    assert lines[0], "the sweep lines start on the first page"
    with_lines = [text for text, found in zip(pages, lines, strict=True) if found]
    assert all(re.search(r"no\.\s+kind\s+start", text) for text in with_lines)
    assert "Next step" in pages[0]


def test_both_papers_carry_the_same_text(text_of):
    view = film_view()
    a4, letter = (
        "".join("".join(text_of(run_sheet_pdf(view, paper=paper))).split()) for paper in ("a4", "us-letter")
    )
    assert a4 == letter

"""The methods appendix: no sentence vanishes, the same data give the same bytes, and what strangers write compiles as text."""

from __future__ import annotations

import json
import re
from dataclasses import replace

import pytest
from matplotlib.figure import Figure
from matplotlib.layout_engine import ConstrainedLayoutEngine

from archive.errors import BadRequest, UnknownAddress
from archive.reduction.steps import STEPS
from archive.reports import methods_appendix
from archive.reports.appendix import ITEMS
from archive.reports.bibliography import bibliography_of, known_keys
from archive.reports.figures import figures
from archive.reports.scope import Scope
from tests.archive.reports.factories import accession, film_view, finding, moment, reduction, view_of

ADDRESS = "2026-03/s001@film-transition.1"
HOSTILE = '50 % of \\input{/etc/passwd} \\write18{id} \\catcode`\\%=12 ^^5cinput{x} {unbalanced $y_1 & z# ~ <a|b> "q" مرحبا 氦 é'


@pytest.fixture
def drawn():
    """Ask for figures that are written out."""


@pytest.fixture(autouse=True)
def undrawn(request, monkeypatch):
    """Make figures without writing them out, which takes most of the time, for a test that neither compiles nor asks for `drawn`."""
    if not {"compiled", "drawn"} & set(request.fixturenames):
        monkeypatch.setattr(ConstrainedLayoutEngine, "execute", lambda *_: None)
        monkeypatch.setattr(Figure, "savefig", lambda _, file, **__: file.write(b"not drawn"))


def made(view=None, **options):
    """Return the appendix of the first sweep of a view."""
    return methods_appendix([film_view() if view is None else view], [ADDRESS], **options)


def companion(files):
    """Return the companion."""
    return json.loads(files["appendix.json"])


def sentences(files):
    """Return item and text of every sentence outside the steps."""
    return [
        (each["item"], each["text"], each["present"])
        for section in companion(files)["sections"]
        for each in section["sentences"]
    ]


def present(files):
    """Return how many items the torsional oscillator has, and of how many."""
    line = next(each for each in companion(files)["completeness"] if each.startswith("torsional oscillator"))
    return tuple(int(each) for each in re.findall(r"(\d+) of (\d+) present", line)[0])


def test_the_sections_stand_in_order():
    keys = [each["key"] for each in companion(made())["sections"]]
    assert keys == [
        "scope",
        "cells",
        "gas",
        "thermometry",
        "measurement",
        "reduction",
        "fits",
        "uncertainty",
        "not-done",
        "data",
    ]


REQUIRED = [
    ("R01", "cell", "seal"), ("R02", "cell", "free_volume"), ("R03", "cell", "rod"), ("R06", "cell", "inertia"), ("R05", "cell", "empty_quality_factor"),
    ("R13", "substrate", "mass"), ("R14", "substrate", "area"), ("R16", "substrate", "preplating"), ("R34", "cryostat", "frequency_reference"),
]  # fmt: skip


@pytest.mark.parametrize(
    ("code", "kind", "field"), REQUIRED, ids=[f"{code}-{field}" for code, _, field in REQUIRED]
)
def test_without_a_field_its_sentence_turns_negative_and_the_count_drops_by_one(code, kind, field):
    whole, less = made(), made(film_view(record={kind: {field: None}}))
    before = [text for item, text, _ in sentences(whole) if item == code]
    after = [(text, there) for item, text, there in sentences(less) if item == code]
    assert len(after) == len(before), "no sentence vanishes"
    assert all(there is False and "does not exist" in text for text, there in after)
    (had, of), (has, of_less) = present(whole), present(less)
    assert (has, of_less) == (had - 1, of)


@pytest.mark.parametrize("name", ["doser", "gauge", "detection"])
def test_what_the_sheet_does_not_say_becomes_negative_too(name):
    empty = None if name == "detection" else []
    whole, less = made(), made(film_view(said={name: empty}))
    codes = {"doser": ["R17"], "gauge": ["R18"], "detection": ["R07", "R08"]}[name]
    turned = {item for item, _, there in sentences(less) if not there} - {
        item for item, _, there in sentences(whole) if not there
    }
    assert sorted(turned) == codes
    assert present(less)[0] == present(whole)[0] - len(codes)


def test_every_item_that_is_needed_says_something():
    said = {item for item, _, _ in sentences(made())}
    needed = {item.code for item in ITEMS if item.applies(("TO",))}
    assert needed <= said
    assert len(ITEMS) == len({item.code for item in ITEMS})


def test_a_changed_parameter_changes_what_depends_on_it_and_nothing_else():
    one, two = companion(made(film_view(order=2))), companion(made(film_view(order=3)))
    changed = set()
    for a, b in zip(one["sections"], two["sections"], strict=True):
        for part in ("sentences", "steps", "figures"):
            changed |= {f"{a['key']}.{part}" for x, y in zip(a[part], b[part], strict=True) if x != y}
        for x, y in zip(a["tables"], b["tables"], strict=True):
            rows = [k for k, (p, q) in enumerate(zip(x["rows"], y["rows"], strict=True)) if p != q]
            changed |= {f"{x['name']} row {k}" for k in rows}
    # The sentences of the steps, both steps' lines in the table (parameters and the digest of the array), and R40, which quotes a step.
    assert changed == {"reduction.steps", "steps row 1", "steps row 2", "fits.sentences"}


def test_a_changed_result_changes_its_numbers_everywhere():
    tex = made(film_view(value=0.74))["appendix.tex"].decode()
    assert "740.0(1.2)" in tex
    assert "731.2(1.2)" not in tex


def test_the_same_data_give_the_same_bytes(drawn):
    assert made() == made()


def test_every_number_is_in_the_companion_with_the_same_digits():
    files = made(film_view(findings=[finding(waived=True)]))
    text = files["appendix.json"].decode()
    tex = files["appendix.tex"].decode()
    numbers = set(re.findall(r"\\val\{([^{}]+)\}", tex)) | set(
        re.findall(r"(?<!\\)\$(-?[0-9][0-9.()]*)\$", tex)
    )
    assert len(numbers) > 30
    # A power of ten is printed without a plus sign and leading zeros; the companion has it as the record wrote it.
    spelled = re.sub(r"e\+?(-?)0*([1-9])", r"e\1\2", text)
    assert [each for each in sorted(numbers) if each not in spelled] == []
    results = files["results.tex"].decode()
    assert "731.2(1.2)" in results


def test_each_sentence_stands_after_a_comment_with_item_and_record():
    lines = made()["appendix.tex"].decode().splitlines()
    comments = [line for line in lines if re.match(r"% (R\d\d|ST|scope) \| \S", line)]
    assert len(comments) >= 60
    assert "% R14 | MYL-1.r1" in lines
    assert f"% ST | {ADDRESS} step 2" in lines


def test_every_known_effect_stands_in_one_state():
    said = [text for item, text, _ in sentences(made()) if item == "R52"]
    assert len(said) == 1 + 19
    assert (
        "Self-heating was not corrected; it is below 0.05 mK at 20 mK, from: bridge power halved at base."
        in said
    )
    assert "Crossing modes was not examined." in said
    assert (
        f"Remounting shift was treated in {ADDRESS}, step 1: A constant shift is removed by the alignment."
        in said
    )


def test_waived_warnings_are_told_and_counted_even_when_there_are_none():
    none = [text for item, text, _ in sentences(made()) if item == "R53"]
    assert none == ["No warnings were waived in 2026-03; 0 open, 0 cleared."]
    told = " ".join(
        text for item, text, _ in sentences(made(film_view(findings=[finding(waived=True)]))) if item == "R53"
    )
    assert (
        "Check rod-below-200-mk (a beryllium copper rod in the cold is tested at two drives) found in s001"
        in told
    )
    assert "waived on 2026-04-22 by postdoc because: The drive sweeps show no dependence" in told
    assert "not estimated" in told


def test_a_replaced_result_names_both_values():
    view = view_of(accession(), reductions=(reduction(number_=1), reduction(number_=2, value=0.74)))
    files = methods_appendix([view], ["2026-03/s001@film-transition.2"])
    told = [text for item, text, _ in sentences(files) if item == "R55"]
    assert len(told) == 1
    assert "740.0(1.2) mK on PLTS-2000" in told[0]
    assert "replaces 731.2(1.2) mK on PLTS-2000" in told[0]


def test_the_data_sentence_has_the_whole_digest_in_groups_of_four():
    view = film_view()
    digest = view.sealed["2026-03/2026-03.a1"][0]
    grouped = " ".join(digest[k : k + 4] for k in range(0, 64, 4))
    files = made(view)
    assert any(grouped in text for item, text, _ in sentences(files) if item == "R58")
    assert grouped in files["appendix.tex"].decode().replace("\n", " ")


def test_the_scale_of_coverage_is_named_with_its_anchor_or_said_to_have_none():
    assert any(
        "its anchor is: two-thirds power" in text for item, text, _ in sentences(made()) if item == "R23"
    )
    bare = made(film_view(record={"substrate": {"layer": None, "layer_definition": None}}))
    assert any("has no anchor" in text for item, text, _ in sentences(bare) if item == "R23")


def test_only_what_is_cited_is_in_the_bibliography():
    files = made()
    keys = set(re.findall(r"@\w+\{([^,]+),", files["methods.bib"].decode()))
    assert keys == {"bishop-reppy-1980", "nelson-kosterlitz-1977", "ahns-1980", "jcgm-100"}
    cited = {
        key
        for group in re.findall(r"\\cite\{([^}]+)\}", files["appendix.tex"].decode())
        for key in group.split(",")
    }
    assert cited == keys


def test_every_step_cites_what_the_reviewed_list_has():
    assert {key for step in STEPS for key in step.citations} <= set(known_keys())
    with pytest.raises(BadRequest, match="nobody-2099"):
        bibliography_of(["nobody-2099"])


def test_what_is_asked_for_must_be_there():
    with pytest.raises(UnknownAddress, match="no reduction"):
        methods_appendix([film_view()], ["2026-03/s009@film-transition.1"])
    with pytest.raises(BadRequest, match="at least one"):
        methods_appendix([film_view()], [])
    with pytest.raises(BadRequest, match="part"):
        made(level="part")


def test_figures_are_vector_pdf_without_a_date(drawn):
    figures = {name: content for name, content in made().items() if name.startswith("figures/")}
    assert list(figures) == [
        "figures/film-transition-2026-03-s001.pdf",
        "figures/areal-density-TO-4-r2.pdf",
    ]
    for content in figures.values():
        assert content.startswith(b"%PDF")
        assert b"CreationDate" not in content
        assert b"/Subtype /Image" not in content


@pytest.mark.parametrize("level", ["chapter", "section", "subsection"])
def test_it_compiles_alone_at_every_level(compiled, level):
    log, pages = compiled(made(level=level, title="Films on polyimide"))
    text = " ".join("\n".join(pages).split())
    assert "Films on polyimide" in text
    assert "731.2(1.2)" in text
    assert "Undefined control sequence" not in log


def test_every_sentence_and_figure_is_printed_with_its_mark_and_what_it_rests_on(compiled):
    files = made()
    (fits,) = [each for each in companion(files)["sections"] if each["key"] == "fits"]
    text = files["appendix.tex"].decode()
    log, pages = compiled(files)
    assert "Undefined control sequence" not in log
    page = "".join("".join(pages).split())
    told = companion(files)["sections"]
    marks = [each["mark"] for section in told for each in section["sentences"]]
    marks += [mark for section in told for block in section["steps"] for mark in block["marks"]]
    assert sorted(marks, key=lambda each: int(each[1:])) == [f"s{k}" for k in range(1, len(marks) + 1)]
    assert [each["mark"] for each in fits["figures"]] == ["f1", "f2"]
    for mark in [*marks, "f1", "f2"]:
        assert f"#{mark}" in page, mark
        assert text.count(f"\\stillmark{{{mark}}}") == 1
    (table,) = [each for each in told[-1]["tables"] if each["name"] == "marks"]
    steps = next(each for each in told if each["steps"])["steps"][0]["marks"]
    assert [f"{ADDRESS}, one mark a step", f"#{steps[0]} to #{steps[-1]}"] in table["rows"]


def test_figures_do_not_pile_up_before_their_places(compiled, monkeypatch):
    """LaTeX lets eighteen figures wait and no more; a chapter may have many."""
    drawn = next(figures(Scope([film_view()], [ADDRESS])))
    many = [replace(drawn, name=f"figures/f-{number}.pdf") for number in range(30)]
    monkeypatch.setattr("archive.reports.appendix.figures", lambda scope: many)
    compiled(made())


def test_it_compiles_without_siunitx(compiled):
    files = made()
    preamble = files["appendix-preamble.tex"].replace(
        b"\\IfFileExists{siunitx.sty}", b"\\IfFileExists{no-such-package.sty}"
    )
    _, pages = compiled({**files, "appendix-preamble.tex": preamble})
    assert "731.2(1.2)" in "".join(pages)


def test_text_of_persons_compiles_as_text_and_fits_the_page(compiled):
    view = film_view(
        said={
            "purpose": HOSTILE,
            "event": [{"at": "2026-03-05T00:00:00+00:00", "what": "other", "text": HOSTILE}],
        },
        record={"cell": {"mode": HOSTILE, "seal": "x" * 300, "rod": HOSTILE}, "substrate": {"form": HOSTILE}},
        findings=[finding(waived=True, what=HOSTILE)],
    )
    log, pages = compiled(made(view, title=HOSTILE))
    text = "".join("".join(pages).split())
    assert "\\input{/etc/passwd}" in text
    assert "\\write18{id}" in text
    assert "root:" not in text
    assert max((float(each) for each in re.findall(r"Overfull \\hbox \(([0-9.]+)pt", log)), default=0.0) < 20


def test_the_table_of_results_can_be_read_into_a_document(compiled):
    files = made()
    document = b"\\documentclass{article}\\input{appendix-preamble.tex}\\begin{document}\\input{results.tex}\\end{document}\n"
    _, pages = compiled({**files, "mine.tex": document}, "mine.tex")
    assert "731.2(1.2)" in "".join(pages)


def test_text_of_the_author_survives_in_its_slot(compiled):
    files = made()
    assert not [name for name in files if name.startswith("slot-")]
    _, pages = compiled({**files, "slot-fits.tex": b"Written by hand.\n"})
    text = " ".join("".join(pages).split())
    assert "Written by hand." in text
    assert "The section fits carries text written by hand" in text


def test_a_plan_without_a_figure_of_its_kind_shows_its_curve(drawn):
    outputs = [
        {"name": "temperature", "quantity": "temperature", "unit": "K", "description": "temperature of each row", "step": 1, "rows": 60, "scale": "PLTS-2000", "digest": "0" * 64},
        {"name": "period", "quantity": "period", "unit": "s", "description": "period of each row", "step": 1, "rows": 60, "digest": "1" * 64},
    ]  # fmt: skip
    own = {
        "name": "own-plan",
        "revision": 1,
        "title": "Own",
        "applies": {"sweep_kinds": ["temperature-sweep"]},
        "step": [{"use": "static-transition", "take": {}, "give": {}}],
    }
    view = view_of(accession(), reductions=(reduction(outputs=outputs, plan=own),))
    files = made(view)
    assert files["figures/own-plan-2026-03-s001.pdf"].startswith(b"%PDF")
    figures = [each for section in companion(files)["sections"] for each in section["figures"]]
    assert figures[0]["caption"].startswith(
        "Period of each row against temperature of each row, 2026-03/s001 by plan own-plan.r1"
    )


def test_where_a_figure_s_numbers_are_not_held_it_is_said_why():
    outputs = [
        {
            "name": "T_KT",
            "quantity": "temperature",
            "unit": "K",
            "description": "static transition temperature",
            "step": 2,
            "scale": "PLTS-2000",
            "value": 0.7,
            "uncertainty": 0.001,
            "digest": "0" * 64,
        }
    ]
    files = made(view_of(accession(), reductions=(reduction(outputs=outputs),)))
    assert not [name for name in files if name.startswith("figures/")]
    assert "There is no figure of 2026-03/s001@film-transition.1: the reduction has no temperature." in [
        each["text"] for section in companion(files)["sections"] for each in section["sentences"]
    ]


def own_steps(*told):
    """Return steps with these names and sentences."""
    return [
        {"number": k, "name": name, "version": 1, "sentence": text, "parameters": {}, "inputs": {}, "outputs": [], "begin": moment(900), "end": moment(900)}
        for k, (name, text) in enumerate(told, 1)
    ]  # fmt: skip


def test_rows_left_out_of_three_channels_are_told_once():
    text = "12 of 320 points were left out (the dewar shook)."
    files = made(film_view(steps=own_steps(*[("leave-out", text)] * 3)))
    told = [said for item, said, _ in sentences(files) if item == "R43"]
    assert told == [f"2026-03/s001: {text} What keeping them would change was not computed."]
    (record,) = (
        each["record"]
        for section in companion(files)["sections"]
        for each in section["sentences"]
        if each["item"] == "R43"
    )
    assert record == "; ".join(f"{ADDRESS} step {k}" for k in (1, 2, 3))


def test_a_test_of_linearity_that_was_not_asked_for_is_still_a_test():
    first = film_view()
    other = reduction("s002", steps=own_steps(("drive-linearity", "The period moved by 0.1 ps.")), outputs=[])
    view = view_of(first.newest, reductions=(*first.reductions, other))
    told = [(said, there) for item, said, there in sentences(made(view)) if item == "R09"]
    assert told == [
        (
            "2026-03/s002: The period moved by 0.1 ps. This reduction, 2026-03/s002@film-transition.1, is not among those of this appendix.",
            True,
        )
    ]


def test_the_doses_are_counted_apart_from_what_was_removed():
    # 2 doses of 30 umol, 5 umol removed between them, and all recovered at the end: 55 umol were there last.
    acts = (("d1", "add", 30), ("d2", "remove", 25), ("d3", "add", 55), ("d4", "recover", 0))
    first = film_view()
    dose = first.newest.doses[0]
    doses = tuple(
        dose.model_copy(
            update={
                "name": name,
                "act": act,
                "running_amount": dose.running_amount.model_copy(update={"value": left * 1e-6}),
            }
        )
        for name, act, left in acts
    )
    view = view_of(first.newest.model_copy(update={"doses": doses}), reductions=first.reductions)
    (told,) = (said for item, said, _ in sentences(made(view)) if item == "R20")
    assert told.startswith("In 2026-03 2 doses, less 1 removal, left 55.00(50)")


def test_an_effect_is_told_by_the_reductions_asked_for():
    first = film_view()
    steps = json.loads(first.reductions[0].model_dump_json())["steps"]
    steps[0]["effects"] = {"remounting shift": "Another reduction's shift."}
    # It sorts before the one asked for, and is not of this appendix.
    other = reduction("s000", steps=steps)
    view = view_of(first.newest, reductions=(other, *first.reductions))
    files = made(view)
    (told,) = (said for item, said, _ in sentences(files) if item == "R52" and said.startswith("Remounting"))
    assert (
        told
        == f"Remounting shift was treated in {ADDRESS}, step 1: A constant shift is removed by the alignment."
    )

"""Lineage in both directions, two reductions side by side, everything computed again, the journal of it all."""

from __future__ import annotations

import json
import math
import subprocess
from collections.abc import Iterator
from pathlib import Path
from xml.etree import ElementTree

import numpy as np
import pytest

from archive import Archive
from archive.errors import ArchiveBusy, ArchiveError, BadRequest, UnknownAddress
from archive.lab.forward import affected
from archive.lab.journaling import AFTERWARDS
from archive.reduction.planning import shipped_plans
from archive.reduction.trace import TraceNode
from archive.reports.lineage_graph import cooldown_graph, trace_graph
from tests.small_cooldown import write_folder

EMPTY, DYNAMIC = "2026-03/s001@empty-cell.1", "2026-03/s001@our-empty.1"


def every(node: TraceNode) -> Iterator[TraceNode]:
    """Yield a node and all below it."""
    yield node
    for child in node.children:
        yield from every(child)


def drawing_of(text: str | bytes) -> ElementTree.Element:
    """Return a drawing of our own as a tree."""
    return ElementTree.fromstring(text)  # noqa: S314 - drawings of our own


@pytest.fixture(scope="module")
def reduced(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Archive]:
    """Give an archive whose one sweep is reduced by two plans: the shipped one, and one of lower order."""
    root = tmp_path_factory.mktemp("lineage")
    plan = root / "our-empty.toml"
    text = (
        'name = "our-empty"\nrevision = 1\ntitle = "Ours"\ndescription = "Background by a fixed order."\nheadline = ["empty_period"]\n'
        '[applies]\nsweep_kinds = ["temperature-sweep"]\nempty_cell = true\n'
        '[[step]]\nuse = "background-fit"\nset = { order = 1 }\n'
        'take = { temperature = "channel:@temperature", values = "channel:@period" }\n'
        'give = { coefficients = "period_background", low = "period_low", high = "period_high", value_at_low = "empty_period" }\n'
    )
    plan.write_text(text, encoding="utf-8")
    with Archive.create(root / "lab", name="Test laboratory") as lab:
        lab.ingest(write_folder(root / "2026-03"))
        for each in ("empty-cell", plan):
            (made,) = lab.reduce("2026-03", plan=each, sweep="s001")
            assert made.problem is None, made.problem
        yield lab


def test_the_setting_is_what_the_tests_think(reduced: Archive) -> None:
    assert [row.reduction for row in reduced.results("empty_period")] == [EMPTY, DYNAMIC]


def test_a_record_is_led_to_its_line_of_the_sheet(reduced: Archive) -> None:
    sheet = (reduced.root.parent / "2026-03" / "cooldown.toml").read_text(encoding="utf-8").splitlines()
    node = reduced.trace("bob.r1")
    (home,) = node.children
    assert home.address == "2026-03.a1:cooldown.toml"
    (line,) = home.facts["lines"]  # type: ignore[misc]
    assert sheet[line - 1] == "[[record.cell]]"  # type: ignore[operator]


def test_a_step_and_a_sentence_of_an_appendix_are_led_down(reduced: Archive) -> None:
    step = reduced.trace(f"{EMPTY} step 1")
    assert step.kind == "step"
    assert any(node.address == "2026-03.a1:empty.csv" for node in every(step))
    sentence = reduced.trace(f"% R21 | {EMPTY} step 1; {DYNAMIC} step 1")
    assert [child.address for child in sentence.children] == [f"{EMPTY} step 1", f"{DYNAMIC} step 1"]
    with pytest.raises(UnknownAddress, match="no step 9"):
        reduced.trace(f"{EMPTY} step 9")


def test_every_mark_of_an_appendix_is_led_home(reduced: Archive, tmp_path: Path) -> None:
    reduced.write_reports(reduced.appendix([EMPTY]), tmp_path / "thesis")
    sections = json.loads((tmp_path / "thesis" / "appendix.json").read_text(encoding="utf-8"))["sections"]
    said = {each["mark"]: each for section in sections for each in section["sentences"]}
    for mark, each in said.items():
        node = reduced.trace(f"{tmp_path / 'thesis'}#{mark}")
        assert node.label == f"{mark}: {each['text']}"
        rests_on_raw = any(below.kind == "raw-file" for below in every(node))
        assert rests_on_raw == (not each["record"].startswith("the ")), each
    (block,) = [block for section in sections for block in section["steps"]]
    step = reduced.trace(f"{tmp_path / 'thesis' / 'appendix.json'}#{block['marks'][0]}")
    assert [below.address for below in step.children] == [f"{EMPTY} step 1"]
    figure = reduced.trace(f"{tmp_path / 'thesis'}#f1")
    assert [below.address for below in figure.children] == [EMPTY]
    last = f"s{len(said) + len(block['marks'])}"
    with pytest.raises(BadRequest, match=f"no such mark.*found s9999; expected s1 to {last} and f1 to f"):
        reduced.trace(f"{tmp_path / 'thesis'}#s9999")
    assert reduced.trace(f"% ST | {EMPTY} step 1").kind == "step"


def test_a_figure_is_led_to_its_reductions(reduced: Archive, tmp_path: Path) -> None:
    told = {"sections": [{"figures": [{"file": "figures/background.pdf", "reductions": [EMPTY]}]}]}
    (tmp_path / "figures").mkdir()
    (tmp_path / "appendix.json").write_text(json.dumps(told), encoding="utf-8")
    assert reduced.trace(str(tmp_path / "figures" / "background.pdf")).address == EMPTY
    with pytest.raises(BadRequest, match="does not tell of this figure"):
        reduced.trace(str(tmp_path / "figures" / "other.pdf"))
    with pytest.raises(BadRequest, match="appendix is not there"):
        reduced.trace(str(tmp_path.parent / "nowhere" / "other.pdf"))
    (tmp_path / "appendix.json").write_text("[]", encoding="utf-8")
    with pytest.raises(BadRequest, match="no appendix of Stillroom"):
        reduced.trace(str(tmp_path / "figures" / "background.pdf"))


@pytest.mark.parametrize(
    ("address", "found"),
    [
        ("2026-03.a1:empty.csv", {EMPTY, DYNAMIC}),
        ("2026-03.a1:cooldown.toml", {EMPTY, DYNAMIC}),
        ("2026-03.a1:film.csv", set()),
        ("2026-03.a1", {EMPTY, DYNAMIC}),
        ("2026-03", {EMPTY, DYNAMIC}),
        ("2026-03/s001", {EMPTY, DYNAMIC}),
        ("2026-03/s001#period", {EMPTY, DYNAMIC}),
        ("2026-03/s002", set()),
        ("bob.r1", {EMPTY, DYNAMIC}),
        ("bob", {EMPTY, DYNAMIC}),
        ("empty-cell.r1", {EMPTY}),
        (EMPTY, {EMPTY}),
        (f"{EMPTY}#empty_period", set()),
        ("2026-03/d02", set()),
    ],
)  # fmt: skip
def test_what_rests_on_a_thing(reduced: Archive, address: str, found: set[str]) -> None:
    tree = reduced.trace(address, forward=True)
    assert {node.address for node in every(tree) if node.kind == "reduction"} == found


@pytest.mark.parametrize(
    "address",
    ["2026-03.a9", "2026-03.a1:no.csv", "2026-03/s009", "2026-03/s001#no", "no", "no.r1", f"{EMPTY}#no"],
)
def test_forwards_from_nothing_says_so(reduced: Archive, address: str) -> None:
    with pytest.raises(UnknownAddress):
        reduced.trace(address, forward=True)


def test_only_what_a_step_made_of_an_input_is_affected(reduced: Archive) -> None:
    document = reduced._source.reduction(EMPTY)
    by_period = affected(document, ["2026-03/s001#period"])
    assert {"empty_period", "period_background"} <= by_period
    assert "temperature" not in by_period
    assert affected(document, ["2026-03/s001"]) == {entry.name for entry in document.outputs}
    assert affected(document, ["2026-03/s002"]) == set()


def test_a_lineage_is_drawn_once_each_and_nothing_overlaps(reduced: Archive) -> None:
    tree = reduced.trace(f"{EMPTY}#empty_period")
    drawing = drawing_of(trace_graph(tree))
    boxes = [
        tuple(float(each.attrib[name]) for name in ("x", "y", "width", "height"))
        for each in drawing.iter("{http://www.w3.org/2000/svg}rect")
    ]
    assert len(boxes) == len({node.address for node in every(tree)})
    for number, (x, y, width, height) in enumerate(boxes):
        for x2, y2, width2, height2 in boxes[number + 1 :]:
            assert x + width <= x2 + 0.05 or x2 + width2 <= x + 0.05 or y + height <= y2 or y2 + height2 <= y
    assert trace_graph(tree) == trace_graph(reduced.trace(f"{EMPTY}#empty_period"))


def test_a_cooldown_is_drawn_with_its_reductions(reduced: Archive) -> None:
    document = reduced._source.accession("2026-03.a1")
    drawn = cooldown_graph(
        "2026-03", document.sweeps, [reduced._source.reduction(each) for each in (EMPTY, DYNAMIC)]
    )
    assert drawn is not None
    texts = [each.text for each in drawing_of(drawn).iter("{http://www.w3.org/2000/svg}text")]
    assert {"s001", "empty-cell.1", "our-empty.1"} <= set(texts)
    assert cooldown_graph("2026-03", document.sweeps, []) is None


def test_two_reductions_side_by_side(reduced: Archive) -> None:
    found = reduced.compare(EMPTY, DYNAMIC)
    assert found.same_data
    assert found.plans == ("empty-cell.r1", "our-empty.r1")
    changed = {
        (each.parameter, each.second) for each in found.parameters if each.step.startswith("background-fit")
    }
    assert ("order", 1) in changed
    period = next(each for each in found.results if each.name == "empty_period")
    a, b = (reduced.show(f"{each}#empty_period") for each in (EMPTY, DYNAMIC))
    assert period.change == pytest.approx(b["value"] - a["value"], rel=1e-6)
    assert period.change_uncertainty == pytest.approx(b["uncertainty"])
    assert period.significance == pytest.approx((period.change or 0) / b["uncertainty"])
    background = next(each for each in found.arrays if each.name == "period_background")
    first, second = (reduced.array(f"{each}#period_background") for each in (EMPTY, DYNAMIC))
    if first.shape == second.shape:
        assert background.largest == pytest.approx(np.abs(first - second).max())
    else:
        assert "rows differ" in background.remark
    (only,) = [each for each in found.arrays if each.name == "temperature"]
    assert only.remark == "in the first only"


def test_a_reduction_beside_itself_does_not_differ(reduced: Archive) -> None:
    found = reduced.compare(EMPTY, EMPTY)
    assert (found.parameters, found.inputs, found.software) == ((), (), {})
    assert all(each.change == 0 for each in found.results if each.first is not None)
    assert {each.remark for each in found.arrays} == {"equal bit for bit"}


def test_a_comparison_is_drawn(reduced: Archive) -> None:
    found = reduced.compare(EMPTY, DYNAMIC)
    assert reduced.compare_figure(found).startswith(b"%PDF")
    first = reduced.compare_figure(found, kind="svg")
    assert first == reduced.compare_figure(found, kind="svg")
    drawing_of(first)


@pytest.mark.parametrize("address", ["2026-03", "2026-03/s001", "2026-03/s001#period", "bob.r1"])
def test_only_reductions_are_compared(reduced: Archive, address: str) -> None:
    with pytest.raises(BadRequest, match="is no reduction"):
        reduced.compare(address, EMPTY)
    with pytest.raises(UnknownAddress, match="there is no reduction"):
        reduced.compare(EMPTY, "2026-03/s001@empty-cell.7")


def test_everything_computed_again_is_the_same(reduced: Archive) -> None:
    told = dict(reduced.replay_all())
    assert set(told) == {EMPTY, DYNAMIC}
    for report in told.values():
        assert not isinstance(report, ArchiveError)
        assert report.identical
        assert report.moved(0.0) == {}


def test_what_cannot_be_computed_again_is_told_and_passed_over(
    reduced: Archive, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("archive.reduction.replay.run", _refuse)
    told = dict(reduced.replay_all())
    assert all(isinstance(each, UnknownAddress) for each in told.values())
    assert len(told) == 2


def _refuse(*_: object, **__: object) -> None:
    raise UnknownAddress("a record is gone")


def test_a_lost_result_counts_as_moved() -> None:
    from archive.lab import ReplayReport

    report = ReplayReport(
        "x", identical=False, outputs=2, largest_difference={"T_c": math.nan, "b": 1e-9}, shifts={"b": 0.2}
    )
    assert report.moved(0.1) == {"T_c": math.inf, "b": 0.2}
    assert report.moved(0.3) == {"T_c": math.inf}


def test_acts_are_entered_as_they_are_done(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("STILLROOM_ROLE", "data steward")
    with Archive.create(tmp_path / "lab", name="Test laboratory") as lab:
        lab.ingest(write_folder(tmp_path / "2026-03"))
        lab.reduce("2026-03", plan="empty-cell")
        told = [(each.act.act, each.act.what, each.act.by) for each in lab.journal()]
        assert told == [
            ("init", "Test laboratory", "data steward"),
            ("ingest", "2026-03.a1", "data steward"),
            ("reduce", EMPTY, "data steward"),
        ]
        assert lab.fixity() == []
    Archive.rebuild_index(tmp_path / "lab")
    with Archive.open(tmp_path / "lab") as lab:
        assert lab.journal()[-1].act.act == "rebuild-index"
        assert lab.fixity() == []


def test_what_is_given_away_is_entered_with_its_digest(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("STILLROOM_ROLE", "postdoc")
    with Archive.create(tmp_path / "lab", name="Test laboratory") as lab:
        lab.ingest(write_folder(tmp_path / "2026-03"))
        lab.export(["2026-03"], tmp_path / "bag", reports=False)
        prov = lab.provenance("2026-03").text.encode()
        lab.write_reports({"it.prov.json": prov}, tmp_path, of=["2026-03"])
        exported, reported = lab.journal()[-2:]
        assert (exported.act.act, exported.act.what, exported.act.by) == ("export", "2026-03", "postdoc")
        assert (reported.act.act, reported.act.what, reported.act.by) == ("report", "2026-03", "postdoc")
        # coreutils made both digests from the files as they lie there.
        for command, folder, act in (
            ("sha256sum < manifest-sha256.txt", tmp_path / "bag", exported.act),
            ("sha256sum it.prov.json | sha256sum", tmp_path, reported.act),
        ):
            said = subprocess.run(["sh", "-c", command], cwd=folder, capture_output=True, check=True)
            assert act.sha256 == said.stdout.decode().split()[0]
        assert lab.fixity() == []

        def busy(*_: object) -> None:
            raise ArchiveBusy("another process is writing")

        monkeypatch.setattr("archive.lab.handing.archive_lock", busy)
        lab.write_reports({"again.json": prov}, tmp_path, of=["2026-03"])
        assert lab.notices == [
            "the journal does not tell of this report: another process was writing all the while"
        ]
        assert lab.journal()[-1] == reported


def test_a_lost_journal_is_written_again_and_says_so(tmp_path: Path) -> None:
    with Archive.create(tmp_path / "lab", name="Test laboratory") as lab:
        lab.ingest(write_folder(tmp_path / "2026-03"))
        (tmp_path / "lab" / "journal.jsonl").unlink()
        assert any("no line tells of" in each.what for each in lab.fixity())
    with Archive.open(tmp_path / "lab") as lab:
        assert lab.notices == ["1 acts were entered in the journal afterwards"]
        (entry,) = lab.journal()
        assert (entry.act.act, entry.act.by, entry.act.note) == ("ingest", "graduate student", AFTERWARDS)
        assert lab.fixity() == []


def test_every_shipped_plan_can_stand_in_a_picture(reduced: Archive) -> None:
    document = reduced._source.reduction(EMPTY)
    plans = [
        document.model_copy(update={"plan": plan, "address": f"2026-03/s001@{plan.name}.1"})
        for plan in shipped_plans()
    ]
    drawn = cooldown_graph("2026-03", reduced._source.accession("2026-03.a1").sweeps, plans)
    assert drawn is not None
    assert all(f">{plan.name}.1<" in drawn for plan in shipped_plans())

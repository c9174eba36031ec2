"""Revisions, amendments, withdrawals, what is stale by them, and what is made anew: through the door."""

from __future__ import annotations

import shutil
from collections.abc import Iterator
from pathlib import Path

import pytest

from archive import Archive
from archive.errors import BadRequest, UnknownAddress
from archive.index import Index, SearchQuery
from archive.lab import reporting
from archive.lab.source import document_of
from archive.reduction.monte_carlo import Request
from archive.reports import run_sheet_html
from archive.reports.after_the_fact import act_sentences
from archive.reports.scope import Scope
from tests.revisable_cooldown import PLAN, amendment, calibration, substrate, write_calibrated

EMPTY, FILLING = "2026-03/s001@empty-cell", "2026-03/s002@filling"


def plan(revision: int, changed: str = "") -> str:
    """Return a plan file."""
    return PLAN.replace("REVISION", str(revision)).replace("CHANGED", changed)


def revision(table: str, *, head: str = 'by = "data steward"\nbecause = "measured again"') -> str:
    """Return a revision sheet."""
    return f'format = "stillroom-revision/1"\n{head}\n{table}'


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Make one archive with a calibrated cooldown, a plan of its own and two reductions."""
    root = tmp_path_factory.mktemp("afterwards")
    folder = write_calibrated(root / "2026-03")
    with Archive.create(root / "lab") as lab:
        assert lab.ingest(folder).state == "ingested"
        (root / "filling.toml").write_text(plan(1), encoding="utf-8")
        assert lab.revise(root / "filling.toml", by="graduate student").state == "sealed"
        for name, sweep in (("empty-cell", "s001"), ("filling", "s002")):
            (outcome,) = lab.reduce("2026-03", plan=name, sweep=sweep)
            assert outcome.problem is None
    return root


@pytest.fixture
def lab(made: Path, tmp_path: Path) -> Iterator[Archive]:
    """Give a copy of that archive to write to."""
    shutil.copytree(made / "lab", tmp_path / "lab")
    with Archive.open(tmp_path / "lab") as lab:
        yield lab


@pytest.fixture(scope="module")
def untouched(made: Path) -> Iterator[Archive]:
    """Give that archive itself to tests of what is refused; whatever they ask, nothing may be written."""
    with Archive.open(made / "lab") as lab:
        rows = lab._index.rows()
        yield lab
        assert lab._index.rows() == rows


@pytest.fixture
def sheet(tmp_path: Path):
    """Write a sheet and return its path."""

    def write(text: str, name: str = "sheet.toml") -> Path:
        (tmp_path / name).write_text(text, encoding="utf-8")
        return tmp_path / name

    return write


def stale_now(lab: Archive) -> dict[str, set[str]]:
    """Return what is stale, and the kinds of reason."""
    return {each.reduction: {reason.kind for reason in each.reasons} for each in lab.stale()}


def addresses(outcomes) -> list[str]:
    """Return the addresses of reductions made without a problem."""
    assert [str(each.problem) for each in outcomes if each.problem] == []
    return [each.address for each in outcomes]


def taken(lab: Archive, reduction: str, role: str) -> list[dict]:
    """Return the inputs of a role."""
    return [each for each in lab.show(reduction)["inputs"] if each["role"] == role]


def value(lab: Archive, name: str) -> float:
    """Return a result of the current reductions."""
    (row,) = lab.results(name)
    assert row.value_si is not None
    return row.value_si


def assert_derivable(lab: Archive) -> None:
    """The sealed files alone give the index that is, in whatever order they are recorded."""
    sealed = lab._index.sealed_files()
    entries = [
        (key, *row, document_of(key, lab._store.document(key)))
        for key, row in sorted(sealed.items(), reverse=True)
    ]
    with Index.create(f"sqlite:///{lab.root}/again.sqlite3") as again:
        again.rebuild(entries)
        assert again.rows() == lab._index.rows()


def test_the_index_is_made_anew_with_every_act(lab: Archive, sheet) -> None:
    lab.revise(sheet(revision(calibration(2, first=3.01))))
    lab.amend(sheet(amendment(DOSE)))
    lab.withdraw("2026-03/s001", why="the magnet was ramped", by="data steward")
    lab.withdraw("RX-cal.r2", why="the reference was broken", by="data steward")
    rows = lab._index.rows()
    assert all(
        rows[table] for table in ("revision", "amendment", "amendment_sweep", "amended_sweep", "withdrawal")
    )
    lab.close()
    (lab.root / "index.sqlite3").unlink()
    Archive.rebuild_index(lab.root)
    with Archive.open(lab.root) as again:
        assert again._index.rows() == rows
        assert again.statistics()["records"] == 7


def test_nothing_is_stale_when_nothing_was_said_afterwards(lab: Archive) -> None:
    assert lab.stale() == lab.stale("2026-03") == []
    assert lab.reduce_stale() == []
    for ask in (lab.stale, lab.reduce_stale):
        with pytest.raises(UnknownAddress, match="no cooldown 2027-01"):
            ask("2027-01")


def test_a_revised_calibration_makes_stale_what_rests_on_it_and_is_then_taken(lab: Archive, sheet) -> None:
    path = sheet(revision(calibration(2, first=3.01)))
    shown = lab.revise(path, dry_run=True)
    assert (shown.state, shown.previous) == ("shown", "RX-cal.r1")
    assert [(each.field, each.before, each.after) for each in shown.differences] == [
        ("relation.coefficients[1]", "3.0", "3.01")
    ]
    assert [each.reduction for each in shown.stale] == [f"{EMPTY}.1", f"{FILLING}.1"]
    assert stale_now(lab) == {}
    assert lab.revise(path).state == "sealed"
    assert stale_now(lab) == {f"{EMPTY}.1": {"record"}, f"{FILLING}.1": {"record", "reduction"}}
    low = value(lab, "period_low")
    made = addresses(lab.reduce_stale())
    assert made == [f"{EMPTY}.2", f"{FILLING}.2"]
    # The relation is ln T = a - 3 ln R, so every temperature rises by exp(0.01).
    assert value(lab, "period_low") == pytest.approx(low * 1.0100501670841682, rel=1e-9)
    (used,) = taken(lab, f"{FILLING}.2", "calibration")
    assert (used["address"], used["instead_of"]) == ("RX-cal.r2", "RX-cal.r1")
    assert "newest" in used["because"]
    assert {each["address"].partition("#")[0] for each in taken(lab, f"{FILLING}.2", "temperature")} == {
        f"{EMPTY}.2"
    }
    assert lab.show(f"{EMPTY}.1")["superseded_by"] == f"{EMPTY}.2"
    assert any(
        "lab.records/RX-cal.r2, raw/sheet.toml" in line for line in lab.trace(f"{EMPTY}.2#period_low").lines()
    )
    assert stale_now(lab) == {}
    # What was taken anew stays in force; the older reductions stay and are computed again from what they took.
    assert [each.already for each in lab.reduce("2026-03", plan="filling")] == [True]
    for each in (f"{EMPTY}.1", f"{FILLING}.1", *made):
        assert lab.replay(each).identical, each
        assert lab.replay(each).changed_inputs == ()
    assert_derivable(lab)


def test_a_revision_that_supersedes_another_holds_in_its_place_at_once(lab: Archive, sheet) -> None:
    head = 'by = "data steward"\nbecause = "the relation was copied wrongly"\nsupersedes = "RX-cal.r1"'
    lab.revise(sheet(revision(calibration(2, first=3.01), head=head)))
    (made,) = lab.reduce("2026-03", plan="empty-cell")
    assert made.address == f"{EMPTY}.2"
    (used,) = taken(lab, f"{EMPTY}.2", "calibration")
    assert used["because"] == "RX-cal.r2 supersedes RX-cal.r1: the relation was copied wrongly"


def test_a_revision_that_is_not_valid_yet_makes_nothing_stale(lab: Archive, sheet) -> None:
    lab.revise(sheet(revision(calibration(2, first=3.01, more="valid_from = 2026-04-01"))))
    assert lab.stale() == []
    lab.revise(sheet(revision(calibration(3, first=3.01, more="valid_from = 2026-03-01"))))
    assert set(stale_now(lab)) == {f"{EMPTY}.1", f"{FILLING}.1"}


def test_a_revision_of_a_later_cooldown_holds_from_there_on(lab: Archive, tmp_path: Path) -> None:
    folder = write_calibrated(tmp_path / "2027-03", name="2027-03", year=2027)
    text = (folder / "cooldown.toml").read_text(encoding="utf-8")
    text = text.replace(calibration(1), calibration(2, first=3.01)).replace("RX-cal.r1", "RX-cal.r2")
    (folder / "cooldown.toml").write_text(text, encoding="utf-8")
    assert lab.ingest(folder).state == "ingested"
    assert lab.stale() == []


def test_an_area_measured_again_changes_the_coverage_by_its_ratio(lab: Archive, sheet) -> None:
    before = value(lab, "coverage")
    lab.revise(sheet(revision(substrate(2, "1.70(3) m^2"))))
    assert stale_now(lab) == {f"{FILLING}.1": {"record"}}
    addresses(lab.reduce_stale())
    assert value(lab, "coverage") == pytest.approx(before * 1.60 / 1.70, rel=1e-12)


def test_equal_values_in_other_units_are_no_difference(lab: Archive, sheet) -> None:
    shown = lab.revise(sheet(revision(substrate(2, "16000(300) cm^2"))), dry_run=True)
    assert shown.differences == ()


def test_a_newer_plan_is_used_and_what_the_older_gave_is_stale(lab: Archive, sheet) -> None:
    lab.revise(sheet(plan(2, 'changed = "another name of the result"').replace('"coverage" }', '"areal" }')
                     .replace('["coverage"]', '["areal"]')), by="graduate student")  # fmt: skip
    assert stale_now(lab) == {f"{FILLING}.1": {"plan"}}
    assert addresses(lab.reduce_stale("2026-03/s002")) == [f"{FILLING}.2"]
    assert lab.show(f"{FILLING}.2")["plan"]["revision"] == 2
    assert [row.name for row in lab.results("areal")] == ["areal"]


@pytest.mark.parametrize(
    ("text", "said"),
    [
        (revision(calibration(1, first=3.01)), "RX-cal.r1 is in the archive already"),
        (revision(calibration(2), head='because = "measured again"'), "it is not said by whom"),
        (revision(calibration(2), head='by = "data steward"'), "it is not said why"),
        (revision(calibration(2).replace("RX.r1", "RY.r1")), "there is no thermometer RY.r1"),
        (revision(calibration(2).replace('"RX-cal"', '"plastic"')), "plastic is the name of a substrate"),
        (revision(calibration(2) + substrate(2, "1 m^2")), "holds one record or plan, and this one holds 2"),
        (
            revision(calibration(2), head='by = "data steward"\nbecause = "measured again"\nsupersedes = "RX-cal.r7"'),
            "cannot supersede RX-cal.r7",
        ),
        (plan(1).replace("period-drop", "period-drip"), "filling.r1 is in the archive already"),
        (plan(2).replace("period-drop", "period-drip"), "period-drip"),
        (revision(calibration(2, low="50 mmK")), "mmK"),
        ("format = ", "this is not valid TOML"),
    ],
)  # fmt: skip
def test_a_revision_that_cannot_be_is_refused_with_its_line(
    untouched: Archive, sheet, text: str, said: str
) -> None:
    outcome = untouched.revise(sheet(text))
    assert outcome.state == "refused"
    told = [finding.sentence() for finding in outcome.findings]
    assert any(said in each for each in told), told
    assert all("sheet.toml" in each and "line" in each for each in told)


DOSE = """
[[change]]
address = "2026-03/d02"
field = "amount"
value = "16.0(1) umol"
"""


def test_a_dose_that_was_stated_cites_no_equation_of_state(untouched: Archive) -> None:
    steps = {each["name"]: each for each in untouched.show(f"{FILLING}.1")["steps"]}
    assert "as stated in the notebook" in steps["amount-from-doses"]["sentence"]
    assert steps["amount-from-doses"]["citations"] == []


def test_a_corrected_dose_is_used_found_and_told_and_the_sealed_value_stays(lab: Archive, sheet) -> None:
    path = sheet(amendment(DOSE))
    shown = lab.amend(path, dry_run=True)
    assert (shown.state, shown.sweeps) == ("shown", ("2026-03/s002",))
    assert ("dose.d02.amount", "8.0(1) umol", "16.0(1) umol") in {
        (each.field, each.before, each.after) for each in shown.differences
    }
    assert lab.amend(path).address == "2026-03.m1"
    assert stale_now(lab) == {f"{FILLING}.1": {"amendment"}}
    # 40 umol and 16 umol over 1.60 m^2.
    (row,) = lab.search(SearchQuery(coverage=(34.9e-6, 35.1e-6)))
    assert (row.address, row.amended) == ("2026-03/s002", ("2026-03.m1",))
    assert row.coverage == pytest.approx(35e-6, rel=1e-12)
    assert lab.search(SearchQuery(coverage=(29e-6, 31e-6))) == []
    assert addresses(lab.reduce("2026-03", plan="filling")) == [f"{FILLING}.2"]
    assert value(lab, "coverage") == pytest.approx(35e-6, rel=1e-12)
    (used,) = taken(lab, f"{FILLING}.2", "amendment")
    assert used["address"] == "2026-03.m1"
    dose = lab.show("2026-03/d02")
    assert dose["amount"]["value"] == pytest.approx(16e-6)
    assert dose["amended"] == ["2026-03.m1: the notebook was misread at the ingest"]
    sealed = lab._source.accession("2026-03.a1")
    assert [each.amount.value for each in sealed.doses] == pytest.approx([40e-6, 8e-6])
    assert any("2026-03.m1, amendment" in line for line in lab.trace(f"{FILLING}.2#coverage").lines())
    assert lab.replay(f"{FILLING}.1").identical
    assert_derivable(lab)


def test_withdrawing_an_amendment_undoes_it_and_taking_that_back_does_it_again(lab: Archive, sheet) -> None:
    lab.amend(sheet(amendment(DOSE)))
    lab.reduce("2026-03", plan="filling")
    lab.withdraw("2026-03.m1", why="it was read rightly at first", by="data steward")
    assert [row.coverage for row in lab.search(SearchQuery(sort="name"))] == pytest.approx([0, 30e-6])
    assert lab.flagged() == {f"{FILLING}.2": ("2026-03.m1",)}
    assert stale_now(lab) == {f"{FILLING}.2": {"withdrawn"}}
    outcome = lab.withdraw("2026-03.w1", why="it was misread after all", by="data steward")
    assert outcome.restored == "2026-03.m1"
    assert [row.coverage for row in lab.search(SearchQuery(sort="name"))] == pytest.approx([0, 35e-6])
    assert lab.stale() == []
    with pytest.raises(BadRequest, match="cannot be taken back again"):
        lab.withdraw("2026-03.w2", why="once more, to and fro", by="data steward")
    assert_derivable(lab)


def test_another_calibration_holds_for_one_sweep_of_the_cooldown(lab: Archive, sheet) -> None:
    lab.revise(sheet(revision(calibration(2, first=3.0001, more="valid_from = 2030-01-01"))))
    lab.amend(sheet(amendment('[[calibration]]\nthermometer = "RX"\nuse = "RX-cal.r2"\nsweeps = ["s002"]')))
    assert stale_now(lab) == {f"{FILLING}.1": {"amendment"}}
    addresses(lab.reduce_stale())
    (used,) = taken(lab, f"{FILLING}.2", "calibration")
    assert (used["address"], used["instead_of"]) == ("RX-cal.r2", "RX-cal.r1")
    assert "2026-03.m1" in used["because"]
    assert lab.replay(f"{FILLING}.2").identical
    assert lab.stale() == []


def test_rows_left_out_afterwards_are_left_out_with_their_reason(lab: Archive, sheet) -> None:
    lab.amend(sheet(amendment('[[left_out]]\nsweep = "s001"\nrows = [5, 9]\nreason = "a door was slammed"')))
    assert stale_now(lab) == {f"{EMPTY}.1": {"amendment"}, f"{FILLING}.1": {"reduction"}}
    assert addresses(lab.reduce_stale()) == [f"{EMPTY}.2", f"{FILLING}.2"]
    steps = lab.show(f"{EMPTY}.2")["steps"]
    assert any("5 of 60 points" in each["sentence"] and "door" in each["sentence"] for each in steps)


def test_a_new_number_of_what_a_reduction_rests_on_alone_makes_no_new_one(lab: Archive) -> None:
    (repeated,) = lab.reduce("2026-03/s001", plan="empty-cell", monte_carlo=Request(trials=2))
    assert repeated.address == f"{EMPTY}.2"
    assert stale_now(lab) == {}
    (again,) = lab.reduce("2026-03", plan="filling")
    assert (again.address, again.already) == (f"{FILLING}.1", True)
    # What rests on something withdrawn is made anew, though its numbers are the same.
    lab.withdraw(f"{EMPTY}.1", why="it was made without drawn inputs", by="data steward")
    (anew,) = lab.reduce("2026-03", plan="filling")
    assert (anew.address, anew.already) == (f"{FILLING}.2", False)


@pytest.mark.parametrize(
    ("written", "said"),
    [
        ("soon", "not a date with a time of day"),
        ("2026-03-02", "not a date with a time of day"),
        ("2026-03-02T09:10:00", "no offset from UTC"),
    ],
)
def test_a_wrong_time_in_an_amendment_says_where_and_what_was_expected(
    untouched: Archive, sheet, written: str, said: str
) -> None:
    text = amendment(DOSE + f'[[change]]\naddress = "2026-03/d02"\nfield = "at"\nvalue = "{written}"\n')
    (finding,) = untouched.amend(sheet(text)).findings
    assert said in finding.what
    assert "2026-03-02T09:10:00+02:00" in finding.what
    assert finding.field == "change[2].value"
    assert finding.line is not None
    assert text.splitlines()[finding.line - 1] == f'value = "{written}"'


@pytest.mark.parametrize(
    ("body", "said"),
    [
        (DOSE.replace("d02", "d09"), "no sweep or dose d09"),
        (DOSE.replace('"amount"', '"amuont"'), "there is no amuont"),
        (DOSE.replace("umol", "mmHg"), "mmHg"),
        (DOSE.replace("2026-03/", "2026-04/"), "expected 2026-03"),
        (DOSE.replace("16.0(1)", "8.0(1)"), "nothing is read otherwise"),
        ('[[change]]\naddress = "2026-03/s002"\nfield = "files"\nvalue = ["x.csv"]', "decided how the file was read"),
        ('[[change]]\naddress = "2026-03"\nfield = "record.cell"\nvalue = 1', "stillroom revise"),
        ('[[change]]\naddress = "2026-03/d02"\nfield = "amount"', "one of both"),
        ('[[calibration]]\nthermometer = "RX"\nuse = "RX-cal.r9"', "there is no record RX-cal.r9"),
        ('[[calibration]]\nthermometer = "RY"\nuse = "RX-cal.r1"', "calibrates RX.r1, not RY"),
        ('[[calibration]]\nthermometer = "RX"\nuse = "plastic.r1"', "no calibration"),
        ('[[use]]\ninstead_of = "plastic.r1"\nuse = "bob.r1"', "is a cell"),
        ('[[left_out]]\nsweep = "s002"\nrows = [50, 90]\nreason = "noise"', "from 1 to 60"),
        ("", "amends nothing"),
    ],
)  # fmt: skip
def test_an_amendment_that_cannot_be_is_refused_with_its_line(
    untouched: Archive, sheet, body: str, said: str
) -> None:
    outcome = untouched.amend(sheet(amendment(body)))
    assert outcome.state == "refused"
    told = [finding.sentence() for finding in outcome.findings]
    assert any(said in each for each in told), told
    assert all("sheet.toml, line" in each for each in told)


def test_a_later_sheet_that_says_something_else_has_the_last_word(
    lab: Archive, sheet, tmp_path: Path
) -> None:
    lab.amend(
        sheet(amendment('[[change]]\naddress = "2026-03/s002"\nfield = "notes"\nvalue = "amended"\n' + DOSE))
    )
    folder = write_calibrated(tmp_path / "again")
    text = (folder / "cooldown.toml").read_text(encoding="utf-8")
    text = text.replace('after_dose = "d02"', 'after_dose = "d02"\nnotes = "said in the supplement"')
    (folder / "cooldown.toml").write_text(text, encoding="utf-8")
    assert lab.ingest(folder).state == "supplement"
    shown = lab.show("2026-03/s002")
    assert shown["accession"] == "2026-03.a2"
    assert shown["sheet"]["notes"] == "said in the supplement"
    # The dose stands in the new sheet as in the old one, so the amendment still speaks of it.
    assert lab.show("2026-03/d02")["amount"]["value"] == pytest.approx(16e-6)
    assert "accession" in stale_now(lab)[f"{FILLING}.1"]


def test_a_supplement_that_corrects_a_dose_reaches_the_sweeps_that_saw_it(
    lab: Archive, tmp_path: Path
) -> None:
    folder = write_calibrated(tmp_path / "again")
    text = (folder / "cooldown.toml").read_text(encoding="utf-8")
    (folder / "cooldown.toml").write_text(text.replace("8.0(1) umol", "16.0(1) umol"), encoding="utf-8")
    outcome = lab.ingest(folder)
    assert outcome.differences[1:] == ("sweep s002: its description in the sheet changed (doses)",)
    assert [row.coverage for row in lab.search(SearchQuery(sort="name"))] == pytest.approx([0, 35e-6])
    assert stale_now(lab) == {f"{FILLING}.1": {"accession"}}
    addresses(lab.reduce_stale())
    assert value(lab, "coverage") == pytest.approx(35e-6, rel=1e-12)
    assert lab.replay(f"{FILLING}.1").identical


def test_a_withdrawn_sweep_is_left_out_shown_with_its_mark_and_not_reduced(lab: Archive) -> None:
    outcome = lab.withdraw("2026-03/s001", why="the magnet was ramped", by="data steward")
    assert outcome.resting == (f"{EMPTY}.1", f"{FILLING}.1")
    assert [row.address for row in lab.search(SearchQuery())] == ["2026-03/s002"]
    every = {row.address: row.withdrawn for row in lab.search(SearchQuery(withdrawn=True))}
    assert "the magnet was ramped" in (every["2026-03/s001"] or "")
    assert lab.results("period_low") == []
    (row,) = lab.results("period_low", withdrawn=True)
    assert row.withdrawn
    assert [(row.reduction, row.flagged) for row in lab.results("coverage")] == [(f"{FILLING}.1", True)]
    shown = lab.show("2026-03/s001")
    assert "the magnet was ramped" in shown["withdrawn"]
    assert "2026-03/s001: the magnet was ramped" in lab.show(f"{FILLING}.1#coverage")["rests_on_withdrawn"][0]
    assert any("WITHDRAWN: the magnet" in line for line in lab.trace(f"{FILLING}.1#shift").lines())
    with pytest.raises(BadRequest, match="the magnet was ramped"):
        lab.reduce("2026-03/s001")
    (made,) = lab.reduce("2026-03/s002", plan="filling")
    assert "empty-cell" in str(made.problem)
    assert stale_now(lab) == {f"{FILLING}.1": {"withdrawn"}}
    assert lab.replay(f"{FILLING}.1").identical
    assert_derivable(lab)


def test_a_withdrawn_reduction_serves_no_other_and_the_one_before_counts_again(lab: Archive, sheet) -> None:
    lab.amend(sheet(amendment('[[left_out]]\nsweep = "s001"\nrows = [5, 9]\nreason = "a door was slammed"')))
    lab.reduce_stale()
    lab.withdraw(f"{EMPTY}.2", why="fitted over a crossing mode", by="data steward")
    assert [row.address for row in lab._index.reductions(plan="empty-cell", newest_only=True)] == [
        f"{EMPTY}.1"
    ]
    assert lab.flagged() == {f"{FILLING}.2": (f"{EMPTY}.2",)}
    assert addresses(lab.reduce_stale()) == [f"{EMPTY}.3", f"{FILLING}.3"]
    assert {each["address"].partition("#")[0] for each in taken(lab, f"{FILLING}.3", "temperature")} == {
        f"{EMPTY}.3"
    }


def test_a_withdrawn_calibration_must_be_replaced_before_anything_rests_on_it_anew(
    lab: Archive, sheet
) -> None:
    lab.withdraw("RX-cal.r1", why="the reference was broken", by="data steward")
    assert set(lab.flagged()) == {f"{EMPTY}.1", f"{FILLING}.1"}
    (made,) = lab.reduce("2026-03", plan="empty-cell")
    assert "the reference was broken" in str(made.problem)
    assert "supersedes" in str(made.problem)
    outcomes = lab.reduce_stale()
    assert "the reference was broken" in str(outcomes[0].problem)
    assert "could not be made anew" in str(outcomes[1].problem)
    head = 'by = "data steward"\nbecause = "against a sound reference"\nsupersedes = "RX-cal.r1"'
    lab.revise(sheet(revision(calibration(2, first=3.001), head=head)))
    assert addresses(lab.reduce_stale()) == [f"{EMPTY}.2", f"{FILLING}.2"]
    assert lab.flagged().keys() == {f"{EMPTY}.1", f"{FILLING}.1"}


def test_a_withdrawn_cooldown_accession_or_plan_is_passed_over(lab: Archive, tmp_path: Path) -> None:
    lab.withdraw("filling.r1", why="it leaves out the vapour", by="data steward")
    with pytest.raises(BadRequest, match="it leaves out the vapour"):
        lab.reduce("2026-03", plan="filling")
    assert stale_now(lab) == {f"{FILLING}.1": {"withdrawn"}}
    folder = write_calibrated(tmp_path / "again")
    text = (folder / "film.csv").read_text(encoding="utf-8")
    (folder / "film.csv").write_text(text.replace("1.0000", "1.0001"), encoding="utf-8")
    lab.ingest(folder)
    lab.withdraw("2026-03.a2", why="the file was mangled", by="data steward")
    assert [row.accession for row in lab.search(SearchQuery(sort="name"))] == ["2026-03.a1", "2026-03.a1"]
    lab.withdraw("2026-03", why="the wrong cell was mounted", by="data steward")
    assert lab.search(SearchQuery()) == []
    assert len(lab.search(SearchQuery(withdrawn=True))) == 2
    assert "wrong cell" in lab.show("2026-03")["withdrawn"]
    with pytest.raises(BadRequest, match="wrong cell"):
        lab.reduce("2026-03")
    assert_derivable(lab)


def test_the_checks_run_again_and_what_is_new_is_told_and_kept(lab: Archive, sheet) -> None:
    path = sheet(amendment('[[change]]\naddress = "2026-03/s002"\nfield = "after_dose"\nvalue = "d01"'))
    assert [each.code for each in lab.amend(path, dry_run=True).raised["2026-03"]] == ["dose-order"]
    (found,) = lab.amend(path).raised["2026-03"]
    assert "d02 was given before it began" in found.what
    # T = 0.20, 0.21, ... K in both sweeps, so ten rows of each lie below 0.3 K.
    raised = lab.revise(sheet(revision(calibration(2, low="300 mK")))).raised["2026-03"]
    outside = [each for each in raised if each.code == "temperature-outside-calibration"]
    assert [(each.place, each.what.split()[0]) for each in outside] == [("s001", "10"), ("s002", "10")]
    assert "dose-order" not in {each.code for each in raised}
    assert lab.amend(sheet(amendment(DOSE))).raised == {"2026-03": ()}
    sealed = [lab._source.document(key) for key in ("2026-03/2026-03.m1", "lab.records/RX-cal.r2")]
    assert sealed[0].findings == (found,)
    assert sealed[1].findings == {"2026-03": raised}
    files = lab.run_sheet("2026-03")
    page = files["run-sheet-2026-03.html"].decode()
    for said in (
        "found 1 thing that they had not found before",
        "d02 was given before it began",
        "the checks, run again, found nothing new",
        "10 reading(s) of s001 lie outside calibration RX-cal.r2",
    ):
        assert said in page, said
    assert files["run-sheet-2026-03.pdf"].startswith(b"%PDF")
    view = reporting.view(lab._source, lab.name, "2026-03")
    told = [each.text for each in act_sentences(Scope([view], [f"{FILLING}.1"]))]
    assert any("With 2026-03.m1 the checks of 2026-03 found (warning):" in each for each in told)
    lab.withdraw("RX-cal.r2", why="the range was stated wrongly", by="data steward")
    assert "outside calibration RX-cal.r2" not in run_sheet_html(reporting.view(lab._source, "", "2026-03"))


GATHERING = """
name = "gathering"
revision = 1
title = "Lowest temperatures of the empty cell, beside the sweep's own"

[applies]
sweep_kinds = ["temperature-sweep"]
empty_cell = false

[needs.empties]
plan = "empty-cell"
relation = "same-cell"
many = true
optional = true

[[step]]
use = "temperature-from-calibration"
take = { reading = "channel:@thermometer", calibration = "calibration:@thermometer" }
give = { temperature = "temperature" }

[[step]]
use = "temperature-on-scale"
set = { source = "ITS-90", target = "ITS-90" }
optional = true
take = { temperature = "need:empties#period_low" }
give = { temperature = "lowest" }
"""


def test_an_optional_need_of_many_is_kept_when_a_stale_reduction_is_made_anew(lab: Archive, sheet) -> None:
    assert lab.revise(sheet(GATHERING), by="graduate student").findings == ()
    (first,) = lab.reduce("2026-03/s002", plan="gathering")
    lab.amend(sheet(amendment('[[left_out]]\nsweep = "s001"\nrows = [1, 3]\nreason = "a door was slammed"')))
    assert "2026-03/s002@gathering.2" in addresses(lab.reduce_stale())
    for number, address in enumerate((first.address, "2026-03/s002@gathering.2"), 1):
        assert address is not None
        inputs = [each["address"] for each in lab.show(address)["inputs"]]
        assert f"{EMPTY}.{number}#period_low" in inputs
        assert "empties_period_low" in {each["name"] for each in lab.show(address)["outputs"]}


def test_what_rests_on_a_repetition_of_equal_outputs_is_not_stale(lab: Archive, sheet) -> None:
    (repeated,) = lab.reduce("2026-03/s001", plan="empty-cell", monte_carlo=Request(trials=2))
    assert repeated.address == f"{EMPTY}.2"
    assert stale_now(lab) == {}
    assert lab.reduce_stale() == []
    # A repetition that is stale itself, or of which the older one was withdrawn, is another matter.
    lab.withdraw(f"{EMPTY}.1", why="fitted over a crossing mode", by="data steward")
    assert stale_now(lab) == {f"{FILLING}.1": {"reduction"}}
    lab.withdraw("2026-03.w1", why="no mode crossed after all", by="data steward")
    assert stale_now(lab) == {}
    lab.amend(sheet(amendment('[[left_out]]\nsweep = "s001"\nrows = [5, 9]\nreason = "a door was slammed"')))
    assert stale_now(lab) == {f"{EMPTY}.2": {"amendment"}, f"{FILLING}.1": {"reduction"}}
    assert addresses(lab.reduce_stale()) == [f"{EMPTY}.3", f"{FILLING}.2"]
    assert stale_now(lab) == {}


@pytest.mark.parametrize(
    ("address", "error", "said"),
    [
        ("2026-03/s009", UnknownAddress, "no sweep"),
        ("2026-03/d02", BadRequest, "crossed_out"),
        ("2026-03/s002#period", BadRequest, "amend the cooldown"),
        (f"{FILLING}.1#coverage", BadRequest, "withdraw the reduction"),
        ("2026-03.a1:film.csv", BadRequest, "withdraw the accession"),
        ("RX-cal", BadRequest, "name the revision"),
        ("RX-cal.r7", UnknownAddress, "no record or plan"),
        ("2026-03.m4", UnknownAddress, "no amendment"),
        ("2027-01", UnknownAddress, "no cooldown"),
    ],
)
def test_what_cannot_be_withdrawn_says_what_to_do(
    untouched: Archive, address: str, error: type[Exception], said: str
) -> None:
    with pytest.raises(error, match=said):
        untouched.withdraw(address, why="a reason that is long enough", by="data steward")
    assert untouched.withdrawals() == []


def test_a_withdrawal_needs_a_reason_and_a_role_and_is_not_made_twice(
    lab: Archive, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.delenv("STILLROOM_ROLE", raising=False)
    with pytest.raises(BadRequest, match="too short"):
        lab.withdraw("2026-03/s001", why="bad", by="data steward")
    with pytest.raises(BadRequest, match="by whom"):
        lab.withdraw("2026-03/s001", why="the magnet was ramped")
    monkeypatch.setenv("STILLROOM_ROLE", "data steward")
    assert lab.withdraw("2026-03/s001", why="the magnet was ramped").address == "2026-03.w1"
    with pytest.raises(BadRequest, match=r"withdrawn already.*2026-03\.w1"):
        lab.withdraw("2026-03/s001", why="the magnet was ramped")
    assert lab.show("2026-03.w1")["by"] == "data steward"


def test_reports_tell_what_was_said_afterwards(lab: Archive, sheet) -> None:
    lab.amend(sheet(amendment(DOSE)))
    lab.reduce_stale()
    lab.withdraw(f"{EMPTY}.1", why="fitted over a crossing mode", by="data steward")
    view = reporting.view(lab._source, lab.name, "2026-03")
    page = run_sheet_html(view)
    for said in (
        "Said after it was sealed",
        "Amendment 2026-03.m1",
        "amount was 8.0(1) umol",
        "RESTS ON SOMETHING WITHDRAWN",
        "fitted over a crossing mode",
    ):
        assert said in page, said
    told = [each.text for each in act_sentences(Scope([view], [f"{FILLING}.2"]))]
    assert any("dose.d02.amount was 8.0(1) umol and is 16.0(1) umol" in each for each in told)
    assert f"Reduction {FILLING}.2 rests on {EMPTY}.1, withdrawn." in told


CELL = """
[[record.cell]]
name = "bob"
revision = 2
kind = "torsional-oscillator"
rod_material = "Al5056"
rim_radius = "7.5(1) mm"
empty_period = "1.000000(1) ms"
mass_sensitivity = "168(3) ns/mmol"
substrate = "plastic.r1"
free_volume = "2.1(1) cm^3"
closable_volume = "3.0(1) cm^3"
"""


GAS_END = """
[[change]]
address = "2026-03"
field = "gas_end.state"
value = "left-in-cell"
[[change]]
address = "2026-03"
field = "gas_end.valve_open"
value = false
"""


def test_a_caution_is_worked_out_from_what_was_said_afterwards(lab: Archive, sheet) -> None:
    def caution() -> dict:
        (found,) = [
            each
            for each in reporting.view(lab._source, "", "2026-03").newest.cautions
            if each["subject"].startswith("trapped gas")
        ]
        return found

    assert caution()["state"] == "not assessed"
    head = 'by = "data steward"\nbecause = "the valve volume was measured"\nsupersedes = "bob.r1"'
    lab.revise(sheet(revision(CELL, head=head)))
    lab.amend(sheet(amendment(GAS_END)))
    first = caution()
    assert (first["state"], first["subject"]) == ("caution", "trapped gas in bob.r2")
    lab.amend(sheet(amendment(DOSE)))
    second = caution()
    # 48 umol became 56 umol; each caution takes the unfavourable end of its own amount.
    ratio = second["numbers"]["amount"]["value"] / first["numbers"]["amount"]["value"]
    assert ratio == pytest.approx(56 / 48, rel=0.01)

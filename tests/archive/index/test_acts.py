"""Revisions, amendments and withdrawals in the index, on both engines."""

from __future__ import annotations

import json
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from archive.index import Index, SearchQuery
from schemas.acts import AmendmentDocument, RevisionDocument, WithdrawalDocument
from tests.archive.index import documents as make
from tests.archive.index.documents import SOFTWARE, digest, moment

ActDocument = RevisionDocument | AmendmentDocument | WithdrawalDocument


def revision(address: str = "TO-4.r3", kind: str = "cell", **more: Any) -> RevisionDocument:
    """Return a revision."""
    said = {
        "format": "stillroom-revision/1", "address": address, "kind": kind, "digest": digest(address, kind), "content": {"name": "TO-4"},
        "because": "measured again", "by": "data steward", "made": moment(500), "sheet_file": "r.toml", "software": SOFTWARE,
    }  # fmt: skip
    return RevisionDocument.model_validate_json(json.dumps({**said, **more}))


def amendment(
    number: int = 1, *, sequence: int | None = None, rests_on: int = 1, **more: Any
) -> AmendmentDocument:
    """Return an amendment of the coverage of s017."""
    said = {
        "format": "stillroom-amendment/1", "address": f"2026-03.m{number}", "cooldown": "2026-03", "number": number,
        "sequence": sequence or number, "rests_on": f"2026-03.a{rests_on}", "because": "misread at the ingest", "by": "data steward",
        "made": moment(600), "sweeps": ["2026-03/s017"], "entries": [make.sweep(coverage=make.number(40e-6, "mol/m^2"))],
        "sheet_file": "m.toml", "software": SOFTWARE,
    }  # fmt: skip
    return AmendmentDocument.model_validate_json(json.dumps({**said, **more}))


def withdrawal(
    target: str, number: int = 1, *, address: str | None = None, **more: Any
) -> WithdrawalDocument:
    """Return a withdrawal."""
    said = {
        "format": "stillroom-withdrawal/1", "address": address or f"2026-03.w{number}", "target": target, "cooldown": "2026-03",
        "number": number, "sequence": number + 10, "rests_on": "2026-03.a1", "why": "it was wrong", "by": "data steward",
        "made": moment(700), "software": SOFTWARE,
    }  # fmt: skip
    return WithdrawalDocument.model_validate_json(json.dumps({**said, **more}))


def record(index: Index, *documents: Any) -> None:
    """Record documents one by one."""
    for document in documents:
        index.record(document, **row(document))


def row(document: Any) -> dict[str, Any]:
    """Key, digest and size of a document."""
    body = document.model_dump_json()
    key = make.entry(document)[0] if not isinstance(document, ActDocument) else f"acts/{document.address}"
    return {"key": key, "sha256": digest(body), "size": len(body)}


def entries(documents: list[Any]) -> list[Any]:
    """Return documents as a rebuild takes them."""
    return [(*row(each).values(), each) for each in documents]


EMPTY = make.reduction(plan="empty-cell")
FILM = make.reduction(inputs=("2026-03/s017#period", "2026-03/s017@empty-cell.1#period_background"))


@settings(max_examples=6, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(data=st.data())
def test_acts_recorded_in_any_order_give_the_same_rows(index: Index, data: st.DataObject) -> None:
    documents = [
        make.accession(), EMPTY, FILM, revision(), revision("film.r2", "plan"), amendment(), amendment(2),
        withdrawal("2026-03.m1"), withdrawal("TO-4.r3", address="TO-4.r3.w1", cooldown=None, rests_on=None),
    ]  # fmt: skip
    index.rebuild(entries(documents))
    rows = index.rows()
    index.rebuild(entries(data.draw(st.permutations(documents))))
    assert index.rows() == rows
    record(index, *documents)
    assert index.rows() == rows


def coverages(index: Index, **asked: Any) -> list[float | None]:
    """Return the coverages that a search finds."""
    return [each.coverage for each in index.search(SearchQuery(**asked))]


def test_a_search_finds_amended_values_until_the_amendment_is_withdrawn(index: Index) -> None:
    record(index, make.accession(), amendment())
    assert coverages(index) == [40e-6]
    assert coverages(index, coverage=(39e-6, 41e-6)) == [40e-6]
    assert coverages(index, coverage=(31e-6, 32e-6)) == []
    assert index.search(SearchQuery())[0].amended == ("2026-03.m1",)
    record(index, withdrawal("2026-03.m1", entries=[make.sweep()]))
    assert coverages(index) == [31.42e-6]
    assert index.search(SearchQuery())[0].amended == ()
    assert [each.counts for each in index.amendments("2026-03")] == [False]


def test_a_later_accession_of_a_sweep_has_the_last_word_in_a_search(index: Index) -> None:
    later = make.accession(accession_number=2, sweeps=(make.sweep(coverage=make.number(50e-6, "mol/m^2")),))
    record(index, make.accession(), amendment(), later)
    assert coverages(index) == [50e-6]
    record(index, amendment(2, rests_on=2))
    assert coverages(index) == [40e-6]


@pytest.mark.parametrize("target", ["2026-03", "2026-03/s017", "2026-03.a1"])
def test_what_is_withdrawn_is_left_out_and_shown_when_asked_for(index: Index, target: str) -> None:
    record(index, make.accession(), EMPTY, withdrawal(target))
    assert index.search(SearchQuery()) == []
    assert index.sweeps("2026-03") == []
    (found,) = index.search(SearchQuery(withdrawn=True))
    assert found.withdrawn == "it was wrong (data steward, 2026-03-31, 2026-03.w1)"
    record(index, withdrawal("2026-03.w1", 2))
    assert [each.withdrawn for each in index.search(SearchQuery())] == [None]


def test_a_withdrawn_accession_gives_way_to_the_one_before(index: Index) -> None:
    record(index, make.accession(), make.accession(accession_number=2), withdrawal("2026-03.a2"))
    assert [each.accession for each in index.search(SearchQuery())] == ["2026-03.a1"]
    assert index.sweep_holders() == {"2026-03/s017": "2026-03.a1"}


def test_results_of_a_withdrawn_reduction_are_left_out_and_the_one_before_counts(index: Index) -> None:
    second = make.reduction(reduction_number=2, supersedes="2026-03/s017@film-transition.1")
    record(index, make.accession(), FILM, second)
    assert [each.reduction for each in index.results()] == [second.address]
    record(index, withdrawal(second.address))
    assert [(each.reduction, each.withdrawn) for each in index.results()] == [(FILM.address, False)]
    assert [each.newest for each in index.reductions()] == [True, False]
    assert {(each.reduction, each.withdrawn) for each in index.results(withdrawn=True)} == {
        (FILM.address, False), (second.address, True),
    }  # fmt: skip


@pytest.mark.parametrize(
    ("target", "resting"),
    [
        ("2026-03/s017@empty-cell.1", [FILM.address]),
        ("2026-03/s017", [EMPTY.address, FILM.address]),
        ("2026-03", [EMPTY.address, FILM.address]),
        ("film-transition.r1", [FILM.address]),
        ("empty-cell.r1", [EMPTY.address, FILM.address]),
        ("2026-03/s01", []),
        ("TO-4.r1", []),
    ],
)
def test_what_rests_on_something_withdrawn_is_flagged_however_far_down(
    index: Index, target: str, resting: list[str]
) -> None:
    record(index, make.accession(), EMPTY, FILM, withdrawal(target))
    assert index.flagged() == dict.fromkeys(sorted(resting), (target,))


def test_a_record_is_listed_whether_it_came_with_a_cooldown_or_by_itself(index: Index) -> None:
    record(index, make.accession(records=[make.record("TO-4.r2")]), revision(), revision("film.r2", "plan"))
    assert [(each.address, each.accession) for each in index.records("TO-4")] == [
        ("TO-4.r2", "2026-03.a1"),
        ("TO-4.r3", None),
    ]
    assert [each.address for each in index.records(kind="cell")] == ["TO-4.r2", "TO-4.r3"]
    assert index.statistics()["records"] == 2
    assert [(each.address, each.kind) for each in index.revisions()] == [
        ("TO-4.r3", "cell"),
        ("film.r2", "plan"),
    ]


def test_what_a_reduction_took_instead_is_known_while_it_counts(index: Index) -> None:
    said = {"address": "RX.r2", "role": "calibration", "instead_of": "RX.r1", "because": "newest"}
    took = make.reduction(reduction_number=2).model_copy(
        update={"inputs": (*FILM.inputs, type(FILM.inputs[0]).model_validate_json(json.dumps(said)))}
    )
    record(index, make.accession(), took)
    assert index.replaced_records("2026-03") == {("2026-03", "RX.r1"): ("RX.r2", took.address)}
    assert index.current_replacements() == {took.address: {"RX.r2": "RX.r1"}}
    record(index, withdrawal(took.address))
    assert index.replaced_records() == {}

"""Searches and lists, against sweeps whose answers are known."""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterator
from contextlib import closing
from datetime import UTC, datetime, timedelta, timezone
from pathlib import Path
from typing import Any

import pytest

from archive.errors import BadRequest
from archive.index import Index, ResultCondition, SearchQuery, SweepResult, queries
from tests.archive.index import documents as make


def _temperatures(low: float | None, high: float | None) -> dict[str, Any]:
    return {
        "temperature_low": None if low is None else make.number(low, "K", scale="ITS-90"),
        "temperature_high": None if high is None else make.number(high, "K", scale="ITS-90"),
    }


@pytest.fixture(scope="module")
def filled(shared_url: str) -> Iterator[Index]:
    """Give an index, only to be read, of two cooldowns: a supplement that changes a sweep and adds one, and reductions old and new."""
    first = make.accession(
        sweeps=(
            make.sweep(
                "e1",
                cell="TO-4.r1",
                empty_cell=True,
                coverage=None,
                begin=make.moment(0),
                end=make.moment(1),
                **_temperatures(0.1, 2.0),
            ),
            make.sweep(
                "s1",
                coverage=make.number(20.0, "umol/m^2"),
                begin=make.moment(2),
                end=make.moment(3),
                **_temperatures(400.0e-3, 1.0),
            ),
            make.sweep(
                "s2",
                coverage=make.number(30e-6, "mol/m^2", uncertainty=1e-6),
                begin=make.moment(4),
                end=make.moment(5),
                **_temperatures(1.0, 1.5),
            ),
        ),
        notes={"s1": "A knock at the pumping line; 100% sure, path a_b."},
        findings=[
            {"code": "drift", "severity": "warning", "what": "drift"},
            {"code": "gap", "severity": "note", "what": "gap"},
        ],
    )
    supplement = make.accession(
        accession_number=2,
        supplements="2026-03.a1",
        sweeps=(
            make.sweep("s2", coverage=make.number(31e-6, "mol/m^2"), begin=make.moment(4), end=make.moment(5), **_temperatures(1.0, 1.6)),
            make.sweep("s3", cell="CAL-1.r1", kind="heat-capacity", begin=None, end=None, coverage=None, substrate=None, thermometers=["RX-2.r1", "GE-7.r3"], **_temperatures(None, 3.0)),
        ),
        records=[make.record("TO-4.r2"), make.record("GE-7.r3", kind="thermometer")],
        sheet={"outcome": "aborted"},
    )  # fmt: skip
    other = make.accession(
        "2026-04",
        sweeps=(make.sweep("s1", cell="TO-4b.r1", sample="He-2.r1", begin=make.moment(100), end=make.moment(101), channels=[make.channel("temperature", quantity="temperature", unit="K", scale="PLTS-2000")], temperature_low=None, temperature_high=None),),
        records=[make.record("TO-4b.r1")],
    )  # fmt: skip
    reductions = (
        make.reduction("2026-03/s1", outputs=(make.output(value=0.7),)),
        make.reduction(
            "2026-03/s1",
            reduction_number=2,
            outputs=(
                make.output("period", None, rows=300),
                make.output("width", 5.0, unit="mK"),
                make.output(value=0.8),
            ),
        ),
        make.reduction(
            "2026-03/s2",
            plan="film",
            outputs=(make.output(value=None, uncertainty=None, verdict="no transition in range"),),
        ),
        make.reduction(
            "2026-03/s2", plan="film-two", supersedes="2026-03/s2@film.1", outputs=(make.output(value=1.2),)
        ),
    )
    with Index.create(shared_url) as index:
        index.rebuild([make.entry(document) for document in (*reductions, other, supplement, first)])
        yield index


def _found(index: Index, **query: Any) -> list[str]:
    return [row.address for row in index.search(SearchQuery(**{"sort": "name", **query}))]


E1, S1, S2, S3, OTHER = "2026-03/e1", "2026-03/s1", "2026-03/s2", "2026-03/s3", "2026-04/s1"


@pytest.mark.parametrize(
    ("query", "expected"),
    [
        pytest.param({}, [E1, S1, S2, S3, OTHER], id="everything once"),
        pytest.param({"coverage": (20e-6, 30.5e-6)}, [S1], id="coverage; the older version of s2 does not count"),
        pytest.param({"coverage": (31e-6, None)}, [S2, OTHER], id="coverage open above, end included"),
        pytest.param({"coverage": (None, None)}, [S1, S2, OTHER], id="any coverage"),
        pytest.param({"temperature": (1.55, 1.9)}, [E1, S2], id="temperature overlaps"),
        pytest.param({"temperature": (None, 0.4)}, [E1, S1], id="temperature touches"),
        pytest.param({"temperature": (3.0, 3.0)}, [S3], id="a sweep with one end is a point"),
        pytest.param({"scale": "ITS-90"}, [E1, S1, S2, S3], id="scale"),
        pytest.param({"scale": "PLTS-2000"}, [OTHER], id="scale of a channel"),
        pytest.param({"cell": "TO-4"}, [E1, S1, S2], id="cell by name, not its namesake TO-4b"),
        pytest.param({"cell": "TO-4.r2"}, [S1, S2], id="cell by revision"),
        pytest.param({"cell": "TO-4' OR '1'='1"}, [], id="a value is never SQL"),
        pytest.param({"cell": "\x00"}, [], id="the character that PostgreSQL has not"),
        pytest.param({"substrate": "PI-240"}, [E1, S1, S2, OTHER], id="substrate"),
        pytest.param({"sample": "He-2"}, [OTHER], id="sample"),
        pytest.param({"thermometer": "GE-7"}, [E1, S1, S2, S3, OTHER], id="thermometer by name"),
        pytest.param({"thermometer": "GE-7.r3"}, [S3], id="thermometer by revision"),
        pytest.param({"kind": "heat-capacity"}, [S3], id="kind"),
        pytest.param({"plan": "film"}, [S2], id="plan, superseded too"),
        pytest.param({"plan": "film-transition.r1"}, [S1], id="plan by revision"),
        pytest.param({"plan": "film-transition.r2"}, [], id="plan by another revision"),
        pytest.param({"empty_cell": True}, [E1], id="empty cell"),
        pytest.param({"empty_cell": False, "cooldown": "2026-03"}, [S1, S2, S3], id="cooldown"),
        pytest.param({"since": make.BEGIN + timedelta(hours=3)}, [S1, S2, OTHER], id="since, end included"),
        pytest.param({"until": make.BEGIN + timedelta(hours=2)}, [E1, S1], id="until, end included"),
        pytest.param({"results": (ResultCondition("T_KT", low=0.75),)}, [S1, S2], id="newest results"),
        pytest.param({"results": (ResultCondition("T_KT", 0.65, 0.75),)}, [], id="an older result does not count"),
        pytest.param({"results": (ResultCondition("width", 4e-3, 6e-3),)}, [S1], id="a bound in SI"),
        pytest.param({"results": (ResultCondition("T_KT"), ResultCondition("width"))}, [S1], id="two results"),
        pytest.param({"results": (ResultCondition("period"),)}, [], id="an array is no result"),
        pytest.param({"text": "KNOCK pumping"}, [S1], id="words in any case"),
        pytest.param({"text": "100%"}, [S1], id="a wildcard is a character"),
        pytest.param({"text": "a_b /s1"}, [S1], id="underscore"),
        pytest.param({"text": "axb"}, [], id="underscore is not any character"),
        pytest.param({"text": "knock elsewhere"}, [], id="all words"),
        pytest.param({"text": "superfluidity"}, [E1, S1, S2, S3, OTHER], id="purpose"),
        pytest.param({"text": "'; DROP TABLE sweep; --"}, [], id="text is never SQL"),
        pytest.param({"sort": "coverage"}, [S1, S2, OTHER, E1, S3], id="by coverage, none last"),
        pytest.param({"sort": "coverage", "descending": True}, [OTHER, S2, S1, E1, S3], id="descending, none still last"),
        pytest.param({"sort": "date"}, [E1, S1, S2, OTHER, S3], id="by date"),
        pytest.param({"sort": "temperature"}, [E1, S1, S2, S3, OTHER], id="by temperature"),
        pytest.param({"sort": "cell"}, [S3, E1, S1, S2, OTHER], id="by cell"),
        pytest.param({"limit": 2, "offset": 1}, [S1, S2], id="a page"),
        pytest.param({"limit": None, "offset": 4}, [OTHER], id="an offset without a limit"),
        pytest.param({"limit": 0}, [], id="nothing wanted"),
    ],
)  # fmt: skip
def test_a_search_finds(filled: Index, query: dict[str, Any], expected: list[str]) -> None:
    assert _found(filled, **query) == expected


@pytest.mark.parametrize(
    "query",
    [
        pytest.param({"since": datetime(2026, 3, 2)}, id="no offset from UTC"),  # noqa: DTZ001 - that is the fault
        pytest.param(
            {"until": datetime.max.replace(tzinfo=timezone(-timedelta(hours=1)))}, id="out of the calendar"
        ),
        pytest.param({"limit": -1}, id="negative limit"),
        pytest.param({"offset": -1}, id="negative offset"),
        pytest.param({"text": "x" * 2000}, id="endless word"),
        pytest.param({"text": "x " * 2000}, id="endless text"),
        pytest.param({"sort": "colour"}, id="unknown order"),
    ],
)
def test_a_search_that_cannot_be_is_refused(index: Index, query: dict[str, Any]) -> None:
    with pytest.raises(BadRequest):
        index.search(SearchQuery(**query))


def test_a_sweep_is_shown_in_its_newest_version_and_older_ones_stay(filled: Index) -> None:
    newest = filled.sweep(S2)
    assert newest is not None
    assert (newest.accession, newest.coverage, newest.temperature_high) == ("2026-03.a2", 31e-6, 1.6)
    older = {row.name: row for row in filled.sweeps_of_accession("2026-03.a1")}
    assert (older["s2"].coverage, older["s2"].coverage_uncertainty) == (30e-6, 1e-6)
    assert [row.name for row in filled.sweeps("2026-03")] == ["e1", "s1", "s2", "s3"]
    assert filled.sweep("2026-03/s9") is None


def test_a_sweep_row_says_what_a_list_shows(filled: Index) -> None:
    (row,) = filled.search(SearchQuery(text="knock"))
    assert row.coverage == 20e-6, "the nearest float, so that a bound of 20 umol/m^2 includes it"
    assert row.begin == datetime(2026, 3, 2, 9, 10, tzinfo=UTC)
    assert row.channels == ("period", "temperature")
    assert row.thermometers == ("GE-7.r1",)
    assert row.scale == "ITS-90"
    assert row.results == (
        SweepResult("T_KT", 0.8, 0.003, "K", None),
        SweepResult("width", 5.0, 0.003, "mK", None),
    ), "headline first, arrays not at all"


def test_accessions_count_what_came_in(filled: Index) -> None:
    first, second = filled.accessions("2026-03")
    assert (first.address, first.sweeps, first.raw_files, first.raw_bytes) == ("2026-03.a1", 3, 3, 15000)
    assert (first.warnings, first.notes, first.waived) == (1, 1, 0)
    assert (second.supplements, second.sweeps, second.records) == ("2026-03.a1", 2, 2)
    assert [row.address for row in filled.accessions()] == ["2026-03.a1", "2026-03.a2", "2026-04.a1"]


def test_a_cooldown_is_told_by_its_newest_accession(filled: Index) -> None:
    row = filled.cooldowns()[0]
    assert (row.name, row.newest_accession, row.outcome) == ("2026-03", "2026-03.a2", "aborted")
    assert (row.accessions, row.sweeps, row.reductions) == (2, 4, 4)


def test_a_record_is_listed_once_with_the_accession_that_brought_it(filled: Index) -> None:
    assert [(row.address, row.accession) for row in filled.records(kind="cell")] == [
        ("TO-4.r2", "2026-03.a1"),
        ("TO-4b.r1", "2026-04.a1"),
    ]
    assert [row.address for row in filled.records("TO-4")] == ["TO-4.r2"]
    (row,) = filled.records("GE-7.r3")
    assert (row.kind, row.revision, row.content["name"]) == ("thermometer", 3, "GE-7")


def test_reductions_say_which_are_newest(filled: Index) -> None:
    every = {row.address: row.newest for row in filled.reductions()}
    assert every == {
        "2026-03/s1@film-transition.1": False,
        "2026-03/s1@film-transition.2": True,
        "2026-03/s2@film.1": False,
        "2026-03/s2@film-two.1": True,
    }
    assert [row.number for row in filled.reductions(sweep=S1, newest_only=True)] == [2]
    assert [row.sweep for row in filled.reductions(plan="film.r1")] == [S2]
    assert [row.sweep for row in filled.reductions(cooldown="2026-03", plan="film")] == [S2]
    assert len(filled.reductions(step="leave-out")) == 4
    assert filled.reductions(step="bet-area") == []


def test_results_stand_beside_the_coverage_of_their_sweep(filled: Index) -> None:
    rows = filled.results(name="T_KT")
    assert [(row.sweep, row.value_si, row.coverage, row.cell) for row in rows] == [
        (S1, 0.8, 20e-6, "TO-4.r2"),
        (S2, 1.2, 31e-6, "TO-4.r2"),
    ]
    assert [row.value_si for row in filled.results(name="width")] == [0.005]
    every = filled.results(name="T_KT", cooldown="2026-03", newest_only=False)
    assert sorted((row.value or 0.0, row.newest) for row in every) == [
        (0.0, False),
        (0.7, False),
        (0.8, True),
        (1.2, True),
    ]
    assert [row.verdict for row in filled.results(sweep=S2, newest_only=False)] == [
        "no transition in range",
        None,
    ]


def test_a_raw_file_is_found_by_its_digest_wherever_it_came_in(filled: Index) -> None:
    rows = filled.raw_files(sha256=make.digest("raw", "s2"))
    assert [row.address for row in rows] == ["2026-03.a1:s2.csv", "2026-03.a2:s2.csv"]
    assert len(filled.raw_files(cooldown="2026-04")) == 1
    assert filled.raw_files(sha256="0" * 64) == []


def test_dependents_follow_an_address_its_parts_and_its_revisions(index: Index) -> None:
    first = make.reduction(
        "2026-03/e1", plan="empty-cell", inputs=("2026-03/e1#period", "TO-4.r2", "2026-03.a1:raw/e1.csv")
    )
    second = make.reduction("2026-03/s1", inputs=("2026-03/e1@empty-cell.1#background", "2026-03/s1#period"))
    index.rebuild([make.entry(document) for document in (second, first)])
    for address, expected in (
        ("2026-03/e1", [first.address]),
        ("2026-03/e1#period", [first.address]),
        ("2026-03/e1@empty-cell.1", [second.address]),
        ("2026-03/e1@empty-cell.1#background", [second.address]),
        ("TO-4", [first.address]),
        ("TO-4.r2", [first.address]),
        ("2026-03.a1", [first.address]),
        ("2026-03/s", []),
        ("TO-4.r1", []),
    ):
        assert index.dependents(address) == expected, address


def test_the_gas_ledger_is_that_of_the_newest_accession_with_doses(index: Index) -> None:
    def dose(name: str, amount: float) -> dict[str, Any]:
        return {
            "name": name,
            "at": make.moment(1),
            "act": "add",
            "counted": True,
            "amount": make.number(amount, "mmol", uncertainty=0.01),
            "running_amount": make.number(amount * 1e-3, "mol"),
            "method": "pV = nRT",
        }

    index.rebuild(
        [
            make.entry(make.accession(doses=[dose("d2", 1.0), dose("d1", 2.0)])),
            make.entry(make.accession(accession_number=2, doses=[dose("d2", 1.5), dose("d1", 2.0)])),
            make.entry(make.accession(accession_number=3)),
        ]
    )
    rows = index.doses("2026-03")
    assert [(row.address, row.accession) for row in rows] == [
        ("2026-03/d2", "2026-03.a2"),
        ("2026-03/d1", "2026-03.a2"),
    ]
    assert (rows[0].amount, rows[0].amount_uncertainty) == pytest.approx((1.5e-3, 1e-5))


def test_findings_are_listed_with_their_place(filled: Index) -> None:
    rows = filled.findings(severity="warning")
    assert [(row.address, row.code, row.waived, row.content["what"]) for row in rows] == [
        ("2026-03.a1", "drift", False, "drift")
    ]
    assert [row.code for row in filled.findings(address="2026-03.a1")] == ["drift", "gap"]


def test_statistics_count_each_sweep_once(filled: Index) -> None:
    counted = filled.statistics()
    assert (counted["cooldowns"], counted["accessions"], counted["sweeps"], counted["rows"]) == (
        2,
        3,
        5,
        1500,
    )
    assert (counted["reductions"], counted["results"], counted["raw_files"], counted["raw_bytes"]) == (
        4,
        5,
        6,
        30000,
    )
    assert counted["sealed_files"] == 7
    assert all(type(value) is int for value in counted.values())


def test_many_sweeps_get_their_own_parts(index: Index) -> None:
    count = 1203
    index.rebuild(
        [
            make.entry(
                make.accession(
                    sweeps=tuple(
                        make.sweep(f"s{n:04}", channels=[make.channel(f"c{n}")]) for n in range(count)
                    )
                )
            )
        ]
    )
    rows = index.search(SearchQuery(limit=None, sort="name"))
    assert [row.channels for row in rows] == [(f"c{n}",) for n in range(count)]


@pytest.mark.parametrize("descending", [False, True])
@pytest.mark.parametrize("sort", ["date", "coverage", "temperature", "cell", "name"])
def test_a_list_goes_on_behind_its_last_sweep(filled: Index, sort: Any, descending: bool) -> None:  # noqa: FBT001 - a parameter
    """One by one, behind sweeps without a value too, gives the list in one piece."""
    whole = [row.address for row in filled.search(SearchQuery(sort=sort, descending=descending))]
    after, paged = None, []
    for _ in range(len(whole) + 1):
        query = SearchQuery(sort=sort, descending=descending, limit=1, after=after)
        found = filled.search(query)
        if not found:
            break
        after = found[0].address
        paged.append(after)
    assert paged == whole
    assert len(whole) > 3


def test_a_list_cannot_go_on_behind_nothing(filled: Index) -> None:
    with pytest.raises(BadRequest, match="begin the list anew"):
        filled.search(SearchQuery(after="2026-03/s999"))


def test_short_answers_agree_with_the_long_ones(filled: Index) -> None:
    """What pages ask for without reading all of it is what reading all of it gives."""
    assert filled.cooldown_names() == sorted(row.name for row in filled.cooldowns())
    assert {row.name: row.reductions for row in filled.cooldowns()} == {
        name: len(filled.reductions(cooldown=name)) for name in filled.cooldown_names()
    }
    assert {row.name: row.sweeps for row in filled.cooldowns()} == {"2026-03": 4, "2026-04": 1}
    assert filled.sealed_files(under="2026-03/") == {
        key: row for key, row in filled.sealed_files().items() if key.startswith("2026-03/")
    }
    everything = filled.findings()
    counts = filled.finding_counts()
    assert sum(count for *_, count in counts) == len(everything)
    assert {(each.severity, each.code, each.waived) for each in everything} == {
        (severity, code, bool(waived)) for severity, code, waived, _ in counts
    }
    assert {plan["name"] for plan in filled.plans()} == {row.plan for row in filled.reductions()}
    assert filled.result_quantities("T_KT") == ["temperature"]
    assert filled.result_quantities("nothing") == []


def _steps_of_records(folder: Path, held: int) -> int:
    """Return how many steps SQLite takes to list records that so many accessions hold, the earliest of them recorded last."""
    path = folder / f"{held}.sqlite3"
    with Index.create(f"sqlite:///{path}") as index:
        key, sha256, size, document = make.entry(make.accession())
        index.record(document, key=key, sha256=sha256, size=size)
    statement = str(queries.records(None, None).compile(compile_kwargs={"literal_binds": True}))
    steps = 0

    def step() -> None:
        nonlocal steps
        steps += 1

    with closing(sqlite3.connect(path)) as connection:
        connection.execute("PRAGMA foreign_keys = OFF")
        for table in ("accession", "record"):
            columns = [row[1] for row in connection.execute(f"PRAGMA table_info({table})")]
            changed = {
                "address": "'c' || value" if table == "accession" else "address",
                "accession": "'c' || value",
                "cooldown": "'c' || value",
                "key": "'c' || value",
                "accessioned": "datetime(accessioned, '-' || value || ' days')",
            }
            said = ", ".join(changed.get(each, each) for each in columns)
            connection.execute(
                f"INSERT INTO {table} SELECT {said} FROM {table}, json_each(?)",  # noqa: S608 - names of our own
                [json.dumps(list(range(1, held)))],
            )
        connection.set_progress_handler(step, 1)
        (row,) = connection.execute(statement).fetchall()
        connection.set_progress_handler(None, 0)
    assert f"c{held - 1}" in row
    return steps


def test_listing_records_costs_in_proportion_to_the_accessions_that_hold_them(tmp_path: Path) -> None:
    # In proportion it would be 8 times as many, as the square 64 times.
    assert _steps_of_records(tmp_path, 400) < 12 * _steps_of_records(tmp_path, 50)

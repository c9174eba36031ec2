"""Search in a cell of so many sweeps that the way by date is taken: the same answers, and no table gone through from end to end."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from sqlalchemy import event

from archive.index import Index, SearchQuery
from tests.archive.index import documents as make

MANY = 1_100
CELL = "TO-4.r2"
WINDOW = (20e-6, 40e-6)


def begin(number: int) -> str | None:
    """Instant of a sweep: not in the order of names, three at a time, and none for some."""
    return None if number % 50 == 7 else make.moment(float(number * 37 % 401))


def filled(url: str) -> Index:
    """Return an index of one cooldown."""
    sweeps = tuple(
        make.sweep(
            f"s{number:04}",
            begin=begin(number),
            end=None,
            coverage=make.number((20.0 + number % 21) * 1e-6, "mol/m^2"),
            cell=CELL if number < MANY else "CAL-1.r1",
        )
        for number in range(MANY + 30)
    )
    index = Index.create(url)
    index.rebuild([make.entry(make.accession(sweeps=sweeps))])
    return index


@pytest.fixture(scope="module")
def many(shared_url: str) -> Iterator[Index]:
    """Give such an index."""
    with filled(shared_url) as index:
        yield index


def expected(*, low: float, high: float, descending: bool) -> list[str]:
    """Addresses in order, worked out without a database."""
    inside = [n for n in range(MANY) if low <= (20.0 + n % 21) * 1e-6 <= high]
    dated = [n for n in inside if begin(n) is not None]
    dated.sort(key=lambda n: float(n * 37 % 401), reverse=descending)
    return [f"2026-03/s{n:04}" for n in (*dated, *(n for n in inside if begin(n) is None))]


@pytest.mark.parametrize("descending", [False, True])
@pytest.mark.parametrize("window", [WINDOW, (25e-6, 25.5e-6)], ids=["wide", "narrow"])
def test_a_cell_by_date_gives_what_sorting_all_of_it_gives(
    many: Index,
    window: tuple[float, float],
    descending: bool,  # noqa: FBT001 - a parameter
) -> None:
    whole = expected(low=window[0], high=window[1], descending=descending)
    query = SearchQuery(cell=CELL, coverage=window, descending=descending, limit=400)
    found: list[str] = []
    while page := many.search(replace(query, after=found[-1] if found else None)):
        found += [row.address for row in page]
    assert found == whole, "page by page, across the end of those with a date"
    some = many.search(replace(query, limit=50, offset=13))
    assert [row.address for row in some] == whole[13:63]


def test_no_search_in_a_cell_scans_a_table(tmp_path: Path) -> None:
    """As SQLite tells the plan of each statement that a search sends; PostgreSQL scans what is small, whatever there is."""
    sent: list[tuple[str, Any]] = []

    def note(_connection: Any, _cursor: Any, sql: str, values: Any, *_: Any) -> None:
        sent.append((sql, values))

    with filled(f"sqlite:///{tmp_path / 'index.sqlite3'}") as index:
        event.listen(index._engine, "before_cursor_execute", note)
        for window in (WINDOW, (25e-6, 25.5e-6)):
            for cell in (CELL, "TO-4"):
                index.search(SearchQuery(cell=cell, coverage=window, limit=50))
        event.remove(index._engine, "before_cursor_execute", note)
        asked = [(sql, values) for sql, values in sent if "FROM sweep" in sql or "FROM reduction" in sql]
        assert len(asked) >= 8
        with index._engine.connect() as connection:
            for sql, values in asked:
                plan = [row[3] for row in connection.exec_driver_sql(f"EXPLAIN QUERY PLAN {sql}", values)]
                assert not [line for line in plan if line.startswith("SCAN")], (sql, plan)
    walked = [sql for sql, _ in asked if "+sweep.coverage_mol_per_m2" in sql.replace("+ ", "+")]
    assert walked, "the wide window is gone through by date"

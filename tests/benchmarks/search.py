"""Search in very many sweeps: a cell and a window of coverage, by date, the first fifty with all that a list shows of them.

The baseline goes through the driver alone, on the same database with the same indices, with statements written by hand. It knows that
nothing is amended or withdrawn in there, and asks for no page but the first. Windows are drawn once, from a hundredth of the range of
coverages to all of it; each answer is timed by itself, and the middle one or the slowest but five per cent is what counts.
"""

from __future__ import annotations

import sqlite3
import tempfile
import time
from collections.abc import Callable, Sequence
from contextlib import ExitStack, closing
from pathlib import Path
from typing import Any

import numpy as np

from archive.index import Index, SearchQuery, SweepRow
from tests.benchmarks.harness import Benchmark, Size, Timed, Work
from tests.benchmarks.wide_index import CELLS, wide_index

__all__ = ["MIDDLE", "SLOWEST", "SWEEPS", "Rows", "asked", "by_hand", "compared"]

SWEEPS = {"small": 3_000, "default": 200_000, "full": 1_000_000}
_QUERIES = {"small": 6, "default": 40, "full": 40}
_SHOWN = 50
_NARROWEST, _WIDEST = 0.4e-6, 40e-6  # mol/m^2

Rows = Callable[[str, Sequence[Any]], list[Any]]
"""Rows of a statement with a question mark for each value."""

_COLUMNS = """address, cooldown, name, kind, accession, cell, substrate, sample, empty_cell, after_dose, "begin", "end", direction, rows,
    coverage_mol_per_m2, coverage_uncertainty_mol_per_m2, "temperature_low_K", "temperature_high_K", scale"""
_NEWEST = "NOT EXISTS (SELECT 1 FROM sweep AS later WHERE later.address = sweep.address AND later.number > sweep.number)"
_FOUND = f"""SELECT {_COLUMNS} FROM sweep WHERE cell = ? AND coverage_mol_per_m2 BETWEEN ? AND ? AND {_NEWEST}
    ORDER BY "begin", address LIMIT {_SHOWN}"""  # noqa: S608 - words of this module
_PARTS = (
    """SELECT sweep.address, thermometer FROM sweep_thermometer AS part
        JOIN sweep ON sweep.accession = part.accession AND sweep.name = part.sweep
        WHERE sweep.address IN ({}) ORDER BY sweep.address, position""",
    """SELECT sweep.address, part.name FROM channel AS part JOIN sweep ON sweep.accession = part.accession AND sweep.name = part.sweep
        WHERE sweep.address IN ({}) ORDER BY sweep.address, position""",
    """SELECT reduction.sweep, output.name, output.value, output.uncertainty, output.unit, output.verdict
        FROM reduction JOIN output ON output.reduction = reduction.address
        WHERE reduction.sweep IN ({}) AND output.rows IS NULL AND NOT EXISTS (SELECT 1 FROM reduction AS later
            WHERE later.sweep = reduction.sweep AND later.plan = reduction.plan AND later.number > reduction.number)
        AND NOT EXISTS (SELECT 1 FROM reduction AS other WHERE other.supersedes = reduction.address)
        ORDER BY reduction.sweep, output.headline IS NULL, reduction.plan, output.headline, output.position""",
)


def asked(size: Size) -> list[SearchQuery]:
    """Searches that are the same in every run."""
    drawn = np.random.default_rng(20260302)
    found = []
    for _ in range(_QUERIES[size]):
        width = float(np.exp(drawn.uniform(np.log(_NARROWEST), np.log(_WIDEST))))
        low = 25e-6 + float(drawn.uniform(0.0, 1.0)) * (_WIDEST - width)
        found.append(
            SearchQuery(cell=str(drawn.choice(CELLS)), coverage=(low, low + width), sort="date", limit=_SHOWN)
        )
    return found


def by_hand(rows: Rows, query: SearchQuery) -> list[list[Any]]:
    """Rows of a search, then of its thermometers, channels and results, by statements alone."""
    found = rows(_FOUND, (query.cell, *(query.coverage or ())))
    addresses = [row[0] for row in found]
    marks = ", ".join("?" * len(addresses))
    return [found, *(rows(part.format(marks), addresses) if addresses else [] for part in _PARTS)]


def _numbers_by_hand(answered: list[list[Any]]) -> list[float]:
    found, *parts = answered
    value: dict[str, float] = {}
    for address, _, number, *_ in parts[-1]:
        value.setdefault(address, number)
    return _numbers((row[14], row[13], value.get(row[0], 0.0)) for row in found) + [
        float(len(part)) for part in parts
    ]


def _numbers_of_index(rows: Sequence[SweepRow]) -> list[float]:
    counts = (
        sum(len(getattr(row, part)) for row in rows) for part in ("thermometers", "channels", "results")
    )
    shown = ((row.coverage, row.rows, row.results[0].value if row.results else 0.0) for row in rows)
    return _numbers(shown) + [float(count) for count in counts]


def _numbers(rows: Any) -> list[float]:
    return [float(number) for row in rows for number in row]


def compared(index: Index, rows: Rows, queries: Sequence[SearchQuery], *, percent: float) -> Work:
    """Work of both sides on the same searches; the time below which so many per cent of the answers took is what counts."""

    def subject() -> Timed:
        return _timed(lambda query: index.search(query), queries, _numbers_of_index, percent)

    def baseline() -> Timed:
        return _timed(lambda query: by_hand(rows, query), queries, _numbers_by_hand, percent)

    return Work(subject, baseline, len(queries))


def _timed(
    answer: Callable[[SearchQuery], Any],
    queries: Sequence[SearchQuery],
    numbers: Callable[[Any], list[float]],
    percent: float,
) -> Timed:
    taken, found = [], []
    for query in queries:
        begin = time.perf_counter()
        answered = answer(query)
        taken.append(time.perf_counter() - begin)
        found += numbers(answered)
    return Timed(found, float(np.percentile(taken, percent)))


def _prepare(size: Size, percent: float) -> Work:
    with ExitStack() as held:
        folder = Path(held.enter_context(tempfile.TemporaryDirectory(prefix="stillroom-search-")))
        path = wide_index(folder, SWEEPS[size])
        index = held.enter_context(Index.open(f"sqlite:///{path}"))
        connection = held.enter_context(closing(sqlite3.connect(f"file:{path}?mode=ro", uri=True)))
        work = compared(
            index,
            lambda sql, values: connection.execute(sql, values).fetchall(),
            asked(size),
            percent=percent,
        )
        return Work(work.subject, work.baseline, SWEEPS[size], held.pop_all().close)


def _row(name: str, which: str, percent: float) -> Benchmark:
    return Benchmark(
        name=name,
        description=f"cell and window of coverage, by date, fifty rows: {which} of forty searches",
        subject="Index.search on SQLite",
        baseline="sqlite3 alone, four statements by hand, the same indices",
        unit="sweeps",
        prepare=lambda size: _prepare(size, percent),
    )


MIDDLE = _row("search-p50", "the middle one", 50.0)
SLOWEST = _row("search-p95", "the slowest but five per cent", 95.0)

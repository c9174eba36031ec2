"""The plane of 100,000 sweeps, merged into strips that keep every extreme, against bare SQL that reads the same sweeps and transitions.

The baseline goes through the driver of SQLite alone, with statements written by hand, and reduces what it reads with NumPy; it makes no
strips and no points. Both tell how many sweeps each cell has and what they reach over.
"""

from __future__ import annotations

import sqlite3
import tempfile
from contextlib import closing
from pathlib import Path

import numpy as np

from archive.index import Index, SearchQuery
from archive.lab.plane import plane
from archive.lab.plane_window import MOST_BARS
from archive.lab.source import LabSource
from archive.reports.plane_view import PlaneView
from archive.store.memory import MemoryStore
from tests.benchmarks.harness import Benchmark, Size, Work
from tests.benchmarks.wide_index import wide_index

__all__ = ["BENCHMARK"]

_SWEEPS = """
    SELECT cell, coverage_mol_per_m2, temperature_low_K, temperature_high_K,
        EXISTS (SELECT 1 FROM reduction WHERE reduction.sweep = sweep.address)
    FROM sweep WHERE NOT EXISTS (SELECT 1 FROM sweep AS later WHERE later.address = sweep.address AND later.number > sweep.number)
"""
_TRANSITIONS = """
    SELECT reduction.sweep, output.value_si, output.uncertainty_si FROM output JOIN reduction ON reduction.address = output.reduction
    WHERE output.name = 'T_KT' AND output.headline IS NOT NULL AND NOT EXISTS (
        SELECT 1 FROM reduction AS later WHERE later.sweep = reduction.sweep AND later.plan = reduction.plan AND later.number > reduction.number)
"""


def _prepare(size: Size) -> Work:
    folder = tempfile.TemporaryDirectory(prefix="stillroom-plane-")
    sweeps = 100_000 if size != "small" else 3_000
    path = wide_index(Path(folder.name), sweeps)
    index = Index.open(f"sqlite:///{path}", read_only=True)
    source = LabSource(MemoryStore(), index)

    def subject() -> np.ndarray:
        # Asked with a `most` of its own, a view is made each time.
        return _reaches(plane(source, SearchQuery(), most=MOST_BARS))

    def baseline() -> np.ndarray:
        with closing(sqlite3.connect(f"file:{path}?mode=ro", uri=True)) as connection:
            rows = connection.execute(_SWEEPS).fetchall()
            connection.execute(_TRANSITIONS).fetchall()
        cells = np.array([row[0] for row in rows])
        numbers = np.array([row[1:4] for row in rows])
        return np.array([_reach(numbers[cells == cell]) for cell in sorted(set(cells))])

    def close() -> None:
        index.close()
        folder.cleanup()

    return Work(subject, baseline, sweeps, close)


def _reach(numbers: np.ndarray) -> tuple[float, ...]:
    coverage, cold, warm = numbers.T
    return len(numbers), coverage.min(), coverage.max(), cold.min(), warm.max()


def _reaches(view: PlaneView) -> np.ndarray:
    found = []
    for _, look in sorted(view.cells):
        own = [strip for strip in view.strips if strip.look == look]
        ends = (
            min(s.bottom for s in own),
            max(s.top for s in own),
            min(s.cold for s in own),
            max(s.warm for s in own),
        )
        found.append((sum(strip.count for strip in own), *ends))
    return np.array(found)


BENCHMARK = Benchmark(
    name="plane",
    description="all sweeps and transitions of an archive laid out on the plane, nothing lost at its edges",
    subject="Archive.plane: rows, strips, points, lines",
    baseline="sqlite3 alone, two statements by hand, the same rows",
    unit="sweeps",
    prepare=_prepare,
)

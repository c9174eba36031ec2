"""The first picture of ten million rows, and a closer view of them, against reading both columns and looking through them.

The baseline reads both columns with h5py as they lie in the sealed file and takes lowest and highest of each of 800 pixels'
rows; of a view, of the rows that lie in it. Both sides return first, last, lowest and highest of what is seen.
"""

from __future__ import annotations

import shutil
import tempfile
from collections.abc import Callable
from functools import partial
from pathlib import Path

import h5py
import numpy as np

from archive.lab.curves.columns import DrawnColumn
from archive.lab.curves.reading import points
from archive.store.interface import Column
from archive.store.local import LocalStore
from tests.benchmarks.harness import Benchmark, Size, Work

__all__ = ["FIRST", "ZOOM"]

_PIXELS = 800
_MOST = 7 * _PIXELS
_KEY = "2026-03/2026-03.a1"
_STEP_S = 0.1


def _rows(size: Size) -> int:
    return 10_000_000 if size != "small" else 1_200_000


def _sealed(root: Path, rows: int) -> LocalStore:
    """A store with one sweep of time and period, drifting and noisy."""
    seed = np.random.default_rng(20260301)
    store = LocalStore(root)
    with store.writer(_KEY) as writer:
        columns = [
            Column("time", "float64", "s", "s", "instant", "time stamps"),
            Column("period", "float64", "us", "us", "period", "period"),
        ]
        table = writer.table("sweeps/s001", columns)
        drift = 1003.2
        for start in range(0, rows, 1 << 20):
            count = min(1 << 20, rows - start)
            walk = drift + np.cumsum(seed.standard_normal(count)) * 1e-6
            drift = float(walk[-1])
            table.append(
                {
                    "time": 1.7e9 + _STEP_S * np.arange(start, start + count),
                    "period": walk + 1e-4 * seed.standard_normal(count),
                }
            )
        writer.document("{}")
        writer.seal()
    return store


def _column(store: LocalStore, name: str, kind: str, unit: str, rows: int, run: int) -> DrawnColumn:
    path = f"sweeps/s001/{name}"
    # Another digest in each round: nothing is found in memory.
    return DrawnColumn(
        "2026-03/s001", name, kind, unit, "", rows, f"{name} {run}",
        _read=lambda start, stop: store.column(_KEY, path, start, stop),
    )  # fmt: skip


def _told(x: np.ndarray, y: np.ndarray) -> np.ndarray:
    return np.array([x[0] - 1.7e9, x[-1] - 1.7e9, y[0], y[-1], y.min(), y.max()])


def _naive(path: Path, low: float, high: float) -> np.ndarray:
    with h5py.File(path) as file:
        x, y = file["sweeps/s001/time"][()], file["sweeps/s001/period"][()]
    if low > -np.inf:
        inside = (x >= low) & (x <= high)
        x, y = x[inside], y[inside]
    size = -(-y.size // _PIXELS)
    grid = np.concatenate([y, np.full(_PIXELS * size - y.size, y[-1])]).reshape(_PIXELS, size)
    lowest, highest = grid.min(axis=1), grid.max(axis=1)
    return np.array([x[0] - 1.7e9, x[-1] - 1.7e9, y[0], y[-1], lowest.min(), highest.max()])


def _prepare(size: Size, *, closer: bool) -> Work:
    folder = Path(tempfile.mkdtemp(prefix="stillroom-picture-"))
    rows = _rows(size)
    store = _sealed(folder, rows)
    span = rows * _STEP_S
    # Ends between two rows, so that a row more or less is no matter of rounding.
    low, high = (1.7e9 + 0.4 * span + 0.05, 1.7e9 + 0.6 * span + 0.05) if closer else (-np.inf, np.inf)
    run = 0

    def columns() -> tuple[DrawnColumn, DrawnColumn]:
        return (
            _column(store, "time", "instant", "s", rows, run),
            _column(store, "period", "period", "us", rows, run),
        )

    def first() -> np.ndarray:
        nonlocal run
        run += 1
        x, y = columns()
        found = points(x, y, low, high, _MOST)
        return _told(found.x, found.y)

    def zoom() -> np.ndarray:
        found = points(*columns(), low, high, _MOST)
        inside = (found.x >= low) & (found.x <= high)
        return _told(found.x[inside], found.y[inside])

    subject: Callable[[], np.ndarray] = zoom if closer else first
    return Work(
        subject,
        partial(_naive, store.path(_KEY), low, high),
        rows,
        lambda: shutil.rmtree(folder),
    )


FIRST = Benchmark(
    name="first-picture",
    description="points of the first picture of a long sweep, 800 pixels wide, nothing in memory yet",
    subject="survey of both columns, thinned to first, last, extremes and gap of each bucket",
    baseline="h5py reads both columns, numpy takes lowest and highest of each pixel",
    unit="rows",
    prepare=partial(_prepare, closer=False),
)

ZOOM = Benchmark(
    name="closer-picture",
    description="points of the middle fifth of the same sweep, looked through before",
    subject="thinned from the survey, the ends read from the chunks that they touch",
    baseline="h5py reads both columns, numpy cuts out the view and takes lowest and highest of each pixel",
    unit="rows",
    prepare=partial(_prepare, closer=True),
)

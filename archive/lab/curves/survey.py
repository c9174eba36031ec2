"""A long pair of columns looked through once, so that any part of it can be drawn at once.

A survey keeps, of every bucket of rows, what `thinned.kept_in_buckets` keeps, and how far the bucket reaches along x. A wide
view is thinned from these; a close one, and the ends of a wide one, are read from the file: only the chunks that they touch.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from archive.lab.curves.thinned import kept_in_buckets, kept_rows

__all__ = ["EXACT_ROWS", "Points", "Read", "Survey", "seen", "surveyed"]

FloatArray = NDArray[np.float64]

Read = Callable[[int, int], tuple[FloatArray, FloatArray, FloatArray | None]]
"""x, y and, where it is stored, the standard uncertainty of y, of the rows from a start to before a stop."""

EXACT_ROWS = 1 << 20
"""As many rows are read from the file when they are asked for; two columns of them take some 60 ms."""

_SMALLEST_BUCKET = 256
_MOST_BUCKETS = 1 << 16
# A reading of this many rows is a whole number of chunks and little enough memory.
_BLOCK = 1 << 20
# Ranges that are nearer than a chunk of 32,768 rows share it.
_NEAR = 1 << 15


@dataclass(frozen=True)
class Points:
    """Rows of a pair of columns.

    Attributes
    ----------
    rows : ndarray of int64
        Their numbers, from 0, ascending.
    x, y : ndarray
    u : ndarray or None
        Standard uncertainty of y.
    thinned : bool
        Whether rows of the range asked for are left out.
    rising : bool
        Whether x never falls from row to row, in all rows that there are.
    """

    rows: NDArray[np.int64]
    x: FloatArray
    y: FloatArray
    u: FloatArray | None
    thinned: bool = False
    rising: bool = False

    def take(self, which: NDArray[np.bool_] | NDArray[np.int64], *, thinned: bool) -> Points:
        """Some of them."""
        u = None if self.u is None else self.u[which]
        return Points(self.rows[which], self.x[which], self.y[which], u, thinned, self.rising)


@dataclass(frozen=True)
class Survey:
    """What one look through a pair of columns found.

    Attributes
    ----------
    count : int
        Rows of the columns.
    size : int
        Rows of a bucket.
    points : Points
        Rows kept.
    low, high : ndarray
        Smallest and largest x of each bucket; NaN where it has none.
    rising : bool
        Whether x never falls from row to row.
    """

    count: int
    size: int
    points: Points
    low: FloatArray
    high: FloatArray
    rising: bool

    @property
    def nbytes(self) -> int:
        """Memory it takes."""
        own = self.points
        return sum(each.nbytes for each in (own.rows, own.x, own.y, self.low, self.high)) + (
            0 if own.u is None else own.u.nbytes
        )


def surveyed(read: Read, count: int) -> Survey:
    """Look through a pair of columns.

    Parameters
    ----------
    read : callable
    count : int
        Number of rows.
    """
    size = max(_SMALLEST_BUCKET, -(-count // _MOST_BUCKETS))
    block = max(size, _BLOCK - _BLOCK % size)
    parts: list[Points] = []
    rising, last = True, -np.inf
    for start in range(0, count, block):
        x, y, u = read(start, min(start + block, count))
        rows = kept_in_buckets(x, y, size)
        parts.append(Points(rows + start, x[rows], y[rows], None if u is None else u[rows]))
        known = x[np.isfinite(x)]
        if known.size:
            rising = rising and bool(known[0] >= last) and bool((known[1:] >= known[:-1]).all())
            last = known[-1]
    points = _joined(parts)
    low, high = _reach(points, size, -(-count // size))
    return Survey(count, size, points, low, high, rising)


def _joined(parts: list[Points]) -> Points:
    if not parts:
        empty = np.empty(0)
        return Points(np.empty(0, dtype=np.int64), empty, empty, None)
    u = [part.u for part in parts if part.u is not None]
    return Points(
        np.concatenate([part.rows for part in parts]),
        np.concatenate([part.x for part in parts]),
        np.concatenate([part.y for part in parts]),
        np.concatenate(u) if len(u) == len(parts) else None,
        any(part.thinned for part in parts),
        parts[0].rising,
    )


def _reach(points: Points, size: int, buckets: int) -> tuple[FloatArray, FloatArray]:
    """Smallest and largest x of each bucket, from the rows kept: both are among them; without any, those of the one before."""
    low, high = np.full(buckets, np.inf), np.full(buckets, -np.inf)
    known = np.isfinite(points.x) & np.isfinite(points.y)
    of = points.rows[known] // size
    np.minimum.at(low, of, points.x[known])
    np.maximum.at(high, of, points.x[known])
    # A gap belongs to what it follows, so that a line that is seen on both sides of it is broken there.
    before = np.maximum.accumulate(np.where(low <= high, np.arange(buckets), 0))
    return low[before], high[before]


def seen(survey: Survey | None, read: Read, count: int, low: float, high: float, most: int) -> Points:
    """Points to draw where x lies between two ends, the extremes among them.

    Parameters
    ----------
    survey : Survey or None
        None where there are so few rows that all of them are read.
    read : callable
    count : int
        Number of rows.
    low, high : float
        Ends along x; infinite for all of it.
    most : int
        No more points than this; at least 9.

    Returns
    -------
    Points
        Those within; where x never falls also the next row on both sides, so that a line leaves the picture where it does.
    """
    found = _all_rows(read, count) if survey is None else _of_survey(survey, read, low, high)
    within = np.flatnonzero((found.x >= low) & (found.x <= high) & np.isfinite(found.x))
    if not within.size:
        return found.take(within, thinned=found.thinned)
    if not found.rising:
        return _thinned(found.take(within, thinned=found.thinned), most)
    first, last = int(within[0]), int(within[-1]) + 1
    inner = _thinned(found.take(np.arange(first, last), thinned=found.thinned), most - 2)
    outer = found.take(np.arange(last, min(last + 1, found.rows.size)), thinned=False)
    return _joined([found.take(np.arange(max(first - 1, 0), first), thinned=False), inner, outer])


def _thinned(points: Points, most: int) -> Points:
    if points.rows.size <= most:
        return points
    return points.take(kept_rows(points.x, points.y, most), thinned=True)


def _all_rows(read: Read, count: int) -> Points:
    x, y, u = read(0, count)
    known = x[np.isfinite(x)]
    return Points(np.arange(count), x, y, u, rising=bool((known[1:] >= known[:-1]).all()))


def _of_survey(survey: Survey, read: Read, low: float, high: float) -> Points:
    """Rows of the buckets that reach into a range, and of their neighbours: from the file where that is little, else as kept."""
    touched = (survey.high >= low) & (survey.low <= high)
    touched[1:] |= touched[:-1].copy()
    touched[:-1] |= touched[1:].copy()
    exact = touched.copy()
    if np.count_nonzero(exact) * survey.size > EXACT_ROWS:
        # A bucket across an end of the range may have its extremes outside: its rows are read, too.
        exact &= (survey.low < low) | (survey.high > high)
        if np.count_nonzero(exact) * survey.size > EXACT_ROWS:
            exact[:] = False
    kept = survey.points
    parts = [kept.take((touched & ~exact)[kept.rows // survey.size], thinned=True)]
    for start, stop in _ranges(exact, survey):
        x, y, u = read(start, stop)
        rows = np.arange(start, stop)
        wanted = exact[rows // survey.size]
        parts.append(Points(rows, x, y, u).take(wanted, thinned=False))
    found = _joined([part for part in parts if part.rows.size])
    ordered = found.take(np.argsort(found.rows, kind="stable"), thinned=found.thinned)
    return replace(ordered, rising=survey.rising)


def _ranges(exact: NDArray[np.bool_], survey: Survey) -> Iterator[tuple[int, int]]:
    """Ranges of rows to read for some buckets; what lies between near ones is read along with them."""
    buckets = np.flatnonzero(exact)
    if not buckets.size:
        return
    cuts = np.flatnonzero(np.diff(buckets) * survey.size > _NEAR) + 1
    for run in np.split(buckets, cuts):
        yield int(run[0]) * survey.size, min((int(run[-1]) + 1) * survey.size, survey.count)

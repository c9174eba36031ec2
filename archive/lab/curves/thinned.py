"""Fewer points that look like all of them: for each bucket of rows its first, its last and its extremes.

Rules: every point kept is a row that was recorded, in the order of the rows; no extreme of either axis is lost; where values
are missing, a row without a value stays, so that a line breaks there and nowhere else.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = ["POINTS_PER_BUCKET", "kept_in_buckets", "kept_rows"]

FloatArray = NDArray[np.float64]
RowArray = NDArray[np.int64]

POINTS_PER_BUCKET = 7
"""First, last, lowest and highest of both axes, and one row without a value."""


def kept_rows(x: FloatArray, y: FloatArray, most: int) -> RowArray:
    """Rows to draw, at most `most` of them, ascending.

    Parameters
    ----------
    x, y : ndarray of float64, equal length
        NaN where there is no value.
    most : int
        At least `POINTS_PER_BUCKET`.

    Returns
    -------
    ndarray of int64
        All rows where there are no more than `most`.

    Raises
    ------
    ValueError
        If `most` is too small to keep the extremes.

    Examples
    --------
    >>> y = np.zeros(100)
    >>> y[37] = 5.0
    >>> 37 in kept_rows(np.arange(100.0), y, 14)
    True
    """
    if most < POINTS_PER_BUCKET:
        raise ValueError(f"most: expected at least {POINTS_PER_BUCKET}, found {most}")
    if x.size <= most:
        return np.arange(x.size)
    return kept_in_buckets(x, y, -(-x.size // (most // POINTS_PER_BUCKET)))


def kept_in_buckets(x: FloatArray, y: FloatArray, size: int) -> RowArray:
    """Rows kept of each bucket of `size` rows, ascending.

    Parameters
    ----------
    x, y : ndarray of float64, equal length
    size : int
        Rows in a bucket; the last one may have fewer.
    """
    rows = x.size
    buckets = -(-rows // size)
    known = np.isfinite(x) & np.isfinite(y)
    inside = _flags(known, buckets, size)
    whole = bool(known.all()) and rows == buckets * size
    x_grid, y_grid = (_values(each, buckets, size) for each in (x, y))

    def extremes(values: FloatArray) -> tuple[RowArray, RowArray]:
        if whole:
            return values.argmin(axis=1), values.argmax(axis=1)
        return (
            np.where(inside, values, np.inf).argmin(axis=1),
            np.where(inside, values, -np.inf).argmax(axis=1),
        )

    first, last = inside.argmax(axis=1), size - 1 - inside[:, ::-1].argmax(axis=1)
    found = np.stack([first, last, *extremes(x_grid), *extremes(y_grid)])
    begins = np.arange(buckets, dtype=np.int64) * size
    kept = (begins + found)[:, inside.any(axis=1)].ravel()
    if not whole:
        missing = ~inside & _flags(np.ones(rows, dtype=np.bool_), buckets, size)
        gaps = (begins + missing.argmax(axis=1))[missing.any(axis=1)]
        kept = np.concatenate([kept, gaps])
    return np.unique(kept)


def _values(values: FloatArray, buckets: int, size: int) -> FloatArray:
    """Values as one row for each bucket, the last one filled up."""
    short = buckets * size - values.size
    return (np.concatenate([values, np.zeros(short)]) if short else values).reshape(buckets, size)


def _flags(flags: NDArray[np.bool_], buckets: int, size: int) -> NDArray[np.bool_]:
    """Flags in the same shape; what fills up the last row is not set."""
    short = buckets * size - flags.size
    return (np.concatenate([flags, np.zeros(short, dtype=np.bool_)]) if short else flags).reshape(
        buckets, size
    )

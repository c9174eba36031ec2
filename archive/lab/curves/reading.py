"""Reading pairs of columns: short ones whole and kept in memory, long ones by a survey and the chunks that a view touches.

What is kept in memory is found again by the digest of what was sealed; it is bounded, and gone when the process ends: to
look through ten million rows again takes about a second, which no file of our own beside the sealed ones is worth.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from archive.lab.curves.columns import DrawnColumn
from archive.lab.curves.kept import Kept
from archive.lab.curves.survey import EXACT_ROWS, Points, Survey, seen, surveyed

__all__ = ["ends", "points"]

FloatArray = NDArray[np.float64]

_SURVEYS: Kept[Survey] = Kept(most=1 << 26, size=lambda survey: survey.nbytes)
_COLUMNS: Kept[FloatArray] = Kept(most=1 << 26, size=lambda values: values.nbytes)
_NONE = np.empty(0)


def points(x: DrawnColumn, y: DrawnColumn, low: float, high: float, most: int) -> Points:
    """Points of a pair of columns where x lies between two ends; see `archive.lab.curves.survey.seen`.

    Parameters
    ----------
    x, y : DrawnColumn
        Of equal length.
    low, high : float
        In the unit that x is stored in.
    most : int
    """
    survey = _survey(x, y) if y.rows > EXACT_ROWS else None
    return seen(survey, lambda start, stop: _pair(x, y, start, stop), y.rows, low, high, most)


def ends(column: DrawnColumn, beside: DrawnColumn | None = None) -> tuple[float, float]:
    """Smallest and largest value of a column, NaN where there is none.

    Parameters
    ----------
    column : DrawnColumn
    beside : DrawnColumn, optional
        What it is to be drawn against: a long column whose ends are not recorded is then looked through once for both.
    """
    if column.low is not None and column.high is not None:
        return column.low, column.high
    if column.rows <= EXACT_ROWS:
        values = _values(column, 0, column.rows)
    else:
        survey = _survey(column if beside is None else beside, column)
        values = survey.points.y
    known = values[np.isfinite(values)]
    return (float(known.min()), float(known.max())) if known.size else (float("nan"), float("nan"))


def _survey(x: DrawnColumn, y: DrawnColumn) -> Survey:
    key = (x.digest, y.digest, y.owner)
    return _SURVEYS.get(key, lambda: surveyed(lambda start, stop: _pair(x, y, start, stop), y.rows))


def _pair(
    x: DrawnColumn, y: DrawnColumn, start: int, stop: int
) -> tuple[FloatArray, FloatArray, FloatArray | None]:
    values = _values(y, start, stop)
    return _values(x, start, stop), values, _spread(y, start, stop, values)


def _values(column: DrawnColumn, start: int, stop: int) -> FloatArray:
    if column.rows > EXACT_ROWS or not column.digest:
        return column.read(start, stop)
    whole = _COLUMNS.get(column.digest, lambda: column.read(0, column.rows))
    return whole[start:stop]


def _spread(column: DrawnColumn, start: int, stop: int, values: FloatArray) -> FloatArray | None:
    if column.rows > EXACT_ROWS:
        found = column.spread(start, stop, values)
    else:
        found = _COLUMNS.get((column.address, column.digest), lambda: _known(column, values))
    # A zero says that none is known, not that the values are exact.
    return found if found is not None and found.size and bool(np.any(found > 0)) else None


def _known(column: DrawnColumn, values: FloatArray) -> FloatArray:
    """Uncertainties of a whole short column; nothing where none is known."""
    found = column.spread(0, column.rows, values)
    return _NONE if found is None else found

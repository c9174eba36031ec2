"""Interpolation in the table of liquid 4He at saturated vapour pressure: ranges, and the two sides of the lambda point.

Rule: the two sides are interpolated separately; nothing is fitted across the lambda point.

References
----------
R. J. Donnelly, C. F. Barenghi, J. Phys. Chem. Ref. Data 27, 1217 (1998). Temperatures are T90.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from archive.physics import tables_helium4_liquid as table
from archive.physics.constants import T_LAMBDA
from archive.physics.ranges import Floats, floats, within

__all__ = [
    "COLDEST",
    "FIRST_ABOVE",
    "LAST_BELOW",
    "WARMEST",
    "checked_temperature",
    "reduced_temperature",
    "rows_above",
    "rows_below",
    "two_sides",
]

_T: Final = np.array(table.TEMPERATURE)
COLDEST, WARMEST = float(_T[0]), float(_T[-1])
LAST_BELOW, FIRST_ABOVE = 2.175, 2.18


def _rows(column: tuple[float, ...], low: float, high: float) -> tuple[Floats, Floats]:
    values = np.array(column)
    chosen = (low <= _T) & (high >= _T) & ~np.isnan(values)
    return _T[chosen], values[chosen]


def rows_below(column: tuple[float, ...], low: float = COLDEST) -> tuple[Floats, Floats]:
    """Return temperatures and values of a column from `low` up to the last row below the lambda point."""
    return _rows(column, low, LAST_BELOW)


def rows_above(column: tuple[float, ...]) -> tuple[Floats, Floats]:
    """Return temperatures and values of a column from the first row above the lambda point."""
    return _rows(column, FIRST_ABOVE, WARMEST)


def two_sides(
    temperature: Floats,
    below: Callable[[Floats], Floats],
    above: Callable[[Floats], Floats],
    edges: tuple[float, float] = (T_LAMBDA, T_LAMBDA),
) -> Floats:
    """Return one function below the first edge, another above the second, a straight line between the edges."""
    first, second = edges
    result = np.full(temperature.shape, np.nan)
    cold, warm = temperature <= first, temperature >= second
    result[cold] = below(temperature[cold])
    result[warm] = above(temperature[warm])
    between = (temperature > first) & (temperature < second)
    if between.any():
        left, right = below(floats(first)), above(floats(second))
        result[between] = left + (right - left) * (temperature[between] - first) / (second - first)
    return result[()]


def checked_temperature(
    temperature: ArrayLike, name: str, low: float = COLDEST, high: float = WARMEST
) -> Floats:
    """Return temperatures as floats, refused outside the range of a property of the table."""
    return within(
        temperature,
        "temperature",
        low=low,
        high=high,
        unit="K",
        formula=f"the table of the {name} of liquid 4He",
    )


def reduced_temperature(T: Floats) -> Floats:
    """Return 1 - T/T_lambda."""
    return 1 - T / T_LAMBDA

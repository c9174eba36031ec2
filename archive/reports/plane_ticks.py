"""Round values beside the sides of the plane, and how they are written."""

from __future__ import annotations

import math
from collections.abc import Sequence
from itertools import pairwise

from schemas.uncertain_text import rounded

__all__ = ["round_values", "value_texts"]

# From here on a number beside an axis is written as a power of ten.
_LARGE = 1e6


def round_values(low: float, high: float, *, log: bool, most: int = 7) -> list[float]:
    """Return round values from low to high, few enough to be written beside an axis.

    Parameters
    ----------
    low, high : float
        Both above zero where `log`.
    log : bool
    most : int

    Examples
    --------
    >>> round_values(0.0, 1.1, log=False, most=6)
    [0.0, 0.2, 0.4, 0.6, 0.8, 1.0]
    >>> round_values(0.04, 3.0, log=True, most=7)
    [0.05, 0.1, 0.2, 0.5, 1.0, 2.0]
    """
    if log:
        return _round_logarithmic(low, high, most)
    step = 10.0 ** math.floor(math.log10((high - low) / most))
    step = next((step * k for k in (1, 2, 5) if (high - low) / (step * k) <= most), step * 10)
    first, last = math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9)
    # Rounded to the step's own place: 3 x 0.1 is not to be written 0.30000000000000004.
    places = max(0, -math.floor(math.log10(step) + 1e-9))
    return [round(k * step, places) + 0.0 for k in range(first, last + 1)]


def _round_logarithmic(low: float, high: float, most: int) -> list[float]:
    if high < 2.5 * low:
        return _inside(round_values(low, high, log=False, most=most), low, high)
    decades = range(math.floor(math.log10(low)), math.ceil(math.log10(high)) + 1)
    for factors in ((1, 2, 5), (1, 3), (1,)):
        values = _inside([float(f"{factor}e{power}") for power in decades for factor in factors], low, high)
        if len(values) <= most:
            return values
    every = math.ceil(len(decades) / most)
    return _inside([float(f"1e{power}") for power in decades if power % every == 0], low, high)


def _inside(values: Sequence[float], low: float, high: float) -> list[float]:
    return [value for value in values if low <= value <= high]


def value_texts(values: Sequence[float]) -> list[str]:
    """Return round values as they are written beside an axis: evenly spaced ones to the same place.

    Parameters
    ----------
    values : sequence of float

    Examples
    --------
    >>> value_texts([0.0, 0.5, 1.0]), value_texts([0.01, 0.1, 1.0]), value_texts([1e6, 1e7, 1e8])
    (['0.0', '0.5', '1.0'], ['0.01', '0.1', '1'], ['10⁶', '10⁷', '10⁸'])
    """
    steps = [high - low for low, high in pairwise(values)]
    if steps and max(steps) < 1.01 * min(steps) and max(map(abs, values)) < _LARGE:
        places = max(0, -math.floor(math.log10(min(steps)) + 1e-9))
        return [f"{value:.{places}f}".replace("-", "\N{MINUS SIGN}") for value in values]
    return [_alone(value) for value in values]


def _alone(value: float) -> str:
    if value == 0 or 1e-4 <= abs(value) < _LARGE:
        return f"{value:g}".replace("-", "\N{MINUS SIGN}")
    return rounded(float(f"{value:.2g}"), None).typographic().removeprefix("1\N{THIN SPACE}×\N{THIN SPACE}")

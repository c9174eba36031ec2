"""How the plane is laid out, on paper and on a page alike: looks, units, ticks, and bars at one height side by side."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Sequence
from itertools import pairwise
from typing import NamedTuple

from archive.reports.figure_style import LOOKS
from archive.reports.plane_view import Bar, PlaneAxis, Window
from schemas.uncertain_text import rounded
from schemas.units import parse_unit

__all__ = [
    "HeightUnit",
    "height_unit",
    "is_short",
    "logarithmic",
    "mark_and_shade",
    "round_values",
    "side_by_side",
]

# Share of the width of a picture.
_SHORT = 0.008
# From here on a number beside an axis is written as a power of ten.
_LARGE = 1e6


class HeightUnit(NamedTuple):
    """Factor from the SI unit to the unit that is shown, and its names: plain, and as it is printed."""

    per_si: float
    plain: str
    text: str


_UNITS: dict[PlaneAxis, HeightUnit] = {
    "coverage": HeightUnit(1e6, "umol/m^2", parse_unit("umol/m^2").typographic),
    "pressure": HeightUnit(1e-3, "kPa", "kPa"),
    "cell": HeightUnit(1.0, "", ""),
}


def height_unit(axis: PlaneAxis) -> HeightUnit:
    """Return the unit in which an axis is shown."""
    return _UNITS[axis]


def logarithmic(axis: PlaneAxis) -> tuple[bool, bool]:
    """Whether temperature and the axis are logarithmic: films are looked at on linear sides, where the jump is a straight line."""
    return axis != "coverage", axis == "pressure"


def mark_and_shade(look: int) -> tuple[str, int]:
    """Return mark and number of the shade of a look: 49 looks differ before one comes again.

    Examples
    --------
    >>> mark_and_shade(0), mark_and_shade(6), mark_and_shade(7)
    (('o', 0), ('+', 6), ('s', 0))
    """
    count = len(LOOKS)
    return LOOKS[(look + look // count) % count][0], look % count


def is_short(bar: Bar, window: Window, *, log: bool) -> bool:
    """Whether a bar is too short to be seen as one, and is to be drawn as a stroke across."""
    if log:
        return math.log(bar.warm / bar.cold) < _SHORT * math.log(window.warm / window.cold)
    return bar.warm - bar.cold < _SHORT * (window.warm - window.cold)


def side_by_side(bars: Sequence[Bar]) -> dict[str, int]:
    """Return the place of each bar among those at exactly its height that it would cover: 0 on its height, 1, -1, 2, ... beside it.

    Parameters
    ----------
    bars : sequence of Bar

    Examples
    --------
    >>> one = Bar("2026-03/s1", "temperature-sweep", "TO-4", 0, None, 0.1, 0.6, 3e-5, 3e-5, None)
    >>> two = Bar("2026-03/s2", "temperature-sweep", "TO-4", 0, None, 0.5, 0.7, 3e-5, 3e-5, None)
    >>> side_by_side([one, two])
    {'2026-03/s1': 0, '2026-03/s2': 1}
    """
    groups: dict[tuple[float, float], list[Bar]] = defaultdict(list)
    for bar in bars:
        groups[bar.bottom, bar.top].append(bar)
    places: dict[str, int] = {}
    for group in groups.values():
        reached: list[float] = []
        for bar in sorted(group, key=lambda each: (each.cold, -each.warm, each.address)):
            row = next((place for place, warm in enumerate(reached) if warm < bar.cold), len(reached))
            if row == len(reached):
                reached.append(bar.warm)
            reached[row] = bar.warm
            places[bar.address] = (row + 1) // 2 * (1 if row % 2 else -1)
    return places


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

"""How the plane is laid out, on paper and on a page alike: looks, units, and bars at one height side by side."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Sequence
from typing import NamedTuple

from archive.reports.figure_style import LOOKS
from archive.reports.plane_view import Bar, PlaneAxis, Window
from schemas.units import parse_unit

__all__ = [
    "height_unit",
    "is_short",
    "logarithmic",
    "mark_and_shade",
    "side_by_side",
]

# Share of the width of a picture.
_SHORT = 0.008


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

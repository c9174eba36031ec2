"""A part of the plane as a person writes it, and the way back: two ranges, of which neither end is open."""

from __future__ import annotations

from collections.abc import Callable
from typing import Final

from archive.errors import BadRequest
from archive.reports.plane_layout import height_unit, logarithmic
from archive.reports.plane_view import PlaneAxis, Window
from schemas.quantity import Quantity
from schemas.ranges import si_bounds

__all__ = ["HEIGHTS", "plane_window", "window_fields"]

HEIGHTS: Final[dict[PlaneAxis, str]] = {"coverage": "coverage", "pressure": "pressure", "cell": "lanes"}
"""Field in which the range of each axis stands."""

_EXAMPLES = {
    "temperature": "0.1:0.9 K",
    "coverage": "20:35 umol/m^2",
    "pressure": "1:100 kPa",
    "lanes": "0:3",
}
# Relative to the larger end: closer, and rounding shows.
_NARROWEST = 1e-9
# In SI units: beyond what any laboratory has, and far from where numbers of a computer end.
_FARTHEST = 1e12
_LEAST = 1e-15


def plane_window(
    axis: PlaneAxis,
    *,
    temperature: str | None,
    height: str | None,
    spelt: Callable[[str], str] = lambda name: name,
) -> Window | None:
    """Return the part of the plane that two ranges ask for; None if neither is there.

    Parameters
    ----------
    axis : PlaneAxis
    temperature, height : str, optional
        Such as `0.1:0.9 K` and `20:35 umol/m^2`; lanes of cells are counted from below, `0:3`.
    spelt : callable
        How a person knows a field by its name.

    Raises
    ------
    BadRequest
        If one range is missing, an end is open, a text is no range, or there is nothing between its ends.
    """
    if temperature is None and height is None:
        return None
    sides = (("temperature", temperature, "temperature"), (HEIGHTS[axis], height, axis))
    ends: list[float] = []
    for (name, text, kind), log in zip(sides, logarithmic(axis), strict=True):
        ends += _ends(name, text, kind, log=log, field=spelt(name))
    return Window(*ends)


def _ends(name: str, text: str | None, kind: str, *, log: bool, field: str) -> tuple[float, float]:
    expected = f"a range with both ends, such as {_EXAMPLES[name]}"
    if text is None:
        raise BadRequest("a part of the plane has two sides", field=field, expected=expected)

    def to_si(number: str, unit: str) -> float:
        if kind != "cell":
            return Quantity.parse(f"{number} {unit}".strip(), kind).si
        if unit:
            raise ValueError(f"found the unit {unit!r}; lanes are counted")
        return float(number)

    try:
        low, high = si_bounds(text, to_si)
    except ValueError as error:
        raise BadRequest(str(error), field=field, expected=expected) from None
    if low is None or high is None or not -_FARTHEST <= low <= high <= _FARTHEST or (log and low < _LEAST):
        raise BadRequest("the plane has no such part", field=field, found=text, expected=expected)
    if not high - low > max(_NARROWEST * max(abs(low), abs(high)), _LEAST):
        raise BadRequest(
            "there is nothing to see between these ends", field=field, found=text, expected=expected
        )
    return low, high


def window_fields(window: Window, axis: PlaneAxis) -> dict[str, str]:
    """Return the fields that ask for a window.

    Examples
    --------
    >>> window_fields(Window(0.1, 0.9, 20e-6, 35e-6), "coverage")
    {'temperature': '0.1:0.9 K', 'coverage': '20:35 umol/m^2'}
    """
    unit = height_unit(axis)
    low, high = (f"{end * unit.per_si:.9g}" for end in (window.bottom, window.top))
    return {
        "temperature": f"{window.cold:.9g}:{window.warm:.9g} K",
        HEIGHTS[axis]: f"{low}:{high} {unit.plain}".strip(),
    }

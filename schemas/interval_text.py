"""Intervals and contributions of a result as text, in the unit in which the result itself reads best."""

from __future__ import annotations

import math
from collections.abc import Sequence

from schemas.kinds import KINDS
from schemas.quantity import Quantity
from schemas.uncertain_text import in_preferred_unit

__all__ = ["contribution_text", "interval_text", "preferred_unit"]


def preferred_unit(value: float, unit: str, kind: str, uncertainty: float | None = None) -> tuple[str, float]:
    """Return the unit that a result is shown in, and the factor to it.

    Parameters
    ----------
    value : float
    unit : str
        Unit of the value.
    kind : str
        Quantity kind.
    uncertainty : float, optional
        Standard uncertainty, which decides where the value is zero.

    Examples
    --------
    >>> unit, factor = preferred_unit(0.00100321, "s", "period")
    >>> unit, round(factor, 9)
    ('ms', 1000.0)
    """
    size = value or uncertainty or 0.0
    if kind not in KINDS or not math.isfinite(size) or size == 0:
        return unit, 1.0
    spread = uncertainty if uncertainty and math.isfinite(uncertainty) and uncertainty > 0 else None
    shown = in_preferred_unit(Quantity(value=size, uncertainty=spread, unit=unit, kind=kind))
    return shown.unit, shown.value / size


def interval_text(
    interval: Sequence[float] | None, *, uncertainty: float | None, unit: str, factor: float = 1.0
) -> str:
    """Return an interval to the place of the second digit of a standard uncertainty, "-" for none.

    Examples
    --------
    >>> interval_text((0.456321, 0.460812), uncertainty=0.0012, unit="K"), interval_text(None, uncertainty=1.0, unit="K")
    ('[0.4563, 0.4608] K', '-')
    >>> interval_text((123456.0, 234567.0), uncertainty=30000.0, unit="1")
    '[123000, 235000]'
    """
    if interval is None:
        return "-"
    low, high = (number * factor for number in interval)
    spread = abs(high - low) / 4 if not uncertainty else uncertainty * factor
    tail = "" if unit == "1" else f" {unit}"
    if not (spread > 0 and math.isfinite(spread)):
        return f"[{low:.6g}, {high:.6g}]{tail}"
    place = math.floor(math.log10(spread)) - 1
    large = max(abs(low), abs(high))
    if place > 3 or large < 1e-4 or large >= 1e7:
        digits = max(math.floor(math.log10(large)) - place, 1) if large > 0 else 1
        return f"[{low:.{digits}e}, {high:.{digits}e}]{tail}"
    if place > 0:
        return f"[{round(low, -place):.0f}, {round(high, -place):.0f}]{tail}"
    return f"[{low:.{-place}f}, {high:.{-place}f}]{tail}"


def contribution_text(contribution: float, *, unit: str, factor: float = 1.0) -> str:
    """Return a contribution to an uncertainty with three digits and its unit.

    Examples
    --------
    >>> contribution_text(-0.00012345, unit="mK", factor=1000.0), contribution_text(999.7, unit="uK")
    ('-0.123 mK', '1000 uK')
    """
    number = contribution * factor
    # What rounds up to a thousand, or stands beside what does, needs no power of ten.
    text = f"{number:.0f}" if 999.5 <= abs(number) < 1e6 else f"{number:.3g}"
    return text + ("" if unit == "1" else f" {unit}")

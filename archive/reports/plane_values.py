"""Numbers of the plane as they are read: from SI to the unit people like, with the standard uncertainty in brackets."""

from __future__ import annotations

import html

from archive.reports.plane_view import Bar, PlaneAxis
from schemas.quantity import Quantity
from schemas.uncertain_text import html_text, in_preferred_unit, rounded

__all__ = ["height_words", "span_words", "value_words"]

_DASH = "\N{EN DASH}"


def value_words(value: float, u: float | None, kind: str, unit: str) -> str:
    """Return a value in SI with its standard uncertainty in brackets, in the unit people like to read.

    Examples
    --------
    >>> value_words(0.45873584, 0.00105, "temperature", "K")
    '458.7(1.0)\N{NO-BREAK SPACE}mK'
    """
    known = u if u is not None and u > 0 else None
    shown = value if known is not None else float(f"{value:.4g}")
    return _plain(Quantity(value=shown, uncertainty=known, unit=unit, kind=kind))


def _plain(quantity: Quantity) -> str:
    return html.unescape(html_text(in_preferred_unit(quantity)))


def span_words(low: float, high: float, kind: str, unit: str) -> str:
    """Return a range in SI, both ends in the unit that suits the higher one."""
    if low == high:
        return _plain(Quantity(value=float(f"{low:.4g}"), unit=unit, kind=kind))
    top = in_preferred_unit(Quantity(value=float(f"{high:.4g}"), unit=unit, kind=kind))
    bottom = Quantity(value=float(f"{low:.4g}"), unit=unit, kind=kind).to(top.unit)
    if bottom.value == top.value:
        return _plain(top)
    return f"{rounded(float(f'{bottom.value:.4g}'), None).typographic()}{_DASH}{_plain(top)}"


def height_words(bar: Bar, axis: PlaneAxis) -> str:
    """Return where a bar stands on the axis; nothing for a lane."""
    if axis == "cell":
        return ""
    unit = "mol/m^2" if axis == "coverage" else "Pa"
    if bar.bottom != bar.top:
        return span_words(bar.bottom, bar.top, axis, unit)
    return value_words(bar.top, bar.uncertainty, axis, unit)

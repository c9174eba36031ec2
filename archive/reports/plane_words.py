"""What the plane says in words: of a bar, a point, a strip, a line, and of all that the picture leaves out."""

from __future__ import annotations

import html
import math
from collections.abc import Iterator

from archive.index import SweepResult
from archive.physics.film_static import onset_coverage
from archive.reports.plane_layout import height_unit
from archive.reports.plane_view import Bar, Line, PlaneAxis, PlaneView, Point, Strip
from schemas.quantity import Quantity
from schemas.uncertain_text import html_text, in_preferred_unit, rounded
from schemas.units import parse_unit

__all__ = [
    "TITLES",
    "bar_words",
    "height_words",
    "line_remarks",
    "line_words",
    "point_words",
    "remarks",
    "result_words",
    "span_words",
    "strip_words",
    "value_words",
]

TITLES: dict[PlaneAxis, str] = {
    "coverage": "Coverage against temperature",
    "pressure": "Pressure against temperature",
    "cell": "Cells against temperature",
}

_DASH = "\N{EN DASH}"
_SPACE = "\N{NO-BREAK SPACE}"


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


def bar_words(bar: Bar, axis: PlaneAxis) -> str:
    """Return a sweep in one line: address, what it is, where it stands, its temperatures, its marks and results."""
    parts = [
        f"{bar.kind}, {bar.cell}",
        height_words(bar, axis),
        span_words(bar.cold, bar.warm, "temperature", "K"),
    ]
    parts += [*bar.marks, *bar.results]
    return f"{bar.address}: " + "; ".join(part for part in parts if part)


def point_words(point: Point, axis: PlaneAxis) -> str:
    """Return a transition in one line."""
    at = value_words(point.temperature, point.temperature_uncertainty, "temperature", "K")
    words = f"{point.address}: {at}"
    if axis == "cell":
        return f"{words}, {point.cell}"
    unit = "mol/m^2" if axis == "coverage" else "Pa"
    return f"{words} at {value_words(point.height, point.height_uncertainty, axis, unit)}, {point.cell}"


def result_words(result: SweepResult) -> str:
    """Return a result as `name = value`, in its own unit."""
    if result.value is None:
        return f"{result.name}: {result.verdict or 'no number'}"
    u = result.uncertainty if result.uncertainty and math.isfinite(result.uncertainty) else None
    value = result.value if u is not None else float(f"{result.value:.4g}")
    unit = "" if result.unit == "1" else f"{_SPACE}{parse_unit(result.unit).typographic}"
    return f"{result.name} = {rounded(value, u).typographic()}{unit}"


def strip_words(strip: Strip, axis: PlaneAxis) -> str:
    """Return merged bars in one line."""
    unit = {"coverage": "mol/m^2", "pressure": "Pa"}.get(axis)
    where = "" if unit is None else f" at {span_words(strip.bottom, strip.top, axis, unit)}"
    return f"{strip.count} sweeps of {strip.cell}{where}, {span_words(strip.cold, strip.warm, 'temperature', 'K')}"


def line_words(line: Line) -> str:
    """Return where a line of the universal jump begins, and why there."""
    if line.source is None:
        return f"{line.cell}: no inert layer has been found, so the line begins at zero"
    inert = value_words(line.inert, line.inert_uncertainty, "coverage", "mol/m^2")
    return f"{line.cell}: above an inert layer of {inert}, from {line.source}"


def remarks(view: PlaneView) -> Iterator[str]:
    """Yield sentences on what is shown, what is merged, and what is left out."""
    shown = len(view.bars) + view.merged
    yield (
        f"{_count(view.sweeps, 'sweep')}, {shown} of them shown."
        if view.outside is not None
        else f"{_count(shown, 'sweep')} in this part of the plane."
    )
    if view.outside:
        yield f"{_count(view.outside, 'sweep')} beyond the edges."
    for what, count in view.unplaced:
        yield f"{_count(count, 'sweep')} without {what}."
    if view.merged:
        yield (
            f"{view.merged} bars are too many to be told apart: they are merged into {len(view.strips)} strips, each of which reaches exactly "
            "as far as its bars. Look closer to see them one by one."
        )
    if view.thinned:
        yield f"{_count(view.thinned, 'transition')} left out where others of the same cell stand at the same place; the outermost are all here."


def line_remarks(view: PlaneView) -> Iterator[str]:
    """Yield sentences on the lines: what they are, what they rest on, and which cells have none."""
    if view.lines:
        per_kelvin = float(onset_coverage(1.0, inert_coverage=0.0)) * height_unit("coverage").per_si
        yield (
            f"Broken lines: the coverage at which a flat film becomes superfluid by the universal jump alone, {per_kelvin:.3f} {height_unit('coverage').text} per kelvin "
            "above its inert layer (Nelson and Kosterlitz, Phys. Rev. Lett. 39, 1201, 1977). What thermal excitations take away is not in it, so that "
            "films are expected above their line."
        )
        yield from (f"{line_words(line)}." for line in view.lines)
    if view.in_pores:
        yield f"{', '.join(view.in_pores)}: no line, since a film on the walls of pores has no universal jump."


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}{'' if number == 1 else 's'}"

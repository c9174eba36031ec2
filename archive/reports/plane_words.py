"""What stands on the plane, each in one line of words."""

from __future__ import annotations

import math

from archive.index import SweepResult
from archive.reports.plane_values import height_words, span_words, value_words
from archive.reports.plane_view import Bar, Line, PlaneAxis, Point, Strip
from schemas.uncertain_text import rounded
from schemas.units import parse_unit

__all__ = ["bar_words", "line_words", "point_words", "result_words", "strip_words"]


_DASH = "\N{EN DASH}"
_SPACE = "\N{NO-BREAK SPACE}"


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
    """Return where a line of the universal jump begins, and why there; the address of its source, if it has one, follows."""
    if line.source is None:
        return f"{line.cell}: no inert layer has been found, so the line begins at zero"
    inert = value_words(line.inert, line.inert_uncertainty, "coverage", "mol/m^2")
    return f"{line.cell}: above an inert layer of {inert}, from "

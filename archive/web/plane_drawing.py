"""The plane as shapes that a template writes out as SVG: every place a percentage of the field, so that it fits any width.

Rules: a shape has no style of its own, only a class and attributes; a bar reaches a little over the edge where it goes on.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any

from archive.physics.film_static import onset_coverage
from archive.reports.plane_layout import height_unit, is_short, logarithmic, mark_and_shade, side_by_side
from archive.reports.plane_ticks import round_values, value_texts
from archive.reports.plane_view import Bar, PlaneView, Window
from archive.reports.plane_words import bar_words, line_words, point_words, strip_words
from archive.web.links import path_of

__all__ = ["MARKS", "Drawing", "Mark", "Shape", "Stroke", "Tick", "drawing"]

_APART = 5
"""Pixels between bars that stand beside each other at one height."""

_OVER = 0.02

MARKS = {
    "o": "M0-4a4 4 0 1 0 .01 0z",
    "s": "M-3.7-3.7h7.4v7.4h-7.4z",
    "^": "M0-4.6 4.4 3.4h-8.8z",
    "v": "M0 4.6 4.4-3.4h-8.8z",
    "D": "M0-4.8 4.8 0 0 4.8-4.8 0z",
    "x": "M-3.8-3.8 3.8 3.8M-3.8 3.8 3.8-3.8",
    "+": "M-4.8 0h9.6M0-4.8v9.6",
}
"""Outline of each mark about its middle, in pixels."""


@dataclass(frozen=True)
class Tick:
    """A value written beside a side of the field."""

    at: str
    text: str


@dataclass(frozen=True)
class Stroke:
    """A line from one place to another."""

    x1: str
    y1: str
    x2: str
    y2: str


@dataclass(frozen=True)
class Mark:
    """A point with its uncertainties."""

    x: str = ""
    y: str = ""
    path: str = ""
    open: bool = False
    across: Stroke | None = None
    upright: Stroke | None = None


@dataclass(frozen=True)
class Shape:
    """Something on the plane that leads somewhere: one of `stroke`, `box` and `mark` says where it is."""

    href: str
    words: str
    kind: str
    shade: int
    beside: int = 0
    stroke: Stroke | None = None
    box: tuple[str, str, str, str] | None = None
    mark: Mark | None = None
    weight: str = ""


@dataclass(frozen=True)
class Drawing:
    """The field with what is on it, and the ticks of its sides."""

    across: tuple[Tick, ...]
    upright: tuple[Tick, ...]
    rules: tuple[str, ...]
    lines: tuple[Shape, ...]
    strips: tuple[Shape, ...]
    bars: tuple[Shape, ...]
    points: tuple[Shape, ...]


Place = Callable[[float], float]


def drawing(view: PlaneView, closer: Callable[[Window], str]) -> Drawing:
    """Return what is drawn of a view.

    Parameters
    ----------
    view : PlaneView
    closer : callable
        Address of the plane with another window, to which a strip leads.
    """
    window, log, unit = view.window, logarithmic(view.axis), height_unit(view.axis)
    x = _place(window.cold, window.warm, log=log[0])
    y = _place(window.bottom, window.top, log=log[1])
    across = round_values(window.cold, window.warm, log=log[0])
    if view.axis == "cell":
        shown = [(lane, name) for lane, (name, _) in enumerate(view.lanes)]
        upright = [Tick(_percent(1 - y(lane + 0.5)), name) for lane, name in shown if 0 <= y(lane + 0.5) <= 1]
        rules = tuple(_percent(1 - y(float(lane))) for lane, _ in shown if 0 < y(float(lane)) < 1)
    else:
        bottom, top = window.bottom * unit.per_si, window.top * unit.per_si
        values = round_values(bottom, top, log=log[1])
        upright = [
            Tick(_percent(1 - y(value / unit.per_si)), text)
            for value, text in zip(values, value_texts(values), strict=True)
        ]
        rules = ()
    return Drawing(
        across=tuple(
            Tick(_percent(x(value)), text) for value, text in zip(across, value_texts(across), strict=True)
        ),
        upright=tuple(upright),
        rules=rules,
        lines=tuple(_lines(view, x, y)),
        strips=tuple(_strips(view, x, y, closer)),
        bars=tuple(_bars(view, x, y)),
        points=tuple(_points(view, x, y)),
    )


def _place(low: float, high: float, *, log: bool) -> Place:
    def share(value: float) -> float:
        if log:
            return math.log(max(value, 1e-300) / low) / math.log(high / low)
        return (value - low) / (high - low)

    return share


def _percent(share: float) -> str:
    return f"{100 * min(max(share, -_OVER), 1 + _OVER):.3f}%"


def _stroke(x: tuple[float, float], y: tuple[float, float]) -> Stroke:
    return Stroke(_percent(x[0]), _percent(1 - y[0]), _percent(x[1]), _percent(1 - y[1]))


def _box(x: tuple[float, float], y: tuple[float, float]) -> tuple[str, str, str, str]:
    """Return left, top, width and height of a box that ends at the edges."""
    left, right = (min(max(each, -_OVER), 1 + _OVER) for each in x)
    low, high = (min(max(each, -_OVER), 1 + _OVER) for each in y)
    return tuple(f"{100 * each:.3f}%" for each in (left, 1 - high, right - left, high - low))  # type: ignore[return-value]


def _bars(view: PlaneView, x: Place, y: Place) -> Iterator[Shape]:
    beside = side_by_side(view.bars)
    for bar in view.bars:
        yield Shape(
            href=path_of(bar.address),
            words=bar_words(bar, view.axis),
            kind=" ".join(("bar", *_manner(bar))),
            shade=mark_and_shade(bar.look)[1],
            beside=-_APART * beside[bar.address],
            **_outline(bar, view, x, y),
        )


def _outline(bar: Bar, view: PlaneView, x: Place, y: Place) -> dict[str, Any]:
    """Return a bar as a line along or up; as a stroke across where it has neither length, as a box where it has both."""
    across, upright = (x(bar.cold), x(bar.warm)), (y(bar.bottom), y(bar.top))
    middle = sum(across) / 2
    short, level = is_short(bar, view.window, log=logarithmic(view.axis)[0]), bar.bottom == bar.top
    if short and level:
        return {"mark": Mark(_percent(middle), _percent(1 - upright[0]), "M0-6v12")}
    if level:
        return {"stroke": _stroke(across, upright)}
    if short:
        return {"stroke": _stroke((middle, middle), upright)}
    # Which temperature went with which height is not known here: a box, not a slanted line.
    return {"box": _box(across, upright)}


def _manner(bar: Bar) -> Iterator[str]:
    if "withdrawn" in bar.marks or "stale" in bar.marks:
        yield "doubted"
    elif "not reduced" in bar.marks:
        yield "raw"


def _strips(view: PlaneView, x: Place, y: Place, closer: Callable[[Window], str]) -> Iterator[Shape]:
    most = max((strip.count for strip in view.strips), default=1)
    for strip in view.strips:
        yield Shape(
            href=closer(_about(strip.cold, strip.warm, strip.bottom, strip.top, view)),
            words=f"{strip_words(strip, view.axis)}; look closer",
            kind="strip",
            shade=mark_and_shade(strip.look)[1],
            box=_box((x(strip.cold), x(strip.warm)), (y(strip.bottom), y(strip.top))),
            weight=f"{0.12 + 0.48 * strip.count / most:.2f}",
        )


def _about(cold: float, warm: float, bottom: float, top: float, view: PlaneView) -> Window:
    """Return a window a little wider than a strip, and never wider than the one it was seen in."""
    window, log = view.window, logarithmic(view.axis)

    def side(low: float, high: float, least: float, most: float, *, log: bool) -> tuple[float, float]:
        if log:
            wider = max((high / low) ** 0.1, (most / least) ** 0.005)
            return max(low / wider, least), min(high * wider, most)
        wider = max(0.1 * (high - low), 0.005 * (most - least))
        return max(low - wider, least), min(high + wider, most)

    return Window(
        *side(cold, warm, window.cold, window.warm, log=log[0]),
        *side(bottom, top, window.bottom, window.top, log=log[1]),
    )


def _points(view: PlaneView, x: Place, y: Place) -> Iterator[Shape]:
    for point in view.points:
        mark, shade = mark_and_shade(point.look)
        u, v = point.temperature_uncertainty or 0.0, point.height_uncertainty or 0.0
        at = x(point.temperature), y(point.height)
        across = (x(point.temperature - u), x(point.temperature + u))
        upright = (y(point.height - v), y(point.height + v))
        yield Shape(
            href=path_of(point.address),
            words=point_words(point, view.axis),
            kind="point",
            shade=shade,
            mark=Mark(
                _percent(at[0]),
                _percent(1 - at[1]),
                MARKS[mark],
                mark not in "x+",
                _stroke(across, (at[1], at[1])) if u else None,
                _stroke((at[0], at[0]), upright) if v else None,
            ),
        )


def _lines(view: PlaneView, x: Place, y: Place) -> Iterator[Shape]:
    for line in view.lines:
        ends = max(view.window.cold, 0.0), view.window.warm
        heights = [float(onset_coverage(end, inert_coverage=line.inert)) for end in ends]
        u = line.inert_uncertainty or 0.0
        foot = (
            _stroke((x(0.0), x(0.0)), (y(line.inert - u), y(line.inert + u)))
            if u and view.window.cold <= 0.0
            else None
        )
        yield Shape(
            href="" if line.source is None else path_of(line.source),
            words=f"universal jump, {line_words(line)}{line.source or ''}",
            kind="universal",
            shade=0 if line.look is None else mark_and_shade(line.look)[1],
            stroke=_unclipped((x(ends[0]), x(ends[1])), (y(heights[0]), y(heights[1]))),
            mark=None if foot is None else Mark(upright=foot),
        )


def _unclipped(x: tuple[float, float], y: tuple[float, float]) -> Stroke:
    """Return a slanted line as it is, for cutting an end off would turn it; the field hides what is outside."""
    across, upright = [f"{100 * each:.3f}%" for each in x], [f"{100 - 100 * each:.3f}%" for each in y]
    return Stroke(across[0], upright[0], across[1], upright[1])

"""Strips one below the other over one abscissa, as from a chart recorder of many channels: points that lead somewhere, lines with their bands.

Rules: presentation attributes and classes alone; whoever cannot tell colours apart has marks and dashes; everything drawn
stands in a table of its page as well.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from xml.sax.saxutils import escape, quoteattr

import numpy as np
from numpy.typing import NDArray

from archive.lab.curves.ink import LOOKS
from archive.reports.plane_ticks import round_values
from archive.reports.svg import Axis, tick_texts
from archive.web.plane_drawing import MARKS

__all__ = ["Bar", "Drawn", "Line", "Spot", "Strip", "dash_of", "mark_path", "strips"]

FloatArray = NDArray[np.float64]

_LEFT, _RIGHT, _WIDTH = 92.0, 986.0, 1000
_HIGH, _ABOVE, _FOOT, _BARS = 128.0, 30.0, 46.0, 30.0
_SIZE = 'font-size="13"'
_NAMES = tuple(MARKS)


@dataclass(frozen=True)
class Spot:
    """A point: its place, its standard uncertainty, the look it has, the page it leads to, and what it is in words."""

    x: float
    y: float
    u: float | None
    look: int
    href: str
    words: str


@dataclass(frozen=True)
class Line:
    """A curve with the band of its standard uncertainty."""

    x: FloatArray
    y: FloatArray
    u: FloatArray | None
    look: int


@dataclass(frozen=True)
class Strip:
    """One ordinate with what is drawn over it."""

    words: str
    axis: Axis
    spots: tuple[Spot, ...] = ()
    lines: tuple[Line, ...] = ()


@dataclass(frozen=True)
class Bar:
    """A stretch of the abscissa that has a name and a page."""

    begin: float
    end: float
    text: str
    href: str
    words: str


@dataclass(frozen=True)
class Drawn:
    """A drawing and its size in px."""

    svg: str
    width: int
    height: int


def mark_path(look: int) -> str:
    """Return the outline of the mark of a look, about its middle, in px."""
    return MARKS[_NAMES[look % len(_NAMES)]]


def dash_of(look: int) -> str:
    """Return the dashes of a line of a look, as SVG writes them."""
    return LOOKS[look % len(LOOKS)][1] or "none"


def strips(
    across: Axis,
    ticks: Sequence[tuple[float, str]],
    below: Sequence[Strip],
    *,
    bars: Sequence[Bar] = (),
    label: str,
) -> Drawn:
    """Draw strips.

    Parameters
    ----------
    across : Axis
    ticks : sequence of (float, str)
        Places along it and what is written there.
    below : sequence of Strip
    bars : sequence of Bar
        Drawn above the strips.
    label : str
        The drawing in words.
    """
    top = _BARS if bars else 0.0
    height = int(top + len(below) * (_HIGH + _ABOVE) + _FOOT)
    parts = [
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {_WIDTH} {height}" width="{_WIDTH}" height="{height}" role="group" aria-label={quoteattr(label)}>'
    ]
    foot = height - _FOOT
    parts += _bars(across, bars, foot)
    for number, strip in enumerate(below):
        begin = top + number * (_HIGH + _ABOVE) + _ABOVE
        parts += _strip(across, ticks, strip, begin, begin + _HIGH)
    for place, text in ticks:
        x = _x(across, place)
        parts.append(f'<text x="{x:.1f}" y="{foot + 18:.1f}" {_SIZE} text-anchor="middle">{text}</text>')
    parts.append(
        f'<text x="{(_LEFT + _RIGHT) / 2}" y="{foot + 38:.1f}" {_SIZE} text-anchor="middle">{escape(across.name)}</text></svg>'
    )
    return Drawn("".join(parts), _WIDTH, height)


def _x(across: Axis, value: float) -> float:
    return _LEFT + float(across.place(np.array([value]))[0]) * (_RIGHT - _LEFT)


def _bars(across: Axis, bars: Sequence[Bar], foot: float) -> Iterator[str]:
    reached = 0.0
    for bar in bars:
        x1, x2 = _x(across, bar.begin), _x(across, bar.end)
        x2 = max(x2, x1 + 4)
        # A name that would cover the one before it is left to the title, which is read out all the same.
        room = x1 >= reached
        reached = x1 + 8.2 * len(bar.text) if room else reached
        name = f'<text x="{x1:.1f}" y="14" {_SIZE}>{escape(bar.text)}</text>' if room else ""
        yield (
            f"<a href={quoteattr(bar.href)}><title>{escape(bar.words)}</title>"
            f'<path d="M{x1:.1f} 24H{x2:.1f}" stroke="#000" stroke-opacity="0" stroke-width="24"/>'
            f'<path d="M{x1:.1f} 24H{x2:.1f}" class="ink" stroke="#000" stroke-width="4"/>{name}</a>'
            f'<path d="M{x1:.1f} 24V{foot:.1f}" stroke="#666" stroke-width="0.6" stroke-dasharray="1 5"/>'
        )


def _strip(
    across: Axis, ticks: Sequence[tuple[float, str]], strip: Strip, top: float, bottom: float
) -> Iterator[str]:
    def high(value: float) -> float:
        share = float(strip.axis.place(np.array([value]))[0])
        return float(np.clip(bottom - share * (bottom - top), top, bottom))

    yield f'<path d="M{_LEFT} {top:.1f}H{_RIGHT}V{bottom:.1f}H{_LEFT}Z" fill="none" stroke="#000" stroke-width="0.9"/>'
    yield f'<text x="{_LEFT}" y="{top - 8:.1f}" {_SIZE} font-style="italic">{escape(strip.words)}</text>'
    middle = (top + bottom) / 2
    yield f'<text x="14" y="{middle:.1f}" {_SIZE} text-anchor="middle" transform="rotate(-90 14 {middle:.1f})">{escape(strip.axis.name)}</text>'
    for place, _ in ticks:
        yield f'<path d="M{_x(across, place):.1f} {bottom:.1f}v5" stroke="#000" stroke-width="0.9"/>'
    values = round_values(strip.axis.low, strip.axis.high, log=strip.axis.log, most=4)
    for value, text in zip(values, _texts(strip.axis, values), strict=True):
        y = high(value)
        yield f'<path d="M{_LEFT} {y:.1f}H{_RIGHT}" stroke="#666" stroke-width="0.6" stroke-dasharray="1 5"/>'
        yield f'<text x="{_LEFT - 6}" y="{y + 4.5:.1f}" {_SIZE} text-anchor="end">{text}</text>'
    for line in strip.lines:
        yield from _line(across, line, high)
    for spot in strip.spots:
        yield _spot(_x(across, spot.x), spot, high)


def _texts(axis: Axis, values: list[float]) -> list[str]:
    """What is written beside an ordinate; powers only where zeros would be counted."""
    if axis.log:
        return [f"{each:g}" for each in values]
    return tick_texts(axis, values)


def _line(across: Axis, line: Line, high: Callable[[float], float]) -> Iterator[str]:
    known = np.isfinite(line.x) & np.isfinite(line.y)
    X = [_x(across, float(each)) for each in line.x[known]]
    if not X:
        return
    look = f'class="look-{line.look % 7}"'
    if line.u is not None:
        ends = [
            [high(float(y)) for y in line.y[known] + sign * np.nan_to_num(line.u[known])] for sign in (1, -1)
        ]
        there = "L".join(f"{x:.1f} {y:.1f}" for x, y in zip(X, ends[0], strict=True))
        back = "L".join(f"{x:.1f} {y:.1f}" for x, y in zip(reversed(X), reversed(ends[1]), strict=True))
        yield f'<path d="M{there}L{back}Z" {look} fill="currentColor" fill-opacity="0.16"/>'
    path = "L".join(f"{x:.1f} {high(float(y)):.1f}" for x, y in zip(X, line.y[known], strict=True))
    yield f'<path d="M{path}" {look} fill="none" stroke="currentColor" stroke-width="1.6" stroke-dasharray="{dash_of(line.look)}"/>'


def _spot(x: float, spot: Spot, high: Callable[[float], float]) -> str:
    y = high(spot.y)
    spread = ""
    if spot.u:
        a, b = high(spot.y + spot.u), high(spot.y - spot.u)
        if b - a > 1:
            spread = f'<path d="M{x:.1f} {a:.1f}V{b:.1f}" stroke="currentColor" stroke-width="1.3"/>'
    return (
        f'<a href={quoteattr(spot.href)} class="look-{spot.look % 7}"><title>{escape(spot.words)}</title>'
        f'<circle cx="{x:.1f}" cy="{y:.1f}" r="12" fill="#000" fill-opacity="0"/>{spread}'
        f'<path transform="translate({x:.1f} {y:.1f})" d="{mark_path(spot.look)}" class="ink" fill="#fff" stroke="currentColor" stroke-width="1.7"/></a>'
    )

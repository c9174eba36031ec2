"""Small plots as SVG: black lines on white, axes named as quantity over unit, the same bytes for the same numbers."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from itertools import pairwise
from xml.sax.saxutils import escape

import numpy as np
from numpy.typing import NDArray

__all__ = ["Axis", "Frame", "Series", "axis_of", "plot"]

_FONT = "Libertinus Serif, Source Sans 3, Helvetica, Arial, sans-serif"
_MOST_POINTS = 300


@dataclass(frozen=True)
class Axis:
    """One axis: its name with unit, its ends, and whether it is logarithmic."""

    name: str
    low: float
    high: float
    log: bool = False

    def place(self, values: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return where values stand, 0 at the low end and 1 at the high end."""
        if self.log:
            with np.errstate(invalid="ignore", divide="ignore"):
                return np.asarray(
                    (np.log10(values) - math.log10(self.low)) / (math.log10(self.high) - math.log10(self.low))
                )
        return np.asarray((values - self.low) / (self.high - self.low))

    def ticks(self, most: int = 4) -> list[float]:
        """Return round values along the axis."""
        if self.log:
            decades = range(
                math.ceil(math.log10(self.low) - 1e-9), math.floor(math.log10(self.high) + 1e-9) + 1
            )
            ticks = [10.0**each for each in decades]
            return ticks if len(ticks) >= 2 else [self.low, self.high]
        span = self.high - self.low
        step = 10.0 ** math.floor(math.log10(span / most))
        step = next((step * k for k in (1, 2, 2.5, 5, 10) if span / (step * k) <= most), step * 10)
        first = math.ceil(self.low / step - 1e-9)
        return [k * step for k in range(first, math.floor(self.high / step + 1e-9) + 1)]


@dataclass(frozen=True)
class Series:
    """One series of points; `marks` draws points, else a line."""

    x: NDArray[np.float64]
    y: NDArray[np.float64]
    marks: bool = False
    dash: str = ""
    grey: bool = False


@dataclass
class Frame:
    """A plot being drawn, in millimetres."""

    width: float
    height: float
    label: str
    parts: list[str] = field(default_factory=list)

    def line(
        self,
        x1: float,
        y1: float,
        x2: float,
        y2: float,
        *,
        width: float = 0.14,
        dash: str = "",
        colour: str = "#000",
    ) -> None:
        """Add a straight line."""
        dashes = f' stroke-dasharray="{dash}"' if dash else ""
        self.parts.append(
            f'<line x1="{x1:.2f}" y1="{y1:.2f}" x2="{x2:.2f}" y2="{y2:.2f}" stroke="{colour}" stroke-width="{width}"{dashes}/>'
        )

    def text(
        self, x: float, y: float, words: str, *, size: float = 2.5, anchor: str = "middle", turn: bool = False
    ) -> None:
        """Add a text; `size` is in millimetres."""
        turned = f' transform="rotate(-90 {x:.2f} {y:.2f})"' if turn else ""
        self.parts.append(
            f'<text x="{x:.2f}" y="{y:.2f}" font-size="{size}" text-anchor="{anchor}"{turned}>{escape(words)}</text>'
        )

    def done(self) -> str:
        """Return the SVG."""
        return (
            f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {self.width:g} {self.height:g}" width="{self.width:g}mm" height="{self.height:g}mm" '
            f'role="img" font-family="{_FONT}"><title>{escape(self.label)}</title>{"".join(self.parts)}</svg>'
        )


def axis_of(name: str, values: Sequence[NDArray[np.float64]], *, log: bool = False) -> Axis | None:
    """Return an axis over all finite values, or None if there is nothing to show."""
    parts = [each[np.isfinite(each)] for each in values]
    every = np.concatenate(parts) if parts else np.array([])
    if log:
        every = every[every > 0]
    if every.size == 0:
        return None
    low, high = float(every.min()), float(every.max())
    if log:
        return Axis(name, low * 0.93, max(high * 1.07, low * 1.01), log=True)
    span = high - low
    margin = 0.05 * span if span > 0 else max(abs(low) * 0.05, 1e-12)
    return Axis(name, low - margin, high + margin)


def plot(
    x: Axis, y: Axis, series: Sequence[Series], *, label: str, width: float = 57.0, height: float = 36.0
) -> str:
    """Return a plot of series as SVG.

    Parameters
    ----------
    x, y : Axis
    series : sequence of Series
        Points that are not finite break a line.
    label : str
        Text alternative: what is shown, axes with units.
    width, height : float
        mm.
    """
    frame = Frame(width, height, label)
    left, right, top, bottom = 11.5, width - 1.0, 1.6, height - 7.4
    _frame(frame, x, y, (left, right, top, bottom))
    for each in series:
        X = left + x.place(each.x) * (right - left)
        Y = bottom - y.place(each.y) * (bottom - top)
        shown = np.isfinite(X) & np.isfinite(Y)
        colour = "#666" if each.grey else "#000"
        if each.marks:
            for k in _thinned(np.flatnonzero(shown)):
                frame.parts.append(f'<circle cx="{X[k]:.2f}" cy="{Y[k]:.2f}" r="0.42" fill="{colour}"/>')
            continue
        dash = f' stroke-dasharray="{each.dash}"' if each.dash else ""
        for run in np.split(np.flatnonzero(shown), np.flatnonzero(np.diff(np.flatnonzero(shown)) > 1) + 1):
            points = " ".join(f"{X[k]:.2f},{Y[k]:.2f}" for k in _thinned(run))
            if points:
                frame.parts.append(
                    f'<polyline points="{points}" fill="none" stroke="{colour}" stroke-width="0.22"{dash}/>'
                )
    return frame.done()


def _thinned(indices: NDArray[np.int64]) -> NDArray[np.int64]:
    if indices.size <= _MOST_POINTS:
        return indices
    return np.asarray(indices[np.unique(np.linspace(0, indices.size - 1, _MOST_POINTS).astype(np.int64))])


def _frame(frame: Frame, x: Axis, y: Axis, box: tuple[float, float, float, float]) -> None:
    left, right, top, bottom = box
    frame.parts.append(
        f'<rect x="{left:.2f}" y="{top:.2f}" width="{right - left:.2f}" height="{bottom - top:.2f}" fill="none" stroke="#000" stroke-width="0.14"/>'
    )
    for axis, across in ((x, True), (y, False)):
        ticks = axis.ticks()
        texts = tick_texts(axis, ticks)
        for value, words in zip(ticks, texts, strict=True):
            share = float(axis.place(np.array([value]))[0])
            if not -0.001 <= share <= 1.001:
                continue
            if across:
                at = left + share * (right - left)
                frame.line(at, bottom, at, bottom - 0.9)
                frame.text(at, bottom + 2.7, words)
            else:
                at = bottom - share * (bottom - top)
                frame.line(left, at, left + 0.9, at)
                frame.text(left - 0.7, at + 0.8, words, anchor="end")
    frame.text((left + right) / 2, bottom + 6.3, x.name, size=2.7)
    frame.text(2.4, (top + bottom) / 2, y.name, size=2.7, turn=True)


def tick_texts(axis: Axis, ticks: Sequence[float]) -> list[str]:
    """Return the texts of ticks, all to the same place, with a true minus."""
    if axis.log:
        return [f"{value:.3g}" for value in ticks]
    values = list(ticks)
    step = (
        min(
            (abs(b - a) for a, b in pairwise(values)),
            default=abs(values[0]) if values else 1.0,
        )
        or 1.0
    )
    places = max(0, -math.floor(math.log10(step) + 1e-9))
    if round(step, places) != 0 and abs(step - round(step, places)) > 0.01 * step:
        places += 1
    largest = max((abs(value) for value in values), default=0.0)
    if places > 4 or largest >= 1e5:
        texts = [f"{value:.1e}" if value else "0" for value in values]
        return [_powers(text) for text in texts]
    return [
        f"{value:.{places}f}".replace("-", "\u2212") if abs(value) > step * 1e-6 else "0" for value in values
    ]


def _powers(text: str) -> str:
    if "e" not in text:
        return text
    digits, _, power = text.partition("e")
    raised = str(int(power)).translate(str.maketrans("0123456789-", "⁰¹²³⁴⁵⁶⁷⁸⁹⁻"))
    return f"{digits.removesuffix('.0')}×10{raised}".replace("-", "\u2212")

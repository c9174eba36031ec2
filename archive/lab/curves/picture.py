"""A chart as SVG: panels one below the other over one abscissa, like the strips of a recorder; and the same as PDF.

Rules: presentation attributes alone, no style sheet and no script, so that it may stand in any page; the same chart gives the
same bytes; curves differ by mark or dashes, not by colour alone.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from xml.sax.saxutils import escape

import numpy as np
from numpy.typing import NDArray

from archive.lab.curves.chart import Chart, Curve, Panel
from archive.lab.curves.ink import INKS, LOOKS, Ink, InkName
from archive.reports.svg import Axis, tick_texts

__all__ = ["across_name", "picture", "picture_pdf", "picture_size"]

FloatArray = NDArray[np.float64]

_FONT = "Libertinus Serif, Charter, Georgia, serif"
_SIZE = 13
_RIGHT, _ABOVE, _FOOT, _KEY = 14, 24, 44, 20
# Beyond these there are more marks than can be told apart, and bars become a band.
_MOST_MARKS, _MOST_BARS = 400, 120
_MARK = 3.0


def picture_size(panels: int, owners: int, *, width: int = 960) -> tuple[int, int]:
    """Width and height of a picture in px, before anything is read.

    Parameters
    ----------
    panels, owners : int
    width : int
    """
    high = 260 if panels == 1 else 200 if panels <= 3 else 156
    keys = _KEY * owners + 6 if owners > 1 else 0
    return width, keys + panels * (high + _ABOVE) + _FOOT


def across_name(chart: Chart) -> str:
    """Name of the abscissa with its unit and, of a temperature, its scale."""
    if chart.since:
        return f"{chart.across.name}, since the first row{' of each' if len(chart.since) > 1 else ''}"
    return chart.across.name + (f" ({chart.scale})" if chart.scale else "")


def picture(chart: Chart, *, ink: InkName = "light", width: int = 960) -> str:
    """Draw a chart.

    Parameters
    ----------
    chart : Chart
    ink : {"light", "dark"}
    width : int
        px; texts stay as large as they are.
    """
    colours = INKS[ink]
    _, height = picture_size(len(chart.panels), len(chart.owners), width=width)
    left = 66 if width < 600 else 84
    across = _across(chart)
    top = _KEY * len(chart.owners) + 6 if len(chart.owners) > 1 else 0
    each = (height - top - _FOOT) / max(len(chart.panels), 1) - _ABOVE
    said = f"{', '.join(panel.words for panel in chart.panels)} against {across_name(chart)}: {', '.join(chart.owners)}"
    parts = [
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {width} {height}" width="{width}" height="{height}" role="img" '
        f'font-family="{_FONT}" font-size="{_SIZE}" fill="{colours.text}"><title>{escape(said)}</title>',
        f'<rect width="{width}" height="{height}" fill="{colours.paper}"/>',
    ]
    parts += _keys(chart, colours, left)
    for number, panel in enumerate(chart.panels):
        begin = top + number * (each + _ABOVE) + _ABOVE
        box = (float(left), float(width - _RIGHT), begin, begin + each)
        last = number == len(chart.panels) - 1
        parts += [
            f'<clipPath id="panel{number}"><rect x="{left}" y="{begin:.1f}" width="{width - _RIGHT - left}" height="{each:.1f}"/></clipPath>'
        ]
        parts += _panel(panel, across, box, colours, clip=f"panel{number}", last=last)
    parts.append(
        f'<text x="{(left + width - _RIGHT) / 2:.1f}" y="{height - 10}" text-anchor="middle">{escape(across_name(chart))}</text></svg>'
    )
    return "".join(parts)


def _across(chart: Chart) -> Axis:
    low, high = chart.low, chart.high
    margin = 0.02 * (high - low) if high > low else max(abs(high) * 0.05, 1.0)
    if math.isnan(low):
        low, high, margin = 0.0, 1.0, 0.0
    begin, end = low - margin, high + margin
    if chart.view is not None:
        # An end that is not given is that of the rows, or beyond the one that is.
        first, last = chart.view
        width = max(end - begin, *(1e-6 * abs(each) for each in chart.view if math.isfinite(each)))
        begin, end = (
            first if math.isfinite(first) else min(begin, last - width),
            last if math.isfinite(last) else max(end, first + width),
        )
    return Axis(across_name(chart), begin, end)


def _up(panel: Panel) -> Axis:
    """Ordinate over what is shown, with its uncertainty where that is not much more."""
    shown = [curve.y[np.isfinite(curve.y)] for curve in panel.curves]
    every = np.concatenate(shown) if shown else np.empty(0)
    if panel.log:
        every = every[every > 0]
    if not every.size:
        return Axis(panel.axis.name, 0.0, 1.0)
    low, high = float(every.min()), float(every.max())
    if panel.log:
        return Axis(panel.axis.name, low * 0.8, high * 1.25, log=True)
    span = high - low
    margin = 0.07 * span if span > 0 else max(abs(high) * 0.05, 1e-12)
    return Axis(panel.axis.name, low - margin, high + margin)


def _keys(chart: Chart, ink: Ink, left: int) -> Iterator[str]:
    if len(chart.owners) < 2:
        return
    for number, owner in enumerate(chart.owners):
        y = 18.0 + _KEY * number
        colour = ink.curves[number % len(ink.curves)]
        mark, dash = LOOKS[number % len(LOOKS)]
        yield (
            f'<path d="M{left} {y - 4:.1f}H{left + 34}" stroke="{colour}" stroke-width="1.4"{_dashed(dash)}/>'
            f'<path d="{_marks(mark, np.array([left + 17.0]), np.array([y - 4]), 3.6)}" fill="{_filled(mark, colour)}" stroke="{colour}"/>'
            f'<text x="{left + 44}" y="{y:.1f}">{escape(owner)}</text>'
        )


def _panel(
    panel: Panel, across: Axis, box: tuple[float, float, float, float], ink: Ink, *, clip: str, last: bool
) -> Iterator[str]:
    left, right, top, bottom = box
    up = _up(panel)
    yield from _grid(across, up, box, ink, last=last)
    yield f'<g clip-path="url(#{clip})">'
    for curve in panel.curves:
        yield from _curve(curve, across, up, box, ink)
    yield "</g>"
    yield f'<rect x="{left:.1f}" y="{top:.1f}" width="{right - left:.1f}" height="{bottom - top:.1f}" fill="none" stroke="{ink.text}" stroke-width="0.8"/>'
    name = panel.axis.name + (f" ({panel.scale})" if panel.scale else "")
    y = (top + bottom) / 2
    yield f'<text x="15" y="{y:.1f}" text-anchor="middle" transform="rotate(-90 15 {y:.1f})">{escape(name)}</text>'
    yield f'<text x="{left:.1f}" y="{top - 6:.1f}" font-style="italic">{escape(panel.words)}</text>'
    if not any(np.isfinite(curve.y).any() for curve in panel.curves):
        yield f'<text x="{(left + right) / 2:.1f}" y="{y:.1f}" text-anchor="middle">no value here</text>'


def _grid(
    across: Axis, up: Axis, box: tuple[float, float, float, float], ink: Ink, *, last: bool
) -> Iterator[str]:
    left, right, top, bottom = box
    for axis, along, most in (
        (across, True, max(3, int((right - left) // 110))),
        (up, False, max(4, int((bottom - top) // 40))),
    ):
        ticks = axis.ticks(most)
        for value, words in zip(ticks, tick_texts(axis, ticks), strict=True):
            share = float(axis.place(np.array([value]))[0])
            if not -1e-6 <= share <= 1 + 1e-6:
                continue
            if along:
                x = left + share * (right - left)
                yield f'<path d="M{x:.1f} {top:.1f}V{bottom:.1f}" stroke="{ink.rule}" stroke-width="0.7"/>'
                if last:
                    yield f'<text x="{x:.1f}" y="{bottom + 17:.1f}" text-anchor="middle">{words}</text>'
            else:
                y = bottom - share * (bottom - top)
                yield (
                    f'<path d="M{left:.1f} {y:.1f}H{right:.1f}" stroke="{ink.rule}" stroke-width="0.7"/>'
                    f'<text x="{left - 6:.1f}" y="{y + 4:.1f}" text-anchor="end">{words}</text>'
                )


def _curve(
    curve: Curve, across: Axis, up: Axis, box: tuple[float, float, float, float], ink: Ink
) -> Iterator[str]:
    left, right, top, bottom = box
    colour = ink.curves[curve.look % len(ink.curves)]
    mark, dash = LOOKS[curve.look % len(LOOKS)]

    def high(values: FloatArray) -> FloatArray:
        # What lies far outside is drawn just outside: coordinates stay short.
        return np.clip(bottom - up.place(values) * (bottom - top), top - 40, bottom + 40)

    X = np.clip(left + across.place(curve.x) * (right - left), left - 40, right + 40)
    Y = high(curve.y)
    known = np.isfinite(X) & np.isfinite(Y)
    if curve.u is not None:
        yield from _spread(curve, X, (high(curve.y - curve.u), high(curve.y + curve.u)), known, colour)
    if np.count_nonzero(known) > _MOST_MARKS and curve.line:
        path = "".join(f"M{_joined(X[run], Y[run])}" for run in _runs(known))
        yield f'<path d="{path}" fill="none" stroke="{colour}" stroke-width="1.1" stroke-linejoin="round"{_dashed(dash)}/>'
        return
    size = _MARK if np.count_nonzero(known) <= _MOST_MARKS else 1.6
    yield f'<path d="{_marks(mark, X[known], Y[known], size)}" fill="{_filled(mark, colour)}" stroke="{colour}" stroke-width="0.8"/>'


def _spread(
    curve: Curve, X: FloatArray, ends: tuple[FloatArray, FloatArray], known: NDArray[np.bool_], colour: str
) -> Iterator[str]:
    low, high = ends
    has = known & np.isfinite(low) & np.isfinite(high) & (np.abs(low - high) > 0.6)
    if np.count_nonzero(has) > _MOST_BARS and curve.line:
        for run in _runs(has):
            there, back = _joined(X[run], high[run]), _joined(X[run][::-1], low[run][::-1])
            yield f'<path d="M{there}L{back}Z" fill="{colour}" fill-opacity="0.2"/>'
        return
    if has.any():
        bars = "".join(
            f"M{x:.1f} {a:.1f}V{b:.1f}" for x, a, b in zip(X[has], low[has], high[has], strict=True)
        )
        yield f'<path d="{bars}" stroke="{colour}" stroke-width="0.7"/>'


def _runs(known: NDArray[np.bool_]) -> list[NDArray[np.int64]]:
    where = np.flatnonzero(known)
    return [run for run in np.split(where, np.flatnonzero(np.diff(where) > 1) + 1) if run.size]


def _joined(X: FloatArray, Y: FloatArray) -> str:
    return "L".join(f"{x:.1f} {y:.1f}" for x, y in zip(X, Y, strict=True))


def _marks(mark: str, X: FloatArray, Y: FloatArray, r: float) -> str:
    """Path of one mark at each point."""
    outline = {
        "circle": f"m{-r:g} 0a{r:g} {r:g} 0 1 0 {2 * r:g} 0a{r:g} {r:g} 0 1 0 {-2 * r:g} 0",
        "square": f"m{-r:g} {-r:g}h{2 * r:g}v{2 * r:g}h{-2 * r:g}z",
        "triangle": f"m0 {-1.2 * r:g}l{1.1 * r:g} {2 * r:g}h{-2.2 * r:g}z",
        "down": f"m0 {1.2 * r:g}l{1.1 * r:g} {-2 * r:g}h{-2.2 * r:g}z",
        "diamond": f"m0 {-1.3 * r:g}l{r:g} {1.3 * r:g}l{-r:g} {1.3 * r:g}l{-r:g} {-1.3 * r:g}z",
        "cross": f"m{-r:g} {-r:g}l{2 * r:g} {2 * r:g}m0 {-2 * r:g}l{-2 * r:g} {2 * r:g}",
        "plus": f"m{-r:g} 0h{2 * r:g}m{-r:g} {-r:g}v{2 * r:g}",
    }[mark]
    return "".join(f"M{x:.1f} {y:.1f}{outline}" for x, y in zip(X, Y, strict=True))


def _filled(mark: str, colour: str) -> str:
    # What is laid over leaves what lies below in sight.
    return colour if mark == "circle" else "none"


def _dashed(dash: str) -> str:
    return f' stroke-dasharray="{dash}"' if dash else ""


def picture_pdf(chart: Chart) -> bytes:
    """Draw a chart as PDF, with letters as letters and lines as lines.

    Parameters
    ----------
    chart : Chart
    """
    import typst

    drawn = picture(chart).encode()
    page = b'#set page(width: auto, height: auto, margin: 4mm)\n#image(bytes(sys.inputs.picture), format: "svg", width: 170mm)'
    return bytes(typst.compile(page, format="pdf", sys_inputs={"picture": drawn.decode()}))

"""Which part of the plane is shown at first, and how very many bars become few strips without losing an extreme."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Iterator, Sequence
from itertools import pairwise

from archive.reports.plane_view import Bar, Point, Strip, Window

__all__ = ["MOST_BARS", "first_window", "inside", "strips_of", "thinned_points", "whole_of"]

MOST_BARS = 2000
"""Bars that a picture shows one by one; more could not be told apart on a screen."""

# A few sweeps far from all others do not squeeze the rest (a pore filled to the brim beside films of two layers): how many
# times farther, and which share of all sweeps at most.
_FAR = 4.0
_FEW = 0.2
_MARGIN = 0.06
_BELOW = 0.04
_CELLS_ACROSS = 400
"""Places of one point each along either side, about as many as a screen can tell apart."""


def whole_of(bars: Sequence[Bar], *, log: tuple[bool, bool]) -> Window:
    """Return a window that holds all bars, of which there are some, with a margin; linear sides begin at zero."""
    cold, warm = min(bar.cold for bar in bars), max(bar.warm for bar in bars)
    bottom, top = min(bar.bottom for bar in bars), max(bar.top for bar in bars)
    low, high = _side(bottom, top, log=log[1])
    # Bars at zero (empty cells) are not to lie on the edge.
    return Window(*_side(cold, warm, log=log[0]), low - _BELOW * high if bottom == 0 else low, high)


def _side(low: float, high: float, *, log: bool) -> tuple[float, float]:
    if log:
        factor = (high / low) ** _MARGIN if high > low else 1.5
        factor = max(factor, 1.1)
        return low / factor, high * factor
    return min(0.0, low * (1 + _MARGIN)), high * (1 + _MARGIN) or 1.0


def first_window(bars: Sequence[Bar], *, log: tuple[bool, bool]) -> Window:
    """Return the window to begin with: all bars, but for a few that lie far above all others on a linear side."""
    kept = bars if log[1] else _without_far(bars, [bar.top for bar in bars])
    return whole_of(kept if log[0] else _without_far(kept, [bar.warm for bar in kept]), log=log)


def _without_far(bars: Sequence[Bar], ends: Sequence[float]) -> Sequence[Bar]:
    rising = sorted(ends)
    first = math.ceil(len(rising) * (1 - _FEW))
    limit = next(
        (
            low
            for place, (low, high) in enumerate(pairwise(rising), start=1)
            if place >= first and low > 0 and high > _FAR * low
        ),
        math.inf,
    )
    return [bar for bar, end in zip(bars, ends, strict=True) if end <= limit]


def inside(bar: Bar, window: Window) -> bool:
    """Whether any of a bar lies in a window."""
    return (
        bar.warm >= window.cold
        and bar.cold <= window.warm
        and bar.top >= window.bottom
        and bar.bottom <= window.top
    )


def strips_of(bars: Sequence[Bar], window: Window, *, most: int, log: tuple[bool, bool]) -> tuple[Strip, ...]:
    """Return bars merged into at most so many strips: bars of one cell, near each other on the axis, that touch in temperature.

    Parameters
    ----------
    bars : sequence of Bar
        In the window.
    window : Window
    most : int
        At least as many as there are cells.
    log : (bool, bool)
        Whether temperature and axis are logarithmic.

    Notes
    -----
    A strip reaches exactly from the least to the largest end of its bars on both axes, and counts them: no extreme is lost.
    """
    rows, gap = max(1, most // (2 * len({bar.look for bar in bars}) or 1)), 1 / 200
    while True:
        found = tuple(_merged(bars, window, rows=rows, gap=gap, log=log))
        if len(found) <= most or (rows == 1 and math.isinf(gap)):
            return found
        rows, gap = max(1, rows // 2), gap * 2 if rows > 1 else math.inf


def _merged(
    bars: Sequence[Bar], window: Window, *, rows: int, gap: float, log: tuple[bool, bool]
) -> Iterator[Strip]:
    groups: dict[tuple[int, int], list[Bar]] = defaultdict(list)
    for bar in bars:
        share = _share((bar.bottom + bar.top) / 2, window.bottom, window.top, log=log[1])
        groups[bar.look, min(max(math.floor(share * rows), -1), rows)].append(bar)
    for key in sorted(groups):
        run: list[Bar] = []
        reached = -math.inf
        for bar in sorted(groups[key], key=lambda each: (each.cold, each.address)):
            begin = _share(bar.cold, window.cold, window.warm, log=log[0])
            if run and begin > reached + gap:
                yield _strip(run)
                run = []
            run.append(bar)
            reached = max(reached, _share(bar.warm, window.cold, window.warm, log=log[0]))
        yield _strip(run)


def _strip(run: Sequence[Bar]) -> Strip:
    return Strip(
        cell=run[0].cell,
        look=run[0].look,
        count=len(run),
        cold=min(bar.cold for bar in run),
        warm=max(bar.warm for bar in run),
        bottom=min(bar.bottom for bar in run),
        top=max(bar.top for bar in run),
    )


def _share(value: float, low: float, high: float, *, log: bool) -> float:
    if log:
        return math.log(value / low) / math.log(high / low)
    return (value - low) / (high - low)


def thinned_points(
    points: Sequence[Point], window: Window, *, most: int, log: tuple[bool, bool]
) -> tuple[Point, ...]:
    """Return all points, or where there are too many one for each place of a fine grid, the outermost of each cell always."""
    if len(points) <= most:
        return tuple(points)
    kept: dict[str, None] = {}
    for look in sorted({point.look for point in points}):
        own = [point for point in points if point.look == look]
        for side in (lambda each: each.temperature, lambda each: each.height):
            kept |= dict.fromkeys((min(own, key=side).address, max(own, key=side).address))
    across = _CELLS_ACROSS
    while True:
        places: dict[tuple[int, int, int], str] = {}
        for point in points:
            x = _share(point.temperature, window.cold, window.warm, log=log[0])
            y = _share(point.height, window.bottom, window.top, log=log[1])
            places.setdefault((point.look, math.floor(x * across), math.floor(y * across)), point.address)
        chosen = kept | dict.fromkeys(places.values())
        if len(chosen) <= most or across == 1:
            return tuple(point for point in points if point.address in chosen)
        across = max(1, across // 2)

"""The plane of an archive: its sweeps as bars over temperature, with the transitions that were found in them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Literal

from archive.index import Index, PlaneResult, PlaneSweep, SearchQuery
from archive.lab.curves.kept import Kept
from archive.lab.plane_bars import bars_of, places_of
from archive.lab.plane_lines import NO_CELL, cell_name, cell_uses, inert_layers, universal_lines
from archive.lab.plane_window import (
    MOST_BARS,
    first_window,
    inside,
    strips_of,
    thinned_points,
    whole_of,
)
from archive.lab.source import LabSource
from archive.lab.stale import stale
from archive.reports.plane_layout import logarithmic
from archive.reports.plane_view import Bar, Line, PlaneAxis, PlaneView, Point, Window
from archive.reports.plane_words import result_words

__all__ = ["TRANSITIONS", "PlaneState", "plane"]

PlaneState = Literal["any", "reduced", "not reduced", "stale", "withdrawn"]
"""Which sweeps by their state; withdrawn ones are there only if they are asked for."""

TRANSITIONS = ("T_KT", "T_KT_by_fit", "T_KT_by_peak", "T_c", "T_lambda")
"""Results that are temperatures of a transition; the foremost of a reduction's headline is its point."""

_AT_COVERAGE = "transition_coverage"
"""Result that is the coverage of a transition, at the temperature of its sweep."""

# What is shown where there is nothing: the usual part of such a plane.
_EMPTY: dict[PlaneAxis, Window] = {
    "coverage": Window(0.0, 1.0, 0.0, 60e-6),
    "pressure": Window(0.01, 10.0, 1.0, 1e6),
    "cell": Window(0.01, 10.0, 0.0, 1.0),
}

# A view takes about a kilobyte for each bar, and is the same until something comes in.
_KEPT: Kept[PlaneView] = Kept(
    most=2**25, size=lambda view: 2**10 * (1 + len(view.bars) + len(view.strips) + len(view.points))
)

# Headline results stand first.
_FEW = 3


def plane(
    source: LabSource,
    query: SearchQuery,
    *,
    axis: PlaneAxis = "coverage",
    state: PlaneState = "any",
    window: Window | None = None,
    everything: bool = False,
    most: int | None = None,
) -> PlaneView:
    """Return a window of the plane.

    Parameters
    ----------
    source : LabSource
    query : SearchQuery
        Which sweeps; its order and limits do not count.
    axis : {"coverage", "pressure", "cell"}
        What stands against temperature.
    state : {"any", "reduced", "not reduced", "stale", "withdrawn"}
    window : Window, optional
        Else all sweeps but for a few that lie far from all others.
    everything : bool
        Those few, too, where no window is given.
    most : int, optional
        Bars, and points, that are shown one by one; 2,000 if left out. Of more bars than that no results are told.

    Notes
    -----
    What was looked at is kept in memory, but for views of another `most`, until a file comes into the archive.
    """
    if most is not None:
        return _made(source, query, axis=axis, state=state, window=window, everything=everything, most=most)
    key = (source.index.stamp(), query, axis, state, window, everything)
    return _KEPT.get(
        key,
        lambda: _made(
            source, query, axis=axis, state=state, window=window, everything=everything, most=MOST_BARS
        ),
    )


def _made(
    source: LabSource,
    query: SearchQuery,
    *,
    axis: PlaneAxis,
    state: PlaneState,
    window: Window | None,
    everything: bool,
    most: int,
) -> PlaneView:
    index, log = source.index, logarithmic(axis)
    wanted = replace(query, withdrawn=True) if state == "withdrawn" else query
    part = window if axis == "coverage" else None
    rows, stale_ones = _of_state(source, _rows(index, wanted, part), state)
    looks = _looks(index)
    bars, unplaced = bars_of(
        rows, places_of(index, rows, axis), looks, stale_ones, log=log, stated=axis == "coverage"
    )
    # An empty cell is worth showing beside its films; that of a calorimeter full of liquid is not.
    films = {bar.cell for bar in bars if bar.top > 0}
    seen = window or _window(
        [bar for bar in bars if everything or bar.cell in films] or bars, axis, everything=everything
    )
    shown = [bar for bar in bars if inside(bar, seen)]
    points = _points(index, bars, axis, seen)
    kept = thinned_points(points, seen, most=most, log=log)
    merged = len(shown) > most
    lines, in_pores = _lines(index, rows, bars, query, looks, part) if axis == "coverage" else ((), ())
    names = {bar.cell for bar in bars} if axis == "cell" else {bar.cell for bar in shown}
    return PlaneView(
        axis=axis,
        cells=tuple((name, looks[name]) for name in looks if name in names),
        window=seen,
        bars=() if merged else _with_results(index, shown),
        points=kept,
        strips=strips_of(shown, seen, most=most, log=log) if merged else (),
        lines=lines,
        sweeps=len(rows) if part is None else len(shown),
        outside=len(bars) - len(shown) if part is None else None,
        unplaced=tuple(sorted(unplaced.items())) if part is None else (),
        merged=len(shown) if merged else 0,
        thinned=len(points) - len(kept),
        in_pores=in_pores,
        lanes=tuple((name, looks[name]) for name in sorted(names, reverse=True)) if axis == "cell" else (),
    )


def _rows(index: Index, query: SearchQuery, part: Window | None) -> list[PlaneSweep]:
    """Sweeps of a search; where only a part of the plane is looked at, no others are asked for."""
    if part is None:
        return index.plane_sweeps(query)
    warm = replace(query, temperature=(part.cold, part.warm))
    cells = sorted({use.cell for use in cell_uses(index) if use.cell is not None})
    stated = index.plane_sweeps(warm, cells=cells, between=(part.bottom, part.top))
    return stated + index.plane_sweeps(warm, cells=cells)


def _window(bars: Sequence[Bar], axis: PlaneAxis, *, everything: bool) -> Window:
    if not bars:
        return _EMPTY[axis]
    return (whole_of if everything else first_window)(bars, log=logarithmic(axis))


def _of_state(
    source: LabSource, rows: Sequence[PlaneSweep], state: PlaneState
) -> tuple[list[PlaneSweep], frozenset[str]]:
    if state == "stale":
        found = frozenset(each.sweep for each in stale(source))
        return [row for row in rows if row.address in found], found
    if state == "withdrawn":
        return [row for row in rows if row.withdrawn], frozenset()
    if state == "any":
        return list(rows), frozenset()
    return [row for row in rows if row.reduced == (state == "reduced")], frozenset()


def _looks(index: Index) -> dict[str, int]:
    """Look of every cell of the archive in the order of first use: no filter changes it, nor do later cooldowns."""
    first: dict[str, str] = {}
    for use in cell_uses(index):
        since = "~" if use.since is None else use.since.isoformat()
        name = cell_name(use.cell)
        first[name] = min(since, first.get(name, since))
    names = sorted(set(first) - {NO_CELL}, key=lambda name: (first[name], name))
    return {name: look for look, name in enumerate([*names, NO_CELL])}


def _lines(
    index: Index,
    rows: Sequence[PlaneSweep],
    bars: Sequence[Bar],
    query: SearchQuery,
    looks: Mapping[str, int],
    part: Window | None,
) -> tuple[tuple[Line, ...], tuple[str, ...]]:
    """Lines for the cells whose films are in the picture, and in a part of it for those whose sweeps are beside it, too."""
    filled = {bar.address for bar in bars if bar.top > 0}
    films = {cell_name(row.cell): row.substrate for row in rows if row.address in filled}
    known = inert_layers(index)
    if part is not None and query.cell is None and query.substrate is None:
        for use in cell_uses(index):
            if cell_name(use.cell) in known:
                films.setdefault(cell_name(use.cell), use.substrate)
    return universal_lines(index, films, known, looks)


def _with_results(index: Index, bars: Sequence[Bar]) -> tuple[Bar, ...]:
    if len(bars) > MOST_BARS:
        return tuple(bars)
    found = index.sweep_results([bar.address for bar in bars])
    return tuple(
        bar._replace(results=tuple(map(result_words, found.get(bar.address, ())[:_FEW]))) for bar in bars
    )


def _points(index: Index, bars: Sequence[Bar], axis: PlaneAxis, seen: Window) -> list[Point]:
    by_sweep = {bar.address: bar for bar in bars}
    found: list[Point] = []
    reductions: set[str] = set()
    for result in index.plane_results(TRANSITIONS, low=seen.cold, high=seen.warm):
        bar = by_sweep.get(result.sweep)
        if bar is None or result.reduction in reductions or result.quantity != "temperature":
            continue
        reductions.add(result.reduction)
        height = (bar.bottom + bar.top) / 2
        point = _point(result, bar, (result.value, result.uncertainty), (height, bar.uncertainty))
        found.append(point)
    if axis == "coverage":
        for result in index.plane_results((_AT_COVERAGE,)):
            bar = by_sweep.get(result.sweep)
            if bar is not None:
                at = ((bar.cold + bar.warm) / 2, (bar.warm - bar.cold) / 2 or None)
                found.append(_point(result, bar, at, (result.value, result.uncertainty)))
    return [
        point
        for point in found
        if seen.cold <= point.temperature <= seen.warm and seen.bottom <= point.height <= seen.top
    ]


def _point(
    result: PlaneResult, bar: Bar, temperature: tuple[float, float | None], height: tuple[float, float | None]
) -> Point:
    return Point(
        f"{result.reduction}#{result.name}",
        bar.address,
        result.name,
        bar.cell,
        bar.look,
        *temperature,
        *height,
    )

"""Where each sweep stands on the plane, by each of its axes, as a bar."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Mapping, Sequence
from functools import cache
from typing import NamedTuple

from archive.index import Index, PlaneSweep
from archive.lab.plane_lines import cell_name
from archive.reports.plane_view import Bar, PlaneAxis
from schemas.quantity import unit_factor

__all__ = ["Place", "bars_of", "places_of"]


class Place(NamedTuple):
    """Ends of a sweep on the axis, and the standard uncertainty where they are one."""

    bottom: float
    top: float
    uncertainty: float | None


def places_of(index: Index, rows: Sequence[PlaneSweep], axis: PlaneAxis) -> dict[str, Place]:
    """Where each sweep stands on the axis, by its address."""
    if axis == "coverage":
        # Where a sweep states its coverage, it stands there; see `bars_of`.
        return {
            span.sweep: Place(span.low, span.high, None)
            for span in index.dosed_spans()
            if span.low is not None
        }
    if axis == "pressure":
        return _pressures(index)
    return _lanes(rows)


def _pressures(index: Index) -> dict[str, Place]:
    """Pressure found by a reduction, else what the sweep's channels reach over."""
    places: dict[str, Place] = {}
    for span in index.spans("pressure"):
        if span.sweep not in places:
            factor = unit_factor(span.unit, "pressure")
            places[span.sweep] = Place(span.low * factor, span.high * factor, None)
    for result in index.plane_results(("pressure",), headline=False):
        places[result.sweep] = Place(result.value, result.value, result.uncertainty)
    return {address: place for address, place in places.items() if place.bottom > 0}


def _lanes(rows: Sequence[PlaneSweep]) -> dict[str, Place]:
    """A lane of height one for each cell, from the top in the order of names; within it sweeps from below by time."""
    lanes: dict[str, list[PlaneSweep]] = defaultdict(list)
    for row in rows:
        lanes[cell_name(row.cell)].append(row)
    places = {}
    for lane, name in enumerate(sorted(lanes, reverse=True)):
        ordered = sorted(lanes[name], key=lambda row: (row.begin is None, row.begin, row.address))
        for place, row in enumerate(ordered, start=1):
            height = lane + place / (len(ordered) + 1)
            places[row.address] = Place(height, height, None)
    return places


def bars_of(
    rows: Sequence[PlaneSweep],
    places: Mapping[str, Place],
    looks: Mapping[str, int],
    stale_ones: frozenset[str],
    *,
    log: tuple[bool, bool],
    stated: bool,
) -> tuple[list[Bar], Counter[str]]:
    """Return the bars of the sweeps that have a place, and how many have none, by what they lack.

    Parameters
    ----------
    rows : sequence of PlaneSweep
    places : mapping
        From `places_of`.
    looks : mapping
        Look of each cell by its name.
    stale_ones : frozenset of str
        Sweeps that are to be marked as stale.
    log : (bool, bool)
        Whether temperature and axis are logarithmic.
    stated : bool
        Whether a sweep that states its coverage stands there.
    """
    bars, unplaced = [], Counter[str]()
    for row in rows:
        cold, warm = row.temperature_low, row.temperature_high
        place: tuple[float, float, float | None] | None = places.get(row.address)
        if stated and row.coverage is not None:
            place = (row.coverage, row.coverage, row.coverage_uncertainty)
        cold, warm = warm if cold is None else cold, cold if warm is None else warm
        if place is None or cold is None or warm is None or (log[0] and cold <= 0):
            unplaced["a temperature" if place is not None else "a place on this axis"] += 1
            continue
        name = cell_name(row.cell)
        marks = _marks(row.withdrawn, row.empty_cell, row.reduced, row.address in stale_ones)
        bars.append(Bar(row.address, row.kind, name, looks[name], row.begin, cold, warm, *place, marks))
    return bars, unplaced


@cache
def _marks(withdrawn: bool, empty: int, reduced: bool, stale: bool) -> tuple[str, ...]:  # noqa: FBT001 - of a row
    manner = "stale" if stale else "" if reduced else "not reduced"
    return tuple(
        mark for mark in ("withdrawn" if withdrawn else "", "empty cell" if empty else "", manner) if mark
    )

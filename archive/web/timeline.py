"""The weeks of a cooldown as one drawing: doses and what they add up to, sweeps over their temperatures, gaps, notes and events.

Everything in it comes from the index and the sheet; no sealed file is read. Each sweep and dose is a link.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from xml.sax.saxutils import escape, quoteattr

import numpy as np

from archive.index import SweepRow
from archive.reports.moments import in_zone, span_text
from archive.reports.svg import Axis, axis_of
from archive.web.links import path_of
from schemas.cooldown import CooldownSheet

__all__ = ["Dosed", "Moment", "Timeline", "moments_of", "timeline"]

_LEFT, _RIGHT, _WIDTH = 62.0, 990.0, 1000
_MARKS_AT = 26.0
_TOP, _BOTTOM = 44.0, 190.0
_FILM_TOP, _FILM_BOTTOM = 212.0, 262.0
_GAP = timedelta(hours=36)
"""Nothing recorded for longer than this is told as a gap (common practice, no source)."""
_LEAST_PX = 3.0
_MOST_DAYS = 12
_SIZE = 'font-size="13"'


@dataclass(frozen=True)
class Dosed:
    """A dose, and what all doses up to it add up to."""

    address: str
    at: datetime
    act: str
    counted: bool
    amount_mol: float | None
    coverage_mol_per_m2: float | None


@dataclass(frozen=True)
class Moment:
    """An event or a note: its number on the drawing, when, what and in which words."""

    number: int
    at: datetime
    what: str
    text: str
    sweeps: tuple[str, ...] = ()


@dataclass(frozen=True)
class Timeline:
    """The drawing, its size in px, the gaps in words, and why there is none where there is none."""

    svg: str
    width: int
    height: int
    gaps: tuple[str, ...]
    why_not: str = ""


def moments_of(sheet: CooldownSheet) -> list[Moment]:
    """Return events and dated notes of a sheet, numbered in the order of time."""
    found = [(each.at, each.what.replace("-", " "), each.text, each.sweeps) for each in sheet.event]
    found += [
        (each.at, f"note, {each.role}" if each.role else "note", each.text, ())
        for each in sheet.note
        if each.at is not None
    ]
    return [Moment(number, *each) for number, each in enumerate(sorted(found, key=lambda each: each[0]), 1)]


def timeline(sheet: CooldownSheet, sweeps: Sequence[SweepRow], doses: Sequence[Dosed]) -> Timeline:
    """Draw the time line of a cooldown.

    Parameters
    ----------
    sheet : CooldownSheet
        Begin, end, events, notes and the zone of the clock.
    sweeps : sequence of SweepRow
    doses : sequence of Dosed
        In order.
    """
    timed = [row for row in sweeps if row.begin is not None]
    every = [at for row in timed for at in (row.begin, row.end) if at is not None]
    every += [each.at for each in doses] + [each.at for each in moments_of(sheet)]
    every += [at for at in (sheet.begin, sheet.end) if at is not None]
    if not every or max(every) <= min(every):
        return Timeline("", 0, 0, (), sheet.undated or "no time is recorded")
    begin, end = min(every), max(every)
    time = Axis("time", begin.timestamp(), end.timestamp())
    gaps = list(_gaps(timed, begin, end))
    film = any(each.coverage_mol_per_m2 is not None or each.amount_mol is not None for each in doses)
    bottom = _FILM_BOTTOM if film else _BOTTOM
    parts = [
        *_gap_marks(time, gaps, sheet.time_zone),
        *_temperatures(time, timed),
        *(_film(time, doses, end) if film else ()),
        *_moments(time, moments_of(sheet), bottom),
        *_days(time, begin, end, sheet.time_zone, bottom),
    ]
    height = int(bottom + 34)
    svg = (
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {_WIDTH} {height}" width="{_WIDTH}" height="{height}" role="group" '
        f'aria-label="Time line from {in_zone(begin, sheet.time_zone):%Y-%m-%d} to {in_zone(end, sheet.time_zone):%Y-%m-%d}">{"".join(parts)}</svg>'
    )
    words = tuple(
        f"{_stamp(a, sheet.time_zone)} to {_stamp(b, sheet.time_zone)}: nothing recorded for {span_text(a, b)}"
        for a, b in gaps
    )
    return Timeline(svg, _WIDTH, height, words)


def _stamp(at: datetime, zone: str) -> str:
    return f"{in_zone(at, zone):%Y-%m-%d %H:%M}"


def _x(time: Axis, at: datetime) -> float:
    return _LEFT + float(time.place(np.array([at.timestamp()]))[0]) * (_RIGHT - _LEFT)


def _gaps(sweeps: Sequence[SweepRow], begin: datetime, end: datetime) -> Iterator[tuple[datetime, datetime]]:
    reached = begin
    for row in sorted(sweeps, key=lambda row: row.begin or begin):
        if row.begin is not None and row.begin - reached > _GAP:
            yield reached, row.begin
        reached = max(reached, row.end or row.begin or reached)
    if end - reached > _GAP:
        yield reached, end


def _gap_marks(time: Axis, gaps: Sequence[tuple[datetime, datetime]], zone: str) -> Iterator[str]:
    for a, b in gaps:
        x1, x2 = _x(time, a), _x(time, b)
        said = f"{_stamp(a, zone)} to {_stamp(b, zone)}: nothing recorded for {span_text(a, b)}"
        lines = "".join(f"M{x:.1f} {_BOTTOM:.1f}l8 -8" for x in np.arange(x1, max(x1, x2 - 8), 8.0))
        yield f'<path d="M{x1:.1f} {_BOTTOM:.1f}H{x2:.1f}{lines}" stroke="#666" stroke-width="0.8" fill="none"><title>{escape(said)}</title></path>'


def _temperatures(time: Axis, sweeps: Sequence[SweepRow]) -> Iterator[str]:
    ends = [
        end
        for row in sweeps
        for end in (row.temperature_low, row.temperature_high)
        if end is not None and end > 0
    ]
    axis = axis_of("T / K", [np.array(ends, dtype=np.float64)], log=True)
    yield f'<path d="M{_LEFT} {_TOP}H{_RIGHT}V{_BOTTOM}H{_LEFT}Z" fill="none" stroke="#000" stroke-width="1"/>'
    yield f'<text x="14" y="{(_TOP + _BOTTOM) / 2}" {_SIZE} text-anchor="middle" transform="rotate(-90 14 {(_TOP + _BOTTOM) / 2})">T / K</text>'
    if axis is not None:
        for tick in axis.ticks():
            y = _y(axis, tick)
            yield f'<path d="M{_LEFT} {y:.1f}H{_RIGHT}" stroke="#666" stroke-width="0.6" stroke-dasharray="1 4"/>'
            yield f'<text x="{_LEFT - 6}" y="{y + 4.5:.1f}" {_SIZE} text-anchor="end">{tick:.3g}</text>'
    for row in sorted(sweeps, key=lambda row: row.begin or datetime.max.replace(tzinfo=UTC)):
        yield _stroke(time, axis, row)


def _y(axis: Axis, value: float) -> float:
    return _BOTTOM - 6 - float(axis.place(np.array([value]))[0]) * (_BOTTOM - _TOP - 12)


def _stroke(time: Axis, axis: Axis | None, row: SweepRow) -> str:
    """One sweep: a line along the way its temperature went, or a bar at the foot where none is known; a link either way."""
    begin = row.begin or datetime.now(UTC)
    x1 = _x(time, begin)
    x2 = max(_x(time, row.end or begin), x1 + _LEAST_PX)
    known = [end for end in (row.temperature_low, row.temperature_high) if end is not None and end > 0]
    if axis is None or not known:
        ys = [_BOTTOM - 3.0, _BOTTOM - 3.0]
    else:
        ys = [_y(axis, known[0]), _y(axis, known[-1])]
        if row.direction == "down":
            ys.reverse()
    dash = ' stroke-dasharray="3 3"' if row.withdrawn else ""
    said = f"{row.address}, {row.kind.replace('-', ' ')}, from {begin:%Y-%m-%d %H:%M} UTC for {span_text(row.begin, row.end)}"
    said += f", {' to '.join(f'{each:.4g}' for each in dict.fromkeys(known))} K" if known else ""
    said += ", withdrawn" if row.withdrawn else ""
    path = f"M{x1:.1f} {ys[0]:.1f}L{x2:.1f} {ys[1]:.1f}"
    return (
        f"<a href={quoteattr(path_of(row.address))}><title>{escape(said)}</title>"
        f'<path d="{path}" stroke="#000" stroke-opacity="0" stroke-width="14" stroke-linecap="round"/>'
        f'<path d="{path}" class="ink" stroke="#000" stroke-width="2.4" stroke-linecap="round"{dash}/></a>'
    )


def _film(time: Axis, doses: Sequence[Dosed], end: datetime) -> Iterator[str]:
    """What the doses add up to, as a staircase: coverage where the cell has an area, else amount."""
    per_area = all(each.coverage_mol_per_m2 is not None for each in doses if each.counted)
    factor, name = (1e6, "µmol/m²") if per_area else (1e6, "µmol")
    values = [((each.coverage_mol_per_m2 if per_area else each.amount_mol) or 0.0) * factor for each in doses]
    highest = max(values, default=0.0)
    if not highest > 0:
        return
    axis = Axis(name, 0.0, highest * 1.12)
    yield f'<path d="M{_LEFT} {_FILM_TOP}V{_FILM_BOTTOM}H{_RIGHT}" fill="none" stroke="#000" stroke-width="1"/>'
    yield f'<text x="{_LEFT + 6}" y="{_FILM_TOP + 9}" {_SIZE}>{name}</text>'
    for tick in axis.ticks(2):
        y = _FILM_BOTTOM - float(axis.place(np.array([tick]))[0]) * (_FILM_BOTTOM - _FILM_TOP)
        yield f'<text x="{_LEFT - 6}" y="{y + 4.5:.1f}" {_SIZE} text-anchor="end">{tick:g}</text>'
    stairs = [f"M{_LEFT:.1f} {_FILM_BOTTOM:.1f}"]
    for each, value in zip(doses, values, strict=True):
        y = _FILM_BOTTOM - value / axis.high * (_FILM_BOTTOM - _FILM_TOP)
        stairs.append(f"H{_x(time, each.at):.1f}V{y:.1f}")
    yield f'<path d="{"".join(stairs)}H{_x(time, end):.1f}" fill="none" stroke="#000" stroke-width="1.4"/>'
    for each, value in zip(doses, values, strict=True):
        said = f"{each.address}, {each.act}, {each.at:%Y-%m-%d %H:%M} UTC: {value:.4g} {name} in all"
        said += "" if each.counted else ", not counted"
        x, y = _x(time, each.at), _FILM_BOTTOM - value / axis.high * (_FILM_BOTTOM - _FILM_TOP)
        ring = "#000" if each.counted else "#fff"
        yield (
            f"<a href={quoteattr(path_of(each.address))}><title>{escape(said)}</title>"
            f'<circle cx="{x:.1f}" cy="{y:.1f}" r="8" fill="#000" fill-opacity="0"/>'
            f'<circle cx="{x:.1f}" cy="{y:.1f}" r="3.4" fill="{ring}" stroke="#000" stroke-width="1.2"/></a>'
        )


def _moments(time: Axis, moments: Sequence[Moment], bottom: float) -> Iterator[str]:
    """Numbered flags above, with a line down through everything; numbers that would cover each other step up."""
    last = -math.inf
    for each in moments:
        x = _x(time, each.at)
        high = _MARKS_AT - (14 if x - last < 16 else 0)
        last = x if high == _MARKS_AT else last
        yield (
            f"<g><title>{escape(f'{each.number}: {each.what}, {each.at:%Y-%m-%d %H:%M}')}</title>"
            f'<path d="M{x:.1f} {high + 4:.1f}V{bottom:.1f}" stroke="#666" stroke-width="0.9" stroke-dasharray="5 3"/>'
            f'<text x="{x:.1f}" y="{high:.1f}" {_SIZE} text-anchor="middle">{each.number}</text></g>'
        )


def _days(time: Axis, begin: datetime, end: datetime, zone: str, bottom: float) -> Iterator[str]:
    span = max((end - begin).days, 1)
    step = next((each for each in (1, 2, 5, 7, 14, 30, 60, 180, 365) if span / each <= _MOST_DAYS), 730)
    day = in_zone(begin, zone).replace(hour=0, minute=0, second=0, microsecond=0) + timedelta(days=1)
    while day.astimezone(UTC) <= end.astimezone(UTC):
        x = _x(time, day)
        yield f'<path d="M{x:.1f} {bottom:.1f}v6" stroke="#000" stroke-width="1"/>'
        if _LEFT + 12 < x < _RIGHT - 24:
            yield f'<text x="{x:.1f}" y="{bottom + 20:.1f}" {_SIZE} text-anchor="middle">{day:%m-%d}</text>'
        day += timedelta(days=step)

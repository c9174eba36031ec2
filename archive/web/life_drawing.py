"""The pictures of a life story: results against date, and the calibrations of a thermometer laid over the last one."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from datetime import UTC, datetime

import numpy as np

from archive.index import LifeResult, Use
from archive.lab.life import Course
from archive.reduction.calibration_comparison import Drift, readings_at
from archive.reports.axis_units import axis_unit, unit_text
from archive.reports.numbers import shown_value
from archive.reports.plane_ticks import round_values
from archive.reports.prose import symbol_of
from archive.reports.svg import Axis, axis_of
from archive.web.links import path_of
from archive.web.strips import Bar, Drawn, Line, Spot, Strip, strips
from schemas.lineage import Value
from schemas.thermometer import Calibration

__all__ = ["calibrations_drawn", "courses_drawn"]

_MONTHS = (1, 2, 3, 6, 12, 24, 60, 120)
_DAYS = (1, 2, 5, 7, 14)
_MOST_TICKS = 9
_POINTS = 60


def courses_drawn(
    courses: Sequence[Course], uses: Sequence[Use], looks: dict[str, int], *, name: str
) -> Drawn | None:
    """Draw each result of a thing against date, below the cooldowns that used it.

    Parameters
    ----------
    courses : sequence of Course
    uses : sequence of Use
    looks : dict of str to int
        Look of each revision, by its address.
    name : str
        Of the thing.

    Returns
    -------
    Drawn or None
        None where nothing has a date.
    """
    times = [at for use in uses for at in (use.begin, use.end) if at is not None]
    times += [point.begin for course in courses for point in course.points if point.begin is not None]
    if not times:
        return None
    begin, end = min(times), max(times)
    span = max((end - begin).total_seconds(), 86400.0)
    low, high = begin.timestamp() - 0.03 * span, end.timestamp() + 0.05 * span
    below = [strip for course in courses if (strip := _course(course, looks)) is not None]
    said = ", ".join(str(symbol_of(course.name)) for course in courses)
    return strips(
        Axis("date (UTC)", low, high),
        list(_dates(low, high)),
        below,
        bars=list(_bars(uses)),
        label=f"{name} over time: {said or 'cooldowns'}",
    )


def _course(course: Course, looks: dict[str, int]) -> Strip | None:
    dated = [each for each in course.points if each.begin is not None and each.value is not None]
    if not dated:
        return None
    first = dated[0]
    values = np.array([each.value for each in dated], dtype=np.float64)
    u = np.array([each.uncertainty or 0.0 for each in dated])
    low, high = float((values - u).min()), float((values + u).max())
    # What differs is to be seen: the axis need not reach zero.
    unit = axis_unit(low, high, first.quantity, first.unit)
    shown = (values - unit.offset) * unit.factor
    ends = (np.array([low, high]) - unit.offset) * unit.factor
    # A pure number has no more to say than the name above the strip.
    axis = axis_of("" if unit.name == "fraction" else unit.name, [ends])
    if axis is None:
        return None
    margin = 0.15 * (axis.high - axis.low)
    return Strip(
        _set(course.name),
        Axis(axis.name, axis.low - margin, axis.high + margin),
        tuple(
            Spot(
                x=(each.begin or datetime.now(UTC)).timestamp(),
                y=float(shown[k]),
                u=float(u[k] * unit.factor),
                look=looks.get(each.record, 0),
                href=path_of(f"{each.reduction}#{each.name}"),
                words=_words(each),
            )
            for k, each in enumerate(dated)
        ),
    )


def _set(name: str) -> str:
    """Name of a result as it is printed, where sub- and superscripts cannot be set."""
    return "".join(piece.text for piece in symbol_of(name).pieces)


def _words(point: LifeResult) -> str:
    value = Value(value=point.value, uncertainty=point.uncertainty, unit=point.unit, scale=point.scale)
    day = f"{point.begin:%Y-%m-%d}" if point.begin else "[nr]"
    return f"{point.reduction}: {symbol_of(point.name)} = {shown_value(value, point.quantity).text}, {day}, {point.record}"


def _bars(uses: Sequence[Use]) -> Iterator[Bar]:
    for use in uses:
        if use.begin is not None:
            end = use.end or use.begin
            words = f"{use.cooldown}: {use.sweeps} sweeps with {use.record}, {use.begin:%Y-%m-%d} to {end:%Y-%m-%d}"
            yield Bar(use.begin.timestamp(), end.timestamp(), use.cooldown, path_of(use.cooldown), words)


def _dates(low: float, high: float) -> Iterator[tuple[float, str]]:
    """Round days or months inside a span of POSIX seconds, few enough to be written."""
    begin, end = (datetime.fromtimestamp(each, UTC) for each in (low, high))
    days = (end - begin).days
    if days <= _MOST_TICKS * _DAYS[-1] / 2:
        step = next((each for each in _DAYS if days / each <= _MOST_TICKS), _DAYS[-1])
        first = int(low // 86400) + 1
        for day in range(first, int(high // 86400) + 1, step):
            yield 86400.0 * day, f"{datetime.fromtimestamp(86400 * day, UTC):%Y-%m-%d}"[5:]
        return
    step = next((each for each in _MONTHS if days / 30.4 / each <= _MOST_TICKS), _MONTHS[-1])
    month = begin.year * 12 + begin.month - 1
    month += -month % step
    while (at := datetime(month // 12, month % 12 + 1, 1, tzinfo=UTC)) <= end:
        if at >= begin:
            yield at.timestamp(), f"{at:%Y-%m}"
        month += step


def calibrations_drawn(every: Sequence[Calibration], against: Sequence[Drift]) -> Drawn | None:
    """Draw the calibrations of a thermometer over temperature, and the last one less each before it in mK.

    Parameters
    ----------
    every : sequence of Calibration
        Oldest first.
    against : sequence of Drift
        The last one held against each before it.

    Returns
    -------
    Drawn or None
        None where no curve can be drawn.
    """
    curves = list(_curves(every))
    if not curves:
        return None
    ends = [float(end) for line in curves for end in (line.x.min(), line.x.max())]
    across = Axis("T / K", 0.95 * min(ends), 1.05 * max(ends), log=True)
    readings = np.concatenate([line.y for line in curves])
    log = bool(readings.min() > 0 and readings.max() > 3 * readings.min())
    up = axis_of(f"reading / {unit_text(every[-1].reading_unit)}", [readings], log=log)
    below = [Strip("reading", up, lines=tuple(curves))] if up is not None else []
    told = [(look, each.found) for look, each in enumerate(against) if each.found is not None]
    if told:
        spans = [1e3 * (found.difference + sign * found.uncertainty) for _, found in told for sign in (1, -1)]
        axis = axis_of("ΔT / mK", [*spans, np.zeros(1)])
        lines = tuple(
            Line(found.temperature, 1e3 * found.difference, 1e3 * found.uncertainty, look)
            for look, found in told
        )
        if axis is not None:
            below.append(Strip(f"{every[-1].address} less each before it", axis, lines=lines))
    ticks = [(each, f"{each:g}") for each in round_values(across.low, across.high, log=True)]
    names = ", ".join(each.address for each in every)
    return strips(across, ticks, below, label=f"calibrations against temperature: {names}")


def _curves(every: Sequence[Calibration]) -> Iterator[Line]:
    for look, each in enumerate(every):
        if each.reading_unit != every[-1].reading_unit:
            continue
        T = np.geomspace(each.temperature_low.si * (1 + 1e-6), each.temperature_high.si * (1 - 1e-6), _POINTS)
        try:
            reading = np.asarray(readings_at(each, T), dtype=np.float64)
        except ValueError:
            continue
        known = np.isfinite(reading)
        if known.any():
            yield Line(T[known], reading[known], None, look)

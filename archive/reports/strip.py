"""The strip of a run: temperature against time, with doses, sweeps, gaps and events on one axis of time."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

import numpy as np

from archive.reports.holdings import Holdings, Taken
from archive.reports.moments import in_zone
from archive.reports.small_plots import Column, temperature_of
from archive.reports.svg import Axis, Frame, axis_of
from schemas.quantity import unit_factor

__all__ = ["strip"]

_MARKS = {
    "transfer": "T",
    "leak": "L",
    "plug": "P",
    "power-loss": "W",
    "fault": "F",
    "magnet": "M",
    "rotation": "R",
    "turbo": "U",
    "other": "O",
}
_LEFT, _RIGHT, _TOP, _BOTTOM = 10.0, 179.0, 3.4, 20.0


def strip(held: Holdings) -> tuple[str | None, str]:
    """Return the strip as SVG, and its legend; without times, None and the reason.

    Notes
    -----
    From the top: marks of events; temperature, logarithmic; sweeps as bars with their numbers; doses as ticks, as high as
    their amount. Where nothing was recorded the temperature has a gap.
    """
    moments = [
        at
        for each in held.sweeps
        if each.entry is not None
        for at in (each.entry.begin, each.entry.end)
        if at is not None
    ]
    moments += [each.at for each in held.view.newest.doses] + [each.at for each in held.sheet.event]
    moments += [at for at in (held.sheet.begin, held.sheet.end) if at is not None]
    if not moments or max(moments) <= min(moments):
        return None, held.sheet.undated or "[nr]: no time is recorded"
    begin, end = min(moments), max(moments)
    time = Axis("time", begin.timestamp(), end.timestamp())
    frame = Frame(
        180.0,
        30.0,
        f"temperature against time from {begin:%Y-%m-%d} to {end:%Y-%m-%d}, logarithmic, with sweeps, doses and events",
    )
    _temperatures(held, frame, time)
    _bars(held, frame, time)
    _doses(held, frame, time)
    _events(held, frame, time)
    _days(frame, time, begin, end, held.sheet.time_zone)
    used = sorted({each.what for each in held.sheet.event})
    events = ", ".join(f"{_MARKS[what]} {what.replace('-', ' ')}" for what in used)
    legend = "T on a logarithmic axis; bars: sweeps with their numbers; ticks below: doses, height by amount"
    return frame.done(), legend + (f"; marks above: {events}." if events else "; no events are recorded.")


def _x(time: Axis, at: float) -> float:
    return _LEFT + float(time.place(np.array([at]))[0]) * (_RIGHT - _LEFT)


def _temperatures(held: Holdings, frame: Frame, time: Axis) -> None:
    lines = [(taken, found) for taken in held.sweeps if (found := _line(held, taken)) is not None]
    axis = axis_of("T / K", [values for _, (_, values) in lines], log=True)
    frame.parts.append(
        f'<rect x="{_LEFT}" y="{_TOP}" width="{_RIGHT - _LEFT}" height="{_BOTTOM - _TOP}" fill="none" stroke="#000" stroke-width="0.14"/>'
    )
    frame.text(2.4, (_TOP + _BOTTOM) / 2, "T / K", size=2.7, turn=True)
    if axis is None:
        frame.text(
            (_LEFT + _RIGHT) / 2,
            (_TOP + _BOTTOM) / 2 + 1,
            "no temperature is recorded against time",
            size=2.7,
        )
        return
    for tick in axis.ticks():
        at = _BOTTOM - float(axis.place(np.array([tick]))[0]) * (_BOTTOM - _TOP)
        frame.line(_LEFT, at, _RIGHT, at, width=0.08, dash="0.3 0.6", colour="#666")
        frame.text(_LEFT - 0.7, at + 0.8, f"{tick:.3g}", anchor="end")
    for _, (times, values) in lines:
        X = _LEFT + time.place(times) * (_RIGHT - _LEFT)
        Y = _BOTTOM - axis.place(values) * (_BOTTOM - _TOP)
        keep = np.flatnonzero(np.isfinite(X) & np.isfinite(Y))
        gap = (
            np.flatnonzero(np.diff(times[keep]) > 20 * np.median(np.diff(times[keep]))) + 1
            if keep.size > 2
            else np.array([], dtype=int)
        )
        for run in np.split(keep, gap):
            thin = (
                run[np.unique(np.linspace(0, run.size - 1, min(run.size, 80)).astype(int))]
                if run.size
                else run
            )
            if thin.size:
                points = " ".join(f"{X[k]:.2f},{Y[k]:.2f}" for k in thin)
                frame.parts.append(
                    f'<polyline points="{points}" fill="none" stroke="#000" stroke-width="0.3" stroke-linecap="round"/>'
                )


def _line(held: Holdings, taken: Taken) -> tuple[Column, Column] | None:
    entry = taken.entry
    if entry is None or entry.begin is None or entry.end is None:
        return None
    clock = next((each for each in entry.channels if each.quantity == "instant"), None)
    times = None if clock is None else held.column(f"{held.view.newest.cooldown}/{entry.name}", clock.name)
    found = temperature_of(held, taken)
    if times is not None and found is not None and times.shape == found[0].shape:
        order = np.argsort(times, kind="stable")
        return times[order], found[0][order]
    low, high = entry.temperature_low, entry.temperature_high
    if low is None or high is None or low.value is None or high.value is None:
        return None
    ends = np.array([low.value, high.value] if taken.sheet.direction != "down" else [high.value, low.value])
    return np.array([entry.begin.timestamp(), entry.end.timestamp()]), ends


def _bars(held: Holdings, frame: Frame, time: Axis) -> None:
    free = [-1.0, -1.0]
    for taken in held.sweeps:
        entry = taken.entry
        if entry is None or entry.begin is None or entry.end is None:
            continue
        x1, x2 = _x(time, entry.begin.timestamp()), _x(time, entry.end.timestamp())
        x2 = max(x2, x1 + 0.4)
        row = 0 if x1 >= free[0] else 1
        y = 21.2 + 2.5 * row
        frame.line(x1, y, x2, y, width=0.7)
        if x1 >= free[row]:
            name = entry.name if len(entry.name) <= 6 else entry.name[:5] + "\u2026"
            frame.text(max(x1, _LEFT), y + 2.1, name, size=1.9, anchor="start")
            free[row] = max(x2, x1 + 1.05 * len(name)) + 0.3


def _doses(held: Holdings, frame: Frame, time: Axis) -> None:
    sizes = [
        abs(each.amount.value or 0.0) * unit_factor(each.amount.unit, "amount")
        for each in held.view.newest.doses
    ]
    for each, size in zip(held.view.newest.doses, sizes, strict=True):
        height = 0.6 + 2.4 * size / max(max(sizes), 1e-300)
        x = _x(time, each.at.timestamp())
        frame.line(
            x,
            _BOTTOM,
            x,
            _BOTTOM - height,
            width=0.22 if each.act == "add" else 0.5,
            dash="" if each.counted else "0.3 0.3",
        )


def _events(held: Holdings, frame: Frame, time: Axis) -> None:
    for each in held.sheet.event:
        x = _x(time, each.at.timestamp())
        frame.line(x, _TOP, x, _TOP + 1.6, width=0.3)
        frame.text(x, _TOP - 0.6, _MARKS[each.what], size=2.4)


def _days(frame: Frame, time: Axis, begin: datetime, end: datetime, zone: str) -> None:
    days = max(1, (end - begin).days)
    every = next((step for step in (1, 2, 5, 7, 14, 30, 60, 180, 365) if days / step <= 10), 365)
    day = in_zone(begin, zone).replace(hour=0, minute=0, second=0, microsecond=0) + timedelta(days=1)
    if days < 2:
        frame.text(_LEFT, 29.4, f"{in_zone(begin, zone):%Y-%m-%d %H:%M}", anchor="start")
        frame.text(_RIGHT, 29.4, f"{in_zone(end, zone):%Y-%m-%d %H:%M}", anchor="end")
        return
    while day.astimezone(UTC) <= end.astimezone(UTC):
        x = _x(time, day.timestamp())
        frame.line(x, _BOTTOM, x, _BOTTOM + 0.8)
        if _LEFT + 6 < x < _RIGHT - 6:
            frame.text(x, 29.4, f"{day:%Y-%m-%d}")
        day += timedelta(days=every)

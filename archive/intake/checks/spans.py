"""Data, doses and events in time: inside the run, in order, and tied to each other."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import UTC, datetime

import numpy as np

from archive.intake.checks.rows import tables, time_span
from archive.intake.checks.telling import listed, on_row, on_sheet, on_sweep
from archive.intake.reading import Reading
from archive.intake.thresholds import Thresholds
from schemas.finding import Finding

__all__ = ["data_outside_cooldown", "dose_order", "doses_outside_cooldown", "events_during_sweeps"]


def data_outside_cooldown(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find sweeps with time stamps before the begin or after the end of the run."""
    begin, end = reading.sheet.begin, reading.sheet.end
    for table in tables(reading):
        name, span = table.of_kind("instant"), time_span(table)
        if name is None or span is None or table.time is None:
            continue
        for limit, at, word in (
            (begin, span[0], "before the cooldown begins"),
            (end, span[1], "after the cooldown ends"),
        ):
            if limit is None:
                continue
            if (at < limit.timestamp()) if limit is begin else (at > limit.timestamp()):
                row = int(np.nanargmin(table.time) if limit is begin else np.nanargmax(table.time))
                yield on_row(
                    table,
                    "time-outside-cooldown",
                    "warning",
                    f"a time stamp of {table.name} lies {word}",
                    row,
                    channel=name,
                    found=_instant(at),
                    expected=limit.isoformat(),
                    remedy="correct the clock by a correction, the time zone, or begin and end of the sheet",
                )


def _instant(seconds: float) -> str:
    return datetime.fromtimestamp(seconds, UTC).isoformat(timespec="seconds")


def doses_outside_cooldown(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find doses before the begin or after the end of the run."""
    begin, end = reading.sheet.begin, reading.sheet.end
    for number, dose in enumerate(reading.sheet.dose):
        early, late = begin is not None and dose.at < begin, end is not None and dose.at > end
        if early or late:
            yield on_sheet(
                reading,
                "dose-outside-cooldown",
                "warning",
                f"dose {dose.name} lies {'before the cooldown begins' if early else 'after the cooldown ends'}",
                "dose",
                number,
                "at",
                place=dose.name,
                found=dose.at.isoformat(),
                expected=str(begin.isoformat() if early and begin else end.isoformat() if end else ""),
                remedy="correct the time of the dose, or begin and end",
            )


def dose_order(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find doses that stand out of order, and sweeps that name their doses out of order."""
    doses = reading.sheet.dose
    for number in range(1, len(doses)):
        before, after = doses[number - 1], doses[number]
        if after.at < before.at:
            yield on_sheet(
                reading,
                "dose-order",
                "warning",
                f"dose {after.name} stands after {before.name} and is earlier",
                "dose",
                number,
                "at",
                place=after.name,
                found=after.at.isoformat(),
                expected=f"after {before.at.isoformat()}",
                remedy="correct the time, or put the doses in the order in which they were given",
            )
    at = {dose.name: dose.at for dose in doses}
    for number, sweep in enumerate(reading.sheet.sweep):
        times = [at[name] for name in sweep.doses if name in at]
        if times != sorted(times):
            yield on_sheet(
                reading,
                "dose-order",
                "warning",
                f"the doses of {sweep.name} are not named in the order of time",
                "sweep",
                number,
                "doses",
                place=sweep.name,
                remedy="name them in the order in which they were given",
            )
    yield from _dose_after_data(reading, at)


def _dose_after_data(reading: Reading, at: dict[str, datetime]) -> Iterator[Finding]:
    """Find sweeps that began before the dose they are said to follow, or after a later one."""
    counted = [dose for dose in reading.sheet.dose if dose.crossed_out is None]
    for table in tables(reading):
        after = table.sweep.after_dose
        span = time_span(table)
        if span is None or table.sweep.gas != "helium":
            continue
        begin = span[0]
        given = [dose.name for dose in counted if dose.at.timestamp() <= begin and dose.act != "recover"]
        wrong = None
        if after in at and begin < at[after].timestamp():
            wrong = f"{table.name} begins before dose {after}, which it is said to follow"
        elif after in given and given[-1] != after and table.sweep.kind != "dose-run":
            wrong = f"{table.name} is said to follow dose {after}, and {given[-1]} was given before it began"
        elif table.sweep.empty_cell and given:
            wrong = f"{table.name} is said to be of the empty cell, and {given[-1]} was given before it began"
        if wrong is not None:
            yield on_sweep(
                reading,
                table,
                "dose-order",
                "warning",
                wrong,
                key="empty_cell" if table.sweep.empty_cell else "after_dose",
                found=_instant(begin),
                remedy="correct after_dose, the time of the dose, or the clock of the sweep",
            )


def events_during_sweeps(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Note events that fall into a sweep which neither they nor its disturbances name."""
    for number, event in enumerate(reading.sheet.event):
        at = event.at.timestamp()
        hit = []
        for table in tables(reading):
            span = time_span(table)
            if span is None or not span[0] <= at <= span[1]:
                continue
            if table.sweep.kind != "log" and table.name not in event.sweeps and not table.sweep.disturbances:
                hit.append(table.name)
        if hit:
            yield on_sheet(
                reading,
                "event-during-sweep",
                "note",
                f"{event.what} at {event.at.isoformat()} falls into {listed(hit)}",
                "event",
                number,
                place=hit[0],
                remedy="name the sweeps in the event, or add a disturbance to them",
            )

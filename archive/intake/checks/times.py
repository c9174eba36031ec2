"""Time stamps: order, repetition and gaps."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np

from archive.intake.checks.rows import counting, ring_time_s, tables
from archive.intake.checks.telling import number, on_row
from archive.intake.reading import LISTED, Reading, SweepTable
from archive.intake.thresholds import Thresholds
from schemas.finding import Finding, Severity

__all__ = ["time_gap", "time_repeated", "time_reversed"]


def time_reversed(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find time that runs backwards."""
    for table in tables(reading):
        for name, facts in table.facts.items():
            if table.channels[name].quantity == "instant" and table.channels[name].use and facts.reversed_at:
                yield _at_line(
                    table,
                    "time-reversed",
                    "error",
                    f"time runs backwards at {_places(facts.reversed_at)} of {table.name}",
                    name=name,
                    place=facts.reversed_at[0],
                    remedy="name the zone and the hour that is meant if a clock was set back, order the files, or leave the rows out of the copy",
                )


def time_repeated(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find time stamps that stand twice."""
    for table in tables(reading):
        for name, facts in table.facts.items():
            if table.channels[name].quantity == "instant" and table.channels[name].use and facts.repeated_at:
                yield _at_line(
                    table,
                    "time-repeated",
                    "warning",
                    f"a time stamp repeats the one before at {_places(facts.repeated_at)} of {table.name}",
                    name=name,
                    place=facts.repeated_at[0],
                    remedy="look whether rows were written twice, or the clock is too coarse for the rate of reading",
                )


def _places(found: Sequence[tuple[int, int]]) -> str:
    more = " or more" if len(found) >= LISTED else ""
    return f"{len(found)}{more} place{'' if len(found) == 1 else 's'}"


def _at_line(
    table: SweepTable,
    code: str,
    severity: Severity,
    what: str,
    *,
    name: str,
    place: tuple[int, int],
    remedy: str,
) -> Finding:
    file, line = table.sweep.files[place[0]], place[1]
    return Finding(
        code=code,
        severity=severity,
        what=what,
        file=file,
        line=line,
        column=str(table.channels[name].column),
        place=f"{table.name}#{name}",
        remedy=remedy,
    )


def time_gap(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find gaps after which a record is a new segment; those that the sheet explains are left alone."""
    for table in tables(reading):
        name = table.of_kind("instant")
        if name is None or table.sweep.kind == "log":
            continue
        counts = counting(table)
        rows = np.flatnonzero(np.isfinite(table.columns[name]))
        time = table.columns[name][rows]
        if len(time) < 4:
            continue
        steps = np.diff(time)
        usual = float(np.median(steps))
        tau = ring_time_s(reading, table) or 0.0
        limit = max(thresholds.time_gap_ring_times * tau, thresholds.time_gap_intervals * usual)
        stated = [each.at.timestamp() for each in table.sweep.disturbances if each.new_segment]
        # Between the doses of a dose run one waits; that is not a gap.
        stated += [dose.at.timestamp() for dose in reading.sheet.dose if dose.name in table.sweep.doses]
        gaps = [
            int(i)
            for i in np.flatnonzero(steps > limit)
            if usual > 0
            and counts[rows[i]]
            and counts[rows[i + 1]]
            and not any(time[i] <= at <= time[i + 1] for at in stated)
        ]
        if gaps:
            longest = max(gaps, key=lambda i: steps[i])
            yield on_row(
                table,
                "time-gap",
                "warning",
                f"{len(gaps)} gap(s) in {table.name}; the longest lasts {number(float(steps[longest]) / 3600, 'h', 3)}",
                int(rows[longest + 1]),
                channel=name,
                found=number(float(steps[longest]), "s"),
                expected=f"at most {number(limit, 's')} (time_gap_ring_times = {thresholds.time_gap_ring_times:g}, "
                f"time_gap_intervals = {thresholds.time_gap_intervals:g}; ring time {number(tau, 's', 3)}, usual interval {number(usual, 's', 3)})",
                remedy="add a disturbance with new_segment = true where the record begins anew, or waive it with the reason",
            )

"""Columns as an instrument wrote them: sentinels, saturation, floors, phases, dead and coarse channels."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from archive.intake.checks.rows import bound, counting, noise, sigma, tables
from archive.intake.checks.telling import in_file_unit, number, on_row, on_sweep
from archive.intake.reading import Reading, SweepTable
from archive.intake.thresholds import Thresholds
from schemas.cell import TorsionalOscillator
from schemas.finding import Finding

__all__ = [
    "coarse_steps",
    "constant_channel",
    "convention_missing",
    "detection_missing",
    "lock_phase",
    "magnitude_floor",
    "saturated",
    "sentinel_undeclared",
]

# SCPI-1999, volume 1, 7.2.1.4: 9.9E37 for overflow and 9.91E37 for "not a number"; nothing measured comes near.
_SENTINEL = 9.8e37
_ALIVE = (
    "period",
    "frequency",
    "amplitude",
    "resistance",
    "capacitance",
    "mutual_inductance",
    "inductance",
    "dissipation",
    "phase",
)
_OSCILLATING = ("amplitude", "drive")


def sentinel_undeclared(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find values that instruments send for overflow or no reading, read as numbers."""
    for table in tables(reading):
        for name, facts in table.facts.items():
            largest = max(
                (abs(each) for each in (facts.low, facts.high) if not math.isnan(each)), default=0.0
            )
            if largest < _SENTINEL or not table.channels[name].use:
                continue
            column = table.columns[name]
            rows = np.flatnonzero(np.abs(column) >= 0.5 * np.nanmax(np.abs(column)))
            yield on_row(
                table,
                "sentinel-undeclared",
                "error",
                f"channel {name} of {table.name} holds {largest:.4g}, which instruments send for overflow or no reading",
                int(rows[0]),
                channel=name,
                found=f"{largest:.4g}",
                remedy=f'declare it in the channel, as it stands in the file: sentinels = ["{largest:.3G}"]',
            )


def saturated(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find readings near full scale, and plateaus at the largest value of an amplitude."""
    for table in tables(reading):
        rows = counting(table)
        for name, channel in table.channels.items():
            values = np.abs(np.where(rows, table.columns[name], np.nan))
            if not channel.use or channel.quantity == "instant" or not np.isfinite(values).any():
                continue
            if channel.full_scale is not None:
                yield from _near_full_scale(table, name, values, thresholds)
            elif channel.quantity == "amplitude":
                yield from _plateau(table, name, values, thresholds)


def _near_full_scale(
    table: SweepTable, name: str, values: np.ndarray, thresholds: Thresholds
) -> Iterator[Finding]:
    channel = table.channels[name]
    try:
        full = abs(bound(channel.full_scale or "", channel))
    except ValueError:  # told of by the check of the sheet's texts
        return
    limit = thresholds.full_scale_fraction * full
    hit = np.flatnonzero(values > limit)
    if len(hit):
        share = 100 * float(np.nanmax(values)) / full
        yield on_row(
            table,
            "saturated",
            "error",
            f"channel {name} of {table.name} reaches {share:.3g} per cent of its full scale {channel.full_scale} in {len(hit)} row(s)",
            int(hit[0]),
            channel=name,
            expected=f"at most {100 * thresholds.full_scale_fraction:g} per cent (full_scale_fraction)",
            remedy="leave the rows out with the reason, or correct full_scale",
        )


def _plateau(table: SweepTable, name: str, values: np.ndarray, thresholds: Thresholds) -> Iterator[Finding]:
    edges = np.flatnonzero(np.diff(np.concatenate(([0], (values == np.nanmax(values)).astype(np.int8), [0]))))
    begins, lengths = edges[::2], np.diff(edges)[::2]
    begin, longest = int(begins[np.argmax(lengths)]), int(lengths.max())
    present = values[np.isfinite(values)]
    distinct = len(np.unique(present))
    # A coarse column repeats every value; a clipped one repeats only the largest.
    if longest >= thresholds.plateau_rows and distinct > len(present) / 2:
        yield on_row(
            table,
            "saturated",
            "warning",
            f"channel {name} of {table.name} stays at its largest value {in_file_unit(table, name, float(np.nanmax(values)))} for {longest} rows",
            begin,
            channel=name,
            expected=f"fewer than {thresholds.plateau_rows} equal rows there (plateau_rows)",
            remedy="state full_scale; leave clipped rows out with the reason",
        )


def magnitude_floor(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find amplitudes so near to their noise that a magnitude is biased."""
    for table in tables(reading, "temperature-sweep", "dose-run", "drive-sweep"):
        names = [
            name
            for name, channel in table.channels.items()
            if channel.quantity == "amplitude" and channel.use
        ]
        if len(names) != 1:
            continue  # two components are no magnitude
        values = table.columns[names[0]]
        rows = np.flatnonzero(counting(table) & np.isfinite(values))
        if len(rows) < 5:
            continue
        floor = noise(values[rows])
        low = rows[int(np.argmin(np.abs(values[rows])))]
        if floor > 0 and abs(values[low]) < thresholds.magnitude_over_noise * floor:
            yield on_row(
                table,
                "magnitude-floor",
                "warning",
                f"the smallest {names[0]} of {table.name} is {number(abs(float(values[low])) / floor, digits=3)} times its noise",
                int(low),
                channel=names[0],
                expected=f"at least {thresholds.magnitude_over_noise:g} times (magnitude_over_noise)",
                remedy="record both components, drive harder, or waive it with the reason; a magnitude reads too high there",
            )


def lock_phase(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find phases of the lock that mix dissipation into the period."""
    for table in tables(reading, "temperature-sweep", "dose-run", "drive-sweep"):
        name = table.of_kind("phase")
        if name is None or any(each.correct == "phase" for each in table.sweep.corrections):
            continue
        phase = np.degrees(np.where(counting(table), table.columns[name], np.nan))
        if not np.isfinite(phase).any():
            continue
        row = int(np.nanargmax(np.abs(phase)))
        worst = abs(float(phase[row]))
        present = np.flatnonzero(np.isfinite(phase))
        steps = np.abs(np.diff(phase[present]))
        step = float(steps.max()) if len(steps) else 0.0
        if worst > thresholds.lock_phase_deg:
            is_error = worst > thresholds.lock_phase_error_deg
            what, expected = (
                f"the phase of the lock in {table.name} reaches {worst:.3g} deg",
                (
                    f"at most {thresholds.lock_phase_error_deg:g} deg (lock_phase_error_deg)"
                    if is_error
                    else f"at most {thresholds.lock_phase_deg:g} deg (lock_phase_deg)"
                ),
            )
        elif step > thresholds.lock_phase_step_deg:
            is_error, row = False, int(present[int(steps.argmax()) + 1])
            what = f"the phase of the lock in {table.name} steps by {step:.3g} deg"
            expected = f"at most {thresholds.lock_phase_step_deg:g} deg (lock_phase_step_deg)"
        else:
            continue
        yield on_row(
            table,
            "lock-phase",
            "error" if is_error else "warning",
            what,
            row,
            channel=name,
            expected=expected,
            remedy="state a correction of the phase, leave the rows out, or waive it with the reason",
        )


def constant_channel(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find channels that never change."""
    for table in tables(reading):
        for name, channel in table.channels.items():
            facts = table.facts[name]
            # The rate of a record against time is one number.
            meant = table.sweep.kind == "pulse-response" and channel.quantity == "frequency"
            dead = channel.use and channel.quantity in _ALIVE and not meant
            if dead and table.rows >= 10 and facts.low == facts.high:
                yield on_sweep(
                    reading,
                    table,
                    "constant-channel",
                    "warning",
                    f"channel {name} of {table.name} is {number(facts.low, channel.unit or '', 8)} in all {table.rows} rows",
                    channel=name,
                    remedy="look whether the instrument was connected and read; if not, use = false with why_not",
                )
            elif channel.use and math.isnan(facts.low) and table.rows:
                yield on_sweep(
                    reading,
                    table,
                    "constant-channel",
                    "warning",
                    f"channel {name} of {table.name} holds no value in any of {table.rows} rows",
                    channel=name,
                    remedy="look at the column and the sentinels; if nothing was recorded, leave the channel out",
                )


def coarse_steps(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Note columns whose last digit is coarser than their uncertainty."""
    for table in tables(reading):
        for name, channel in table.channels.items():
            if not channel.use or channel.quantity in ("instant", "drive") or channel.uncertainty is None:
                continue
            values = table.columns[name]
            present = values[np.isfinite(values)]
            levels = np.unique(present)
            if len(present) < 20 or len(levels) < 3:
                continue
            u = sigma(table, name)
            step = float(np.min(np.diff(levels)))
            repeats = float(np.mean(np.diff(present) == 0))
            # A uniform step s spreads by s/sqrt(12); told when that exceeds what is stated (derived).
            if u > 0 and repeats > 0.25 and step / math.sqrt(12.0) > u:
                yield on_sweep(
                    reading,
                    table,
                    "coarse-steps",
                    "note",
                    f"channel {name} of {table.name} moves in steps of {in_file_unit(table, name, step)}, {step / u:.3g} times its uncertainty",
                    channel=name,
                    expected="steps smaller than the uncertainty",
                    remedy="write more digits, or state an uncertainty that holds the step",
                )


def detection_missing(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find amplitudes of an oscillator without a statement how they were driven and detected."""
    for table in tables(reading):
        name = table.of_kind("amplitude")
        if name is None or not isinstance(reading.cell_of(table.sweep), TorsionalOscillator):
            continue
        detection = reading.detection_of(table.sweep)
        if detection is None:
            yield on_sweep(
                reading,
                table,
                "detection-missing",
                "warning",
                f"{table.name} has an amplitude, and the sheet does not say how it was driven and detected",
                key="detection",
                remedy="add [detection] to the sheet; without it no dissipation follows from the amplitude",
            )


def convention_missing(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find numbers that may be rms or peak, absolute or gauge, and channels that contradict the detection."""
    seen: set[str | None] = set()
    for table in tables(reading):
        detection = reading.detection_of(table.sweep)
        for name, channel in table.channels.items():
            what = None
            if (
                channel.quantity in _OSCILLATING
                and channel.convention is None
                and (detection is None or channel.quantity == "drive")
            ):
                what = f"channel {name} does not say whether it is rms or peak"
            elif channel.quantity == "pressure" and channel.convention is None and channel.gauge is None:
                what = f"channel {name} does not say whether it is absolute or gauge"
            elif (
                channel.quantity == "amplitude"
                and detection is not None
                and channel.convention not in (None, detection.amplitude_convention)
            ):
                what = f"channel {name} is {channel.convention}, and the detection says {detection.amplitude_convention}"
            if what is None or not channel.use:
                continue
            finding = on_sweep(
                reading,
                table,
                "convention-missing",
                "warning",
                what,
                channel=name,
                remedy="add convention to the channel",
            )
            if finding.field not in seen:
                seen.add(finding.field)
                yield finding

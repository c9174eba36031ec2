"""Quality factors: a ringdown against what the drive gives."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from archive.intake.checks.drive import PEAK
from archive.intake.checks.rows import counting, frequency_hz, tables, temperature
from archive.intake.checks.telling import number, on_sweep
from archive.intake.reading import Reading, SweepTable
from archive.intake.thresholds import Thresholds
from archive.physics.ringdown import ringdown
from schemas.finding import Finding
from schemas.sweep import Detection

__all__ = ["quality_agreement"]


def quality_agreement(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find ringdowns whose Q is not the one that the drive gives: the reference of the detection, or a sweep in the same state."""
    for table in tables(reading, "ringdown"):
        quality, expected = _ringdown_quality(reading, table), _driven_quality(reading, table)
        if quality is None or expected is None:
            continue
        (q, u), (reference, u_reference, origin) = quality, expected
        away = q / reference - 1
        spread = math.hypot(u / q, u_reference / reference)
        if abs(away) > max(thresholds.quality_agreement_fraction, 2 * spread):
            yield on_sweep(
                reading,
                table,
                "quality-agreement",
                "warning",
                f"Q of {table.name} differs by {100 * away:.3g} per cent from that of {origin}",
                found=f"{q:.4g}",
                expected=f"{reference:.4g} within {100 * thresholds.quality_agreement_fraction:g} per cent (quality_agreement_fraction)",
                remedy="look whether amplitude or energy was fitted, whether the gain drifted, and at which temperature each was taken",
            )


def _driven_quality(reading: Reading, table: SweepTable) -> tuple[float, float, str] | None:
    """Q by the drive in the state of a ringdown, its standard uncertainty, and where it is from."""
    detection = reading.detection_of(table.sweep)
    if detection is None or detection.reference_quality_factor is None:
        return None
    reference = detection.reference_quality_factor
    u = (reference.si_uncertainty or 0.0) / reference.si
    if table.sweep.empty_cell:
        return reference.si, u * reference.si, "the detection's reference"
    bath = temperature(reading, table)
    if (
        bath is None
        or detection.reference_signal is None
        or detection.reference_drive is None
        or not np.isfinite(bath).any()
    ):
        return None
    at = float(np.nanmedian(bath))
    for other in tables(reading, "temperature-sweep"):
        same = other.sweep.after_dose == table.sweep.after_dose and not other.sweep.empty_cell
        if not same or reading.sheet.cell_of(other.sweep) != reading.sheet.cell_of(table.sweep):
            continue
        found = _quality_near(reading, other, detection, at)
        if found is not None:
            return found, u * found, f"{other.name} near {number(at, 'K', 3)}"
    return None


def _quality_near(reading: Reading, table: SweepTable, detection: Detection, at: float) -> float | None:
    """Return Q near a temperature from amplitude and drive of a sweep; None with fewer than three rows there."""
    T, signal, drive = temperature(reading, table), table.of_kind("amplitude"), table.of_kind("drive")
    reference, reference_drive, quality = (
        detection.reference_signal,
        detection.reference_drive,
        detection.reference_quality_factor,
    )
    if T is None or signal is None or drive is None or reading.detection_of(table.sweep) != detection:
        return None
    if reference is None or reference_drive is None or quality is None:
        return None
    amplitudes, drives = np.abs(table.columns[signal]), np.abs(table.columns[drive])
    near = counting(table) & np.isfinite(amplitudes) & (drives > 0) & (np.abs(T - at) < 0.05 * at)
    if near.sum() < 3:
        return None
    default = detection.amplitude_convention
    ratio = float(np.median(amplitudes[near])) * PEAK[table.channels[signal].convention or default]
    ratio /= abs(reference.si) * PEAK[reference.convention or default]
    force = (
        float(np.median(drives[near])) * PEAK[table.channels[drive].convention or reference_drive.convention]
    )
    force /= abs(reference_drive.si) * PEAK[reference_drive.convention]
    # Amplitude is Q times torque; the frequency changes by parts in 10^5 and drops out.
    return float(quality.si * ratio / force**detection.torque_exponent)


def _ringdown_quality(reading: Reading, table: SweepTable) -> tuple[float, float] | None:
    time, signal, frequency = table.time, table.values("amplitude"), frequency_hz(reading, table)
    names = [
        name for name, channel in table.channels.items() if channel.quantity == "amplitude" and channel.use
    ]
    if time is None or signal is None or frequency is None or len(names) != 1:
        return None
    rows = counting(table) & np.isfinite(time) & np.isfinite(signal)
    rows[np.flatnonzero(rows)[2000:]] = False  # enough for a Q to a per cent; a check stays quick
    if rows.sum() < 8 or not (np.diff(time[rows]) > 0).all():
        return None
    found = ringdown(time[rows] - time[rows][0], signal[rows], frequency=frequency, convention="amplitude")
    if (
        not found.converged
        or not found.quality_factor > 0
        or not found.standard_uncertainty < 0.1 * found.quality_factor
    ):
        return None
    return found.quality_factor, found.standard_uncertainty

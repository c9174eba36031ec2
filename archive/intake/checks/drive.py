"""Drive and amplitude of an oscillator: linearity, dependence on amplitude, rim velocity, scatter."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from archive.intake.checks.check import History
from archive.intake.checks.rows import (
    counting,
    frequency_hz,
    noise,
    sigma,
    stated_uncertainty,
    tables,
)
from archive.intake.checks.telling import number, on_sweep
from archive.intake.reading import Reading, SweepTable
from archive.intake.thresholds import Thresholds
from archive.physics.constants import HBAR, MASS_HELIUM4
from schemas.finding import Finding

__all__ = [
    "PEAK",
    "amplitude_dependence",
    "diffusion_length_m",
    "drive_beyond_regime",
    "drive_linearity",
    "period_scatter",
    "period_scatter_history",
    "velocity_critical",
    "velocity_film",
]

PEAK = {"rms": math.sqrt(2.0), "peak": 1.0, "peak-to-peak": 0.5, None: 1.0}
"""Factor to the peak value of a sine."""


def diffusion_length_m(frequency: float) -> float:
    """Return r_D = sqrt(14 D/omega) with D = hbar/(4 m), in m.

    References
    ----------
    P. W. Adams, W. I. Glaberson, Phys. Rev. Lett. 57, 82 (1986), for D at the static transition; 14 after V. Ambegaokar,
    B. I. Halperin, D. R. Nelson, E. D. Siggia, Phys. Rev. B 21, 1806 (1980), from memory.

    Examples
    --------
    >>> round(diffusion_length_m(1000.0) * 1e6, 2)
    2.97
    """
    return math.sqrt(14 * HBAR / (4 * MASS_HELIUM4) / (2 * math.pi * frequency))


def drive_linearity(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find drive sweeps whose amplitude is not proportional to the drive (to the power that the detection states)."""
    for table in tables(reading, "drive-sweep"):
        drive, amplitude = table.values("drive"), table.values("amplitude")
        if drive is None or amplitude is None:
            continue
        detection = reading.detection_of(table.sweep)
        x, y = np.abs(drive) ** (1 if detection is None else detection.torque_exponent), np.abs(amplitude)
        rows = counting(table) & np.isfinite(x) & np.isfinite(y)
        x, y = x[rows], y[rows]
        if len(x) < 3 or not x.max() > 1.2 * x.min():
            continue
        slope = float(np.dot(x, y) / np.dot(x, x))
        residual = float(np.max(np.abs(y - slope * x)) / np.max(y)) if np.max(y) > 0 else 0.0
        if residual > thresholds.drive_linearity_fraction:
            yield on_sweep(
                reading,
                table,
                "drive-linearity",
                "warning",
                f"amplitude against drive in {table.name} leaves a line through zero by {100 * residual:.3g} per cent of the largest amplitude",
                expected=f"at most {100 * thresholds.drive_linearity_fraction:g} per cent (drive_linearity_fraction)",
                remedy="use drives in the linear range for the dissipation, or waive it with the reason",
            )


def amplitude_dependence(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find drive sweeps in which the period moves between the largest drive and about a third of it."""
    for table in tables(reading, "drive-sweep"):
        drive, period, name = table.values("drive"), table.values("period"), table.of_kind("period")
        if drive is None or period is None or name is None:
            continue
        rows = counting(table) & np.isfinite(drive) & np.isfinite(period)
        levels = np.unique(
            np.round(np.abs(drive[rows]) / max(float(np.max(np.abs(drive[rows]), initial=0)), 1e-300), 4)
        )
        if len(levels) < 2:
            continue
        third = levels[int(np.argmin(np.abs(levels - 1 / 3)))]
        scaled = np.round(np.abs(drive) / float(np.max(np.abs(drive[rows]))), 4)
        high, low = period[rows & (scaled == 1.0)], period[rows & (scaled == third)]
        u = sigma(table, name) * math.sqrt(1 / len(high) + 1 / len(low))
        shift = float(high.mean() - low.mean())
        if third < 1.0 and u > 0 and abs(shift) > thresholds.amplitude_shift_sigma * u:
            yield on_sweep(
                reading,
                table,
                "amplitude-dependence",
                "warning",
                f"the period of {table.name} moves by {number(shift * 1e9, 'ns', 3)} between the largest drive and {third:.2g} of it",
                found=f"{abs(shift) / u:.3g} sigma",
                expected=f"at most {thresholds.amplitude_shift_sigma:g} sigma (amplitude_shift_sigma)",
                remedy="measure at lower drives, extrapolate to zero amplitude, or waive it with the reason",
            )


def _rim_velocity(reading: Reading, table: SweepTable) -> float | None:
    """Largest rim velocity of a sweep in m/s, peak, from the reference point of its detection."""
    detection, signal = reading.detection_of(table.sweep), table.of_kind("amplitude")
    if (
        detection is None
        or detection.reference_rim_velocity is None
        or detection.reference_signal is None
        or signal is None
    ):
        return None
    channel, values = table.channels[signal], np.where(counting(table), table.columns[signal], np.nan)
    if not np.isfinite(values).any() or detection.reference_signal.si == 0:
        return None
    convention = channel.convention or detection.amplitude_convention
    ratio = float(np.nanmax(np.abs(values))) * PEAK[convention]
    ratio /= (
        abs(detection.reference_signal.si)
        * PEAK[detection.reference_signal.convention or detection.amplitude_convention]
    )
    velocity = detection.reference_rim_velocity
    return ratio * abs(velocity.si) * PEAK[velocity.convention]


def _film_sweeps(reading: Reading) -> Iterator[tuple[SweepTable, float, float]]:
    """Sweeps of a film with the largest rim velocity and the frequency."""
    for table in tables(reading, "temperature-sweep", "dose-run"):
        velocity, frequency = _rim_velocity(reading, table), frequency_hz(reading, table)
        film = (
            not table.sweep.empty_cell
            and table.sweep.gas == "helium"
            and reading.substrate_of(table.sweep) is not None
        )
        if film and velocity is not None and frequency is not None:
            yield table, velocity, frequency


def drive_beyond_regime(reading: Reading, thresholds: Thresholds, earlier: History) -> Iterator[Finding]:
    """Find temperature sweeps driven beyond the rim speed up to which an earlier cooldown found the cell to be linear."""
    for table in tables(reading, "temperature-sweep", "dose-run"):
        cell, velocity = reading.cell_of(table.sweep), _rim_velocity(reading, table)
        regime = None if cell is None else earlier.regimes.get(cell.name)
        if cell is None or regime is None or velocity is None:
            continue
        limit = regime.velocity * PEAK["rms"]
        if velocity > limit:
            words = "is known to be linear" if regime.found else "was tried"
            yield on_sweep(
                reading,
                table,
                "drive-beyond-regime",
                "warning" if regime.found else "note",
                f"the rim of {table.name} moves at up to {number(1e3 * velocity, 'mm/s', 3)} (peak), faster than {cell.name} {words}",
                expected=f"at most {number(1e3 * limit, 'mm/s', 3)} (peak), by {regime.address}",
                remedy="drive less, take a drive sweep that reaches as far, or waive it with the reason",
            )


def velocity_film(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find films driven so fast that vortex pairs are torn apart."""
    for table, velocity, frequency in _film_sweeps(reading):
        limit = thresholds.film_velocity_fraction * HBAR / (MASS_HELIUM4 * diffusion_length_m(frequency))
        if velocity > limit:
            yield on_sweep(
                reading,
                table,
                "velocity-film",
                "warning",
                f"the rim of {table.name} moves at up to {number(1e3 * velocity, 'mm/s', 3)} (peak)",
                expected=f"at most {number(1e3 * limit, 'mm/s', 3)}, which is {thresholds.film_velocity_fraction:g} hbar/(m r_D) (film_velocity_fraction)",
                remedy="repeat one sweep at a smaller drive, or waive it with the reason; the peak is suppressed and shifted down",
            )


def velocity_critical(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find films driven faster than films carry without extra dissipation."""
    for table, velocity, _ in _film_sweeps(reading):
        if velocity > thresholds.film_velocity_m_per_s:
            yield on_sweep(
                reading,
                table,
                "velocity-critical",
                "warning",
                f"the rim of {table.name} moves at up to {number(100 * velocity, 'cm/s', 3)} (peak)",
                expected=f"at most {number(100 * thresholds.film_velocity_m_per_s, 'cm/s')} (film_velocity_m_per_s)",
                remedy="compare temperature sweeps at two drives, or waive it with the reason",
            )


def period_scatter(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Note periods that scatter more than their stated uncertainty."""
    for table in tables(reading, "temperature-sweep", "dose-run", "drive-sweep"):
        name = table.of_kind("period")
        if (
            name is None
            or table.channels[name].uncertainty is None
            or table.channels[name].uncertainty_is == "run"
        ):
            continue
        values = np.where(counting(table), table.columns[name], np.nan)
        try:
            stated = stated_uncertainty(table.channels[name], values)
        except ValueError:  # told of by the check of the sheet's texts
            continue
        scatter = noise(values)
        if stated is None or not scatter > 0 or not np.isfinite(stated).any():
            continue
        usual = float(np.nanmedian(stated))
        if usual > 0 and scatter > thresholds.allan_factor * usual:
            yield on_sweep(
                reading,
                table,
                "period-scatter",
                "note",
                f"the period of {table.name} scatters by {number(scatter * 1e12, 'ps', 3)} from row to row",
                channel=name,
                expected=f"at most {thresholds.allan_factor:g} times the stated {number(usual * 1e12, 'ps', 3)} (allan_factor)",
                remedy="look for vibration or a weak lock, or state the uncertainty that the record shows",
            )


def period_scatter_history(reading: Reading, thresholds: Thresholds, earlier: History) -> Iterator[Finding]:
    """Find periods that scatter more than those of the same cell used to."""
    for table in tables(reading, "temperature-sweep", "dose-run"):
        cell, values = reading.cell_of(table.sweep), table.values("period")
        usual = None if cell is None else earlier.scatter.get(cell.name)
        if cell is None or values is None or usual is None or not usual > 0:
            continue
        values = np.where(counting(table), values, np.nan)
        scatter = noise(values) / float(np.nanmedian(values)) if np.isfinite(values).any() else math.nan
        if scatter > thresholds.allan_factor * usual:
            yield on_sweep(
                reading,
                table,
                "period-scatter-history",
                "warning",
                f"the period of {table.name} scatters by {scatter:.3g} of itself, {scatter / usual:.3g} times the usual of {cell.name}",
                expected=f"at most {thresholds.allan_factor:g} times {usual:.3g} (allan_factor)",
                remedy="look for vibration or a weak lock, or waive it with the reason",
            )

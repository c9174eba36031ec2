"""Forward models: what the instruments of the invented laboratory would have read.

Rules: pure functions of the truth, the conditions and a random generator; arrays in SI units; no files. Every noise
is normal with the standard deviation that the sheet states for it.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from archive.demo.film import planar_transition, response_of
from archive.demo.truth import CellTruth, OscillatorTruth, PlanarFilm, SensorTruth

if TYPE_CHECKING:
    import numpy.typing as npt

    Floats = npt.NDArray[np.float64]

__all__ = [
    "OscillatorRecord",
    "background_period",
    "drive_sweep",
    "film_sweep",
    "frequency_sweep",
    "oscillator_record",
    "resistance",
    "ringdown",
    "sweep_temperatures",
    "temperature_of",
    "transition_temperature",
]


@dataclass(frozen=True)
class OscillatorRecord:
    """Readings of an oscillator, one row each.

    Attributes
    ----------
    temperature : ndarray
        The true temperature in K, which no file holds.
    resistance, period, amplitude, drive : ndarray
        As read: Ohm, s, V rms, V rms.
    """

    temperature: Floats
    resistance: Floats
    period: Floats
    amplitude: Floats
    drive: Floats


def temperature_of(sensor: SensorTruth, reading: npt.ArrayLike) -> Floats:
    """Return the true temperature in K for a resistance in Ohm."""
    z = np.log(np.asarray(reading, dtype=np.float64)) - sensor.centre
    logarithm: Floats = np.polynomial.polynomial.polyval(z, np.array(sensor.coefficients))
    return np.exp(logarithm)


def resistance(sensor: SensorTruth, temperature: npt.ArrayLike) -> Floats:
    """Return the true resistance in Ohm at a temperature in K: `temperature_of` inverted by Newton's method."""
    target = np.log(np.asarray(temperature, dtype=np.float64))
    coefficients = np.array(sensor.coefficients)
    slopes = np.polynomial.polynomial.polyder(coefficients)
    z: Floats = (target - coefficients[0]) / coefficients[1]
    for _ in range(60):
        error = np.polynomial.polynomial.polyval(z, coefficients) - target
        step = error / np.polynomial.polynomial.polyval(z, slopes)
        z = z - np.clip(step, -0.3, 0.3)
        if np.max(np.abs(step), initial=0.0) < 1e-14:
            break
    return np.exp(z + sensor.centre)


def transition_temperature(cell: CellTruth, coverage: float) -> float:
    """Return T_KT of the discs or T_c of the porous glass, in K, at a coverage in mol/m^2."""
    if isinstance(cell.film, PlanarFilm):
        return planar_transition(cell.film, coverage)
    return cell.film.transition_temperature(coverage)


def background_period(oscillator: OscillatorTruth, temperature: npt.ArrayLike) -> Floats:
    """Return the period of the empty cell in s."""
    T = np.asarray(temperature, dtype=np.float64)
    return oscillator.period + oscillator.period_slope * T + oscillator.period_curvature * T**2


def _background_loss(oscillator: OscillatorTruth, T: Floats) -> Floats:
    return oscillator.loss + oscillator.loss_slope * T + oscillator.loss_curvature * T**2


def _period_and_loss(cell: CellTruth, T: Floats, coverage: npt.ArrayLike) -> tuple[Floats, Floats]:
    oscillator, film = cell.oscillator, cell.film
    n = np.asarray(coverage, dtype=np.float64)
    real, imaginary = response_of(film, T, n)
    per_coverage = oscillator.loading * film.area
    empty = background_period(oscillator, T)
    period = empty + per_coverage * (n - (1 - film.chi) * real)
    # 2 (period drop)/P and the added 1/Q are real and imaginary part of one quantity (Ambegaokar, Halperin, Nelson,
    # Siggia 1980; Bishop, Reppy 1980, from memory).
    loss = _background_loss(oscillator, T) + 2 * per_coverage * (1 - film.chi) * imaginary / period
    return period, loss


def oscillator_record(
    cell: CellTruth,
    temperature: npt.ArrayLike,
    coverage: npt.ArrayLike,
    rng: np.random.Generator,
    *,
    cadence: float = 60.0,
    drive: npt.ArrayLike | None = None,
) -> OscillatorRecord:
    """Return what period counter, lock-in amplifier and bridge read.

    Parameters
    ----------
    cell : CellTruth
    temperature : array_like, shape (rows,)
        True temperature in K of every row.
    coverage : array_like
        True coverage in mol/m^2, one number or one a row.
    rng : numpy.random.Generator
    cadence : float
        Seconds between rows; the slow drift grows with them.
    drive : array_like, optional
        V rms; the cell's usual drive if left out.

    Returns
    -------
    OscillatorRecord

    Notes
    -----
    Torque goes with the drive (ac on a fixed bias) and the signal with the rim's velocity, so that the signal is
    proportional to drive times Q over P. The sweep is slow: amplitude and period are those at rest.
    """
    oscillator, sensor = cell.oscillator, cell.sensor
    T = np.asarray(temperature, dtype=np.float64)
    level = np.broadcast_to(
        np.asarray(oscillator.drive if drive is None else drive, dtype=np.float64), T.shape
    )
    period, loss = _period_and_loss(cell, T, coverage)
    signal = (
        oscillator.signal
        * (level / oscillator.drive)
        * (oscillator.loss / loss)
        * (oscillator.period / period)
    )
    shift = (
        oscillator.offset * rng.standard_normal()
        + oscillator.drift * rng.standard_normal() * cadence * np.arange(T.size)
    )
    return OscillatorRecord(
        temperature=T,
        resistance=resistance(sensor, T) * (1 + sensor.reading * rng.standard_normal(T.size)),
        period=period + shift + oscillator.noise * rng.standard_normal(T.size),
        amplitude=signal * (1 + oscillator.signal_noise * rng.standard_normal(T.size)),
        drive=level.copy(),
    )


def sweep_temperatures(transition: float, *, base: float = 0.055, rows: int = 320) -> Floats:
    """Return the temperatures of a warming film sweep in K: half of the rows within 5 per cent of the transition."""
    fine = rows // 2
    warm = rows // 5
    return np.concatenate(
        [
            np.linspace(base, 0.95 * transition, rows - fine - warm, endpoint=False),
            np.linspace(0.95 * transition, 1.05 * transition, fine, endpoint=False),
            np.linspace(1.05 * transition, 1.27 * transition, warm),
        ]
    )


def film_sweep(
    cell: CellTruth, coverage: float, rng: np.random.Generator, *, rows: int = 320, down: bool = False
) -> OscillatorRecord:
    """Return a temperature sweep through the transition of a film.

    Parameters
    ----------
    cell : CellTruth
    coverage : float
        True coverage in mol/m^2; the film must flow at 0.1 K.
    rng : numpy.random.Generator
    rows : int
    down : bool
        Cooling instead of warming.

    Returns
    -------
    OscillatorRecord
    """
    transition = transition_temperature(cell, coverage)
    if not transition > 0.1:
        raise ValueError(f"coverage: found {coverage}, expected one whose film flows at 0.1 K")
    base = max(0.055, 1.08 * cell.sensor.low)
    T = sweep_temperatures(transition, base=base, rows=rows)
    return oscillator_record(cell, T[::-1] if down else T, coverage, rng)


def ringdown(
    cell: CellTruth,
    temperature: float,
    coverage: float,
    rng: np.random.Generator,
    *,
    rows: int = 400,
    step: float = 2.0,
    floor: float = 4e-7,
) -> tuple[Floats, Floats, float]:
    """Return a free decay: elapsed time in s, lock-in magnitude in V rms, and the true Q.

    Parameters
    ----------
    cell : CellTruth
    temperature, coverage : float
        K, mol/m^2.
    rng : numpy.random.Generator
    rows : int
    step : float
        Seconds between rows.
    floor : float
        Standard deviation in V of either quadrature; the magnitude never falls below it.
    """
    period, loss = _period_and_loss(cell, np.array([temperature]), coverage)
    quality = 1 / float(loss[0])
    decay = quality * float(period[0]) / math.pi
    elapsed: Floats = step * np.arange(rows, dtype=np.float64)
    signal = cell.oscillator.signal * cell.oscillator.loss * quality * np.exp(-elapsed / decay)
    noise = floor * rng.standard_normal((2, rows))
    magnitude: Floats = np.hypot(signal + noise[0], noise[1])
    return elapsed, magnitude, quality


def drive_sweep(
    cell: CellTruth,
    temperature: float,
    coverage: float,
    rng: np.random.Generator,
    *,
    levels: int = 15,
    each: int = 12,
) -> OscillatorRecord:
    """Return readings at rising drive, `each` rows a level, up to 1.5 times the usual drive; the response is linear."""
    drive = np.repeat(cell.oscillator.drive * np.linspace(0.1, 1.5, levels), each)
    return oscillator_record(cell, np.full(drive.size, temperature), coverage, rng, drive=drive)


def frequency_sweep(
    cell: CellTruth, temperature: float, rng: np.random.Generator, *, rows: int = 241, widths: float = 8.0
) -> tuple[Floats, Floats, Floats]:
    """Return a slow sweep over the empty cell's resonance: frequency in Hz, in-phase and quadrature signal in V rms.

    Notes
    -----
    Lock-in convention exp(+i w t): signal = A Q/(1 + 2 i Q (f - f0)/f0), turned by 0.3 rad, on a constant
    feed-through of 2 per cent of its height. `widths` is the span in units of f0/Q.
    """
    period, loss = _period_and_loss(cell, np.array([temperature]), 0.0)
    f0, quality = 1 / float(period[0]), 1 / float(loss[0])
    f = f0 * (1 + widths * np.linspace(-0.5, 0.5, rows) / quality)
    top = cell.oscillator.signal * cell.oscillator.loss * quality
    z = top * np.exp(0.3j) / (1 + 2j * quality * (f - f0) / f0) + 0.02 * top * np.exp(-1.1j)
    noise = cell.oscillator.signal * cell.oscillator.signal_noise * rng.standard_normal((2, rows))
    return f, z.real + noise[0], z.imag + noise[1]

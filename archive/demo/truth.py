"""What is true in the invented laboratory: two cells, two films, two sensors, and how well each was measured.

Rules: everything here is invented; nobody's apparatus or data is described. Values are in SI units; what the sheets
say instead is drawn in `archive.demo.stated`.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Final

import numpy as np

__all__ = [
    "PG2",
    "TO4",
    "CellTruth",
    "OscillatorTruth",
    "PlanarFilm",
    "PorousFilm",
    "SensorTruth",
    "remounted",
]

INERT: Final = 24.0e-6
"""mol/m^2 that never flows on the discs, of the size stated for rough surfaces (common practice, no source)."""


@dataclass(frozen=True)
class SensorTruth:
    """A resistance thermometer: ln(T/K) = sum b_i (ln(R/Ohm) - centre)^i, falling with R.

    Attributes
    ----------
    name : str
    coefficients : tuple of float
        b_i.
    centre : float
    low, high : float
        Range of the relation in K (PLTS-2000).
    reading : float
        Relative standard uncertainty of one reading of R.
    calibration : float
        Relative standard uncertainty of a calibrated temperature, common to all readings of one calibration.
    """

    name: str
    coefficients: tuple[float, ...]
    centre: float
    low: float
    high: float
    reading: float = 2e-5
    calibration: float = 1.0e-3


@dataclass(frozen=True)
class PlanarFilm:
    """A film that unbinds vortex pairs.

    Attributes
    ----------
    area : float
        m^2 of substrate.
    inert : float
        Coverage that stays normal, mol/m^2.
    chi : float
        Part of the superfluid that the substrate drags along.
    b, x0 : float
        Non-universal constant of the transition, and the bare start of the flow at T_KT.
    log_diffusion : float
        ln(D/(a^2 w)).
    free_vortices : float
        F.
    """

    area: float
    inert: float = INERT
    chi: float = 0.12
    b: float = 5.5
    x0: float = -0.5
    log_diffusion: float = 12.0
    free_vortices: float = 1.0


@dataclass(frozen=True)
class PorousFilm:
    """A film on connected pores: a power law in 1 - T/T_c and no jump.

    Attributes
    ----------
    area, inert, chi : float
        As for the planar film.
    exponent : float
        zeta.
    amplitude : float
        n_s = amplitude (n - inert) (1 - T/T_c)^zeta, exactly, for 1 - T/T_c up to `window`.
    window : float
    kelvin_per_coverage : float
        T_c over n - inert, K m^2/mol.
    """

    area: float
    inert: float = 22.0e-6
    chi: float = 0.50
    exponent: float = 0.67
    amplitude: float = 2.2
    window: float = 0.12
    kelvin_per_coverage: float = 1 / 12.0e-6

    def transition_temperature(self, coverage: float) -> float:
        """Return T_c in K at a coverage in mol/m^2; zero where nothing flows."""
        return max(coverage - self.inert, 0.0) * self.kelvin_per_coverage


@dataclass(frozen=True)
class OscillatorTruth:
    """A torsional oscillator.

    Attributes
    ----------
    period, period_slope, period_curvature : float
        Empty-cell period P_0 + P_1 T + P_2 T^2 in s, s/K, s/K^2.
    loss, loss_slope, loss_curvature : float
        Empty-cell 1/Q, likewise.
    loading : float
        Period per amount of fully coupled helium, s/mol.
    inertia, gyration : float
        kg m^2 and m^2 as the workshop drawing gives them; the loading they imply is 1 per cent off.
    drive, signal : float
        Drive (V rms) and the signal (V rms) it gives at the empty cell's base temperature.
    rim_velocity : float
        Peak rim speed at that signal, m/s.
    noise, signal_noise : float
        Standard uncertainty of one reading: of the period in s, of the signal as a fraction.
    offset, drift : float
        Standard deviations of the shift of the period between sweeps (s) and of its slope within one (s/s).
    """

    period: float
    period_slope: float
    period_curvature: float
    loss: float
    loss_slope: float
    loss_curvature: float
    loading: float
    inertia: float
    gyration: float
    drive: float
    signal: float
    rim_velocity: float
    noise: float = 1.5e-12
    signal_noise: float = 2e-4
    offset: float = 4e-12
    drift: float = 3e-18


@dataclass(frozen=True)
class CellTruth:
    """A cell with its film, its thermometer and its gas handling.

    Attributes
    ----------
    name : str
    oscillator : OscillatorTruth
    film : PlanarFilm or PorousFilm
    sensor : SensorTruth
    doser_volume : float
        m^3.
    area_uncertainty, volume_uncertainty : float
        Relative standard uncertainties of what the sheet states.
    gauge_gain, gauge_reading, gauge_zero, zero_uncertainty : float
        Relative uncertainty of the gauge's gain; standard uncertainty of a reading, zero and its uncertainty in Pa.
    quality_uncertainty : float
        Relative standard uncertainty of the stated reference quality factor.
    """

    name: str
    oscillator: OscillatorTruth
    film: PlanarFilm | PorousFilm
    sensor: SensorTruth
    doser_volume: float
    area_uncertainty: float = 0.02
    volume_uncertainty: float = 8e-4
    gauge_gain: float = 8e-4
    gauge_reading: float = 0.02
    gauge_zero: float = 1.9
    zero_uncertainty: float = 0.05
    quality_uncertainty: float = 2e-3


TO4: Final = CellTruth(
    name="TO-4",
    oscillator=OscillatorTruth(
        period=1.003214067e-3,
        period_slope=1.1e-9,
        period_curvature=2.6e-9,
        loss=2.5e-6,
        loss_slope=1.5e-7,
        loss_curvature=2.5e-7,
        loading=1.118e-4,
        inertia=5.00e-7,
        gyration=2.81e-5,
        drive=0.100,
        signal=1.500e-3,
        rim_velocity=0.18e-3,
    ),
    film=PlanarFilm(area=1.607),
    sensor=SensorTruth("RX-2", (-1.6104, -2.0667, 0.5896, -0.1858), float(np.log(5000.0)), 0.015, 1.0),
    doser_volume=25.06e-6,
)
"""Stack of polyimide discs on a beryllium copper rod, near 1 kHz."""

PG2: Final = CellTruth(
    name="PG-2",
    oscillator=OscillatorTruth(
        period=1.387052310e-3,
        period_slope=0.9e-9,
        period_curvature=1.9e-9,
        loss=4.5e-6,
        loss_slope=2.0e-7,
        loss_curvature=3.0e-7,
        loading=3.90e-5,
        inertia=1.50e-6,
        gyration=2.11e-5,
        drive=0.200,
        signal=1.200e-3,
        rim_velocity=0.18e-3,
        noise=3e-12,
    ),
    film=PorousFilm(area=108.6),
    sensor=SensorTruth("GE-1", (-1.6125, -0.5238, 0.0521, -0.0147), float(np.log(1000.0)), 0.055, 1.0),
    doser_volume=1.0021e-3,
    gauge_reading=0.05,
    gauge_zero=-3.5,
    zero_uncertainty=0.2,
)
"""Rod of porous glass in a beryllium copper shell, near 720 Hz."""


def remounted(cell: CellTruth) -> CellTruth:
    """Return the cell a year later: remounted, its background shifted, its sensor drifted by some mK.

    Notes
    -----
    The sensor reads 0.8 per cent high in T by its old calibration (4 mK at 0.5 K); the discs and the gas handling are
    untouched.
    """
    b0, b1, *rest = cell.sensor.coefficients
    oscillator = replace(
        cell.oscillator,
        period=cell.oscillator.period - 2.3e-9,
        period_slope=cell.oscillator.period_slope + 0.15e-9,
        loss=cell.oscillator.loss * 1.04,
    )
    sensor = replace(cell.sensor, coefficients=(b0 - 0.008, b1 + 0.002, *rest))
    return replace(cell, oscillator=oscillator, sensor=sensor)

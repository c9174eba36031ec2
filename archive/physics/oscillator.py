"""Torsional oscillator: period, inertia, mass loading, dissipation from the amplitude, lock phase.

Rules: amplitudes of angle are peak values; the torsion constant does not change when helium enters, so dissipation at
constant torque has no frequency factor but that of the transducer.

References
----------
Driven harmonic oscillator, derived here. Use for films: D. J. Bishop, J. D. Reppy, Phys. Rev. Lett. 40, 1727 (1978), Phys. Rev. B 22, 5171 (1980)
(from memory).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray, same_length, series

__all__ = [
    "DriveReference",
    "corrected_frequency",
    "dissipation_from_amplitude",
    "dissipation_from_torque",
    "fractional_period_change",
    "period",
    "period_per_areal_density",
    "period_per_mass",
    "rim_velocity",
    "torsion_constant",
    "transient_correction",
]


def period(*, inertia: npt.ArrayLike, torsion_constant: npt.ArrayLike) -> FloatArray:
    """Return the period ``2 pi sqrt(I/kappa)``, s.

    Parameters
    ----------
    inertia : array_like
        kg m^2, > 0.
    torsion_constant : array_like
        N m/rad, > 0.
    """
    ratio = np.asarray(inertia, dtype=np.float64) / np.asarray(torsion_constant, dtype=np.float64)
    return np.asarray(2 * math.pi * np.sqrt(ratio))


def torsion_constant(*, frequency: npt.ArrayLike, inertia: npt.ArrayLike) -> FloatArray:
    """Return ``kappa = I (2 pi f)^2``, N m/rad, from frequency in Hz and inertia in kg m^2."""
    omega = 2 * math.pi * np.asarray(frequency, dtype=np.float64)
    return np.asarray(np.asarray(inertia, dtype=np.float64) * omega**2)


def fractional_period_change(relative_inertia: npt.ArrayLike) -> FloatArray:
    """Return ``sqrt(1 + dI/I) - 1``, exact and without cancellation.

    Parameters
    ----------
    relative_inertia : array_like
        Change of inertia over inertia, > -1.
    """
    change = np.asarray(relative_inertia, dtype=np.float64)
    return np.asarray(change / (np.sqrt(1 + change) + 1))


def period_per_mass(*, period: float, inertia: float, mean_square_radius: float) -> float:
    """Return the mass sensitivity ``P R_g^2/(2 I)``, s/kg.

    Parameters
    ----------
    period : float
        s.
    inertia : float
        Of the bob (of the mode, if the oscillator has two), kg m^2.
    mean_square_radius : float
        Of the substrate area about the axis, m^2: R^2 for a rim, R^2/2 for a uniform disc or stack, (R1^2 + R2^2)/2 for an
        annulus.

    Notes
    -----
    A check on the measured mass loading; agreement within about 10 per cent is usual (common practice, no source).
    """
    return period * mean_square_radius / (2 * inertia)


def period_per_areal_density(
    *, period: float, inertia: float, mean_square_radius: float, area: float
) -> float:
    """Return the sensitivity to areal mass ``P A R_g^2/(2 I)``, s m^2/kg.

    Parameters
    ----------
    period, inertia, mean_square_radius
        As in `period_per_mass`.
    area : float
        Substrate area, m^2.

    Examples
    --------
    >>> round(period_per_areal_density(period=1e-3, inertia=5e-7, mean_square_radius=2.8e-5, area=1.5), 12)
    0.042
    """
    return area * period_per_mass(period=period, inertia=inertia, mean_square_radius=mean_square_radius)


def dissipation_from_torque(
    *, torque: npt.ArrayLike, torsion_constant: float, amplitude: npt.ArrayLike
) -> FloatArray:
    """Return ``Q^-1 = N/(kappa theta)`` on resonance.

    Parameters
    ----------
    torque : array_like
        Peak drive torque, N m.
    torsion_constant : float
        N m/rad; not ``I w^2`` with a frozen I or w.
    amplitude : array_like
        Peak angle, rad, > 0.
    """
    theta = np.asarray(amplitude, dtype=np.float64)
    return np.asarray(torque, dtype=np.float64) / (torsion_constant * theta)


@dataclass(frozen=True)
class DriveReference:
    """A point where the dissipation is known, e.g. from a ringdown.

    Attributes
    ----------
    dissipation : float
        Q^-1 there.
    drive : float
        Drive voltage there.
    signal : float
        Detected signal there, in the unit of the record.
    frequency : float
        Hz.
    drive_power : int
        p: 1 for an ac drive on a dc bias (torque proportional to the drive), 2 for an ac drive alone (torque at twice the
        frequency).
    signal_power : int
        s: 0 for displacement or charge detection, 1 for velocity or current detection.
    """

    dissipation: float
    drive: float
    signal: float
    frequency: float
    drive_power: int
    signal_power: int

    def __post_init__(self) -> None:
        """Refuse powers the transducers do not have, and values that are not positive."""
        if self.drive_power not in {1, 2}:
            raise ValueError(f"drive_power: found {self.drive_power}, expected 1 or 2")
        if self.signal_power not in {0, 1}:
            raise ValueError(f"signal_power: found {self.signal_power}, expected 0 or 1")
        for name in ("dissipation", "drive", "signal", "frequency"):
            if not getattr(self, name) > 0:
                raise ValueError(f"{name}: found {getattr(self, name)}, expected > 0")


def dissipation_from_amplitude(
    *,
    signal: npt.ArrayLike,
    drive: npt.ArrayLike,
    frequency: npt.ArrayLike,
    reference: DriveReference,
    lock_phase: npt.ArrayLike = 0.0,
) -> FloatArray:
    """Return Q^-1 from the detected amplitude, against a reference point.

    Parameters
    ----------
    signal, drive : array_like
        In the units of the reference; signal > 0.
    frequency : array_like
        Hz.
    reference : DriveReference
    lock_phase : array_like
        Phase error of the loop against resonance, rad, below pi/2 in size.

    Returns
    -------
    ndarray
        ``Q_ref^-1 (V/V_ref)^p (S_ref/S) (w/w_ref)^s cos(phi)``.

    Notes
    -----
    Assumes a linear response; on a drift add `transient_correction` or wait five ring times.
    """
    drive_ratio = np.asarray(drive, dtype=np.float64) / reference.drive
    signal_ratio = reference.signal / np.asarray(signal, dtype=np.float64)
    frequency_ratio = np.asarray(frequency, dtype=np.float64) / reference.frequency
    return np.asarray(
        reference.dissipation
        * drive_ratio**reference.drive_power
        * signal_ratio
        * frequency_ratio**reference.signal_power
        * np.cos(lock_phase)
    )


def transient_correction(
    time: npt.ArrayLike, amplitude: npt.ArrayLike, frequency: npt.ArrayLike
) -> FloatArray:
    """Return what to add to Q^-1 because the amplitude is still on its way, ``-(2/(w theta)) dtheta/dt``.

    Parameters
    ----------
    time : array_like
        s, strictly increasing, at least three points.
    amplitude : array_like
        Any unit, > 0.
    frequency : array_like
        Hz; a scalar serves all.

    Raises
    ------
    ValueError
        Times that do not increase, amplitudes not positive, lengths that differ.

    Notes
    -----
    From the slow-amplitude equation ``dtheta/dt = -(w/2Q) theta + N w/(2 kappa)``. The derivative is a central difference of
    ln(theta): smooth a noisy record first.
    """
    t = series("time", time, least=3)
    theta = series("amplitude", amplitude, positive=True)
    same_length(time=t, amplitude=theta)
    if not (np.diff(t) > 0).all():
        index = int(np.argmax(np.diff(t) <= 0)) + 1
        raise ValueError(f"time[{index}]: found {t[index]}, expected more than {t[index - 1]}")
    omega = 2 * math.pi * np.asarray(frequency, dtype=np.float64)
    return np.asarray(-2 / omega * np.gradient(np.log(theta), t))


def rim_velocity(*, radius: float, frequency: npt.ArrayLike, amplitude: npt.ArrayLike) -> FloatArray:
    """Return the peak velocity of the rim, ``R 2 pi f theta``, m/s; `amplitude` is the peak angle in rad, not rms."""
    omega = 2 * math.pi * np.asarray(frequency, dtype=np.float64)
    return radius * omega * np.asarray(amplitude, dtype=np.float64)


def corrected_frequency(
    *,
    drive_frequency: npt.ArrayLike,
    dissipation: npt.ArrayLike,
    in_phase: npt.ArrayLike,
    quadrature: npt.ArrayLike,
    sign: int,
) -> FloatArray:
    """Return the true resonance frequency of a phase-locked record, Hz.

    Parameters
    ----------
    drive_frequency : array_like
        Hz.
    dissipation : array_like
        Q^-1.
    in_phase, quadrature : array_like
        Lock-in components, one unit; in phase not zero.
    sign : int
        +1 if the quadrature over the in-phase part rises when the drive is detuned upwards, else -1; found by a deliberate
        detuning.

    Returns
    -------
    ndarray
        ``f - (f/2Q) tan(phi)``, first order in the detuning over f.

    Raises
    ------
    ValueError
        A sign that is neither.
    """
    if sign not in {1, -1}:
        raise ValueError(f"sign: found {sign}, expected 1 or -1")
    f = np.asarray(drive_frequency, dtype=np.float64)
    tangent = sign * np.asarray(quadrature, dtype=np.float64) / np.asarray(in_phase, dtype=np.float64)
    return np.asarray(f - f / 2 * np.asarray(dissipation, dtype=np.float64) * tangent)

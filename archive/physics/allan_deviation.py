"""Allan deviation of a period or frequency record, and the thermal limit.

Rules: overlapping estimator, no dead time, equally spaced readings; what a counter does inside a reading is not known here.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray, series
from archive.physics.constants import BOLTZMANN

__all__ = ["AllanDeviation", "allan_deviation", "thermal_allan_deviation"]


@dataclass(frozen=True)
class AllanDeviation:
    """Allan deviation at a few averaging times.

    Attributes
    ----------
    tau : ndarray
        Averaging times, s.
    sigma : ndarray
        Overlapping Allan deviation, dimensionless.
    averages : ndarray of int
        Number of differences in each.
    """

    tau: FloatArray
    sigma: FloatArray
    averages: npt.NDArray[np.int64]


def allan_deviation(
    values: npt.ArrayLike, *, interval: float, factors: npt.ArrayLike | None = None
) -> AllanDeviation:
    """Return the overlapping Allan deviation of equally spaced readings.

    Parameters
    ----------
    values : array_like
        Periods or frequencies, any unit, > 0, at least three.
    interval : float
        s between readings, > 0, equal to the averaging time of each (no dead time).
    factors : array_like of int, optional
        Averaging factors; by default powers of two up to a third of the record.

    Raises
    ------
    ValueError
        Too few readings, an interval at or below zero, or a factor that leaves no difference.

    Notes
    -----
    Fractional values against the mean. White noise falls as tau^-1/2, drift rises as tau. For counters that average over
    overlapping windows this is not the Allan deviation; their mode must be recorded.

    References
    ----------
    IEEE Std 1139-2022, "Definitions of Physical Quantities for Fundamental Frequency and Time Metrology" (from memory).
    """
    y = series("values", values, least=3, positive=True)
    if not interval > 0:
        raise ValueError(f"interval: found {interval}, expected > 0")
    y = y / y.mean() - 1
    if factors is None:
        chosen = 2 ** np.arange(int(math.log2(y.size / 3)) + 1)
    else:
        chosen = np.atleast_1d(np.asarray(factors, dtype=np.int64))
    for index, m in enumerate(chosen):
        if not 1 <= m <= y.size // 2:
            raise ValueError(f"factors[{index}]: found {m}, expected 1 to {y.size // 2}")
    total = np.concatenate([[0.0], np.cumsum(y)])
    sigma, averages = [], []
    for m in chosen:
        mean = (total[m:] - total[:-m]) / m
        difference = mean[m:] - mean[:-m]
        sigma.append(math.sqrt(0.5 * float(np.mean(difference**2))))
        averages.append(difference.size)
    return AllanDeviation(
        interval * chosen.astype(np.float64), np.array(sigma), np.array(averages, dtype=np.int64)
    )


def thermal_allan_deviation(
    *,
    temperature: float,
    inertia: float,
    frequency: float,
    amplitude: float,
    quality_factor: float,
    tau: npt.ArrayLike,
) -> FloatArray:
    """Return the thermal limit ``sqrt(k_B T/(2 E Q w tau))`` with ``E = I w^2 theta^2/2``.

    Parameters
    ----------
    temperature, inertia, frequency, amplitude, quality_factor : float
        K, kg m^2, Hz, peak angle in rad, and Q.
    tau : array_like
        Averaging times, s.

    References
    ----------
    K. L. Ekinci, Y. T. Yang, M. L. Roukes, "Ultimate limits to inertial mass sensing based upon nanoelectromechanical
    systems", Journal of Applied Physics 95, 2682 (2004) (from memory; same form, derived for an averaging time).
    """
    omega = 2 * math.pi * frequency
    energy = inertia * (omega * amplitude) ** 2 / 2
    return np.sqrt(
        BOLTZMANN * temperature / (2 * energy * quality_factor * omega * np.asarray(tau, dtype=np.float64))
    )

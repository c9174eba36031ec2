"""Uncertainty of a resistance thermometer reading, self-heating and leads.

Rule: the calibration's uncertainty is common to all readings of a sensor; it does not average down, so it is kept apart
until the end.

References
----------
JCGM 100:2008 (GUM), 5.1 for the combination; 4.3.7 for the rectangular distribution.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from archive.physics.ranges import Floats, floats

__all__ = [
    "excitation_power",
    "lead_corrected_resistance",
    "self_heating_uncertainty",
    "temperature_uncertainty",
    "zero_power_resistance",
]


def temperature_uncertainty(
    temperature: ArrayLike,
    *,
    relative_resistance_uncertainty: ArrayLike,
    sensitivity: ArrayLike,
    calibration: ArrayLike = 0.0,
    fit: ArrayLike = 0.0,
    heating: ArrayLike = 0.0,
    drift: ArrayLike = 0.0,
) -> Floats:
    """Return the combined standard uncertainty of one temperature reading.

    Parameters
    ----------
    temperature : float or array_like
        K.
    relative_resistance_uncertainty : float or array_like
        u(R)/R.
    sensitivity : float or array_like
        S = d(ln R)/d(ln T), from `log_sensitivity`.
    calibration, fit, heating, drift : float or array_like
        Standard uncertainties in K; `calibration` is shared by all readings of the sensor.

    Returns
    -------
    ndarray of float64
        K, k = 1: sqrt((T u(R)/(R abs(S)))^2 + the four squares).

    Examples
    --------
    >>> u = temperature_uncertainty(1.0, relative_resistance_uncertainty=1e-4, sensitivity=-2.0)
    >>> float(u)
    5e-05
    """
    reading = floats(temperature) * floats(relative_resistance_uncertainty) / np.abs(floats(sensitivity))
    squares = reading**2
    for part in (calibration, fit, heating, drift):
        squares = squares + floats(part) ** 2
    return np.sqrt(squares)[()]


def excitation_power(rms_current: ArrayLike, resistance: ArrayLike) -> Floats:
    """Return the power in the sensor, I^2 R in W, from the rms current in A and the resistance in ohm."""
    return (floats(rms_current) ** 2 * floats(resistance))[()]


def zero_power_resistance(single: ArrayLike, double: ArrayLike) -> Floats:
    """Return the resistance at no power from readings at one power and at twice that power.

    Parameters
    ----------
    single, double : float or array_like
        Ohm, at current I and at sqrt(2) I.

    Returns
    -------
    ndarray of float64
        2 R1 - R2 in ohm.

    Notes
    -----
    The heating must be linear in power. Repeat at each decade of temperature: the thermal resistance to the stage rises
    steeply towards low temperature.
    """
    return (2 * floats(single) - floats(double))[()]


def self_heating_uncertainty(temperature: ArrayLike, zero_power_temperature: ArrayLike) -> Floats:
    """Return the standard uncertainty from self-heating, abs(T(R1) - T(R0))/sqrt(3) in K.

    Parameters
    ----------
    temperature, zero_power_temperature : float or array_like
        K, at the current in use and at no power.

    Returns
    -------
    ndarray of float64
        K.
    """
    result: Floats = (np.abs(floats(temperature) - floats(zero_power_temperature)) / np.sqrt(3.0))[()]
    return result


def lead_corrected_resistance(reading: ArrayLike, lead_resistance: ArrayLike) -> Floats:
    """Return the sensor's resistance from a two-wire reading and the measured resistance of the leads, all in ohm."""
    return (floats(reading) - floats(lead_resistance))[()]

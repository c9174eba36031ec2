"""Hydrostatic and aerostatic corrections of vapour pressure thermometry.

Rule: in He II the bath is isothermal, so a liquid head is a pressure there and never a temperature.

References
----------
Hydrostatics, derived here; that helium II shows no head as a temperature is common practice, no source.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from archive.physics.constants import (
    GAS_CONSTANT,
    MOLAR_MASS_HELIUM3,
    MOLAR_MASS_HELIUM4,
    STANDARD_GRAVITY,
    T_LAMBDA,
)
from archive.physics.helium_liquid import density
from archive.physics.ranges import Floats, floats, within
from archive.physics.vapour_pressure import Isotope, pressure_its90, temperature_per_pressure

__all__ = ["aerostatic_head", "liquid_head", "liquid_head_temperature", "straight_profile"]


def liquid_head(temperature: ArrayLike, depth: ArrayLike) -> Floats:
    """Return the pressure of a column of liquid 4He.

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 0.1 to 4.2221 K.
    depth : float or array_like
        Depth below the surface in m.

    Returns
    -------
    ndarray of float64
        rho g h in Pa, standard gravity.

    Raises
    ------
    ValueError
        When a temperature is outside the range of the density.
    """
    return (density(temperature) * STANDARD_GRAVITY * floats(depth))[()]


def liquid_head_temperature(temperature: ArrayLike, depth: ArrayLike) -> Floats:
    """Return by how much liquid 4He at a depth is warmer than its surface, if it boils evenly.

    Parameters
    ----------
    temperature : float or array_like
        T90 of the surface in K, 2.1768 to 4.2221 K.
    depth : float or array_like
        Depth below the surface in m.

    Returns
    -------
    ndarray of float64
        rho g h dT/dp in K; 0.13 mK per centimetre at 4.2 K.

    Raises
    ------
    ValueError
        Below the lambda point, where He II conducts so well that the bath has the temperature of its surface.

    Notes
    -----
    A bath whose pressure has been falling may be stratified; then a bulb is the better thermometer.
    """
    T = within(temperature, "temperature", low=T_LAMBDA, high=4.2221, unit="K", formula="the liquid head above the lambda point",
               hint="in He II the bath has the temperature of its surface")  # fmt: skip
    return (liquid_head(T, depth) * temperature_per_pressure(pressure_its90(T)))[()]


def aerostatic_head(
    pressure: ArrayLike, *, height: ArrayLike, temperature: ArrayLike, isotope: Isotope = "4He"
) -> Floats:
    """Return the pressure of a column of helium gas at one temperature.

    Parameters
    ----------
    pressure : float or array_like
        Pa.
    height : float or array_like
        m.
    temperature : float or array_like
        K; sum over pieces of the tube when it is not uniform.
    isotope : {"4He", "3He"}
        Which helium.

    Returns
    -------
    ndarray of float64
        p M g h/(R T) in Pa: the lower end has that much more. About 0.1 Pa per metre at 100 Pa and 4 K.
    """
    molar_mass = MOLAR_MASS_HELIUM3 if isotope == "3He" else MOLAR_MASS_HELIUM4
    result: Floats = np.asarray(
        floats(pressure)
        * molar_mass
        * STANDARD_GRAVITY
        * floats(height)
        / (GAS_CONSTANT * floats(temperature))
    )[()]
    return result


def straight_profile(cold: ArrayLike, warm: ArrayLike) -> Floats:
    """Return the temperature of a uniform gas column as heavy as one whose temperature runs straight between its ends.

    Parameters
    ----------
    cold, warm : float or array_like
        Temperatures of the two ends, K, different.

    Returns
    -------
    ndarray of float64
        (T_warm - T_cold)/ln(T_warm/T_cold) in K: the inverse of the mean of 1/T along the column (derived).

    Examples
    --------
    >>> round(float(straight_profile(4.0, 295.0)), 2)
    67.66
    """
    T1, T2 = floats(cold), floats(warm)
    return ((T2 - T1) / np.log(T2 / T1))[()]

"""Saturated vapour of 4He, and the vapour pressure at which it condenses in a pore.

Rule: below 1.25 K these corrections rest on the vapour pressure estimate; a thermometer never does.

References
----------
H. Preston-Thomas, Metrologia 27, 3 (1990) (pressure from 1.25 K); R. J. Donnelly, C. F. Barenghi, J. Phys. Chem. Ref. Data 27, 1217 (1998) (heat of
evaporation, surface tension, density); Kelvin's equation for a curved surface, elementary.
"""

from __future__ import annotations

from typing import Final, Literal

import numpy as np
from numpy.typing import ArrayLike
from scipy.interpolate import CubicSpline

from archive.physics import tables_helium4_gas as table
from archive.physics.constants import GAS_CONSTANT, MOLAR_MASS_HELIUM4
from archive.physics.helium_gas import molar_density
from archive.physics.helium_liquid import density, surface_tension
from archive.physics.ranges import Floats, floats, within
from archive.physics.vapour_pressure import pressure_estimate, pressure_its90

__all__ = [
    "capillary_condensation_ratio",
    "saturated_molar_density",
    "saturated_vapour_density",
    "saturated_vapour_pressure",
]


def saturated_vapour_pressure(temperature: ArrayLike) -> Floats:
    """Return the vapour pressure of 4He from 0.5 K: ITS-90 from 1.25 K up, the estimate below.

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 0.5 to 5.0 K. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        Pa. For corrections; a thermometer uses `archive.physics.vapour_pressure`, which keeps the two apart.

    Raises
    ------
    ValueError
        When a temperature is outside the range.
    """
    T = within(temperature, "temperature", low=0.5, high=5.0, unit="K", formula="the vapour pressure of 4He")
    result = np.full(T.shape, np.nan)
    cold, warm = T < 1.25, T >= 1.25
    result[cold] = pressure_estimate(T[cold])
    result[warm] = pressure_its90(T[warm])
    return result[()]


_V: Final = np.array(table.SATURATED_VAPOUR)
_nonideality = CubicSpline(_V[:, 0], _V[:, 2] * GAS_CONSTANT * _V[:, 0] / (_V[:, 1] * MOLAR_MASS_HELIUM4))


def saturated_molar_density(temperature: ArrayLike) -> Floats:
    """Return the amount of 4He in a unit of volume of its saturated vapour.

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 0.5 to 4.2221 K. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        mol/m^3. From 1.25 K: 0.1 per cent to 2.75 K, 0.3 to 3.75 K, 0.5 above. Below, it rests on the vapour pressure
        estimate (0.1 per cent).

    Raises
    ------
    ValueError
        When a temperature is outside the range.

    Notes
    -----
    From 1.25 K the ratio to the ideal gas is interpolated in a table made with B and C; below, B alone.

    Examples
    --------
    >>> round(float(saturated_molar_density(2.0)), 1)
    195.7
    """
    T = within(
        temperature,
        "temperature",
        low=0.5,
        high=float(_V[-1, 0]),
        unit="K",
        formula="the saturated vapour density of 4He",
    )
    p = floats(saturated_vapour_pressure(T))
    result = np.full(T.shape, np.nan)
    cold, warm = _V[0, 0] > T, _V[0, 0] <= T
    result[cold] = molar_density(p[cold], T[cold])
    result[warm] = p[warm] / (GAS_CONSTANT * T[warm]) * _nonideality(T[warm])
    return result[()]


def saturated_vapour_density(temperature: ArrayLike) -> Floats:
    """Return the mass density of the saturated vapour of 4He.

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 0.5 to 4.2221 K. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        kg/m^3, uncertain as `saturated_molar_density`.

    Raises
    ------
    ValueError
        When a temperature is outside the range.

    Examples
    --------
    >>> round(float(saturated_vapour_density(4.2221)), 2)
    16.92
    """
    return (MOLAR_MASS_HELIUM4 * saturated_molar_density(temperature))[()]


def capillary_condensation_ratio(
    temperature: ArrayLike, radius: ArrayLike, *, meniscus: Literal["hemispherical", "cylindrical"]
) -> Floats:
    """Return p/p0 at which 4He condenses in a pore.

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 0.1 to 4.2221 K.
    radius : float or array_like
        m, the radius that the adsorbed film leaves free, above 0.
    meniscus : {"hemispherical", "cylindrical"}
        A pore that empties, or the surface of a film in a pore that fills.

    Returns
    -------
    ndarray of float64
        Between 0 and 1. Above the lower of the two the coverage is not a uniform film.

    Raises
    ------
    ValueError
        When an argument is outside its range.

    Notes
    -----
    ln(p/p0) = -f gamma V_m/(r R T) with f = 2 or 1. When substrate attraction and curvature act together a film in a
    cylinder becomes unstable earlier (M. W. Cole, W. F. Saam, Phys. Rev. Lett. 32, 985 (1974), from memory).

    Examples
    --------
    >>> round(float(capillary_condensation_ratio(1.5, 25e-9, meniscus="hemispherical")), 3)
    0.944
    """
    factors = {"hemispherical": 2.0, "cylindrical": 1.0}
    if meniscus not in factors:
        raise ValueError(f"meniscus: found {meniscus!r}, expected 'hemispherical' or 'cylindrical'")
    r = within(radius, "radius", low=float(np.finfo(float).tiny), high=np.inf, unit="m", formula="a pore")
    T = floats(temperature)
    molar_volume = MOLAR_MASS_HELIUM4 / density(T)
    return np.exp(-factors[meniscus] * surface_tension(T) * molar_volume / (r * GAS_CONSTANT * T))[()]

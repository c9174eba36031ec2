"""Density, superfluid fraction, specific heat and surface tension of liquid 4He at saturated vapour pressure.

Rule: each property has its own range and is refused outside it.

References
----------
R. J. Donnelly, C. F. Barenghi, J. Phys. Chem. Ref. Data 27, 1217 (1998). Temperatures are T90.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike
from scipy.interpolate import CubicSpline, PchipInterpolator

from archive.physics import tables_helium4_liquid as table
from archive.physics.constants import T_LAMBDA
from archive.physics.helium_table import (
    FIRST_ABOVE,
    LAST_BELOW,
    checked_temperature,
    reduced_temperature,
    rows_above,
    rows_below,
    two_sides,
)
from archive.physics.lambda_line import LAMBDA_PRESSURE, LAMBDA_SLOPE
from archive.physics.ranges import Floats, within

__all__ = [
    "density",
    "lambda_temperature_estimate",
    "normal_density",
    "specific_heat",
    "superfluid_fraction",
    "surface_tension",
]

_DENSITY_LAMBDA: Final = 146.109  # kg/m^3 at the lambda point, Donnelly and Barenghi (1998)
# zeta: Campostrini, Hasenbusch, Pelissetto, Vicari, Phys. Rev. B 74, 144506 (2006).
_ZETA: Final = 0.6717

_cold_t, _cold_rho = rows_below(table.DENSITY)
_warm_t, _warm_rho = rows_above(table.DENSITY)
_density_below = CubicSpline(np.append(_cold_t, T_LAMBDA), np.append(_cold_rho, _DENSITY_LAMBDA))
_density_above = CubicSpline(np.insert(_warm_t, 0, T_LAMBDA), np.insert(_warm_rho, 0, _DENSITY_LAMBDA))


def density(temperature: ArrayLike) -> Floats:
    """Return the density of liquid 4He at saturated vapour pressure.

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 0.1 to 4.2221 K. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        kg/m^3; the interpolation adds less than 3e-5 of it.

    Raises
    ------
    ValueError
        When a temperature is outside the range.

    References
    ----------
    Donnelly and Barenghi (1998), see the module.

    Examples
    --------
    >>> round(float(density(2.0)), 3)
    145.622
    """
    return two_sides(checked_temperature(temperature, "density"), _density_below, _density_above)


_fraction_t, _f = rows_below(table.SUPERFLUID_FRACTION, 0.7)
_fraction_scaled = PchipInterpolator(
    _fraction_t, _f / reduced_temperature(_fraction_t) ** _ZETA, extrapolate=True
)
_ALL_SUPERFLUID = 0.8  # K; the table has 1.0000 up to here


def _fraction_below(T: Floats) -> Floats:
    scaled = _fraction_scaled(np.clip(T, 0.7, LAST_BELOW))
    fraction: Floats = np.where(
        T <= _ALL_SUPERFLUID, 1.0, np.minimum(scaled * np.maximum(reduced_temperature(T), 0.0) ** _ZETA, 1.0)
    )
    return fraction


def superfluid_fraction(temperature: ArrayLike) -> Floats:
    """Return the superfluid fraction rho_s/rho of liquid 4He at saturated vapour pressure.

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 0.1 to 4.2221 K. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        Between 0 and 1; zero above the lambda point. Uncertain by 0.001.

    Raises
    ------
    ValueError
        When a temperature is outside the range.

    Notes
    -----
    rho_s/rho divided by (1 - T/T_lambda)^0.6717 is interpolated; above 2.175 K that quotient is held.

    References
    ----------
    Donnelly and Barenghi (1998); exponent: Campostrini et al., Phys. Rev. B 74, 144506 (2006).

    Examples
    --------
    >>> round(float(superfluid_fraction(2.0)), 4)
    0.4469
    """
    return two_sides(checked_temperature(temperature, "superfluid fraction"), _fraction_below, np.zeros_like)


def normal_density(temperature: ArrayLike) -> Floats:
    """Return the density of the normal component of liquid 4He.

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 1.0 to 4.2221 K. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        kg/m^3; the whole density above the lambda point. Uncertain by 0.15 kg/m^3 below it.

    Raises
    ------
    ValueError
        When a temperature is outside the range. Below 1 K the difference of two tabulated numbers means nothing.
    """
    T = checked_temperature(temperature, "normal density", low=1.0)
    return (density(T) * (1 - superfluid_fraction(T)))[()]


_tension_below = CubicSpline(*rows_below(table.SURFACE_TENSION_MILLINEWTON_PER_METRE))
_tension_above = CubicSpline(*rows_above(table.SURFACE_TENSION_MILLINEWTON_PER_METRE))


def surface_tension(temperature: ArrayLike) -> Floats:
    """Return the surface tension of liquid 4He under its vapour.

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 0.1 to 4.2221 K. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        N/m; tabulated to 2e-6 N/m. A straight line from 2.175 to 2.18 K.

    Raises
    ------
    ValueError
        When a temperature is outside the range.

    Examples
    --------
    >>> round(float(surface_tension(1.7)) * 1e3, 4)
    0.3151
    """
    T = checked_temperature(temperature, "surface tension")
    return (1e-3 * two_sides(T, _tension_below, _tension_above, (LAST_BELOW, FIRST_ABOVE)))[()]


def _stretched(T: Floats) -> Floats:
    """Return a variable in which the logarithmic rise towards the lambda point is nearly a straight line."""
    stretched: Floats = np.log(T) - 0.15 * np.log(T_LAMBDA - T)
    return stretched


_heat_cold_t, _heat_cold = rows_below(table.SPECIFIC_HEAT)
_log_heat_below = CubicSpline(_stretched(_heat_cold_t), np.log(_heat_cold))
_heat_warm_t, _heat_warm = rows_above(table.SPECIFIC_HEAT)
_heat_above = CubicSpline(np.log(_heat_warm_t - T_LAMBDA), _heat_warm)


def specific_heat(temperature: ArrayLike) -> Floats:
    """Return the specific heat of liquid 4He along the saturation line.

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 0.1 to 2.175 K and 2.18 to 4.2221 K. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        J/(kg K). Good to 1 per cent, to 2 per cent from 2.18 to 2.25 K.

    Raises
    ------
    ValueError
        When a temperature is outside the range or in the 5 mK round the lambda point, where the table has no row and
        the specific heat has a singularity.

    Notes
    -----
    At constant pressure it is larger (14 per cent at 4.2 K): record the path.

    Examples
    --------
    >>> round(float(specific_heat(2.0)), 1)
    5316.7
    """
    T = checked_temperature(temperature, "specific heat")
    gap = np.flatnonzero((T > LAST_BELOW) & (T < FIRST_ABOVE))
    if gap.size:
        raise ValueError(
            f"temperature[{gap[0]}] = {T.ravel()[gap[0]]:.8g} K lies between 2.175 and 2.18 K, where the specific heat of "
            "liquid 4He is singular and not tabulated"
        )
    return two_sides(
        T,
        lambda x: np.exp(_log_heat_below(_stretched(x))),
        lambda x: _heat_above(np.log(x - T_LAMBDA)),
        (LAST_BELOW, FIRST_ABOVE),
    )


_LARGEST_LAMBDA_PRESSURE: Final = 1e5


def lambda_temperature_estimate(pressure: ArrayLike) -> Floats:
    """Return an estimate of the lambda temperature of 4He under pressure.

    Parameters
    ----------
    pressure : float or array_like
        Pa, 5042 Pa to 1 bar. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        T90 in K, to about 1 mK: the line is curved and only its slope at saturated vapour pressure is used.

    Raises
    ------
    ValueError
        When a pressure is outside the range; no equation is offered above 1 bar.

    Examples
    --------
    >>> round(float(lambda_temperature_estimate(1e5)), 4)
    2.1684
    """
    p = within(pressure, "pressure", low=LAMBDA_PRESSURE, high=_LARGEST_LAMBDA_PRESSURE, unit="Pa",
               formula="the lambda line estimate")  # fmt: skip
    return (T_LAMBDA + LAMBDA_SLOPE * (p - LAMBDA_PRESSURE))[()]

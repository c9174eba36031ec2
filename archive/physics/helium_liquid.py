"""Properties of liquid 4He at saturated vapour pressure, interpolated in the recommended table.

Rules: each property has its own range and is refused outside it. The two sides of the lambda point are interpolated
separately; nothing is fitted across it except three smooth properties in the 5 mK where the table has no row.

References
----------
R. J. Donnelly, C. F. Barenghi, J. Phys. Chem. Ref. Data 27, 1217 (1998). Temperatures are T90.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Final

import numpy as np
from numpy.typing import ArrayLike
from scipy.interpolate import CubicSpline, PchipInterpolator

from archive.physics import tables_helium4_liquid as table
from archive.physics.constants import T_LAMBDA
from archive.physics.ranges import Floats, floats, within

__all__ = [
    "density",
    "first_sound",
    "lambda_temperature_estimate",
    "normal_density",
    "second_sound",
    "specific_heat",
    "superfluid_fraction",
    "surface_tension",
    "viscosity",
    "viscous_penetration_depth",
]

_T: Final = np.array(table.TEMPERATURE)
_COLDEST, _WARMEST = float(_T[0]), float(_T[-1])
_LAST_BELOW, _FIRST_ABOVE = 2.175, 2.18
_DENSITY_LAMBDA: Final = 146.109  # kg/m^3 at the lambda point, Donnelly and Barenghi (1998)
# Exponents of the power laws that make the interpolated quotient smooth. zeta: Campostrini, Hasenbusch, Pelissetto,
# Vicari, Phys. Rev. B 74, 144506 (2006); second sound: from memory.
_ZETA, _SECOND_SOUND_EXPONENT = 0.6717, 0.387


def _rows(column: tuple[float, ...], low: float, high: float) -> tuple[Floats, Floats]:
    values = np.array(column)
    chosen = (low <= _T) & (high >= _T) & ~np.isnan(values)
    return _T[chosen], values[chosen]


def _below(column: tuple[float, ...], low: float = _COLDEST) -> tuple[Floats, Floats]:
    return _rows(column, low, _LAST_BELOW)


def _above(column: tuple[float, ...]) -> tuple[Floats, Floats]:
    return _rows(column, _FIRST_ABOVE, _WARMEST)


def _two_sides(
    temperature: Floats,
    below: Callable[[Floats], Floats],
    above: Callable[[Floats], Floats],
    edges: tuple[float, float] = (T_LAMBDA, T_LAMBDA),
) -> Floats:
    """Return one function below the first edge, another above the second, a straight line between the edges."""
    first, second = edges
    result = np.full(temperature.shape, np.nan)
    cold, warm = temperature <= first, temperature >= second
    result[cold] = below(temperature[cold])
    result[warm] = above(temperature[warm])
    between = (temperature > first) & (temperature < second)
    if between.any():
        left, right = below(floats(first)), above(floats(second))
        result[between] = left + (right - left) * (temperature[between] - first) / (second - first)
    return result[()]


def _checked(temperature: ArrayLike, name: str, low: float = _COLDEST, high: float = _WARMEST) -> Floats:
    return within(
        temperature,
        "temperature",
        low=low,
        high=high,
        unit="K",
        formula=f"the table of the {name} of liquid 4He",
    )


def _reduced(T: Floats) -> Floats:
    return 1 - T / T_LAMBDA


_cold_t, _cold_rho = _below(table.DENSITY)
_warm_t, _warm_rho = _above(table.DENSITY)
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
    return _two_sides(_checked(temperature, "density"), _density_below, _density_above)


_fraction_t, _f = _below(table.SUPERFLUID_FRACTION, 0.7)
_fraction_scaled = PchipInterpolator(_fraction_t, _f / _reduced(_fraction_t) ** _ZETA, extrapolate=True)
_ALL_SUPERFLUID = 0.8  # K; the table has 1.0000 up to here


def _fraction_below(T: Floats) -> Floats:
    scaled = _fraction_scaled(np.clip(T, 0.7, _LAST_BELOW))
    fraction: Floats = np.where(
        T <= _ALL_SUPERFLUID, 1.0, np.minimum(scaled * np.maximum(_reduced(T), 0.0) ** _ZETA, 1.0)
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
    return _two_sides(_checked(temperature, "superfluid fraction"), _fraction_below, np.zeros_like)


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
    T = _checked(temperature, "normal density", low=1.0)
    return (density(T) * (1 - superfluid_fraction(T)))[()]


_viscosity_t, _v = _below(table.VISCOSITY_MICROPASCAL_SECOND)
_log_viscosity_below = PchipInterpolator(_viscosity_t, np.log(_v))
_viscosity_above = CubicSpline(*_above(table.VISCOSITY_MICROPASCAL_SECOND))


def viscosity(temperature: ArrayLike) -> Floats:
    """Return the viscosity of liquid 4He (of its normal component below the lambda point).

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 0.8 to 4.2221 K. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        Pa s. Good to 1 per cent, to 2 per cent below 1 K and from 2.18 to 2.25 K.

    Raises
    ------
    ValueError
        When a temperature is outside the range.

    Notes
    -----
    Below about 1 K the mean free path is long and the value depends on the geometry. From 2.175 to 2.18 K a straight
    line; the change there is 1.4 per cent.

    Examples
    --------
    >>> round(float(viscosity(2.0)) * 1e6, 3)
    1.468
    """
    T = _checked(temperature, "viscosity", low=float(_viscosity_t[0]))
    edges = (_LAST_BELOW, _FIRST_ABOVE)
    return (1e-6 * _two_sides(T, lambda x: np.exp(_log_viscosity_below(x)), _viscosity_above, edges))[()]


_tension_below = CubicSpline(*_below(table.SURFACE_TENSION_MILLINEWTON_PER_METRE))
_tension_above = CubicSpline(*_above(table.SURFACE_TENSION_MILLINEWTON_PER_METRE))


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
    T = _checked(temperature, "surface tension")
    return (1e-3 * _two_sides(T, _tension_below, _tension_above, (_LAST_BELOW, _FIRST_ABOVE)))[()]


_first_below = CubicSpline(*_below(table.FIRST_SOUND))
_first_above = CubicSpline(*_above(table.FIRST_SOUND))


def first_sound(temperature: ArrayLike) -> Floats:
    """Return the speed of first (ordinary) sound in liquid 4He at saturated vapour pressure.

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 0.1 to 4.2221 K. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        m/s; good to 0.5 per cent. A straight line from 2.175 to 2.18 K, where the dip at the lambda point is lost.

    Raises
    ------
    ValueError
        When a temperature is outside the range.
    """
    return _two_sides(
        _checked(temperature, "first sound"), _first_below, _first_above, (_LAST_BELOW, _FIRST_ABOVE)
    )


_second_t, _u2 = _below(table.SECOND_SOUND)
_second_scaled = CubicSpline(_second_t, np.log(_u2 / _reduced(_second_t) ** _SECOND_SOUND_EXPONENT))


def second_sound(temperature: ArrayLike) -> Floats:
    """Return the speed of second sound in liquid 4He at saturated vapour pressure.

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 0.6 to 2.1768 K. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        m/s; good to 0.5 per cent, 1 per cent below 0.7 K. Zero at the lambda point.

    Raises
    ------
    ValueError
        When a temperature is outside the range: there is no second sound in the normal liquid.

    Notes
    -----
    The speed divided by (1 - T/T_lambda)^0.387 (exponent from memory) is interpolated and held above 2.175 K.

    Examples
    --------
    >>> round(float(second_sound(1.65)), 2)
    20.37
    """
    T = _checked(temperature, "second sound", low=float(_second_t[0]), high=T_LAMBDA)
    scaled = np.exp(_second_scaled(np.minimum(T, _LAST_BELOW)))
    return (scaled * np.maximum(_reduced(T), 0.0) ** _SECOND_SOUND_EXPONENT)[()]


def _stretched(T: Floats) -> Floats:
    """Return a variable in which the logarithmic rise towards the lambda point is nearly a straight line."""
    stretched: Floats = np.log(T) - 0.15 * np.log(T_LAMBDA - T)
    return stretched


_heat_cold_t, _heat_cold = _below(table.SPECIFIC_HEAT)
_log_heat_below = CubicSpline(_stretched(_heat_cold_t), np.log(_heat_cold))
_heat_warm_t, _heat_warm = _above(table.SPECIFIC_HEAT)
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
    T = _checked(temperature, "specific heat")
    gap = np.flatnonzero((T > _LAST_BELOW) & (T < _FIRST_ABOVE))
    if gap.size:
        raise ValueError(
            f"temperature[{gap[0]}] = {T.ravel()[gap[0]]:.8g} K lies between 2.175 and 2.18 K, where the specific heat of "
            "liquid 4He is singular and not tabulated"
        )
    return _two_sides(
        T,
        lambda x: np.exp(_log_heat_below(_stretched(x))),
        lambda x: _heat_above(np.log(x - T_LAMBDA)),
        (_LAST_BELOW, _FIRST_ABOVE),
    )


# K/Pa: -8.88 mK/bar at saturated vapour pressure, by two routes: the gravity shift 1.273 uK per centimetre (G. Ahlers,
# Phys. Rev. 171, 275 (1968), number from memory), and the Pippard-Buckingham-Fairbank relation with the table above.
_LAMBDA_SLOPE: Final = -8.88e-8
_LAMBDA_PRESSURE: Final = 5042.0  # Pa, ITS-90
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
    p = within(pressure, "pressure", low=_LAMBDA_PRESSURE, high=_LARGEST_LAMBDA_PRESSURE, unit="Pa",
               formula="the lambda line estimate")  # fmt: skip
    return (T_LAMBDA + _LAMBDA_SLOPE * (p - _LAMBDA_PRESSURE))[()]


def viscous_penetration_depth(temperature: ArrayLike, frequency: ArrayLike) -> Floats:
    """Return the depth to which an oscillating wall drags liquid 4He along.

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 1.0 to 4.2221 K.
    frequency : float or array_like
        Hz, above 0 (not angular).

    Returns
    -------
    ndarray of float64
        sqrt(2 eta/(rho_n 2 pi f)) in m, with the normal density below the lambda point.

    Raises
    ------
    ValueError
        When a temperature is outside the range or a frequency is not above 0.

    Examples
    --------
    >>> round(float(viscous_penetration_depth(2.0, 1000.0)) * 1e6, 2)
    2.41
    """
    f = within(
        frequency, "frequency", low=float(np.finfo(float).tiny), high=np.inf, unit="Hz", formula="a frequency"
    )
    return np.sqrt(viscosity(temperature) / (normal_density(temperature) * np.pi * f))[()]

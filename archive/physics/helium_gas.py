"""Gaseous helium: second virial coefficient, molar density, amounts.

Rules: the virial equation is cut after B, so it is refused where the next term would matter. Amounts are in mol.

References
----------
The virial equation, solved for the density (derived here); sources of B at `second_virial`.
"""

from __future__ import annotations

from typing import Final, Literal

import numpy as np
from numpy.typing import ArrayLike
from scipy.interpolate import CubicSpline

from archive.physics import tables_helium4_gas as table
from archive.physics.constants import GAS_CONSTANT
from archive.physics.ranges import Floats, floats, within
from archive.physics.vapour_pressure import Isotope

__all__ = [
    "amount_of_gas",
    "dead_volume_amount",
    "molar_density",
    "second_virial",
    "second_virial_uncertainty",
]

_WARM: Final = np.array(table.SECOND_VIRIAL)
_COLD: Final = np.array(table.SECOND_VIRIAL_COLD)
_B_T: Final = np.concatenate([_COLD[:, 0], _WARM[:, 0]])
_second_virial_4 = CubicSpline(-1 / _B_T, np.concatenate([_COLD[:, 1], _WARM[:, 1]]))
_B_RANGES: Final[dict[Isotope, tuple[float, float]]] = {"4He": (0.5, 300.0), "3He": (3.0, 20.0)}
_LARGEST_CORRECTION: Final = 0.1


def second_virial(temperature: ArrayLike, isotope: Isotope = "4He") -> Floats:
    """Return the second virial coefficient of helium gas.

    Parameters
    ----------
    temperature : float or array_like
        K; 4He 0.5 to 300 K, 3He 3 to 20 K. NaN gives NaN.
    isotope : {"4He", "3He"}
        Which helium.

    Returns
    -------
    ndarray of float64
        B in m^3/mol, as in p = rho R T (1 + B rho); uncertain as `second_virial_uncertainty` says.

    Raises
    ------
    ValueError
        When a temperature is outside the range, or the isotope is neither of the two.

    Notes
    -----
    4He: cubic spline in 1/T through tabulated quantum calculations. 3He: the correlation
    16.69 - 336.98/T + 91.04/T^2 - 13.82/T^3 (cm^3/mol, T in K), confirmed to 0.3 cm^3/mol in its range here.

    References
    ----------
    4He from 2 K: potential of W. Cencek et al., J. Chem. Phys. 136, 224303 (2012). 4He below 2 K: potential of R. A.
    Aziz, F. R. W. McCourt, C. C. K. Wong, Mol. Phys. 61, 1487 (1987). 3He: H. Preston-Thomas, Metrologia 27, 3 (1990),
    equation 6a (from memory).

    Examples
    --------
    >>> round(float(second_virial(4.2221)) * 1e6, 2)
    -79.63
    """
    T = _in_range(temperature, isotope)
    if isotope == "4He":
        return (1e-6 * _second_virial_4(-1 / T))[()]
    return (1e-6 * (16.69 - 336.98 / T + 91.04 / T**2 - 13.82 / T**3))[()]


def _in_range(temperature: ArrayLike, isotope: Isotope) -> Floats:
    if isotope not in _B_RANGES:
        raise ValueError(f"isotope: found {isotope!r}, expected '3He' or '4He'")
    low, high = _B_RANGES[isotope]
    return within(
        temperature,
        "temperature",
        low=low,
        high=high,
        unit="K",
        formula=f"the second virial coefficient of {isotope}",
    )


def second_virial_uncertainty(temperature: ArrayLike, isotope: Isotope = "4He") -> Floats:
    """Return the standard uncertainty of `second_virial`.

    Parameters
    ----------
    temperature : float or array_like
        K, range as for `second_virial`.
    isotope : {"4He", "3He"}
        Which helium.

    Returns
    -------
    ndarray of float64
        m^3/mol: for 4He 1 per cent of B below 2 K, 0.3 cm^3/mol below 10 K, 0.1 below 30 K, 0.03 above; for 3He 0.3.

    Raises
    ------
    ValueError
        As `second_virial`.
    """
    T = _in_range(temperature, isotope)
    if isotope == "3He":
        return (0.3e-6 + 0 * T)[()]
    u = np.select(
        [np.isnan(T), T < 2, T < 10, T < 30],
        [np.nan, 0.01 * np.abs(second_virial(T)), 0.3e-6, 0.1e-6],
        0.03e-6,
    )
    return u[()]


def molar_density(
    pressure: ArrayLike,
    temperature: ArrayLike,
    *,
    isotope: Isotope = "4He",
    order: Literal["first", "quadratic"] = "quadratic",
) -> Floats:
    """Return the amount of helium gas in a unit of volume.

    Parameters
    ----------
    pressure : float or array_like
        Pa, not negative.
    temperature : float or array_like
        K, range as for `second_virial`.
    isotope : {"4He", "3He"}
        Which helium.
    order : {"quadratic", "first"}
        Solve p = R T (rho + B rho^2), or expand its solution: rho = p/(R T (1 + B p/(R T))).

    Returns
    -------
    ndarray of float64
        mol/m^3. Within 0.06 per cent of the full equation of state while abs(B p/(R T)) is below 0.05 and T below 5 K,
        1.2 per cent at the limit.

    Raises
    ------
    ValueError
        When abs(B p/(R T)) exceeds 0.1 (0.05 for "first"): the third virial coefficient matters there.

    Examples
    --------
    >>> round(float(molar_density(471.537, 1.5)), 3)
    38.214
    """
    p = within(pressure, "pressure", low=0.0, high=np.inf, unit="Pa", formula="a gas")
    T = floats(temperature)
    B = second_virial(T, isotope)
    ideal = p / (GAS_CONSTANT * T)
    limit = _LARGEST_CORRECTION if order == "quadratic" else 0.5 * _LARGEST_CORRECTION
    within(
        np.abs(B * ideal),
        "B p/(R T)",
        low=0.0,
        high=limit,
        unit="",
        formula="the virial equation cut after B",
        hint="for saturated vapour use saturated_molar_density",
    )
    if order == "first":
        return (ideal / (1 + B * ideal))[()]
    result: Floats = (2 * ideal / (1 + np.sqrt(1 + 4 * B * ideal)))[()]
    return result


def amount_of_gas(
    pressure: ArrayLike, volume: ArrayLike, temperature: ArrayLike, *, isotope: Isotope = "4He"
) -> Floats:
    """Return the amount of helium gas in a volume at one temperature.

    Parameters
    ----------
    pressure : float or array_like
        Pa.
    volume : float or array_like
        m^3, not negative.
    temperature : float or array_like
        K, range as for `second_virial`.
    isotope : {"4He", "3He"}
        Which helium.

    Returns
    -------
    ndarray of float64
        mol, with the second virial coefficient.

    Raises
    ------
    ValueError
        As `molar_density`, or when a volume is negative.

    Examples
    --------
    >>> round(float(amount_of_gas(13332.2368, 10e-6, 295.0)) * 1e6, 3)
    54.352
    """
    V = within(volume, "volume", low=0.0, high=np.inf, unit="m^3", formula="a volume")
    return (molar_density(pressure, temperature, isotope=isotope) * V)[()]


def dead_volume_amount(
    pressure: ArrayLike, *, volumes: ArrayLike, temperatures: ArrayLike, isotope: Isotope = "4He"
) -> Floats:
    """Return the amount of gas in several connected volumes at their own temperatures.

    Parameters
    ----------
    pressure : float or array_like
        The measured pressure in Pa, common to all volumes. The saturated value is only an upper bound.
    volumes, temperatures : array_like, last axis the volumes
        m^3 and K; `temperatures` may have the axes of `pressure` before it.
    isotope : {"4He", "3He"}
        Which helium.

    Returns
    -------
    ndarray of float64
        mol, shape of `pressure`: the amount to take from the total to find the film.

    Raises
    ------
    ValueError
        As `molar_density`.

    Notes
    -----
    Thermomolecular pressure differences between the volumes are not in it.
    """
    p = floats(pressure)[..., np.newaxis]
    total: Floats = np.sum(amount_of_gas(p, volumes, temperatures, isotope=isotope), axis=-1)
    return total

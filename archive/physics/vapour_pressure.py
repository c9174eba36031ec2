"""Vapour pressure of helium and the temperature that ITS-90 defines by it.

Rules: the range of each equation is a hard limit. Below 1.25 K the 4He equation runs away (0.6 K out at 0.8 K) and is
refused there; what may be used instead is a differently named estimate. The result is T90, not thermodynamic T.

References
----------
H. Preston-Thomas, Metrologia 27, 3 (1990), erratum 27, 107 (1990), equation 3 and table 3.
R. J. Donnelly, C. F. Barenghi, J. Phys. Chem. Ref. Data 27, 1217 (1998): latent heat at 0 K.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final, Literal

import numpy as np
from numpy.polynomial import polynomial
from numpy.typing import ArrayLike

from archive.physics.constants import BOLTZMANN, GAS_CONSTANT, MASS_HELIUM4, PLANCK, T_LAMBDA
from archive.physics.inversion import monotonic_inverse
from archive.physics.ranges import Floats, floats, within

__all__ = [
    "Isotope",
    "pressure_estimate",
    "pressure_its90",
    "pressure_range_its90",
    "temperature_estimate",
    "temperature_its90",
    "temperature_per_pressure",
    "temperature_range_its90",
]

Isotope = Literal["3He", "4He"]


@dataclass(frozen=True)
class _Equation:
    """T/K = sum A_i x^i with x = (ln(p/Pa) - B)/C, between two temperatures.

    `bracket` holds every ln(p/Pa) of the range with a little to spare; T rises all through it.
    """

    low: float
    high: float
    bracket: tuple[float, float]
    B: float
    C: float
    A: tuple[float, ...]

    def temperature(self, log_pressure: Floats) -> tuple[Floats, Floats]:
        """Return T and dT/d(ln p)."""
        x = (log_pressure - self.B) / self.C
        slope = polynomial.polyval(x, polynomial.polyder(self.A)) / self.C
        return floats(polynomial.polyval(x, self.A)), floats(slope)

    def log_pressure(self, temperature: ArrayLike) -> Floats:
        """Return ln(p/Pa)."""
        return monotonic_inverse(self.temperature, temperature, low=self.bracket[0], high=self.bracket[1])


# Preston-Thomas (1990), table 3.
_HELIUM3: Final = _Equation(
    0.65, 3.2, (4.7, 11.6), 7.3, 4.3,
    (1.053447, 0.980106, 0.676380, 0.372692, 0.151656, -0.002263, 0.006596, 0.088966, -0.004770, -0.054943),
)  # fmt: skip
_HELIUM4_II: Final = _Equation(
    1.25, T_LAMBDA, (4.7, 8.6), 5.6, 2.9,
    (1.392408, 0.527153, 0.166756, 0.050988, 0.026514, 0.001975, -0.017976, 0.005409, 0.013259),
)  # fmt: skip
_HELIUM4_I: Final = _Equation(
    T_LAMBDA, 5.0, (8.4, 12.3), 10.3, 1.9,
    (3.146631, 1.357655, 0.413923, 0.091159, 0.016349, 0.001826, -0.004325, -0.004973),
)  # fmt: skip
# The two 4He equations meet at the lambda point with a step of 0.3 uK; the switch is at the mean of their pressures.
_LOG_SWITCH: Final = math.log(5041.813)

_ESTIMATE_LOW, _ESTIMATE_HIGH = 0.5, 1.25
_LATENT_HEAT_0K: Final = 59.83  # J/mol, Donnelly and Barenghi (1998)
_ESTIMATE_FACTOR: Final = (2 * math.pi * MASS_HELIUM4 * BOLTZMANN / PLANCK**2) ** 1.5 * BOLTZMANN
_ESTIMATE_HINT: Final = "below 1.25 K use the differently named estimate"


def _ends(isotope: Isotope) -> tuple[_Equation, _Equation]:
    if isotope == "3He":
        return _HELIUM3, _HELIUM3
    if isotope == "4He":
        return _HELIUM4_II, _HELIUM4_I
    raise ValueError(f"isotope: found {isotope!r}, expected '3He' or '4He'")


def temperature_range_its90(isotope: Isotope = "4He") -> tuple[float, float]:
    """Return the lowest and the highest T90 of the vapour pressure equation, in K."""
    lower, upper = _ends(isotope)
    return lower.low, upper.high


def pressure_range_its90(isotope: Isotope = "4He") -> tuple[float, float]:
    """Return the lowest and the highest vapour pressure of the ITS-90 equation, in Pa."""
    return _PRESSURE_RANGES[_checked(isotope)]


def _checked(isotope: Isotope) -> Isotope:
    _ends(isotope)
    return isotope


def _range(isotope: Isotope) -> tuple[float, float]:
    lower, upper = _ends(isotope)
    return math.exp(float(lower.log_pressure(lower.low))), math.exp(float(upper.log_pressure(upper.high)))


_PRESSURE_RANGES: Final[dict[Isotope, tuple[float, float]]] = {"3He": _range("3He"), "4He": _range("4He")}


def temperature_its90(pressure: ArrayLike, isotope: Isotope = "4He") -> Floats:
    """Return the temperature T90 at which helium has this vapour pressure.

    Parameters
    ----------
    pressure : float or array_like
        Vapour pressure in Pa; 3He 115.906 Pa to 101.662 kPa, 4He 114.734 Pa to 196.017 kPa. NaN gives NaN.
    isotope : {"4He", "3He"}
        The helium in the bulb.

    Returns
    -------
    ndarray of float64
        T90 in K, shape of `pressure`. A definition: the scale adds no uncertainty of its own.

    Raises
    ------
    ValueError
        When a pressure is outside the range, or the isotope is neither of the two.

    Notes
    -----
    The 4He pressure 5041.813 Pa divides the equation below from that above the lambda point. Below about 1.5 K T90
    departs from thermodynamic temperature, by up to about 1.5 mK at 0.65 K.

    References
    ----------
    H. Preston-Thomas, Metrologia 27, 3 (1990), equation 3.

    Examples
    --------
    >>> round(float(temperature_its90(101325.0)), 4)
    4.2221
    """
    low, high = pressure_range_its90(isotope)
    hint = _ESTIMATE_HINT if isotope == "4He" else ""
    # The ends were found by inversion; one part in 1e12 is their rounding, a femtokelvin.
    p = within(pressure, "pressure", low=low * (1 - 1e-12), high=high * (1 + 1e-12), unit="Pa",
               formula=f"the ITS-90 {isotope} equation", hint=hint)  # fmt: skip
    return _temperature_and_slope(np.log(p), isotope)[0][()]


def temperature_per_pressure(pressure: ArrayLike, isotope: Isotope = "4He") -> Floats:
    """Return dT90/dp, the sensitivity of the vapour pressure thermometer.

    Parameters
    ----------
    pressure : float or array_like
        Vapour pressure in Pa, range as for `temperature_its90`.
    isotope : {"4He", "3He"}
        The helium in the bulb.

    Returns
    -------
    ndarray of float64
        Kelvin per pascal, for example 10.5 uK/Pa for 4He at 4.2221 K.

    Raises
    ------
    ValueError
        As `temperature_its90`.
    """
    temperature_its90(pressure, isotope)
    p = floats(pressure)
    return (_temperature_and_slope(np.log(p), isotope)[1] / p)[()]


def _temperature_and_slope(log_pressure: Floats, isotope: Isotope) -> tuple[Floats, Floats]:
    lower, upper = _ends(isotope)
    cold, warm = lower.temperature(log_pressure), upper.temperature(log_pressure)
    below = log_pressure <= _LOG_SWITCH
    return np.where(below, cold[0], warm[0]), np.where(below, cold[1], warm[1])


def pressure_its90(temperature: ArrayLike, isotope: Isotope = "4He") -> Floats:
    """Return the vapour pressure of helium at a temperature T90.

    Parameters
    ----------
    temperature : float or array_like
        T90 in K; 3He 0.65 to 3.2 K, 4He 1.25 to 5.0 K. NaN gives NaN.
    isotope : {"4He", "3He"}
        Which helium.

    Returns
    -------
    ndarray of float64
        Pressure in Pa, shape of `temperature`; inverse of `temperature_its90` to rounding, and to 0.3 uK within a few
        millipascal of the lambda point, where the two equations do not quite meet.

    Raises
    ------
    ValueError
        When a temperature is outside the range, or the isotope is neither of the two.

    References
    ----------
    H. Preston-Thomas, Metrologia 27, 3 (1990), equation 3, inverted.

    Examples
    --------
    >>> round(float(pressure_its90(1.5)), 3)
    471.537
    """
    low, high = temperature_range_its90(isotope)
    hint = _ESTIMATE_HINT if isotope == "4He" else ""
    T = within(temperature, "temperature", low=low, high=high, unit="K",
               formula=f"the ITS-90 {isotope} equation", hint=hint)  # fmt: skip
    lower, upper = _ends(isotope)
    log_pressure = np.full(T.shape, np.nan)
    below = lower.high >= T
    log_pressure[below] = lower.log_pressure(T[below])
    log_pressure[~below] = upper.log_pressure(T[~below])
    result: Floats = np.exp(log_pressure)[()]
    return result


def pressure_estimate(temperature: ArrayLike) -> Floats:
    """Return an estimate of the vapour pressure of 4He below the ITS-90 range.

    Parameters
    ----------
    temperature : float or array_like
        Temperature in K, 0.5 to 1.25 K. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        Pressure in Pa. No temperature scale: label what follows from it as an estimate.

    Raises
    ------
    ValueError
        When a temperature is outside 0.5 to 1.25 K.

    Notes
    -----
    Ideal vapour over the liquid with its latent heat at 0 K,
    p = (2 pi m k/h^2)^(3/2) k T^(5/2) exp(-L0/(R T)), L0 = 59.83 J/mol. It reproduces the table of Donnelly and
    Barenghi to 0.1 per cent from 0.65 to 1.2 K and joins ITS-90 at 1.25 K within 0.03 per cent.

    References
    ----------
    R. J. Donnelly, C. F. Barenghi, J. Phys. Chem. Ref. Data 27, 1217 (1998), for the form and for L0.

    Examples
    --------
    >>> round(float(pressure_estimate(1.0)), 2)
    15.58
    """
    T = within(temperature, "temperature", low=_ESTIMATE_LOW, high=_ESTIMATE_HIGH, unit="K",
               formula="the vapour pressure estimate")  # fmt: skip
    result: Floats = (_ESTIMATE_FACTOR * T**2.5 * np.exp(-_LATENT_HEAT_0K / (GAS_CONSTANT * T)))[()]
    return result


def temperature_estimate(pressure: ArrayLike) -> Floats:
    """Return an estimate of the temperature of 4He from a vapour pressure below the ITS-90 range.

    Parameters
    ----------
    pressure : float or array_like
        Pressure in Pa, about 2.064e-3 to 114.76 Pa (0.5 to 1.25 K). NaN gives NaN.

    Returns
    -------
    ndarray of float64
        Temperature in K, inverse of `pressure_estimate`; not a temperature on ITS-90.

    Raises
    ------
    ValueError
        When a pressure is outside the range.
    """
    low, high = float(pressure_estimate(_ESTIMATE_LOW)), float(pressure_estimate(_ESTIMATE_HIGH))
    p = within(pressure, "pressure", low=low, high=high, unit="Pa", formula="the vapour pressure estimate")

    def log_pressure(T: Floats) -> tuple[Floats, Floats]:
        exponent = _LATENT_HEAT_0K / (GAS_CONSTANT * T)
        return math.log(_ESTIMATE_FACTOR) + 2.5 * np.log(T) - exponent, (2.5 + exponent) / T

    return monotonic_inverse(log_pressure, np.log(p), low=_ESTIMATE_LOW, high=_ESTIMATE_HIGH)

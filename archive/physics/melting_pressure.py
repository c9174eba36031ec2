"""Melting pressure of 3He and the temperature that PLTS-2000 defines by it.

Rule: between the minimum at 315.24 mK and the pressure at the cold end two temperatures fit one pressure. Which of them
is meant comes from the record; there is no default branch.

References
----------
R. L. Rusby, M. Durieux, A. L. Reesink, R. P. Hudson, G. Schuster, M. Kuehne, W. E. Fogle, R. J. Soulen, E. D. Adams,
J. Low Temp. Phys. 126, 633 (2002).
"""

from __future__ import annotations

from typing import Final, Literal

import numpy as np
from numpy.polynomial import polynomial
from numpy.typing import ArrayLike

from archive.physics.inversion import monotonic_inverse
from archive.physics.ranges import Floats, floats, within

__all__ = [
    "FIXED_POINTS",
    "Branch",
    "pressure_per_temperature",
    "pressure_plts2000",
    "pressure_range_plts2000",
    "temperature_of_minimum",
    "temperature_plts2000",
    "temperature_uncertainty",
]

Branch = Literal["low", "high"]

# MPa/K^i, i = -3 ... 9, Rusby et al. (2002). One widely spread copy has a_3 = -3.5789858e1, which the fixed
# points do not show; the test table does.
_A: Final = (
    -1.3855442e-12, 4.5557026e-9, -6.4430869e-6, 3.4467434, -4.4176438, 1.5417437e1, -3.5789853e1,
    7.1499125e1, -1.0414379e2, 1.0518538e2, -6.9443767e1, 2.6833087e1, -4.5875709,
)  # fmt: skip
_LOWEST: Final = 3
# The scale begins at the Neel transition, 0.902 mK; 0.9 mK leaves room for rounding. The polynomial turns over at 0.680 mK.
_T_LOW, _T_HIGH = 0.9e-3, 1.0

FIXED_POINTS: Final[tuple[tuple[str, float, float], ...]] = (
    ("pressure minimum", 315.24e-3, 2.93113e6),
    ("A transition (superfluid)", 2.444e-3, 3.43407e6),
    ("A-B transition", 1.896e-3, 3.43609e6),
    ("Neel transition (solid)", 0.902e-3, 3.43934e6),
)
"""Name, T2000 in K and p in Pa of the fixed points as published (Rusby et al. 2002)."""

# Half width of the interval round the minimum in which the slope alone does not give the uncertainty.
_NEAR_MINIMUM: Final = 20e-3


def _pressure(T: Floats) -> tuple[Floats, Floats]:
    """Return p and dp/dT in Pa and Pa/K."""
    q = polynomial.polyval(T, _A)
    dq = polynomial.polyval(T, polynomial.polyder(_A))
    return 1e6 * q / T**_LOWEST, 1e6 * (dq / T**_LOWEST - _LOWEST * q / T ** (_LOWEST + 1))


def _slope(T: Floats) -> tuple[Floats, Floats]:
    """Return dp/dT and its derivative in Pa/K and Pa/K^2."""
    powers = np.arange(-_LOWEST, len(_A) - _LOWEST)
    t = floats(T)[..., np.newaxis]
    second = 1e6 * np.sum(np.array(_A) * powers * (powers - 1) * t ** (powers - 2.0), axis=-1)
    return _pressure(T)[1], second


_T_MINIMUM: Final = float(monotonic_inverse(_slope, 0.0, low=0.25, high=0.40))
_P_MINIMUM: Final = float(_pressure(floats(_T_MINIMUM))[0])
_CURVATURE: Final = float(_slope(floats(_T_MINIMUM))[1])  # 6.6085 MPa/K^2
_SPANS: Final[dict[str, tuple[float, float]]] = {"low": (_T_LOW, _T_MINIMUM), "high": (_T_MINIMUM, _T_HIGH)}


def _span(branch: Branch) -> tuple[float, float]:
    if branch not in _SPANS:
        raise ValueError(
            f"branch: found {branch!r}, expected 'low' (0.9 to 315.24 mK) or 'high' (315.24 mK to 1 K); "
            "take it from the record, a second thermometer, or a neighbouring reading of known branch"
        )
    return _SPANS[branch]


def temperature_of_minimum() -> float:
    """Return the temperature of the minimum of the melting pressure on PLTS-2000, in K (computed, 0.3152396 K)."""
    return _T_MINIMUM


def pressure_range_plts2000(branch: Branch) -> tuple[float, float]:
    """Return the lowest and the highest melting pressure of a branch, in Pa.

    Parameters
    ----------
    branch : {"low", "high"}
        Below or above the temperature of the minimum.

    Returns
    -------
    tuple of float
        2.9311306 MPa to 3.4393447 MPa on the low branch, to 3.9991413 MPa on the high one.
    """
    low, high = _span(branch)
    end = low if branch == "low" else high
    return _P_MINIMUM, float(_pressure(floats(end))[0])


def pressure_plts2000(temperature: ArrayLike) -> Floats:
    """Return the melting pressure of 3He at a temperature T2000.

    Parameters
    ----------
    temperature : float or array_like
        T2000 in K, 0.9 mK to 1 K. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        Pressure in Pa, shape of `temperature`.

    Raises
    ------
    ValueError
        When a temperature is outside the range; the polynomial is never extrapolated.

    References
    ----------
    Rusby et al. (2002), see the module.

    Examples
    --------
    >>> round(float(pressure_plts2000(0.1)))
    3129507
    """
    return _pressure(_checked(temperature))[0][()]


def pressure_per_temperature(temperature: ArrayLike) -> Floats:
    """Return dp/dT of the melting pressure.

    Parameters
    ----------
    temperature : float or array_like
        T2000 in K, 0.9 mK to 1 K.

    Returns
    -------
    ndarray of float64
        Pa/K; negative on the low branch, zero at the minimum.

    Raises
    ------
    ValueError
        When a temperature is outside the range.
    """
    return _pressure(_checked(temperature))[1][()]


def _checked(temperature: ArrayLike) -> Floats:
    return within(temperature, "temperature", low=_T_LOW, high=_T_HIGH, unit="K", formula="PLTS-2000")


def temperature_plts2000(pressure: ArrayLike, *, branch: Branch) -> Floats:
    """Return the temperature T2000 at which 3He melts at this pressure, on the stated branch.

    Parameters
    ----------
    pressure : float or array_like
        Melting pressure in Pa. NaN gives NaN.
    branch : {"low", "high"}
        Below or above the minimum; from recorded evidence.

    Returns
    -------
    ndarray of float64
        T2000 in K, shape of `pressure`.

    Raises
    ------
    ValueError
        When a pressure has no temperature on this branch, or the branch is neither of the two.

    Examples
    --------
    >>> [round(float(temperature_plts2000(3.2e6, branch=b)), 6) for b in ("low", "high")]
    [0.070833, 0.632182]
    """
    cold, warm = _span(branch)
    low, high = pressure_range_plts2000(branch)
    # One part in 1e12 of the pressure is rounding of the polynomial, not an extrapolation.
    p = within(pressure, "pressure", low=low * (1 - 1e-12), high=high * (1 + 1e-12), unit="Pa",
               formula=f"the {branch} branch of PLTS-2000")  # fmt: skip
    return monotonic_inverse(_pressure, p, low=cold, high=warm)


def temperature_uncertainty(temperature: ArrayLike, pressure_uncertainty: ArrayLike) -> Floats:
    """Return the standard uncertainty of T2000 that follows from that of the pressure.

    Parameters
    ----------
    temperature : float or array_like
        T2000 in K, 0.9 mK to 1 K.
    pressure_uncertainty : float or array_like
        Standard uncertainty of the pressure in Pa, not negative.

    Returns
    -------
    ndarray of float64
        Standard uncertainty in K; the scale's own thermodynamic uncertainty is not in it.

    Raises
    ------
    ValueError
        When a temperature is outside the range or an uncertainty is negative.

    Notes
    -----
    u(p)/abs(dp/dT), which grows without bound at the minimum. Within 20 mK of it the smaller of that and
    sqrt(2 u(p)/p'') is returned, p'' = 6.6085 MPa/K^2: the distance at which the parabola has risen by u(p). The two
    meet at half a pressure uncertainty above the minimum, so the result has no step (derived here).

    Examples
    --------
    >>> round(float(temperature_uncertainty(temperature_of_minimum(), 1.0)) * 1e3, 2)
    0.55
    """
    T = _checked(temperature)
    u = within(
        pressure_uncertainty,
        "pressure_uncertainty",
        low=0.0,
        high=np.inf,
        unit="Pa",
        formula="an uncertainty",
    )
    T, u = np.broadcast_arrays(T, u)
    with np.errstate(divide="ignore", invalid="ignore"):
        by_slope = u / np.abs(_pressure(T)[1])
    by_curvature = np.sqrt(2 * u / _CURVATURE)
    near = np.abs(T - _T_MINIMUM) < _NEAR_MINIMUM
    return np.where(near, np.fmin(by_slope, by_curvature), by_slope)[()]

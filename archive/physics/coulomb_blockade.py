"""Coulomb blockade thermometer: temperature from the width and the depth of its conductance dip.

Rules: N equal junctions in series, conductance far above freezing out (depth small against 1); the width needs no
calibration, the depth needs the charging energy. Temperatures are thermodynamic, not on a practical scale.

References
----------
J. P. Pekola, K. P. Hirvi, J. P. Kauppinen, M. A. Paalanen, Phys. Rev. Lett. 73, 2903 (1994) (citation, shape of the dip
and series in the charging energy from memory; the width 5.439 N k T/e follows from the shape, and the series is held
against a tabulated master equation in the tests).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike
from scipy.optimize import brentq, curve_fit

from archive.physics.arrays import same_length, series
from archive.physics.constants import BOLTZMANN, ELEMENTARY_CHARGE
from archive.physics.inversion import monotonic_inverse
from archive.physics.ranges import Floats, floats, within

__all__ = [
    "DipFit",
    "dip_shape",
    "fit_dip",
    "half_width",
    "temperature_from_depth",
    "temperature_from_half_width",
    "zero_bias_depth",
]

_SMALL: Final = 0.05
_LARGE: Final = 200.0
_LARGEST_RATIO: Final = 1.0
"""2 Ec/T up to which the series is used; it stays within 0.1 per cent of the tabulated master equation of one device."""


def dip_shape(bias: ArrayLike) -> Floats:
    """Return the shape of the dip, g(x) = (x sinh x - 4 sinh^2(x/2))/(8 sinh^4(x/2)), over its value at zero bias.

    It is the second derivative of (x/2) coth(x/2) (derived), which the golden-rule rate of a junction brings in.

    Parameters
    ----------
    bias : float or array_like
        x = e V/(N k T), without dimension.

    Returns
    -------
    ndarray of float64
        6 g(x): 1 at zero bias, 1/2 at x = +-2.7196, 0 far away.

    Examples
    --------
    >>> round(float(dip_shape(5.439 / 2)), 4)
    0.5
    """
    x = np.abs(floats(bias))
    series_part = 1 - x**2 / 10 + x**4 / 168  # Taylor series of 6 g, derived
    middle = np.clip(x, _SMALL, _LARGE)
    half = np.sinh(middle / 2)
    exact = 6 * (middle * np.sinh(middle) - 4 * half**2) / (8 * half**4)
    return np.where(x < _SMALL, series_part, np.where(x > _LARGE, 0.0, exact))[()]


# Full width at half depth in units of N k T/e: twice the root of 6 g(x) = 1/2.
_FULL_WIDTH: Final = 2 * float(brentq(lambda x: float(dip_shape(x)) - 0.5, 1.0, 5.0, xtol=1e-14))


def half_width(temperature: ArrayLike, *, junctions: float) -> Floats:
    """Return the full width at half depth of the dip, 5.439 N k T/e.

    Parameters
    ----------
    temperature : float or array_like
        K, thermodynamic.
    junctions : float
        N, in series.

    Returns
    -------
    ndarray of float64
        V, to first order in the depth.

    Examples
    --------
    >>> round(float(half_width(0.1, junctions=20)) * 1e3, 4)
    0.9374
    """
    return (_FULL_WIDTH * junctions * BOLTZMANN * floats(temperature) / ELEMENTARY_CHARGE)[()]


def temperature_from_half_width(width: ArrayLike, *, junctions: float) -> Floats:
    """Return the thermodynamic temperature in K from the full width at half depth in V; the inverse of `half_width`."""
    return (floats(width) * ELEMENTARY_CHARGE / (_FULL_WIDTH * junctions * BOLTZMANN))[()]


def zero_bias_depth(temperature: ArrayLike, *, charging_energy: float) -> Floats:
    """Return the depth of the dip at zero bias, 1 - G(0)/G_T = u/6 - u^2/60 + u^3/630 with u = 2 E_c/(k T).

    Parameters
    ----------
    temperature : float or array_like
        K; at least 2 `charging_energy`.
    charging_energy : float
        E_c/k in K.

    Returns
    -------
    ndarray of float64
        Between 0 and 0.152.

    Raises
    ------
    ValueError
        A temperature so low that the series does not hold.

    Examples
    --------
    >>> round(float(zero_bias_depth(0.02, charging_energy=0.75e-3)), 5)
    0.01241
    """
    T = within(temperature, "temperature", low=2 * charging_energy / _LARGEST_RATIO, high=np.inf, unit="K",
               formula="the series in the charging energy")  # fmt: skip
    return _depth(2 * charging_energy / T)[0][()]


def _depth(u: Floats) -> tuple[Floats, Floats]:
    return u / 6 - u**2 / 60 + u**3 / 630, 1 / 6 - u / 30 + u**2 / 210


def temperature_from_depth(depth: ArrayLike, *, charging_energy: float) -> Floats:
    """Return the temperature in K from the depth at zero bias; the inverse of `zero_bias_depth`.

    Raises
    ------
    ValueError
        A depth that is not above 0, or so large that the series does not hold.
    """
    top = float(_depth(floats(_LARGEST_RATIO))[0])
    value = within(depth, "depth", low=float(np.finfo(float).tiny), high=top, unit="", formula="the series in the charging energy")  # fmt: skip
    return (2 * charging_energy / monotonic_inverse(_depth, value, low=0.0, high=_LARGEST_RATIO))[()]


@dataclass(frozen=True)
class DipFit:
    """A dip fitted to conductance against bias.

    Attributes
    ----------
    conductance : float
        Far from the dip, S.
    depth : float
        At zero bias, over `conductance`.
    width : float
        Full width at half depth, V.
    offset : float
        Bias of the middle of the dip, V.
    covariance : ndarray, shape (4, 4)
        Of these four, in this order.
    residuals : ndarray
        S, of the points that are numbers.
    reduced_chi2 : float or None
        When uncertainties were given.
    """

    conductance: float
    depth: float
    width: float
    offset: float
    covariance: Floats
    residuals: Floats
    reduced_chi2: float | None


def fit_dip(
    bias: ArrayLike, conductance: ArrayLike, *, standard_uncertainty: ArrayLike | None = None
) -> DipFit:
    """Return asymptotic conductance, depth, width and offset of a dip.

    Parameters
    ----------
    bias, conductance : array_like, shape (n,), n at least 10
        V and S.
    standard_uncertainty : array_like, optional
        Of each conductance, S; without it the covariance is scaled by the scatter.

    Returns
    -------
    DipFit

    Raises
    ------
    ValueError
        Too few points, values that are not finite, or no dip that a fit can hold on to.
    """
    V, G = series("bias", bias, least=10), series("conductance", conductance, positive=True)
    same_length(bias=V, conductance=G)
    u = None if standard_uncertainty is None else np.broadcast_to(floats(standard_uncertainty), G.shape)
    scale_V, scale_G = float(np.ptp(V)), float(np.median(G))

    def model(v: Floats, top: float, depth: float, width: float, offset: float) -> Floats:
        return floats(top * (1 - depth * dip_shape((v - offset) / width * _FULL_WIDTH)))

    start = (1.0, max(1 - float(np.min(G)) / scale_G, 1e-3), 0.2, 0.0)
    try:
        values, covariance = curve_fit(
            model, V / scale_V, G / scale_G, p0=start, sigma=None if u is None else u / scale_G, absolute_sigma=u is not None,
            bounds=([0.5, 0.0, 1e-3, -0.5], [2.0, 1.0, 5.0, 0.5]),
        )  # fmt: skip
    except RuntimeError as error:
        raise ValueError(f"conductance: the search for a dip did not end: {error}") from None
    units = np.array([scale_G, 1.0, scale_V, scale_V])
    top, depth, width, offset = (float(each) for each in values * units)
    residuals = G - scale_G * model(V / scale_V, *values)
    reduced = None if u is None else float(np.sum((residuals / u) ** 2) / (V.size - 4))
    if depth < 2 * float(np.sqrt(covariance[1, 1])):
        raise ValueError(
            f"conductance: the dip is {depth:.2g} deep, within twice its uncertainty; found no dip to read"
        )
    return DipFit(
        top, depth, width, offset, floats(covariance * np.outer(units, units)), floats(residuals), reduced
    )

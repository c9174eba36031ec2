"""Paramagnetic thermometer: mutual inductance and temperature by the law of Curie and Weiss.

Rule: theta is written with the sign of T - theta; some papers write T + Delta with Delta = -theta.

References
----------
F. Pobell, Matter and Methods at Low Temperatures, 3rd edition, Springer (2007) (textbook form, from memory).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike
from scipy.optimize import least_squares

from archive.physics.ranges import Floats, floats

__all__ = ["CurieWeissFit", "curie_weiss_inductance", "curie_weiss_temperature", "fit_curie_weiss"]


def curie_weiss_inductance(temperature: ArrayLike, *, offset: float, constant: float, theta: float) -> Floats:
    """Return the mutual inductance of a paramagnetic thermometer.

    Parameters
    ----------
    temperature : float or array_like
        K, above `theta`. NaN gives NaN.
    offset, constant, theta : float
        M0 in the reading's unit, C in that unit times kelvin, theta in K.

    Returns
    -------
    ndarray of float64
        M0 + C/(T - theta), in the unit of `offset`.

    Raises
    ------
    ValueError
        When a temperature is not above theta.

    Examples
    --------
    >>> float(curie_weiss_inductance(0.05, offset=1.0, constant=0.1, theta=0.0))
    3.0
    """
    T = floats(temperature)
    low = np.flatnonzero(theta >= T)
    if low.size:
        raise ValueError(
            f"temperature[{low[0]}] = {T.ravel()[low[0]]:.8g} K is not above theta = {theta:.8g} K"
        )
    return (offset + constant / (T - theta))[()]


def curie_weiss_temperature(inductance: ArrayLike, *, offset: float, constant: float, theta: float) -> Floats:
    """Return the temperature of a paramagnetic thermometer from its mutual inductance.

    Parameters
    ----------
    inductance : float or array_like
        M in the unit of `offset`, on the side of `offset` that the sign of `constant` says. NaN gives NaN.
    offset, constant, theta : float
        As in `curie_weiss_inductance`.

    Returns
    -------
    ndarray of float64
        theta + C/(M - M0) in K.

    Raises
    ------
    ValueError
        When a reading lies on the wrong side of the offset: no temperature belongs to it.

    Examples
    --------
    >>> float(curie_weiss_temperature(3.0, offset=1.0, constant=0.1, theta=0.0))
    0.05
    """
    M = floats(inductance)
    wrong = np.flatnonzero((M - offset) * np.sign(constant) <= 0)
    if wrong.size:
        raise ValueError(
            f"inductance[{wrong[0]}] = {M.ravel()[wrong[0]]:.8g} is not beyond the offset {offset:.8g}; no temperature belongs to it"
        )
    return (theta + constant / (M - offset))[()]


@dataclass(frozen=True)
class CurieWeissFit:
    """Fit of the Curie-Weiss law to a calibration.

    Attributes
    ----------
    offset, constant, theta : float
        M0, C and theta.
    covariance : ndarray, shape (3, 3)
        Of these three in this order.
    residuals : ndarray
        Temperature of each point minus that of the law, K.
    converged : bool
        Whether the least-squares search ended properly.
    message : str
        Why it ended.
    """

    offset: float
    constant: float
    theta: float
    covariance: Floats
    residuals: Floats
    converged: bool
    message: str


def fit_curie_weiss(
    inductance: ArrayLike, temperature: ArrayLike, *, temperature_uncertainty: ArrayLike | None = None
) -> CurieWeissFit:
    """Return M0, C and theta fitted to points (M, T) of another thermometer.

    Parameters
    ----------
    inductance, temperature : array_like, shape (n,), n at least 5
        Readings and temperatures in K.
    temperature_uncertainty : float or array_like, optional
        Standard uncertainty in K. Without it all points count alike in T relative to T, and the covariance is scaled by
        the scatter.

    Returns
    -------
    CurieWeissFit

    Raises
    ------
    ValueError
        When there are fewer than 5 points, shapes differ, or a value is not finite or not above 0 K.

    Notes
    -----
    Residuals are taken in T. The search starts from the straight line M against 1/T (theta = 0).
    """
    M, T = floats(inductance), floats(temperature)
    if M.ndim != 1 or M.shape != T.shape or M.size < 5:
        raise ValueError(
            f"temperature: found shape {T.shape}, expected that of inductance, {M.shape}, with at least 5 points"
        )
    if not (np.isfinite(M).all() and np.isfinite(T).all() and (T > 0).all()):
        raise ValueError(
            "inductance, temperature: every value must be finite, and every temperature above 0 K"
        )
    u = np.broadcast_to(T if temperature_uncertainty is None else floats(temperature_uncertainty), T.shape)
    slope, start = np.polyfit(1 / T, M, 1)
    scale = np.array([np.ptp(M), abs(slope), T.min()])

    def residuals(x: Floats) -> Floats:
        offset, constant, theta = x * scale
        model = offset + constant / (T - theta)
        slope_here = -constant / (T - theta) ** 2
        weighted: Floats = (M - model) / (slope_here * u)
        return weighted

    first = np.array([start, slope, 0.0]) / scale
    bounds = ([-np.inf, -np.inf, -np.inf], [np.inf, np.inf, 0.95])
    found = least_squares(residuals, first, bounds=bounds, xtol=1e-14, ftol=1e-14, gtol=1e-14, x_scale="jac")
    offset, constant, theta = found.x * scale
    jacobian = np.asarray(found.jac, dtype=np.float64)
    covariance = floats(np.linalg.pinv(jacobian.T @ jacobian) * np.outer(scale, scale))
    if temperature_uncertainty is None:
        covariance = covariance * (2 * found.cost / (M.size - 3))
    fitted = theta + constant / (M - offset)
    return CurieWeissFit(
        float(offset),
        float(constant),
        float(theta),
        covariance,
        T - fitted,
        bool(found.status > 0),
        str(found.message),
    )

"""Fit of each calibration form to the points of a resistance thermometer.

Rule: the fitted curve covers the points and no more.

References
----------
The forms of the trade: F. Pobell, Matter and Methods at Low Temperatures, 3rd ed., Springer (2007); carbon: J. R. Clement, E. H. Quinnell, Rev. Sci.
Instrum. 23, 213 (1952) (from memory).
"""

from __future__ import annotations

import numpy as np
from numpy.polynomial import chebyshev, polynomial
from numpy.typing import ArrayLike

from archive.physics.ranges import Floats, floats
from archive.physics.resistance_curves import (
    ChebyshevCurve,
    ClementQuinnellCurve,
    HoppingCurve,
    InverseLogPolynomialCurve,
    LogPolynomialCurve,
    ResistanceCurve,
)
from archive.physics.resistance_order import (
    CurveFit,
    Problem,
    calibration_points,
    choose_order,
    outcome,
    solve,
)

__all__ = [
    "fit_chebyshev",
    "fit_clement_quinnell",
    "fit_hopping",
    "fit_inverse_log_polynomial",
    "fit_log_polynomial",
]


def fit_log_polynomial(
    resistance: ArrayLike,
    temperature: ArrayLike,
    *,
    temperature_uncertainty: ArrayLike | None = None,
    largest_order: int = 9,
    order: int | None = None,
    centre_and_half_width: tuple[float, float] | None = None,
) -> CurveFit:
    """Return the polynomial ln T(ln R) that the points support.

    Parameters
    ----------
    resistance, temperature : array_like, shape (n,), n at least 6
        Ohm and K.
    temperature_uncertainty : float or array_like, optional
        Combined standard uncertainty of each point in K. Without it each point counts alike in T relative to T, and the
        covariance is scaled by the scatter.
    largest_order : int
        Highest power tried; also limited so that two points are left for each parameter.
    order : int, optional
        The power itself, instead of a choice.
    centre_and_half_width : tuple of float, optional
        Of ln R; those of the outermost points if left out.

    Returns
    -------
    CurveFit
        Its curve is a `LogPolynomialCurve`, centred and scaled.

    Raises
    ------
    ValueError
        When there are too few points, shapes differ, or a value is not above 0.

    References
    ----------
    F-test of an additional term; AICc after C. M. Hurvich, C.-L. Tsai, Biometrika 76, 297 (1989) (from memory).
    """
    points = calibration_points(resistance, temperature, temperature_uncertainty, 6)
    centre, scale = centre_and_half_width or _centre_and_scale(np.log(points.R))
    problem = Problem(
        value=np.log(points.T),
        kelvin_per_value=lambda T, R: T + 0 * R,
        design=lambda R, order: floats(polynomial.polyvander((np.log(R) - centre) / scale, order)),
        curve=lambda b: LogPolynomialCurve(tuple(map(float, b)), points.resistance_span, centre, scale),
        centre=centre,
        half_width=scale,
    )
    return outcome(points, problem, *choose_order(points, problem, largest_order, order))


def fit_inverse_log_polynomial(
    resistance: ArrayLike,
    temperature: ArrayLike,
    *,
    temperature_uncertainty: ArrayLike | None = None,
    largest_order: int = 9,
) -> CurveFit:
    """Return the polynomial ln R(ln T) that the points support.

    Parameters
    ----------
    resistance, temperature, temperature_uncertainty, largest_order
        As in `fit_log_polynomial`.

    Returns
    -------
    CurveFit
        Its curve is an `InverseLogPolynomialCurve`. The uncertainties are turned into those of ln R by the slope of a
        quadratic through the points.

    Raises
    ------
    ValueError
        As `fit_log_polynomial`, or when the fitted curve turns within the span.
    """
    points = calibration_points(resistance, temperature, temperature_uncertainty, 6)
    centre, scale = _centre_and_scale(np.log(points.T))
    rough = polynomial.Polynomial.fit(np.log(points.T), np.log(points.R), 2).deriv()
    problem = Problem(
        value=np.log(points.R),
        kelvin_per_value=lambda T, R: T / rough(np.log(T)) + 0 * R,
        design=lambda T, order: floats(polynomial.polyvander((np.log(T) - centre) / scale, order)),
        curve=lambda b: InverseLogPolynomialCurve(
            tuple(map(float, b)), points.temperature_span, centre, scale
        ),
        inverse=True,
        centre=centre,
        half_width=scale,
    )
    return outcome(points, problem, *choose_order(points, problem, largest_order))


def _centre_and_scale(x: Floats) -> tuple[float, float]:
    low, high = float(x.min()), float(x.max())
    return 0.5 * (low + high), 0.5 * (high - low)


def fit_chebyshev(
    resistance: ArrayLike,
    temperature: ArrayLike,
    *,
    temperature_uncertainty: ArrayLike | None = None,
    largest_order: int = 12,
    order: int | None = None,
    centre_and_half_width: tuple[float, float] | None = None,
) -> CurveFit:
    """Return the Chebyshev series T(ln R) that the points support.

    Parameters
    ----------
    resistance, temperature, temperature_uncertainty, largest_order, order, centre_and_half_width
        As in `fit_log_polynomial`.

    Returns
    -------
    CurveFit
        Its curve is a `ChebyshevCurve` in ln R whose ZL and ZU are centre less and plus half width.

    Raises
    ------
    ValueError
        As `fit_log_polynomial`.
    """
    points = calibration_points(resistance, temperature, temperature_uncertainty, 6)
    centre, half = centre_and_half_width or _centre_and_scale(np.log(points.R))
    problem = Problem(
        value=points.T,
        kelvin_per_value=lambda T, R: np.ones_like(T) + 0 * R,
        design=lambda R, order: floats(chebyshev.chebvander((np.log(R) - centre) / half, order)),
        curve=lambda a: ChebyshevCurve(tuple(map(float, a)), centre - half, centre + half, "ln"),
        centre=centre,
        half_width=half,
    )
    return outcome(points, problem, *choose_order(points, problem, largest_order, order))


def fit_hopping(
    resistance: ArrayLike,
    temperature: ArrayLike,
    *,
    exponent: float,
    temperature_uncertainty: ArrayLike | None = None,
) -> CurveFit:
    """Return the hopping law ln R = ln R0 + (T0/T)^n fitted with a fixed exponent.

    Parameters
    ----------
    resistance, temperature, temperature_uncertainty
        As in `fit_log_polynomial`.
    exponent : float
        1/4 (Mott) or 1/2 (Efros-Shklovskii).

    Returns
    -------
    CurveFit
        Its curve is a `HoppingCurve`; the linear problem is T^-n against ln R.

    Raises
    ------
    ValueError
        As `fit_log_polynomial`, or when the resistance does not fall with temperature.
    """
    points = calibration_points(resistance, temperature, temperature_uncertainty, 6)

    def curve(b: Floats) -> ResistanceCurve:
        if b[1] <= 0:
            raise ValueError("resistance: found no fall with temperature, expected one for a hopping law")
        return HoppingCurve(
            float(np.exp(-b[0] / b[1])), float(b[1] ** (-1 / exponent)), exponent, points.temperature_span
        )

    problem = Problem(
        value=points.T**-exponent,
        kelvin_per_value=lambda T, R: -(T ** (exponent + 1)) / exponent + 0 * R,
        design=lambda R, _: np.column_stack([np.ones_like(R), np.log(R)]),
        curve=curve,
        graded=False,
    )
    return outcome(points, problem, 1, solve(points, problem, 1), ())


def fit_clement_quinnell(
    resistance: ArrayLike, temperature: ArrayLike, *, temperature_uncertainty: ArrayLike | None = None
) -> CurveFit:
    """Return the law ln R + K/ln R = A + B/T of carbon resistors fitted to the points.

    Parameters
    ----------
    resistance, temperature, temperature_uncertainty
        As in `fit_log_polynomial`; every resistance above 1 ohm.

    Returns
    -------
    CurveFit
        Its curve is a `ClementQuinnellCurve`; the linear problem is 1/T against 1, ln R and 1/ln R.

    Raises
    ------
    ValueError
        As `fit_log_polynomial`, or when a resistance is not above 1 ohm.

    References
    ----------
    J. R. Clement, E. H. Quinnell, Rev. Sci. Instrum. 23, 213 (1952) (from memory).
    """
    points = calibration_points(resistance, temperature, temperature_uncertainty, 6)

    def curve(b: Floats) -> ResistanceCurve:
        B = 1 / float(b[1])
        return ClementQuinnellCurve(
            A=-B * float(b[0]), B=B, K=B * float(b[2]), resistance_span=points.resistance_span
        )

    if points.R.min() <= 1:
        index = int(np.argmin(points.R))
        raise ValueError(f"resistance[{index}]: found {points.R[index]} ohm, expected more than 1 ohm")
    problem = Problem(
        value=1 / points.T,
        kelvin_per_value=lambda T, R: -(T**2) + 0 * R,
        design=lambda R, _: np.column_stack([np.ones_like(R), np.log(R), 1 / np.log(R)]),
        curve=curve,
        graded=False,
    )
    return outcome(points, problem, 2, solve(points, problem, 2), ())

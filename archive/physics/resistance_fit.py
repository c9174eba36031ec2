"""Fit of a calibration curve to the points of a resistance thermometer, the order chosen by the data.

Rules: weights are the temperature-equivalent uncertainty of each point. The order rises while both the F-test and AICc
ask for it and stops at the first order that neither supports. The fitted curve covers the points and no more.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.polynomial import chebyshev, polynomial
from numpy.typing import ArrayLike

from archive.physics.linear_fit import LinearFit, linear_fit
from archive.physics.ranges import Floats, floats
from archive.physics.residual_tests import aicc, f_test
from archive.physics.resistance_thermometer import (
    ChebyshevCurve,
    ClementQuinnellCurve,
    HoppingCurve,
    InverseLogPolynomialCurve,
    LogPolynomialCurve,
    ResistanceCurve,
    evaluate,
    is_monotonic,
)

__all__ = [
    "CurveFit",
    "OrderTrial",
    "fit_chebyshev",
    "fit_clement_quinnell",
    "fit_hopping",
    "fit_inverse_log_polynomial",
    "fit_log_polynomial",
]

_SIGNIFICANT = 0.05


@dataclass(frozen=True)
class OrderTrial:
    """One order that was tried: chi-squared, AICc, and the chance that it beats the last accepted order by luck."""

    order: int
    chi2: float
    aicc: float
    f_probability: float | None


@dataclass(frozen=True)
class CurveFit:
    """A fitted calibration curve and how well it stands.

    Attributes
    ----------
    curve : ResistanceCurve
        Ready for `evaluate`; its span is that of the points.
    fit : LinearFit
        Coefficients of the linear problem that was solved, with covariance.
    order : int
        Highest power (number of parameters less one).
    residuals : ndarray
        T of each point minus T of the curve, K, in the order given.
    rms, largest : float
        Of the residuals, K; `largest` by absolute value.
    largest_in_uncertainties : float or None
        The largest residual in units of the point's uncertainty, when that was given.
    leave_one_out : float
        Root mean square of the residuals of points left out of their own fit, K.
    reduced_chi2 : float or None
        When uncertainties were given and degrees of freedom are left.
    monotonic : bool
        Whether dT/dR keeps one sign over the span; otherwise do not use the curve.
    trials : tuple of OrderTrial
        The orders tried.
    """

    curve: ResistanceCurve
    fit: LinearFit
    order: int
    residuals: Floats
    rms: float
    largest: float
    largest_in_uncertainties: float | None
    leave_one_out: float
    reduced_chi2: float | None
    monotonic: bool
    trials: tuple[OrderTrial, ...]
    _row: Callable[[Floats], Floats]
    _kelvin_per_value: Callable[[Floats, Floats], Floats]

    def standard_uncertainty(self, resistance: ArrayLike) -> Floats:
        """Return the standard uncertainty in K that the fit leaves at a resistance in ohm; NaN outside the span."""
        R = floats(resistance)
        T = floats(evaluate(self.curve, R).temperature)
        result = np.full(R.shape, np.nan)
        inside = ~np.isnan(T)
        if inside.any():
            rows = self._row(R[inside])
            variance = np.einsum("ij,jk,ik->i", rows, self.fit.covariance, rows)
            result[inside] = np.sqrt(variance) * np.abs(self._kelvin_per_value(T[inside], R[inside]))
        return result[()]


@dataclass(frozen=True)
class _Points:
    R: Floats
    T: Floats
    u: Floats | None

    @property
    def resistance_span(self) -> tuple[float, float]:
        return float(self.R.min()), float(self.R.max())

    @property
    def temperature_span(self) -> tuple[float, float]:
        return float(self.T.min()), float(self.T.max())


def _points(
    resistance: ArrayLike, temperature: ArrayLike, uncertainty: ArrayLike | None, least: int
) -> _Points:
    R, T = floats(resistance), floats(temperature)
    if R.ndim != 1 or R.shape != T.shape:
        raise ValueError(
            f"temperature: found shape {T.shape}, expected that of resistance, {R.shape}, one-dimensional"
        )
    if R.size < least:
        raise ValueError(f"resistance: found {R.size} points, expected at least {least}")
    for name, values in (("resistance", R), ("temperature", T)):
        bad = np.flatnonzero(~(np.isfinite(values) & (values > 0)))
        if bad.size:
            raise ValueError(f"{name}[{bad[0]}]: found {values[bad[0]]}, expected a number above 0")
    if uncertainty is None:
        return _Points(R, T, None)
    u = np.broadcast_to(floats(uncertainty), T.shape)
    bad = np.flatnonzero(~(np.isfinite(u) & (u > 0)))
    if bad.size:
        raise ValueError(f"temperature_uncertainty[{bad[0]}]: found {u[bad[0]]}, expected a number above 0")
    return _Points(R, T, u)


@dataclass(frozen=True)
class _Problem:
    """A calibration form written as a linear problem: value = design @ coefficients."""

    value: Floats
    kelvin_per_value: Callable[[Floats, Floats], Floats]  # dT/d(value) from T and R
    design: Callable[[Floats, int], Floats]  # from R (or T, if inverse) and the order
    curve: Callable[[Floats], ResistanceCurve]
    inverse: bool = False


def _solve(points: _Points, problem: _Problem, order: int) -> LinearFit:
    design = problem.design(points.T if problem.inverse else points.R, order)
    # Without uncertainties the points count alike in T relative to T, as sensors of this kind scatter.
    u_T = 1e-3 * points.T if points.u is None else points.u
    u = u_T / np.abs(problem.kelvin_per_value(points.T, points.R))
    names = tuple(f"b{i}" for i in range(design.shape[1]))
    return linear_fit(
        design, problem.value, names=names, standard_uncertainty=u, absolute=points.u is not None
    )


def _choose(
    points: _Points, problem: _Problem, largest_order: int
) -> tuple[int, LinearFit, tuple[OrderTrial, ...]]:
    n = points.R.size
    # Keep at least two points for each parameter, the variance counted.
    largest = max(1, min(largest_order, n // 2 - 2))
    best = _solve(points, problem, 1)
    order = 1
    trials = [OrderTrial(1, best.chi2, aicc(residual_sum=best.chi2, points=n, parameters=2), None)]
    lowest = trials[0].aicc
    for candidate in range(2, largest + 1):
        fit = _solve(points, problem, candidate)
        chance = f_test(chi2_simple=best.chi2, dof_simple=best.dof, chi2_full=fit.chi2, dof_full=fit.dof)
        trial = OrderTrial(
            candidate, fit.chi2, aicc(residual_sum=fit.chi2, points=n, parameters=candidate + 1), chance
        )
        trials.append(trial)
        significant, lower = chance < _SIGNIFICANT, trial.aicc < lowest
        if significant and lower:
            order, best, lowest = candidate, fit, trial.aicc
        elif not significant and not lower:
            break
    return order, best, tuple(trials)


def _outcome(
    points: _Points, problem: _Problem, order: int, fit: LinearFit, trials: tuple[OrderTrial, ...]
) -> CurveFit:
    curve = problem.curve(fit.values)
    slope = problem.kelvin_per_value(points.T, points.R)
    residuals = fit.residuals * slope
    u_T = 1e-3 * points.T if points.u is None else points.u
    weighted = (
        problem.design(points.T if problem.inverse else points.R, order) * np.abs(slope / u_T)[:, np.newaxis]
    )
    leverage = np.sum(np.linalg.qr(weighted)[0] ** 2, axis=1)
    left_out = residuals / np.maximum(1 - leverage, np.finfo(float).eps)

    def row(R: Floats) -> Floats:
        return problem.design(floats(evaluate(curve, R).temperature) if problem.inverse else R, order)

    return CurveFit(
        curve=curve,
        fit=fit,
        order=order,
        residuals=residuals,
        rms=float(np.sqrt(np.mean(residuals**2))),
        largest=float(np.max(np.abs(residuals))),
        largest_in_uncertainties=None if points.u is None else float(np.max(np.abs(residuals) / points.u)),
        leave_one_out=float(np.sqrt(np.mean(left_out**2))),
        reduced_chi2=None if points.u is None or fit.dof == 0 else fit.chi2 / fit.dof,
        monotonic=is_monotonic(curve),
        trials=trials,
        _row=row,
        _kelvin_per_value=problem.kelvin_per_value,
    )


def fit_log_polynomial(
    resistance: ArrayLike,
    temperature: ArrayLike,
    *,
    temperature_uncertainty: ArrayLike | None = None,
    largest_order: int = 9,
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
    points = _points(resistance, temperature, temperature_uncertainty, 6)
    centre, scale = _centre_and_scale(np.log(points.R))
    problem = _Problem(
        value=np.log(points.T),
        kelvin_per_value=lambda T, R: T + 0 * R,
        design=lambda R, order: floats(polynomial.polyvander((np.log(R) - centre) / scale, order)),
        curve=lambda b: LogPolynomialCurve(tuple(map(float, b)), points.resistance_span, centre, scale),
    )
    return _outcome(points, problem, *_choose(points, problem, largest_order))


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
    points = _points(resistance, temperature, temperature_uncertainty, 6)
    centre, scale = _centre_and_scale(np.log(points.T))
    rough = polynomial.Polynomial.fit(np.log(points.T), np.log(points.R), 2).deriv()
    problem = _Problem(
        value=np.log(points.R),
        kelvin_per_value=lambda T, R: T / rough(np.log(T)) + 0 * R,
        design=lambda T, order: floats(polynomial.polyvander((np.log(T) - centre) / scale, order)),
        curve=lambda b: InverseLogPolynomialCurve(
            tuple(map(float, b)), points.temperature_span, centre, scale
        ),
        inverse=True,
    )
    return _outcome(points, problem, *_choose(points, problem, largest_order))


def _centre_and_scale(x: Floats) -> tuple[float, float]:
    low, high = float(x.min()), float(x.max())
    return 0.5 * (low + high), 0.5 * (high - low)


def fit_chebyshev(
    resistance: ArrayLike,
    temperature: ArrayLike,
    *,
    temperature_uncertainty: ArrayLike | None = None,
    largest_order: int = 12,
) -> CurveFit:
    """Return the Chebyshev series T(ln R) that the points support.

    Parameters
    ----------
    resistance, temperature, temperature_uncertainty, largest_order
        As in `fit_log_polynomial`.

    Returns
    -------
    CurveFit
        Its curve is a `ChebyshevCurve` in ln R whose ZL and ZU are those of the outermost points.

    Raises
    ------
    ValueError
        As `fit_log_polynomial`.
    """
    points = _points(resistance, temperature, temperature_uncertainty, 6)
    low, high = float(np.log(points.R.min())), float(np.log(points.R.max()))
    problem = _Problem(
        value=points.T,
        kelvin_per_value=lambda T, R: np.ones_like(T) + 0 * R,
        design=lambda R, order: floats(
            chebyshev.chebvander((2 * np.log(R) - low - high) / (high - low), order)
        ),
        curve=lambda a: ChebyshevCurve(tuple(map(float, a)), low, high, "ln"),
    )
    return _outcome(points, problem, *_choose(points, problem, largest_order))


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
    points = _points(resistance, temperature, temperature_uncertainty, 6)

    def curve(b: Floats) -> ResistanceCurve:
        if b[1] <= 0:
            raise ValueError("resistance: found no fall with temperature, expected one for a hopping law")
        return HoppingCurve(
            float(np.exp(-b[0] / b[1])), float(b[1] ** (-1 / exponent)), exponent, points.temperature_span
        )

    problem = _Problem(
        value=points.T**-exponent,
        kelvin_per_value=lambda T, R: -(T ** (exponent + 1)) / exponent + 0 * R,
        design=lambda R, _: np.column_stack([np.ones_like(R), np.log(R)]),
        curve=curve,
    )
    return _outcome(points, problem, 1, _solve(points, problem, 1), ())


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
    points = _points(resistance, temperature, temperature_uncertainty, 6)

    def curve(b: Floats) -> ResistanceCurve:
        B = 1 / float(b[1])
        return ClementQuinnellCurve(
            A=-B * float(b[0]), B=B, K=B * float(b[2]), resistance_span=points.resistance_span
        )

    if points.R.min() <= 1:
        index = int(np.argmin(points.R))
        raise ValueError(f"resistance[{index}]: found {points.R[index]} ohm, expected more than 1 ohm")
    problem = _Problem(
        value=1 / points.T,
        kelvin_per_value=lambda T, R: -(T**2) + 0 * R,
        design=lambda R, _: np.column_stack([np.ones_like(R), np.log(R), 1 / np.log(R)]),
        curve=curve,
    )
    return _outcome(points, problem, 2, _solve(points, problem, 2), ())

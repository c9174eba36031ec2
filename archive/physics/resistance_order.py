"""Weighted linear fit of a calibration form to points, the order chosen by the data, and how well it stands.

Rules: weights are the temperature-equivalent uncertainty of each point. The order rises while both the F-test and AICc
ask for it and stops at the first order that neither supports. What the form leaves open between the points is the rms
distance to the curve of the next order, with the scatter beyond the stated uncertainties where chi-squared (5 per cent)
asks for it (the project's own estimate; the covariance of a fit cannot know that the form is only an approximation).

References
----------
F-test and AICc: see `residual_tests`.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from archive.physics.linear_fit import LinearFit, linear_fit
from archive.physics.ranges import Floats, floats
from archive.physics.residual_tests import aicc, chi2_probability, f_test
from archive.physics.resistance_curves import ResistanceCurve
from archive.physics.resistance_thermometer import evaluate, is_monotonic

__all__ = [
    "CurveFit",
    "OrderTrial",
    "Points",
    "Problem",
    "calibration_points",
    "choose_order",
    "outcome",
    "solve",
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
    interpolation : float
        What the form itself leaves open, as a fraction of T; see `interpolation_uncertainty`.
    reduced_chi2 : float or None
        When uncertainties were given and degrees of freedom are left.
    monotonic : bool
        Whether dT/dR keeps one sign over the span; otherwise do not use the curve.
    centre, half_width : float
        Of ln R (of ln T for the inverse form); the variable of the linear problem is (ln R - centre)/half_width.
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
    interpolation: float
    reduced_chi2: float | None
    monotonic: bool
    centre: float
    half_width: float
    trials: tuple[OrderTrial, ...]
    _row: Callable[[Floats], Floats]
    _kelvin_per_value: Callable[[Floats, Floats], Floats]

    def standard_uncertainty(self, resistance: ArrayLike) -> Floats:
        """Return the standard uncertainty in K that the fit leaves at a resistance in ohm; NaN outside the span.

        From the covariance of the coefficients; that the form itself is only an approximation is not in it.
        """
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
class Points:
    """Checked calibration points: ohm, K, and standard uncertainty in K if given."""

    R: Floats
    T: Floats
    u: Floats | None

    @property
    def resistance_span(self) -> tuple[float, float]:
        """Smallest and largest resistance, ohm."""
        return float(self.R.min()), float(self.R.max())

    @property
    def temperature_span(self) -> tuple[float, float]:
        """Lowest and highest temperature, K."""
        return float(self.T.min()), float(self.T.max())


def calibration_points(
    resistance: ArrayLike, temperature: ArrayLike, uncertainty: ArrayLike | None, least: int
) -> Points:
    """Return the points after checking shapes, number and sign; raise ValueError with name and index."""
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
        return Points(R, T, None)
    u = np.broadcast_to(floats(uncertainty), T.shape)
    bad = np.flatnonzero(~(np.isfinite(u) & (u > 0)))
    if bad.size:
        raise ValueError(f"temperature_uncertainty[{bad[0]}]: found {u[bad[0]]}, expected a number above 0")
    return Points(R, T, u)


@dataclass(frozen=True)
class Problem:
    """A calibration form written as a linear problem: value = design @ coefficients."""

    value: Floats
    kelvin_per_value: Callable[[Floats, Floats], Floats]  # dT/d(value) from T and R
    design: Callable[[Floats, int], Floats]  # from R (or T, if inverse) and the order
    curve: Callable[[Floats], ResistanceCurve]
    inverse: bool = False
    graded: bool = True  # whether there is a next order to compare with
    centre: float = 0.0
    half_width: float = 1.0


def solve(points: Points, problem: Problem, order: int) -> LinearFit:
    """Return the weighted linear fit of one order."""
    design = problem.design(points.T if problem.inverse else points.R, order)
    # Without uncertainties the points count alike in T relative to T, as sensors of this kind scatter.
    u_T = 1e-3 * points.T if points.u is None else points.u
    u = u_T / np.abs(problem.kelvin_per_value(points.T, points.R))
    names = tuple(f"b{i}" for i in range(design.shape[1]))
    return linear_fit(
        design, problem.value, names=names, standard_uncertainty=u, absolute=points.u is not None
    )


def choose_order(
    points: Points, problem: Problem, largest_order: int, order: int | None = None
) -> tuple[int, LinearFit, tuple[OrderTrial, ...]]:
    """Return the order that the points support, or the one that is given, its fit, and the orders tried."""
    n = points.R.size
    if order is not None:
        return order, solve(points, problem, order), ()
    # Keep at least two points for each parameter, the variance counted.
    largest = max(1, min(largest_order, n // 2 - 2))
    best = solve(points, problem, 1)
    order = 1
    trials = [OrderTrial(1, best.chi2, aicc(residual_sum=best.chi2, points=n, parameters=2), None)]
    lowest = trials[0].aicc
    for candidate in range(2, largest + 1):
        fit = solve(points, problem, candidate)
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


def outcome(
    points: Points, problem: Problem, order: int, fit: LinearFit, trials: tuple[OrderTrial, ...]
) -> CurveFit:
    """Return the fitted curve with its residuals and quality figures."""
    curve = problem.curve(fit.values)
    slope = problem.kelvin_per_value(points.T, points.R)
    residuals = fit.residuals * slope
    u_T = 1e-3 * points.T if points.u is None else points.u
    weighted = (
        problem.design(points.T if problem.inverse else points.R, order) * np.abs(slope / u_T)[:, np.newaxis]
    )
    kept = np.maximum(1 - np.sum(np.linalg.qr(weighted)[0] ** 2, axis=1), np.finfo(float).eps)
    left_out = residuals / kept

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
        interpolation=math.hypot(
            _next_order(points, problem, order, curve), _excess(points, residuals, kept, fit)
        ),
        reduced_chi2=None if points.u is None or fit.dof == 0 else fit.chi2 / fit.dof,
        monotonic=is_monotonic(curve),
        centre=problem.centre,
        half_width=problem.half_width,
        trials=trials,
        _row=row,
        _kelvin_per_value=problem.kelvin_per_value,
    )


def _next_order(points: Points, problem: Problem, order: int, curve: ResistanceCurve) -> float:
    """Return the rms distance of the next order's curve, as a fraction of T, on an even grid of ln R."""
    if not problem.graded or points.R.size < order + 3:
        return 0.0
    low, high = np.log(points.resistance_span)
    grid = np.linspace(low, high, 200)[1:-1]
    try:
        other = problem.curve(solve(points, problem, order + 1).values)
        with np.errstate(invalid="ignore"):
            distance = other.log_temperature(grid)[0] - curve.log_temperature(grid)[0]
    except ValueError:  # the next order turns within the span: it says nothing
        return 0.0
    distance = distance[np.isfinite(distance)]
    return float(np.sqrt(np.mean(distance**2))) if distance.size else 0.0


def _excess(points: Points, residuals: Floats, kept: Floats, fit: LinearFit) -> float:
    """Return the scatter of the points beyond their uncertainties, as a fraction of T; 0 unless chi-squared asks for it."""
    if points.u is None or chi2_probability(fit.chi2, fit.dof) > _SIGNIFICANT or fit.dof == 0:
        return 0.0
    # The variance of a residual is u^2 (1 - leverage) where the form is true.
    variance = np.mean((residuals**2 / kept - points.u**2) / points.T**2)
    return math.sqrt(max(float(variance), 0.0))

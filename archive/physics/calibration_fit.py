"""Fit of a calibration curve to pairs of reading and reference temperature, and all that its user needs to know of it.

Rules: a point's weight is the uncertainty of its temperature with that of its reading turned into kelvin by the slope;
what all points share (reference, scale) is no weight and is carried separately. A curve that turns within the points is
refused. Without stated uncertainties the points count alike relative to T and the covariance is scaled by the scatter.

References
----------
Effective variance: the uncertainty of the abscissa times the slope, added in quadrature, e.g. W. T. Eadie et al.,
Statistical Methods in Experimental Physics (1971) (from memory). JCGM 100:2008 (GUM), 5.2.2.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike

from archive.physics.calibration_curve import CalibrationCurve, CurveForm
from archive.physics.paramagnetic import fit_curie_weiss
from archive.physics.ranges import Floats, floats
from archive.physics.residual_tests import chi2_probability
from archive.physics.resistance_fit import fit_chebyshev, fit_log_polynomial
from archive.physics.resistance_order import CurveFit, OrderTrial

__all__ = ["CalibrationFit", "fit_calibration"]

_LEAST = {"chebyshev": 6, "log-polynomial": 6, "spline": 7, "curie-weiss": 5}
_MOST_KNOTS = 60
_SIGNIFICANT = 0.05
_USELESS = 0.10  # of T: no thermometer (common practice, no source)


@dataclass(frozen=True)
class CalibrationFit:
    """A fitted calibration and how well it stands.

    Attributes
    ----------
    curve : CalibrationCurve
        Covers the points and no more.
    covariance : ndarray
        Of the coefficients, from the points' own uncertainties.
    order : int
        Highest power; parameters less one.
    residuals : ndarray
        Reference temperature minus that of the curve, K, in the order given.
    rms, largest : float
        Of the residuals, K; `largest` by absolute value.
    leave_one_out : float
        Rms of the residuals of points left out of their own fit, K.
    interpolation : float
        Standard uncertainty of the form itself between the points, as a fraction of T.
    reduced_chi2, chance : float or None
        When uncertainties were given: chi-squared per degree of freedom, and the chance of so large a one.
    trials : tuple of OrderTrial
        The orders tried.
    """

    curve: CalibrationCurve
    covariance: Floats
    order: int
    residuals: Floats
    rms: float
    largest: float
    leave_one_out: float
    interpolation: float
    reduced_chi2: float | None
    chance: float | None
    trials: tuple[OrderTrial, ...] = ()

    def standard_uncertainty(self, reading: ArrayLike) -> Floats:
        """Return the standard uncertainty in K that the covariance leaves at a reading; NaN outside the span."""
        rows = self.curve.derivatives(reading)
        return floats(np.sqrt(np.einsum("ij,jk,ik->i", rows, self.covariance, rows)))


def fit_calibration(
    form: CurveForm,
    reading: ArrayLike,
    temperature: ArrayLike,
    *,
    temperature_uncertainty: ArrayLike | None = None,
    reading_uncertainty: ArrayLike | None = None,
    largest_order: int = 9,
    order: int | None = None,
    centre_and_half_width: tuple[float, float] | None = None,
) -> CalibrationFit:
    """Return a calibration curve fitted to points, with covariance, residuals and interpolation uncertainty.

    Parameters
    ----------
    form : {"chebyshev", "log-polynomial", "spline", "curie-weiss"}
    reading : array_like, shape (n,)
        In any unit; above 0 but for ``curie-weiss``. At least 6 points for the polynomials, 7 for a spline, 5 for
        ``curie-weiss``.
    temperature : array_like, shape (n,)
        K, above 0.
    temperature_uncertainty, reading_uncertainty : array_like, optional
        Standard uncertainty of each point that no other point shares; None or all 0: not stated.
    largest_order : int
        Highest power tried by the polynomials.
    order, centre_and_half_width : optional
        Held instead of chosen, when a fit is repeated with moved points.

    Returns
    -------
    CalibrationFit

    Raises
    ------
    ValueError
        Too few points, values that are not finite or not above 0, two spline points at one reading, more than 60 spline
        points, a curve that misses its points by a tenth of T, or one that turns within them.

    Notes
    -----
    The order of a polynomial is raised while both the F-test (5 per cent) and AICc ask for it. `interpolation` is, for a
    polynomial, the rms distance to the curve of the next order, for a spline the rms miss at points left out beyond what
    their uncertainties explain, and for every form the scatter beyond the stated uncertainties where chi-squared asks for
    it (all four: the project's own estimates).
    """
    R, T = _points(form, reading, temperature)
    u_T = _spread("temperature_uncertainty", temperature_uncertainty, T)
    u_R = _spread("reading_uncertainty", reading_uncertainty, R)

    def fitted(u: Floats | None) -> CalibrationFit:
        if form == "spline":
            return _spline(R, T, u)
        if form == "curie-weiss":
            return _curie_weiss(R, T, u)
        return _polynomial(form, R, T, u, largest_order, order, centre_and_half_width)

    u = u_T
    if u_R is not None:
        # The slope of a first fit turns the reading's uncertainty into kelvin; it hardly depends on the weights.
        slope = np.abs(fitted(u_T).curve.slope(R))
        u = slope * u_R if u_T is None else np.hypot(u_T, slope * u_R)
    found = fitted(u)
    miss = _rms(found.residuals / T)
    if miss > _USELESS:
        raise ValueError(
            f"temperature: the fitted {form} misses its points by {100 * miss:.3g} per cent (rms), so they do not follow it; "
            "leave out points that do not belong, or take another form"
        )
    if not found.curve.is_monotonic():
        raise ValueError(
            f"reading: the fitted {form} of order {found.order} turns within the points, so that two temperatures fit one "
            "reading; lower largest_order, or leave out the points that bend it"
        )
    return found


def _points(form: str, reading: ArrayLike, temperature: ArrayLike) -> tuple[Floats, Floats]:
    R, T = floats(reading), floats(temperature)
    if R.ndim != 1 or R.shape != T.shape:
        raise ValueError(
            f"temperature: found shape {T.shape}, expected that of reading, {R.shape}, one-dimensional"
        )
    if R.size < _LEAST[form]:
        raise ValueError(f"reading: found {R.size} points, expected at least {_LEAST[form]} for a {form}")
    for name, values, positive in (("reading", R, form != "curie-weiss"), ("temperature", T, True)):
        bad = np.flatnonzero(~(np.isfinite(values) & ((values > 0) | (not positive))))
        if bad.size:
            expected = "a number above 0" if positive else "a finite number"
            raise ValueError(f"{name}[{bad[0]}]: found {values[bad[0]]}, expected {expected}")
    return R, T


def _spread(name: str, given: ArrayLike | None, like: Floats) -> Floats | None:
    if given is None:
        return None
    u = np.broadcast_to(floats(given), like.shape)
    if not np.any(u):
        return None
    bad = np.flatnonzero(~(np.isfinite(u) & (u > 0)))
    if bad.size:
        raise ValueError(
            f"{name}[{bad[0]}]: found {u[bad[0]]}, expected a number above 0 for every point, or 0 for all"
        )
    return floats(u)


def _polynomial(
    form: CurveForm, R: Floats, T: Floats, u: Floats | None, largest: int, order: int | None, scaled: tuple[float, float] | None
) -> CalibrationFit:  # fmt: skip
    fit: CurveFit = (fit_chebyshev if form == "chebyshev" else fit_log_polynomial)(
        R, T, temperature_uncertainty=u, largest_order=largest, order=order, centre_and_half_width=scaled
    )
    curve = CalibrationCurve(
        form, tuple(map(float, fit.fit.values)), (float(R.min()), float(R.max())), fit.centre, fit.half_width
    )
    chance = None if u is None else chi2_probability(fit.fit.chi2, fit.fit.dof)
    return CalibrationFit(
        curve, fit.fit.covariance, fit.order, fit.residuals, fit.rms, fit.largest, fit.leave_one_out, fit.interpolation,
        fit.reduced_chi2, chance, fit.trials,
    )  # fmt: skip


def _curie_weiss(M: Floats, T: Floats, u: Floats | None) -> CalibrationFit:
    fit = fit_curie_weiss(M, T, temperature_uncertainty=u)
    if not fit.converged:
        raise ValueError(
            f"reading: the search for the law of Curie and Weiss did not end properly: {fit.message}"
        )
    curve = CalibrationCurve(
        "curie-weiss", (fit.offset, fit.constant, fit.theta), (float(M.min()), float(M.max()))
    )
    rows = curve.derivatives(M) / (T if u is None else u)[:, np.newaxis]
    # Columns of very different size: scaled, so that the decomposition sees all three.
    rows = rows / np.linalg.norm(rows, axis=0)
    kept = np.maximum(1 - np.sum(np.linalg.qr(rows)[0] ** 2, axis=1), np.finfo(float).eps)
    found = CalibrationFit(
        curve, fit.covariance, 2, fit.residuals, _rms(fit.residuals), float(np.max(np.abs(fit.residuals))), _rms(fit.residuals / kept),
        0.0, None, None,
    )  # fmt: skip
    if u is None:
        return found
    chi2, dof = float(np.sum((fit.residuals / u) ** 2)), M.size - 3
    chance = chi2_probability(chi2, dof)
    excess = (
        float(np.mean((fit.residuals**2 / kept - u**2) / T**2))
        if not math.isnan(chance) and chance < _SIGNIFICANT
        else 0.0
    )
    return replace(found, reduced_chi2=chi2 / dof, chance=chance, interpolation=math.sqrt(max(excess, 0.0)))


def _spline(R: Floats, T: Floats, u: Floats | None) -> CalibrationFit:
    if R.size > _MOST_KNOTS:
        raise ValueError(
            f"reading: found {R.size} points, expected at most {_MOST_KNOTS} for a spline; average them to plateaus first"
        )
    order = np.argsort(R)
    x, y = R[order], T[order]
    twice = np.flatnonzero(np.diff(x) == 0)
    if twice.size:
        raise ValueError(
            f"reading: found two points at {x[twice[0]]:.8g}, expected different readings; average them to plateaus first"
        )
    relative = None if u is None else u[order] / y
    miss, explained = _left_out(x, y, relative)
    if relative is None:
        # The misses are all that is known: taken as noise of the points, as a scaled covariance does.
        relative = np.full(y.shape, math.sqrt(float(np.mean(miss**2 / explained))))
        interpolation = 0.0
    else:
        interpolation = math.sqrt(max(float(np.mean(miss**2 - explained)), 0.0))
    curve = CalibrationCurve(
        "spline", tuple(map(float, y)), (float(x[0]), float(x[-1])), knots=tuple(map(float, x))
    )
    residuals = np.zeros(y.size)
    return CalibrationFit(
        curve, np.diag((relative * y) ** 2), y.size - 1, residuals, 0.0, 0.0, math.sqrt(float(np.mean(miss**2 * np.median(y) ** 2))),
        interpolation, None, None,
    )  # fmt: skip


def _left_out(x: Floats, y: Floats, relative: Floats | None) -> tuple[Floats, Floats]:
    """Return ln T misses of points left out, every second one at once, and the variance that noise explains in each."""
    misses, variances = [], []
    noise = np.ones(y.size) if relative is None else relative
    for parity in (0, 1):
        keep = np.arange(y.size) % 2 == parity
        keep[0] = keep[-1] = True
        part = CalibrationCurve("spline", tuple(y[keep]), (x[0], x[-1]), knots=tuple(x[keep]))
        at = x[~keep]
        misses.append(np.log(y[~keep] / part.temperature(at)))
        weights = part.derivatives(at) * y[keep] / part.temperature(at)[:, np.newaxis]
        variances.append(noise[~keep] ** 2 + (weights**2) @ noise[keep] ** 2)
    return np.concatenate(misses), np.concatenate(variances)


def _rms(values: Floats) -> float:
    return float(np.sqrt(np.mean(values**2)))

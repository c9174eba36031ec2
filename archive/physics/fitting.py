"""Nonlinear least squares: one layer over the solver, which says aloud whether it converged.

Rules: parameters are scaled before they reach the solver; the stopping reason of the solver is not believed,
convergence is judged by the relative offset (Bates and Watts); whether uncertainties are absolute is always said by
the caller; nothing is random.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy.optimize import least_squares

from archive.physics.arrays import FloatArray, series
from archive.physics.linear_fit import reciprocal_uncertainty

__all__ = ["FitResult", "Parameter", "fit", "fit_residuals"]

RELATIVE_OFFSET = 1e-3
"""Bates and Watts (1981): at 0.001 the remaining step is about a thousandth of the confidence region."""

ROUNDING = 1e-8
"""A gradient this small against the residuals' own gradient scale is rounding, square root of the precision."""

TOLERANCE = 4 * float(np.finfo(float).eps)
"""The edge of double precision: stopping early is what ruins ill-conditioned problems."""


@dataclass(frozen=True)
class Parameter:
    """What a fit may change: a name, a start value, bounds, and a typical size.

    Parameters
    ----------
    name : str
    start : float
        Finite, inside the bounds.
    lower, upper : float
        Bounds; infinite if there are none.
    scale : float, optional
        Typical size, > 0; by default the size of the start value, or of the interval if that is zero.
    """

    name: str
    start: float
    lower: float = -math.inf
    upper: float = math.inf
    scale: float | None = None

    def typical_size(self) -> float:
        """Return the scale in use."""
        if self.scale is not None:
            return self.scale
        if self.start != 0:
            return abs(self.start)
        width = self.upper - self.lower
        return width if math.isfinite(width) else 1.0


@dataclass(frozen=True)
class FitResult:
    """Outcome of a nonlinear fit.

    Attributes
    ----------
    names : tuple of str
        Parameter names, in the order of `values`.
    values, covariance : ndarray
        Best values and their covariance. Parameters held by a bound have zero variance; all is infinite
        where the data do not determine it.
    residuals : ndarray
        Observed minus fitted, in the unit of the data (weighted, if the caller gave weighted residuals).
    chi2 : float
        Weighted sum of squares.
    dof : int
        Points minus free parameters.
    converged : bool
        Judged by the relative offset, not by the solver's word.
    message : str
        What happened, in words.
    absolute : bool
        True: covariance from the given uncertainties; False: scaled by chi2/dof.
    at_bound : tuple of str
        Parameters that ended on a bound.
    evaluations : int
        Calls of the model.
    """

    names: tuple[str, ...]
    values: FloatArray
    covariance: FloatArray
    residuals: FloatArray
    chi2: float
    dof: int
    converged: bool
    message: str
    absolute: bool
    at_bound: tuple[str, ...]
    evaluations: int

    def value(self, name: str) -> float:
        """Return the best value of a parameter."""
        return float(self.values[self.names.index(name)])

    def standard_uncertainty(self, name: str) -> float:
        """Return the standard uncertainty of a parameter."""
        index = self.names.index(name)
        return float(np.sqrt(self.covariance[index, index]))

    @property
    def reduced_chi2(self) -> float:
        """Chi-squared per degree of freedom; not a number if there is none."""
        return self.chi2 / self.dof if self.dof > 0 else math.nan


def fit(
    model: Callable[[Any, FloatArray], FloatArray],
    parameters: Sequence[Parameter],
    x: Any,
    y: npt.ArrayLike,
    *,
    standard_uncertainty: npt.ArrayLike | None = None,
    absolute: bool,
    max_evaluations: int = 20_000,
) -> FitResult:
    """Return the least-squares fit of ``model(x, values)`` to ``y``.

    Parameters
    ----------
    model : callable
        Takes `x` as given and the parameter values as an array; returns an array like `y`.
    parameters : sequence of Parameter
        What is free; at least one, names unique.
    x : anything
        Handed to the model unchanged.
    y : array_like, shape (points,)
        Observations.
    standard_uncertainty : array_like, optional
        Of each observation (a scalar serves all), > 0.
    absolute : bool
        True: the uncertainties are what they say; False: relative weights, covariance times chi2/dof.
    max_evaluations : int
        Calls of the model before giving up.

    Returns
    -------
    FitResult

    Raises
    ------
    ValueError
        Bad parameters or data, more parameters than points, or a model that is not finite at the start.

    Examples
    --------
    >>> t = np.linspace(0.0, 4.0, 9)
    >>> start = [Parameter("height", 1.0), Parameter("rate", 1.0)]
    >>> found = fit(lambda t, p: p[0] * np.exp(-p[1] * t), start, t, 3 * np.exp(-0.5 * t), absolute=False)
    >>> found.converged, round(found.value("rate"), 9)
    (True, 0.5)
    """
    observed = series("y", y)
    weights = reciprocal_uncertainty(observed, standard_uncertainty, absolute=absolute)

    def residuals(values: FloatArray) -> FloatArray:
        return (observed - model(x, values)) * weights

    # What double precision leaves of the data: a smaller gradient is no sign of a bad fit.
    rounding = 8 * float(np.finfo(float).eps) * float(np.linalg.norm(observed * weights))
    result = fit_residuals(
        residuals, parameters, absolute=absolute, max_evaluations=max_evaluations, rounding=rounding
    )
    return FitResult(**{**vars(result), "residuals": result.residuals / weights})


def fit_residuals(
    residuals: Callable[[FloatArray], FloatArray],
    parameters: Sequence[Parameter],
    *,
    absolute: bool,
    max_evaluations: int = 20_000,
    rounding: float = 0.0,
    jacobian: Callable[[FloatArray], FloatArray] | None = None,
    tolerance: float = TOLERANCE,
) -> FitResult:
    """Return the fit that makes the sum of squares of a residual function least.

    Parameters
    ----------
    residuals : callable
        Takes the parameter values, returns weighted residuals (observed minus fitted over uncertainty).
    parameters, absolute, max_evaluations
        As in `fit`.
    rounding : float
        Length of the residual vector that is rounding of the data alone.
    jacobian : callable, optional
        Takes the parameter values, returns the derivatives of the residuals, shape (residuals, parameters).
    tolerance : float
        Relative change of the parameters at which the search ends, or its square of the sum of squares.

    Returns
    -------
    FitResult
        Its `residuals` are the weighted ones.

    Raises
    ------
    ValueError
        As in `fit`.

    Notes
    -----
    Without `jacobian` the derivatives are central differences. The Levenberg-Marquardt way is tried first if there are no bounds,
    then the trust-region way; the better end is kept. Convergence means that the relative offset (length of
    the residual vector's projection on the tangent plane against its length across it, each per degree of
    freedom) is below 0.001, or that the gradient has vanished to rounding.

    References
    ----------
    D. M. Bates, D. G. Watts, "A relative offset orthogonality convergence criterion for nonlinear least
    squares", Technometrics 23, 179 (1981).
    """
    names = _checked_names(parameters)
    scale = np.array([parameter.typical_size() for parameter in parameters])
    start = np.array([parameter.start for parameter in parameters]) / scale
    lower = np.array([parameter.lower for parameter in parameters]) / scale
    upper = np.array([parameter.upper for parameter in parameters]) / scale
    calls = _Counted(residuals, scale, jacobian)
    first = calls(start)
    if first.size < len(names):
        raise ValueError(
            f"y: found {first.size} points, expected at least {len(names)}, one for each parameter"
        )
    if not np.isfinite(first).all():
        index = int(np.argmax(~np.isfinite(first)))
        raise ValueError(
            f"model: found {first[index]} at point {index} with the start values, expected a finite number"
        )
    bounded = bool(np.isfinite(lower).any() or np.isfinite(upper).any())
    best, best_jacobian, offset = start, _jacobian(calls, start, lower, upper), math.inf
    for method in ("trf",) if bounded else ("lm", "trf"):
        end = _solve(calls, best, lower, upper, method=method, budget=max_evaluations, tolerance=tolerance)
        if np.sum(calls(end) ** 2) <= np.sum(calls(best) ** 2):
            best = end
        best_jacobian = _jacobian(calls, best, lower, upper)
        values = calls(best)
        held = _held(best, best_jacobian, values, lower, upper)
        offset = _relative_offset(values, best_jacobian, held, rounding=rounding)
        if offset < RELATIVE_OFFSET:
            break
    return _result(
        names,
        best,
        best_jacobian,
        calls,
        lower=lower,
        upper=upper,
        offset=offset,
        absolute=absolute,
        budget=max_evaluations,
    )


class _Counted:
    """The residual function in scaled parameters, with a count of calls."""

    def __init__(
        self,
        residuals: Callable[[FloatArray], FloatArray],
        scale: FloatArray,
        slopes: Callable[[FloatArray], FloatArray] | None,
    ) -> None:
        self.residuals = residuals
        self.scale = scale
        self.slopes = slopes
        self.calls = 0

    def __call__(self, scaled: FloatArray) -> FloatArray:
        self.calls += 1
        # A trial step may overflow an exponential; the solver sees a huge residual and steps back.
        with np.errstate(all="ignore"):
            values = np.asarray(self.residuals(scaled * self.scale), dtype=np.float64)
        if values.ndim != 1:
            raise ValueError(f"model: found {values.ndim} dimensions, expected one")
        return values

    def bounded(self, scaled: FloatArray) -> FloatArray:
        """Return residuals with what is not finite made very large."""
        return np.nan_to_num(self(scaled), nan=1e100, posinf=1e100, neginf=-1e100).clip(-1e100, 1e100)


def _checked_names(parameters: Sequence[Parameter]) -> tuple[str, ...]:
    names = tuple(parameter.name for parameter in parameters)
    if not names:
        raise ValueError("parameters: found none, expected at least one")
    if len(set(names)) != len(names):
        raise ValueError(f"parameters: found a name twice in {names}, expected unique names")
    for index, parameter in enumerate(parameters):
        if not (math.isfinite(parameter.start) and parameter.lower <= parameter.start <= parameter.upper):
            raise ValueError(
                f"parameters[{index}] ({parameter.name}): found start {parameter.start}, "
                f"expected a finite number from {parameter.lower} to {parameter.upper}"
            )
        if not parameter.lower < parameter.upper:
            raise ValueError(f"parameters[{index}] ({parameter.name}): found no room between the bounds")
        if parameter.scale is not None and not 0 < parameter.scale < math.inf:
            raise ValueError(
                f"parameters[{index}] ({parameter.name}): found scale {parameter.scale}, expected > 0"
            )
    return names


def _jacobian(calls: _Counted, point: FloatArray, lower: FloatArray, upper: FloatArray) -> FloatArray:
    """Return the caller's Jacobian, or the central-difference one, one-sided where a bound is in the way."""
    if calls.slopes is not None:
        calls.calls += 1
        with np.errstate(all="ignore"):
            return np.nan_to_num(
                np.asarray(calls.slopes(point * calls.scale)) * calls.scale,
                nan=0.0,
                posinf=1e100,
                neginf=-1e100,
            )
    columns = []
    for index, value in enumerate(point):
        # A value is counted in its parameter's own scale: a resonance frequency is many line widths, and a step of a part of
        # it would leap over the line.
        step = np.finfo(float).eps ** (1 / 3) * max(min(abs(value), 1.0), 1e-4)
        above, below = point.copy(), point.copy()
        above[index] = min(value + step, upper[index])
        below[index] = max(value - step, lower[index])
        columns.append((calls.bounded(above) - calls.bounded(below)) / (above[index] - below[index]))
    return np.column_stack(columns)


def _solve(
    calls: _Counted,
    start: FloatArray,
    lower: FloatArray,
    upper: FloatArray,
    *,
    method: str,
    budget: int,
    tolerance: float,
) -> FloatArray:
    if method == "lm":
        bounds: tuple[Any, Any] = (-np.inf, np.inf)
    else:
        bounds = (lower, upper)
        # The trust-region solver wants to begin strictly inside; a start on a bound is allowed here.
        width = np.where(np.isfinite(upper - lower), upper - lower, 1.0)
        start = np.clip(start, lower + 1e-10 * width, upper - 1e-10 * width)

    # The solver's gradient tolerance is absolute, so it must not see the unit of the data.
    unit = float(np.linalg.norm(calls.bounded(start))) or 1.0

    def residuals(point: FloatArray) -> FloatArray:
        return calls.bounded(point) / unit

    def jacobian(point: FloatArray) -> FloatArray:
        return _jacobian(calls, point, lower, upper) / unit

    # Cubes overflow inside the solver when a trial step was wild; it recovers by itself.
    with np.errstate(all="ignore"):
        outcome = least_squares(
            residuals,
            start,
            jac=jacobian,
            bounds=bounds,
            method=method,  # type: ignore[arg-type]
            x_scale="jac",
            # Near the best point the sum of squares goes as the square of the step.
            ftol=max(tolerance**2, TOLERANCE),
            xtol=tolerance,
            gtol=TOLERANCE,
            max_nfev=max(budget // (2 if calls.slopes is not None else 2 * start.size + 1), 10),
        )
    return np.asarray(outcome.x, dtype=np.float64)


def _held(
    point: FloatArray, jacobian: FloatArray, values: FloatArray, lower: FloatArray, upper: FloatArray
) -> npt.NDArray[np.bool_]:
    """Return which parameters sit on a bound with the sum of squares falling towards the outside."""
    near = 1e-7 * np.maximum(np.abs(point), 1e-4)
    gradient = jacobian.T @ values
    return ((point - lower <= near) & (gradient >= 0)) | ((upper - point <= near) & (gradient <= 0))


def _relative_offset(
    values: FloatArray, jacobian: FloatArray, held: npt.NDArray[np.bool_], *, rounding: float
) -> float:
    free = jacobian[:, ~held]
    norm = np.linalg.norm(free, axis=0)
    if free.shape[1] == 0:
        return 0.0
    if not np.isfinite(free).all() or (norm == 0).any():
        return math.inf
    q, _ = np.linalg.qr(free / norm)
    along = float(np.linalg.norm(q.T @ values))
    total = float(np.linalg.norm(values))
    across = math.sqrt(max(total**2 - along**2, 0.0))
    parameters, dof = free.shape[1], values.size - free.shape[1]
    # An exact fit has no length across; then what is left must be nothing against one natural step.
    if total <= ROUNDING * float(np.linalg.norm(norm)) * 1e-3 or along <= rounding:
        return 0.0
    if dof <= 0 or across == 0:
        return math.inf
    return (along / math.sqrt(parameters)) / (across / math.sqrt(dof))


def _result(
    names: tuple[str, ...],
    point: FloatArray,
    jacobian: FloatArray,
    calls: _Counted,
    *,
    lower: FloatArray,
    upper: FloatArray,
    offset: float,
    absolute: bool,
    budget: int,
) -> FitResult:
    values = calls(point)
    held = _held(point, jacobian, values, lower, upper)
    chi2 = float(np.sum(values**2))
    dof = int(values.size - np.count_nonzero(~held))
    covariance, determined = _covariance(jacobian, held)
    if not absolute and determined:
        covariance = covariance * (chi2 / dof) if dof > 0 else np.full_like(covariance, np.inf)
    covariance = covariance * np.outer(calls.scale, calls.scale)
    at_bound = tuple(name for name, flag in zip(names, held, strict=True) if flag)
    if not np.isfinite(values).all():
        converged, message = False, "not converged: the model is not finite where the search ended"
    elif not determined:
        converged, message = False, "not converged: the data do not determine all parameters"
    elif offset >= RELATIVE_OFFSET:
        spent = f" after {calls.calls} evaluations" if calls.calls >= budget else ""
        converged, message = (
            False,
            f"not converged{spent}: relative offset {offset:.2g}, expected below {RELATIVE_OFFSET}",
        )
    else:
        converged, message = True, "converged" + (f"; on a bound: {', '.join(at_bound)}" if at_bound else "")
    return FitResult(
        names,
        point * calls.scale,
        covariance,
        values,
        chi2,
        dof,
        converged,
        message,
        absolute,
        at_bound,
        calls.calls,
    )


def _covariance(jacobian: FloatArray, held: npt.NDArray[np.bool_]) -> tuple[FloatArray, bool]:
    size = jacobian.shape[1]
    covariance = np.zeros((size, size))
    free = np.flatnonzero(~held)
    if free.size == 0:
        return covariance, True
    columns = jacobian[:, free]
    norm = np.linalg.norm(columns, axis=0)
    if not np.isfinite(columns).all() or (norm == 0).any():
        covariance[np.ix_(free, free)] = np.inf
        return covariance, False
    _, singular, vt = np.linalg.svd(columns / norm, full_matrices=False)
    # Columns come from central differences, good to about 1e-10.
    if singular[-1] <= singular[0] * 1e-10:
        covariance[np.ix_(free, free)] = np.inf
        return covariance, False
    covariance[np.ix_(free, free)] = (vt.T / singular**2) @ vt / np.outer(norm, norm)
    return covariance, True

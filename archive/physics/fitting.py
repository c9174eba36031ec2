"""Nonlinear least squares: one layer over the solver, which says aloud whether it converged.

Rules: parameters are scaled before they reach the solver; the stopping reason of the solver is not believed,
convergence is judged by the relative offset (Bates and Watts); whether uncertainties are absolute is always said by
the caller; nothing is random.

References
----------
D. M. Bates, D. G. Watts, Technometrics 23, 179 (1981) (relative offset; from memory). Certified values in the tests: NIST
Statistical Reference Datasets.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray, series
from archive.physics.fit_calls import Residuals
from archive.physics.fit_search import RELATIVE_OFFSET, TOLERANCE, End, Terms, best_end
from archive.physics.linear_fit import reciprocal_uncertainty

__all__ = ["FitResult", "Parameter", "fit", "fit_residuals"]

VOUCHED = 5.0
"""Sum of squares per point up to which stated uncertainties vouch for a fit (common practice, no source)."""


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
        Calls of the model after which no new way is begun.

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
    # A curve that explains less than half of the data's spread may lie in a side valley, if no stated uncertainty vouches for it.
    spread = observed - np.average(observed, weights=np.broadcast_to(weights**2, observed.shape))
    doubt = 0.5 * float(np.sum((spread * weights) ** 2))
    if absolute:
        doubt = max(doubt, VOUCHED * observed.size)
    result = fit_residuals(
        residuals,
        parameters,
        absolute=absolute,
        max_evaluations=max_evaluations,
        rounding=rounding,
        doubt=doubt,
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
    doubt: float = math.inf,
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
    doubt : float
        Sum of squares above which even a converged fit is held against new starts, and left if one is half as high.
    tolerance : float
        Relative change of the parameters at which the search ends, or its square of the sum of squares. One above 1e-8 asks for
        no more than a start, and only one way is tried.

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
    Without `jacobian` the derivatives are central differences. Several ways are tried before a fit is given up: Levenberg and
    Marquardt's if there are no bounds, the trust region, both with a new scale, and new starts around the first, of which
    at least eight are tried; `message` says if one of those was needed. Convergence means that the relative offset (length of
    the residual vector's projection on the tangent plane against its length across it, each per degree of
    freedom) is below 0.001, or that the gradient has vanished to rounding, and that the data determine every parameter.

    References
    ----------
    D. M. Bates, D. G. Watts, "A relative offset orthogonality convergence criterion for nonlinear least
    squares", Technometrics 23, 179 (1981).
    """
    names = _checked_names(parameters)
    scale = np.array([parameter.typical_size() for parameter in parameters])
    calls = Residuals(
        residuals,
        jacobian,
        scale=scale,
        lower=np.array([parameter.lower for parameter in parameters]),
        upper=np.array([parameter.upper for parameter in parameters]),
    )
    start = np.array([parameter.start for parameter in parameters]) / scale
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
    terms = Terms(budget=max_evaluations, tolerance=tolerance, rounding=rounding, doubt=doubt)
    end = best_end(calls, start, terms)
    return _result(names, end, absolute=absolute, budget=max_evaluations)


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


def _result(names: tuple[str, ...], end: End, *, absolute: bool, budget: int) -> FitResult:
    scale, evaluations = end.calls.scale, end.calls.calls
    chi2 = float(np.sum(end.values**2))
    dof = int(end.values.size - np.count_nonzero(~end.held))
    covariance = _covariance(end)
    if not absolute and end.determined:
        covariance = covariance * (chi2 / dof) if dof > 0 else np.full_like(covariance, np.inf)
    covariance = covariance * np.outer(scale, scale)
    at_bound = tuple(name for name, flag in zip(names, end.held, strict=True) if flag)
    if not end.determined:
        converged, message = False, "not converged: the data do not determine all parameters"
    elif end.offset >= RELATIVE_OFFSET:
        spent = f" after {evaluations} evaluations" if evaluations >= budget else ""
        converged, message = (
            False,
            f"not converged{spent}: relative offset {end.offset:.2g}, expected below {RELATIVE_OFFSET}",
        )
    else:
        parts = ("converged", end.way, f"on a bound: {', '.join(at_bound)}" if at_bound else "")
        converged, message = True, "; ".join(part for part in parts if part)
    return FitResult(
        names,
        end.point * scale,
        covariance,
        end.values,
        chi2,
        dof,
        converged,
        message,
        absolute,
        at_bound,
        evaluations,
    )


def _covariance(end: End) -> FloatArray:
    size = end.jacobian.shape[1]
    covariance = np.zeros((size, size))
    free = np.flatnonzero(~end.held)
    if free.size == 0:
        return covariance
    if not end.determined:
        covariance[np.ix_(free, free)] = np.inf
        return covariance
    columns = end.jacobian[:, free]
    norm = np.linalg.norm(columns, axis=0)
    _, singular, vt = np.linalg.svd(columns / norm, full_matrices=False)
    covariance[np.ix_(free, free)] = (vt.T / singular**2) @ vt / np.outer(norm, norm)
    return covariance

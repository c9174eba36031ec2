"""Fit of the heat capacity on both sides of the lambda point, with the logarithm as its nested special case.

Rules: alpha is never fitted with B fixed; a step of temperature is compared with the law's mean over that step and over the height of the cell, not
with its value in the middle; a step during which some part of the cell passes the transition is never used.

References
----------
J. A. Lipa, J. A. Nissen, D. A. Stricker, D. R. Swanson, T. C. P. Chui, Phys. Rev. B 68, 174518 (2003) (the law); the means over step and height
are derived here.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import BoolArray, FloatArray, same_length, series
from archive.physics.fitting import FitResult, Parameter, fit_residuals
from archive.physics.heat_capacity import CONFLUENT_EXPONENT, LambdaLaw, singular_term
from archive.physics.linear_fit import reciprocal_uncertainty
from archive.physics.residual_tests import f_test

__all__ = ["LambdaFit", "Sides", "fit_lambda_law", "sides_of_transition"]

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(6)
"""Six points give the mean of a logarithm over a step as wide as its distance from the transition to 1e-7."""

_HEIGHT_NODES, _HEIGHT_WEIGHTS = np.polynomial.legendre.leggauss(5)
"""Five points give the mean of a logarithm over the height to 1e-5 where the spread is as wide as the distance from the transition."""

NAMES = ("amplitude", "constant", "asymmetry", "first", "second", "exponent", "lambda_temperature")


@dataclass(frozen=True)
class Sides:
    """Which rows lie below the transition and which above, and where it must lie.

    Attributes
    ----------
    below, above : ndarray of bool
        Rows in neither hold the transition, or may.
    low, high : float
        The transition lies between, K; equal if it is given.
    """

    below: BoolArray
    above: BoolArray
    low: float
    high: float


@dataclass(frozen=True)
class LambdaFit:
    """Outcome of the fit.

    Attributes
    ----------
    law : LambdaLaw
    lambda_temperature : float
        K.
    names, covariance
        Of what was free: some of ``amplitude``, ``constant``, ``asymmetry``, ``first``, ``second``, ``exponent``, ``lambda_temperature``.
    fit : FitResult
        The fit with the exponent free; its residuals are weighted.
    logarithm : FitResult
        The same with alpha = 0.
    probability : float
        F-test: chance that the free exponent gains as much as it does where the logarithm is true.
    used : ndarray of bool
    converged : bool
    message : str
    """

    law: LambdaLaw
    lambda_temperature: float
    fit: FitResult
    logarithm: FitResult
    probability: float
    used: BoolArray
    converged: bool
    message: str

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the free parameters."""
        return self.fit.names

    @property
    def covariance(self) -> FloatArray:
        """Covariance of the free parameters."""
        return self.fit.covariance


def sides_of_transition(
    temperature: npt.ArrayLike,
    heat_capacity: npt.ArrayLike,
    *,
    rise: npt.ArrayLike | None = None,
    lambda_temperature: float | None = None,
) -> Sides:
    """Return which rows lie below and above the transition.

    Parameters
    ----------
    temperature : array_like
        Middle of each step, K.
    heat_capacity : array_like
        Any unit.
    rise : array_like, optional
        Step of temperature, K.
    lambda_temperature : float, optional
        K, where it is known; else it is taken to lie where the heat capacity falls most from one row to the next warmer one.

    Raises
    ------
    ValueError
        Fewer than two rows on a side.

    Notes
    -----
    Where the transition is sought among steps, the two rows between which the fall is largest are left out: one of them may hold it.
    """
    T = series("temperature", temperature, least=6, positive=True)
    C = series("heat_capacity", heat_capacity)
    half = np.zeros(T.shape) if rise is None else np.abs(series("rise", rise)) / 2
    same_length(temperature=T, heat_capacity=C, rise=half)
    if lambda_temperature is not None:
        low = high = lambda_temperature
        below, above = T + half < low, T - half > high
    else:
        order = np.argsort(T, kind="stable")
        k = int(np.argmax(C[order][:-1] - C[order][1:]))
        cold, warm = order[k], order[k + 1]
        # Without steps the transition lies between the two rows; with steps in either of them, or between.
        low, high = float((T - half)[cold]), float((T + half)[warm])
        rank = np.argsort(order)
        below, above = (T + half < high) & (rank <= k), (T - half > low) & (rank > k)
        if half.any():
            below[cold] = above[warm] = False
    for name, side in (("below", below), ("above", above)):
        if np.count_nonzero(side) < 2:
            raise ValueError(
                f"temperature: found {np.count_nonzero(side)} rows {name} the transition, expected at least 2"
            )
    return Sides(below, above, low, high)


def fit_lambda_law(
    temperature: npt.ArrayLike,
    heat_capacity: npt.ArrayLike,
    *,
    sides: Sides,
    rise: npt.ArrayLike | None = None,
    window: tuple[float, float] = (1e-6, 1e-2),
    rows: npt.ArrayLike | None = None,
    corrections: int = 2,
    confluent_exponent: float = CONFLUENT_EXPONENT,
    standard_uncertainty: npt.ArrayLike | None = None,
    temperature_uncertainty: npt.ArrayLike | None = None,
    spread: float = 0.0,
    absolute: bool = False,
) -> LambdaFit:
    """Return the fit of the law on both sides of the transition, and of the logarithm.

    Parameters
    ----------
    temperature, heat_capacity, rise
        As in `sides_of_transition`; J/(mol K) for the heat capacity.
    sides : Sides
        The transition is fitted between ``low`` and ``high``, or held if they are equal.
    window : (float, float)
        Range of |1 - T/T_lambda| that is fitted, 0 <= low < high < 1.
    rows : array_like of bool, optional
        Rows to fit, in place of the window.
    corrections : int
        Confluent terms: 0, 1 or 2.
    confluent_exponent : float
        Delta, held.
    standard_uncertainty, temperature_uncertainty : array_like, optional
        Of each row; the second counts through the slope of the logarithm, A/(t T_lambda).
    spread : float
        Difference of T_lambda between top and bottom of the cell, K, >= 0 (`lambda_gravity.lambda_spread`); the cell is as wide at each height.
    absolute : bool
        As in `fitting.fit`.

    Raises
    ------
    ValueError
        Bad arguments, or fewer rows in the window than free parameters and two more.

    Notes
    -----
    The rows of the window are chosen anew with each fitted T_lambda until they stay. With gravity T_lambda is that at half the height.
    """
    T = series("temperature", temperature, positive=True)
    C = series("heat_capacity", heat_capacity)
    step = np.zeros(T.shape) if rise is None else series("rise", rise)
    same_length(temperature=T, heat_capacity=C, rise=step)
    if not 0 <= window[0] < window[1] < 1:
        raise ValueError(f"window: found {window}, expected 0 <= low < high < 1")
    if not 0 <= spread < np.inf:
        raise ValueError(f"spread: found {spread}, expected >= 0 K")
    if corrections not in (0, 1, 2):
        raise ValueError(f"corrections: found {corrections}, expected 0, 1 or 2")
    chosen = sides.below | sides.above
    if rows is not None:
        chosen = chosen & np.asarray(rows, dtype=np.bool_)
    weight = reciprocal_uncertainty(C, standard_uncertainty, absolute=absolute)
    u_T = (
        np.zeros(T.shape)
        if temperature_uncertainty is None
        else np.asarray(temperature_uncertainty, dtype=np.float64)
    )
    problem = _Problem(T, C, step, sides, corrections, confluent_exponent, weight, np.broadcast_to(u_T, T.shape),
                       standard_uncertainty is not None, spread)  # fmt: skip
    centre = (sides.low + sides.high) / 2
    seen: list[BoolArray] = []
    settled = False
    for _ in range(20):
        t = np.abs(1 - T / centre)
        used = chosen if rows is not None or settled else chosen & (t > window[0]) & (t < window[1])
        # Of a step that is used the whole cell is on one side.
        used = used & (
            (np.abs(T - centre) - np.abs(step) / 2 > spread / 2) | (rows is not None) | (spread == 0)
        )
        again = next((k for k, each in enumerate(seen) if np.array_equal(each, used)), None)
        if again is not None:
            if settled or again == len(seen) - 1:
                settled = True
                used = seen[-1]
                break
            # A row on the edge goes in and out with the fitted transition: it stays out.
            settled = True
            used = chosen = np.asarray(np.logical_and.reduce(seen[again:]))
        seen.append(used)
        free = problem.fitted(used, centre, absolute=absolute, logarithm=False)
        centre = free.value("lambda_temperature") if "lambda_temperature" in free.names else centre
    logarithm = problem.fitted(used, centre, absolute=absolute, logarithm=True)
    chance = f_test(
        chi2_simple=logarithm.chi2, dof_simple=logarithm.dof, chi2_full=free.chi2, dof_full=free.dof
    )
    message = free.message if settled else "not converged: the window does not settle"
    inside = sides.low <= centre <= sides.high
    if not inside:
        message = f"not converged: the transition left the interval from {sides.low} K to {sides.high} K"
    converged = free.converged and logarithm.converged and settled and inside
    return LambdaFit(problem.law(free), centre, free, logarithm, chance, used, converged, message)


@dataclass(frozen=True)
class _Problem:
    """Data and form of one fit."""

    T: FloatArray
    C: FloatArray
    step: FloatArray
    sides: Sides
    corrections: int
    delta: float
    weight: FloatArray
    temperature_spread: FloatArray
    stated: bool
    height_spread: float = 0.0

    @property
    def _heights(self) -> tuple[FloatArray, FloatArray]:
        """Return T_lambda at nodes of height, less that at half the height, and the nodes' weights."""
        if self.height_spread == 0:
            return np.zeros(1), np.ones(1)
        return self.height_spread / 2 * _HEIGHT_NODES, _HEIGHT_WEIGHTS / 2

    @property
    def _shares(self) -> FloatArray:
        """Return the weights of all nodes of a row; their sum is one."""
        return np.outer(_WEIGHTS / 2, self._heights[1]).ravel()

    def fitted(self, used: BoolArray, centre: float, *, absolute: bool, logarithm: bool) -> FitResult:
        start = self._start(used, centre)
        names = list(NAMES[: 3 + self.corrections])
        parameters = [
            Parameter(name, start[name], scale=10.0 if name != "asymmetry" else 4.0) for name in names
        ]
        if not logarithm:
            parameters.append(Parameter("exponent", -0.01, scale=0.01))
        if self.sides.high > self.sides.low:
            # Without bounds, which would cost the faster way of the solver; where it ends is checked instead.
            parameters.append(Parameter("lambda_temperature", centre, scale=self.sides.high - self.sides.low))
        least = len(parameters) + 2
        if np.count_nonzero(used) < least:
            raise ValueError(
                f"temperature: found {np.count_nonzero(used)} rows in the window, expected at least {least}"
            )
        order = tuple(parameter.name for parameter in parameters)
        weight = self._weight(used, centre, start["amplitude"])

        def residuals(values: FloatArray) -> FloatArray:
            law, T_lambda = self._law(dict(zip(order, values, strict=True)), centre)
            return (self.C[used] - self._mean(law, T_lambda, used)) * weight

        # With stated uncertainties the gradient is in units of them: a ten-thousandth is no step worth taking.
        rounding = 1e-4 if self.stated else 1e-13 * float(np.linalg.norm(self.C[used] * weight))
        return fit_residuals(residuals, parameters, absolute=absolute, rounding=rounding)

    def law(self, found: FitResult) -> LambdaLaw:
        """Return the law of a fit."""
        return self._law(dict(zip(found.names, map(float, found.values), strict=True)), 0.0)[0]

    def _law(self, values: dict[str, float], centre: float) -> tuple[LambdaLaw, float]:
        law = LambdaLaw(
            values["amplitude"], values.get("exponent", 0.0), values["constant"], values["asymmetry"], values.get("first", 0.0),
            values.get("second", 0.0), self.delta,
        )  # fmt: skip
        return law, values.get("lambda_temperature", centre)

    def _nodes(self, T_lambda: float, used: BoolArray) -> FloatArray:
        nodes = self.T[used, np.newaxis] + self.step[used, np.newaxis] / 2 * _NODES
        distance = 1 - nodes[:, :, np.newaxis] / (T_lambda + self._heights[0])
        # A row that a shift of its temperature carries across the transition is kept finite; its residual is then very large.
        signed = np.where(self.sides.below[used, np.newaxis, np.newaxis], 1.0, -1.0) * distance
        return np.asarray(np.maximum(signed, 1e-12).reshape(nodes.shape[0], -1))

    def _mean(self, law: LambdaLaw, T_lambda: float, used: BoolArray) -> FloatArray:
        values = law.value(self._nodes(T_lambda, used), below=self.sides.below[used, np.newaxis])
        return np.asarray(values @ self._shares)

    def _start(self, used: BoolArray, centre: float) -> dict[str, float]:
        """Return the logarithm by linear least squares."""
        t = self._nodes(centre, used)
        above = np.where(self.sides.below[used], 0.0, -1.0)
        columns = [singular_term(t, exponent=0.0) @ self._shares, np.ones(above.shape), above]
        columns += [t ** (self.delta * power) @ self._shares for power in range(1, self.corrections + 1)]
        w = self.weight[used]
        found = np.linalg.lstsq(np.column_stack(columns) * w[:, np.newaxis], self.C[used] * w, rcond=None)[0]
        start = dict(zip(NAMES, map(float, found), strict=False))
        start["asymmetry"] = start["asymmetry"] / start["amplitude"] if start["amplitude"] > 0 else 4.0
        start["amplitude"] = max(start["amplitude"], 1e-3)
        return start

    def _weight(self, used: BoolArray, centre: float, amplitude: float) -> FloatArray:
        t = self._nodes(centre, used) @ self._shares
        through_slope = amplitude * self.temperature_spread[used] / (t * centre)
        return np.asarray(1 / np.hypot(1 / self.weight[used], through_slope))

"""Empty-cell background as the lowest polynomial that leaves no shape in the residual.

Rules: Chebyshev polynomials on the scaled temperature range; never extrapolated: outside the range the answer is not a number
and is flagged.

References
----------
Least squares in Chebyshev polynomials; the order by the runs test and the F-test of `residual_tests`, the rule itself the project's own.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import BoolArray, FloatArray, same_length, series
from archive.physics.linear_fit import LinearFit, linear_fit
from archive.physics.residual_tests import chi2_probability, f_test, runs_test

__all__ = ["PolynomialBackground", "fit_background"]

RUNS_LEVEL = 0.05
"""A residual with a smaller runs probability still has shape (common practice, no source)."""

GAIN_LEVEL = 0.01
"""A higher order that gains this much by luck less often is needed (common practice, no source)."""


@dataclass(frozen=True)
class PolynomialBackground:
    """A background polynomial with its covariance.

    Attributes
    ----------
    fit : LinearFit
        Chebyshev coefficients, lowest first.
    order : int
        Degree.
    low, high : float
        Range of temperature it was fitted over, K.
    runs_probability, chi2_probability : float
        Of the residual; the second is not a number without absolute uncertainties.
    accepted : bool
        False if no order up to the highest passed; then the highest is returned.
    message : str
    """

    fit: LinearFit
    order: int
    low: float
    high: float
    runs_probability: float
    chi2_probability: float
    accepted: bool
    message: str

    def evaluate(self, temperature: npt.ArrayLike) -> tuple[FloatArray, FloatArray, BoolArray]:
        """Return value, standard uncertainty and the mask of points outside the range.

        Parameters
        ----------
        temperature : array_like
            K.

        Notes
        -----
        Outside the fitted range, and for temperatures that are not numbers, both are not a number and the mask is True. The
        uncertainty is the fit's; the difference between two empty-cell runs may be larger and then counts.
        """
        T = np.atleast_1d(np.asarray(temperature, dtype=np.float64))
        outside = ~((self.low <= T) & (self.high >= T))
        basis = _basis(np.where(outside, self.low, T), self.order, self.low, self.high)
        value = basis @ self.fit.values
        variance = np.einsum("ij,jk,ik->i", basis, self.fit.covariance, basis)
        spread = np.sqrt(np.maximum(variance, 0.0))
        value[outside] = np.nan
        spread[outside] = np.nan
        return value, spread, outside


def fit_background(
    temperature: npt.ArrayLike,
    values: npt.ArrayLike,
    *,
    standard_uncertainty: npt.ArrayLike | None = None,
    absolute: bool = False,
    highest_order: int = 8,
    order: int | None = None,
) -> PolynomialBackground:
    """Return the lowest-order polynomial whose residual passes a runs test and gains nothing from one or two orders more.

    Parameters
    ----------
    temperature : array_like
        K (or its logarithm), any order, at least five different values.
    values : array_like
        Period, or dissipation.
    standard_uncertainty, absolute
        As in `linear_fit.linear_fit`; with ``absolute=True`` chi-squared must pass, too.
    highest_order : int
        Where the search ends.
    order : int, optional
        Take this order and do not search.

    Raises
    ------
    ValueError
        Bad data, or an order the data do not determine.

    Notes
    -----
    Two orders more are tried because an odd term alone gains nothing on an even residual.
    """
    T = series("temperature", temperature, least=5)
    y = series("values", values)
    same_length(temperature=T, values=y)
    rising = np.argsort(T, kind="stable")
    back = np.argsort(rising, kind="stable")
    different = int(np.unique(T).size)
    most = min(highest_order if order is None else order, different - 2, T.size - 2)
    if order is not None and not 0 <= order <= most:
        raise ValueError(
            f"order: found {order}, expected 0 to {different - 2}, two fewer than different temperatures"
        )
    spread = None
    if standard_uncertainty is not None:
        spread = np.broadcast_to(np.asarray(standard_uncertainty, dtype=np.float64), T.shape)[rising]
    low, high = float(T.min()), float(T.max())
    if low == high:
        raise ValueError("temperature: found one value only, expected a range")

    def at(degree: int) -> LinearFit:
        names = tuple(f"c{k}" for k in range(degree + 1))
        basis = _basis(T[rising], degree, low, high)
        return linear_fit(basis, y[rising], names=names, standard_uncertainty=spread, absolute=absolute)

    fits = [at(degree) for degree in (range(most + 1) if order is None else [most])]
    if order is not None:
        return _background(fits[0], low, high, back, accepted=True, message="order given")
    for degree, found in enumerate(fits):
        if _passes(found) and not any(_needed(found, higher) for higher in fits[degree + 1 : degree + 3]):
            return _background(
                found, low, high, back, accepted=True, message=f"order {degree} leaves no shape"
            )
    message = f"no order up to {most} leaves a residual without shape"
    return _background(fits[-1], low, high, back, accepted=False, message=message)


def _basis(T: FloatArray, degree: int, low: float, high: float) -> FloatArray:
    return np.asarray(np.polynomial.chebyshev.chebvander((2 * T - low - high) / (high - low), degree))


def _passes(found: LinearFit) -> bool:
    exact = float(np.max(np.abs(found.residuals))) <= 1e-13 * float(np.max(np.abs(found.values)))
    if exact:
        return True
    if runs_test(found.residuals).probability < RUNS_LEVEL:
        return False
    return not found.absolute or chi2_probability(found.chi2, found.dof) >= GAIN_LEVEL


def _needed(found: LinearFit, higher: LinearFit) -> bool:
    chance = f_test(chi2_simple=found.chi2, dof_simple=found.dof, chi2_full=higher.chi2, dof_full=higher.dof)
    exact = found.chi2 <= (1e-13 * float(np.max(np.abs(found.values)))) ** 2 * found.residuals.size
    return chance < GAIN_LEVEL and not exact


def _background(
    found: LinearFit, low: float, high: float, back: npt.NDArray[np.int64], *, accepted: bool, message: str
) -> PolynomialBackground:
    chance = chi2_probability(found.chi2, found.dof) if found.absolute else float("nan")
    runs = runs_test(found.residuals).probability
    ordered = LinearFit(**{**vars(found), "residuals": found.residuals[back]})
    return PolynomialBackground(ordered, found.values.size - 1, low, high, runs, chance, accepted, message)

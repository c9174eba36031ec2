"""The search for the least sum of squares, in scaled parameters, and the judgement of where it ended.

Rules: the stopping reason of the solver is not believed; several ways are tried before a fit is given up, always the same ones
in the same order, so nothing is random.

References
----------
The project's own; the judgement is that of `fitting`.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from scipy.optimize import least_squares

from archive.physics.arrays import BoolArray, FloatArray
from archive.physics.fit_calls import NO_SLOPE, Residuals

__all__ = ["RELATIVE_OFFSET", "TOLERANCE", "End", "Terms", "best_end"]

RELATIVE_OFFSET = 1e-3
"""Bates and Watts (1981): at 0.001 the remaining step is about a thousandth of the confidence region."""

ROUNDING = 1e-8
"""A gradient this small against the residuals' own gradient scale is rounding, square root of the precision."""

TOLERANCE = 4 * float(np.finfo(float).eps)
"""The edge of double precision: stopping early is what ruins ill-conditioned problems."""

QUICK = 1e-8
"""A search with a wider tolerance than this only looks for a start, and is not repeated."""

RESTARTS, LEAST_RESTARTS = 24, 8
"""New starts at most, and how many are tried before the lowest is taken: the first to converge may lie in a side valley."""

SPREADS = (0.05, 0.3, 1.0)
"""Decades by which new starts differ from the caller's, in turn: a line's place is known well, a rate may be a factor off."""

PRIMES = (2, 3, 5, 7, 11, 13, 17, 19, 23, 29, 31, 37, 41, 43, 47)
"""Bases of the points of J. H. Halton, Numerische Mathematik 2, 84 (1960), for the new starts; they repeat past the last."""


@dataclass(frozen=True)
class End:
    """Where a search ended.

    Attributes
    ----------
    calls : Residuals
        The function, in the scale of `point`.
    point, values, jacobian : ndarray
    held : ndarray of bool
        Which parameters sit on a bound with the sum of squares falling towards the outside.
    offset : float
        Relative offset of Bates and Watts.
    way : str
        What led here, in words, if it was not the first start.
    """

    calls: Residuals
    point: FloatArray
    values: FloatArray
    jacobian: FloatArray
    held: BoolArray
    offset: float
    way: str = ""

    @property
    def chi2(self) -> float:
        """Sum of squares; finite, since a search ends no higher than it began."""
        return float(np.sum(self.values**2))

    @property
    def good(self) -> bool:
        """Whether the search converged on parameters that the data determine."""
        return self.offset < RELATIVE_OFFSET and self.determined

    @property
    def determined(self) -> bool:
        """Whether the data determine every parameter that is not held."""
        columns = self.jacobian[:, ~self.held]
        norm = np.linalg.norm(columns, axis=0)
        if columns.shape[1] == 0:
            return True
        if not (norm < NO_SLOPE).all() or (norm == 0).any():
            return False
        singular = np.linalg.svd(columns / norm, compute_uv=False)
        # Columns come from central differences, good to about 1e-10.
        return bool(singular[-1] > singular[0] * 1e-10)


@dataclass(frozen=True)
class Terms:
    """On what terms a search is made.

    Attributes
    ----------
    budget : int
        Calls after which nothing new is begun.
    tolerance : float
        Relative change of the parameters at which a search ends.
    rounding : float
        Length of the residual vector that is rounding of the data.
    doubt : float
        Sum of squares above which even a good end is not believed before new starts have found nothing half as high.
    """

    budget: int
    tolerance: float = TOLERANCE
    rounding: float = 0.0
    doubt: float = math.inf


def best_end(calls: Residuals, start: FloatArray, terms: Terms) -> End:
    """Return the best end of the searches from a start.

    Parameters
    ----------
    calls : Residuals
    start : ndarray
        Scaled parameters.
    terms : Terms

    Notes
    -----
    In turn, until one end is good: Levenberg and Marquardt's way where there are no bounds; the trust-region way; both again from
    there, with the parameters' own sizes as scale; new starts around the first.
    """
    ways = ("trf",) if calls.bounded else ("lm", "trf")
    share = terms.budget // (2 * len(ways))
    quick = terms.tolerance > QUICK
    best = _by_ways(calls, start, ways, share, terms)
    if not best.good and not quick:
        # The first scale was a guess from the start; where the search has come to, the parameters tell better.
        scaled, point = best.calls.rescaled(best.point)
        again = _by_ways(scaled, point, ways, share, terms)
        best, calls.calls = (again if again.chi2 <= best.chi2 else best), scaled.calls
    if not quick and (not best.good or best.chi2 > terms.doubt):
        best = _from_new_starts(best, calls, start, ways[0], terms)
    return _with_signs_of(start, best, terms)


def _by_ways(calls: Residuals, start: FloatArray, ways: tuple[str, ...], share: int, terms: Terms) -> End:
    best = _searched(calls, start, ways[0], share, terms)
    for method in ways[1:]:
        if best.good or calls.calls >= terms.budget:
            break
        end = _searched(calls, best.point, method, share, terms)
        best = end if end.chi2 <= best.chi2 else best
    return best


def _from_new_starts(best: End, calls: Residuals, start: FloatArray, method: str, terms: Terms) -> End:
    spent, doubted = calls.calls, best.good
    least = best.chi2 * (0.5 if doubted else 1 + 1e-9)
    found = best
    for number, point in enumerate(_new_starts(calls, start), 1):
        if spent >= terms.budget or (found.good and number > LEAST_RESTARTS):
            break
        other, scaled = calls.rescaled(point)
        other.calls = spent
        if np.isfinite(other(scaled)).all():
            share = min(terms.budget - spent, max(terms.budget // 10, 100))
            end = _searched(other, scaled, method, share, terms)
            if end.good and end.chi2 <= least:
                found, least = replace(end, way=f"from new start {number}"), end.chi2
        spent = other.calls
    found.calls.calls = spent
    return found


def _with_signs_of(start: FloatArray, end: End, terms: Terms) -> End:
    """Return the mirrored end if the signs of the start serve as well: two signs of a model often cancel."""
    turned = (start * end.point < 0) & ~end.held
    if not turned.any():
        return end
    point = np.where(turned, -end.point, end.point)
    if np.any((point < end.calls.lower) | (point > end.calls.upper)):
        return end
    # Equal but for rounding: another end, however near, would have to be searched for.
    if not abs(float(np.sum(end.calls.tame(point) ** 2)) - end.chi2) <= 1e-12 * end.chi2:
        return end
    return replace(_judged(end.calls, point, terms), way=end.way)


def _new_starts(calls: Residuals, start: FloatArray) -> Iterator[FloatArray]:
    """Yield starts around the first, spread evenly in the logarithms of the parameters."""
    for number in range(1, RESTARTS + 1):
        spread = SPREADS[number % len(SPREADS)]
        fractions = np.array(
            [
                _radical_inverse(number + index // len(PRIMES), PRIMES[index % len(PRIMES)])
                for index in range(start.size)
            ]
        )
        factor = 10 ** (spread * (2 * fractions - 1))
        moved = np.where(start == 0, spread * (2 * fractions - 1), start * factor)
        # Strictly inside, as the solver wants it.
        width = np.where(np.isfinite(calls.upper - calls.lower), calls.upper - calls.lower, 1.0)
        yield np.clip(moved, calls.lower + 1e-6 * width, calls.upper - 1e-6 * width)


def _radical_inverse(number: int, base: int) -> float:
    result, digit = 0.0, 1.0
    while number:
        digit /= base
        number, rest = divmod(number, base)
        result += digit * rest
    return result


def _searched(calls: Residuals, start: FloatArray, method: str, share: int, terms: Terms) -> End:
    point = _solved(calls, start, method=method, budget=share, tolerance=terms.tolerance)
    if not np.sum(calls.tame(point) ** 2) <= np.sum(calls.tame(start) ** 2):
        point = start
    return _judged(calls, point, terms)


def _judged(calls: Residuals, point: FloatArray, terms: Terms) -> End:
    jacobian, values = calls.jacobian(point), calls(point)
    # 1e-7 of a value is the bound itself: the solver keeps off it.
    near = 1e-7 * np.maximum(np.abs(point), 1e-4)
    gradient = jacobian.T @ values
    held = ((point - calls.lower <= near) & (gradient >= 0)) | (
        (calls.upper - point <= near) & (gradient <= 0)
    )
    return End(
        calls,
        point,
        values,
        jacobian,
        held,
        _relative_offset(values, jacobian, held, rounding=terms.rounding),
    )


def _solved(calls: Residuals, start: FloatArray, *, method: str, budget: int, tolerance: float) -> FloatArray:
    if method == "lm":
        bounds: tuple[Any, Any] = (-np.inf, np.inf)
    else:
        bounds = (calls.lower, calls.upper)
        # The trust-region solver wants to begin strictly inside; a start on a bound is allowed here.
        width = np.where(np.isfinite(calls.upper - calls.lower), calls.upper - calls.lower, 1.0)
        start = np.clip(start, calls.lower + 1e-10 * width, calls.upper - 1e-10 * width)
    # The solver's gradient tolerance is absolute, so it must not see the unit of the data.
    unit = float(np.linalg.norm(calls.tame(start))) or 1.0

    def residuals(point: FloatArray) -> FloatArray:
        return calls.tame(point) / unit

    def jacobian(point: FloatArray) -> FloatArray:
        return calls.jacobian(point) / unit

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


def _relative_offset(values: FloatArray, jacobian: FloatArray, held: BoolArray, *, rounding: float) -> float:
    free = jacobian[:, ~held]
    norm = np.linalg.norm(free, axis=0)
    if free.shape[1] == 0:
        return 0.0
    if not (norm < NO_SLOPE).all() or (norm == 0).any():
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

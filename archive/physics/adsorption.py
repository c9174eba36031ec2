"""Monolayer capacity and area from an adsorption isotherm, by the equation of Brunauer, Emmett and Teller.

Rules: the area of one molecule is always given by the caller, nothing falls back on nitrogen's; what the result is called
(N2, Ar, He-BET) is the caller's, and areas of different gases are never merged; a range that breaks a consistency criterion is
refused with the reason.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray, same_length, series
from archive.physics.constants import AVOGADRO
from archive.physics.linear_fit import straight_line

__all__ = ["BetArea", "bet_area"]

LEAST_POINTS = 5
"""In the range (common practice, no source)."""

LEAST_R_SQUARED = 0.999
"""Of the straight line, unless another is asked for (common practice, no source)."""

TOLERANCE = 0.2
"""Between 1/(sqrt C + 1) and the x at the monolayer (common practice, no source)."""


@dataclass(frozen=True)
class BetArea:
    """Outcome of a BET evaluation.

    Attributes
    ----------
    accepted : bool
        All criteria hold. If False the numbers are kept for the record only (not a number if there was no range at all).
    reasons : tuple of str
        What was broken; empty if accepted.
    monolayer, u_monolayer : float
        Monolayer capacity in the unit of the amounts (mol, mol/kg), and its standard uncertainty.
    constant, u_constant : float
        C, and its standard uncertainty.
    correlation : float
        Of monolayer and constant; 0 if there was no range at all.
    area, u_area : float
        m^2 for amounts in mol, m^2/kg for mol/kg; the uncertainty does not contain the molecule's area.
    slope, intercept, r_squared : float
        Of the straight line.
    low, high : float
        Range of x used.
    points : int
        In the range.
    x_at_monolayer, x_expected : float
        Where the isotherm reaches the monolayer, and 1/(sqrt C + 1).
    cross_section : float
        As given, m^2.
    """

    accepted: bool
    reasons: tuple[str, ...]
    monolayer: float
    u_monolayer: float
    constant: float
    u_constant: float
    correlation: float
    area: float
    u_area: float
    slope: float
    intercept: float
    r_squared: float
    low: float
    high: float
    points: int
    x_at_monolayer: float
    x_expected: float
    cross_section: float


def bet_area(
    x: npt.ArrayLike,
    amount: npt.ArrayLike,
    *,
    cross_section: float,
    bounds: tuple[float, float] | None = None,
    least_r_squared: float = LEAST_R_SQUARED,
) -> BetArea:
    """Return monolayer capacity, constant and area from an isotherm.

    Parameters
    ----------
    x : array_like
        Pressure over saturated pressure at the temperature of the film, never falling; only 0 < x < 1 is used.
    amount : array_like
        Adsorbed amount, mol or mol/kg, > 0 where it is used.
    cross_section : float
        Area of one molecule, m^2, > 0: 0.162e-18 for N2 at 77 K by convention; not standardised for helium.
    bounds : (float, float), optional
        Range of x to use. Without it the largest range (most points, then widest) is taken that meets all criteria.
    least_r_squared : float
        Of the straight line, below 1; 0.999 and 0.995 are both in use (common practice, no source).

    Raises
    ------
    ValueError
        Bad arrays, x that falls, a cross-section at or below zero.

    Notes
    -----
    Criteria: (i) C > 0 by a positive intercept, (ii) n(1 - x) rises over the whole range, (iii) the x of the monolayer lies in the
    range, (iv) it agrees with 1/(sqrt C + 1) within 20 per cent; and at least five points and r^2 above its limit. Points at one x are real
    and all count in the line; for (ii) and (iii) their mean stands. Unweighted line; uncertainties from
    its scatter, for amounts that are all off by one fraction of themselves.

    References
    ----------
    S. Brunauer, P. H. Emmett, E. Teller, "Adsorption of gases in multimolecular layers", Journal of the American Chemical Society
    60, 309 (1938). M. Thommes et al., "Physisorption of gases, with special reference to the evaluation of surface area and pore
    size distribution", Pure and Applied Chemistry 87, 1051 (2015) (criteria from memory). ISO 9277:2022.
    """
    x = series("x", x)
    n = series("amount", amount)
    same_length(x=x, amount=n)
    if not cross_section > 0:
        raise ValueError(f"cross_section: found {cross_section}, expected > 0")
    if (np.diff(x) < 0).any():
        index = int(np.argmax(np.diff(x) < 0)) + 1
        raise ValueError(f"x[{index}]: found {x[index]}, expected at least {x[index - 1]}")
    usable = (x > 0) & (x < 1) & (n > 0)
    x, n = x[usable], n[usable]
    if bounds is not None:
        inside = (bounds[0] <= x) & (x <= bounds[1])
        return _evaluated(x, n, inside, cross_section, least_r_squared)
    best: BetArea | None = None
    for first, last in _candidates(x, n, least_r_squared):
        if best is not None and (last - first, x[last - 1] - x[first]) < _rank(best)[:2]:
            break
        inside = np.zeros(x.shape, dtype=np.bool_)
        inside[first:last] = True
        result = _evaluated(x, n, inside, cross_section, least_r_squared)
        if result.accepted and (best is None or _rank(result) > _rank(best)):
            best = result
    if best is not None:
        return best
    whole = _evaluated(x, n, (x >= 0.05) & (x <= 0.30), cross_section, least_r_squared)
    return BetArea(
        **{**vars(whole), "accepted": False, "reasons": ("no range meets all criteria", *whole.reasons)}
    )


def _rank(result: BetArea) -> tuple[int, float, float]:
    return result.points, result.high - result.low, result.r_squared


def _candidates(x: FloatArray, n: FloatArray, least_r_squared: float) -> list[tuple[int, int]]:
    """Return runs of points over which n(1 - x) rises and which may be straight, the largest first.

    Points at one x stay together. The sums are rough: they leave out only runs that are clearly bent, all others are looked at in full.
    """
    steps, mean = _means(x, n)
    rising = np.diff(mean * (1 - steps)) > 0
    starts, ends = np.searchsorted(x, steps, side="left"), np.searchsorted(x, steps, side="right")
    ordinate = x / (n * (1 - x))
    found = []
    for first in range(steps.size):
        falls = np.flatnonzero(~rising[first:])
        stop = steps.size - 1 if falls.size == 0 else first + int(falls[0])
        rows = slice(starts[first], ends[stop])
        dx, dy = x[rows] - x[starts[first]], ordinate[rows] - ordinate[starts[first]]
        count = np.arange(1, dx.size + 1)
        sx, sy = np.cumsum(dx), np.cumsum(dy)
        xx, yy, xy = (
            np.cumsum(one * other) - a * b / count
            for one, other, a, b in ((dx, dx, sx, sx), (dy, dy, sy, sy), (dx, dy, sx, sy))
        )
        with np.errstate(divide="ignore", invalid="ignore"):
            straight = xy**2 / (xx * yy) > least_r_squared - 1e-6
        found += [
            (int(starts[first]), int(last))
            for last in ends[first + 1 : stop + 1]
            if last - starts[first] >= LEAST_POINTS and straight[last - 1 - starts[first]]
        ]
    return sorted(found, key=lambda run: (run[1] - run[0], x[run[1] - 1] - x[run[0]]), reverse=True)


def _means(x: FloatArray, n: FloatArray) -> tuple[FloatArray, FloatArray]:
    steps, where = np.unique(x, return_inverse=True)
    return steps, np.bincount(where, weights=n) / np.bincount(where)


def _evaluated(
    x: FloatArray, n: FloatArray, inside: npt.NDArray[np.bool_], cross_section: float, least_r_squared: float
) -> BetArea:
    count = int(np.count_nonzero(inside))
    if count < 3 or np.unique(x[inside]).size < 2:
        return _nothing(count, cross_section)
    px, pn = x[inside], n[inside]
    ordinate = px / (pn * (1 - px))
    line = straight_line(px, ordinate, absolute=False)
    slope, intercept = line.value("slope"), line.value("intercept")
    total = float(np.sum((ordinate - ordinate.mean()) ** 2))
    r_squared = 1 - line.chi2 / total if total > 0 else 0.0
    monolayer = 1 / (slope + intercept)
    constant = 1 + slope / intercept if intercept != 0 else math.inf
    # Order of the covariance: intercept, slope.
    by_monolayer = -(monolayer**2) * np.ones(2)
    by_constant = np.array([-slope / intercept**2, 1 / intercept]) if intercept != 0 else np.full(2, np.nan)
    covariance = _covariance(px, ordinate, intercept + slope * px)
    steps, mean = _means(x, n)
    reached = _reached(steps, mean, monolayer)
    expected = 1 / (math.sqrt(constant) + 1) if 0 < constant < math.inf else math.nan
    low, high = float(px[0]), float(px[-1])
    area = monolayer * AVOGADRO * cross_section
    reasons = []
    if count < LEAST_POINTS:
        reasons.append(f"found {count} points, expected at least {LEAST_POINTS}")
    if not (intercept > 0 and constant > 0):
        reasons.append(f"(i) found C = {constant:.4g}, intercept {intercept:.4g}, expected both positive")
    within = (steps >= low) & (steps <= high)
    if (np.diff((mean * (1 - steps))[within]) <= 0).any():
        reasons.append("(ii) n(1 - x) does not rise over the whole range")
    if not low <= reached <= high:
        reasons.append(
            f"(iii) the monolayer is reached at x = {reached:.4g}, expected {low:.4g} to {high:.4g}"
        )
    if not abs(expected - reached) <= TOLERANCE * reached:
        reasons.append(
            f"(iv) found 1/(sqrt C + 1) = {expected:.4g}, expected {reached:.4g} within 20 per cent"
        )
    if not r_squared > least_r_squared:
        reasons.append(f"found r^2 = {r_squared:.6g}, expected above {least_r_squared:g}")
    u_monolayer = math.sqrt(float(by_monolayer @ covariance @ by_monolayer))
    u_constant = math.sqrt(float(by_constant @ covariance @ by_constant))
    together = float(by_monolayer @ covariance @ by_constant)
    return BetArea(
        accepted=not reasons,
        reasons=tuple(reasons),
        monolayer=monolayer,
        u_monolayer=u_monolayer,
        constant=constant,
        u_constant=u_constant,
        correlation=together / (u_monolayer * u_constant) if u_monolayer * u_constant > 0 else 0.0,
        area=area,
        u_area=u_monolayer * AVOGADRO * cross_section,
        slope=slope,
        intercept=intercept,
        r_squared=r_squared,
        low=low,
        high=high,
        points=count,
        x_at_monolayer=reached,
        x_expected=expected,
        cross_section=cross_section,
    )


def _covariance(x: FloatArray, ordinate: FloatArray, line: FloatArray) -> FloatArray:
    """Return the covariance of intercept and slope of the unweighted line, for amounts that scatter by one fraction of themselves.

    The ordinate x/(n (1 - x)) then scatters by that fraction of its own value, several times more at the upper end than at the
    lower; taken as equal, the scatter would make the area's uncertainty too small.
    """
    design = np.column_stack([np.ones(x.size), x])
    solution = np.linalg.pinv(design)
    left = np.eye(x.size) - design @ solution
    # The residuals' sum of squares is on average this many times the fraction squared.
    fraction2 = np.sum((ordinate - line) ** 2) / np.sum((left * line) ** 2)
    return np.asarray((solution * (fraction2 * line**2)) @ solution.T, dtype=np.float64)


def _reached(steps: FloatArray, mean: FloatArray, monolayer: float) -> float:
    """Return the first x at which the isotherm rises through the monolayer, or not a number."""
    crossed = np.flatnonzero((mean[:-1] <= monolayer) & (mean[1:] > monolayer))
    if crossed.size == 0:
        return math.nan
    k = int(crossed[0])
    share = (monolayer - mean[k]) / (mean[k + 1] - mean[k])
    return float(steps[k] + share * (steps[k + 1] - steps[k]))


def _nothing(count: int, cross_section: float) -> BetArea:
    reasons = (f"found {count} points in the range, expected at least {LEAST_POINTS}",)
    nan = math.nan
    numbers = dict.fromkeys(
        (
            "monolayer",
            "u_monolayer",
            "constant",
            "u_constant",
            "area",
            "u_area",
            "slope",
            "intercept",
            "r_squared",
        ),
        nan,
    )
    places = dict.fromkeys(("low", "high", "x_at_monolayer", "x_expected"), nan)
    return BetArea(
        accepted=False,
        reasons=reasons,
        points=count,
        cross_section=cross_section,
        correlation=0.0,
        **numbers,
        **places,
    )

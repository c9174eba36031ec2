"""Mass loading from a dose run at the lowest temperature: slope, drag factor, onset coverage.

Rules: two straight lines, at least four points each; refused with the reason, never guessed. chi is the slope of the raw period
past onset over the slope below; the slope of the period drop would give 1 - chi.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray, same_length, series
from archive.physics.linear_fit import LinearFit, straight_line
from archive.physics.residual_tests import f_test

__all__ = ["Loading", "fit_loading"]

LEAST_POINTS = 4
"""On each line; fewer are refused (common practice, no source)."""

NAMES = ("slope", "drag_factor", "onset_coverage", "period_at_zero")


@dataclass(frozen=True)
class Loading:
    """Outcome of the two-slope fit of period against coverage.

    Attributes
    ----------
    found : bool
    reason : str
        Why, in words.
    names : tuple of str
        slope (S_n, s per unit of coverage), drag_factor (chi), onset_coverage (n_c), period_at_zero (s).
    values, covariance : ndarray
        In that order; not a number unless found. The drag factor of a flat substrate may come out below zero by its
        uncertainty.
    points_below, points_past : int
        Points on each line.
    residuals : ndarray
        Observed minus fitted, s, in the order of rising coverage.
    chi2 : float
    dof : int
    """

    found: bool
    reason: str
    names: tuple[str, ...]
    values: FloatArray
    covariance: FloatArray
    points_below: int
    points_past: int
    residuals: FloatArray
    chi2: float
    dof: int

    def value(self, name: str) -> float:
        """Return a value by name."""
        return float(self.values[self.names.index(name)])

    def standard_uncertainty(self, name: str) -> float:
        """Return the standard uncertainty of a value."""
        index = self.names.index(name)
        return math.sqrt(float(self.covariance[index, index]))


def fit_loading(
    coverage: npt.ArrayLike,
    period: npt.ArrayLike,
    *,
    standard_uncertainty: npt.ArrayLike | None = None,
    absolute: bool = False,
) -> Loading:
    """Return slope, drag factor, onset coverage and empty period from a dose run.

    Parameters
    ----------
    coverage : array_like
        mol/m^2 (or mol), any order.
    period : array_like
        s, at the lowest temperature.
    standard_uncertainty, absolute
        Of the period, as in `linear_fit.linear_fit`.

    Raises
    ------
    ValueError
        Bad arrays.

    Notes
    -----
    The break is the split of least squares among all with four points or more on each line; the onset is where the lines meet,
    with the covariance carried through. Assumes that all added mass is superfluid at this temperature (T < 0.1 T_c), that the
    inert layer does not compress, no capillary condensation, and chi independent of coverage: fit two sub-ranges to see.

    References
    ----------
    G. Agnolet, D. F. McQueeney, J. D. Reppy, "Kosterlitz-Thouless transition in helium films", Physical Review B 39, 8934 (1989)
    (from memory).
    """
    n = series("coverage", coverage)
    P = series("period", period)
    same_length(coverage=n, period=P)
    order = np.argsort(n, kind="stable")
    n, P = n[order], P[order]
    u = None
    if standard_uncertainty is not None:
        given = np.broadcast_to(np.asarray(standard_uncertainty, dtype=np.float64), n.shape)
        u = series("standard_uncertainty", given, positive=True)[order]
    splits = [
        k
        for k in range(LEAST_POINTS, n.size - LEAST_POINTS + 1)
        if np.unique(n[:k]).size >= LEAST_POINTS and np.unique(n[k:]).size >= LEAST_POINTS
    ]
    if not splits:
        return _refused(
            f"found {n.size} points, expected at least {LEAST_POINTS} coverages below and past the onset",
            n.size,
        )
    pairs = {k: (_line(n, P, u, slice(None, k)), _line(n, P, u, slice(k, None))) for k in splits}
    k = min(pairs, key=lambda split: pairs[split][0].chi2 + pairs[split][1].chi2)
    below, past = pairs[k]
    single = _line(n, P, u, slice(None))
    dof = n.size - 4
    chi2 = below.chi2 + past.chi2
    scale = 1.0 if absolute else chi2 / dof
    values, jacobian = _values(below, past)
    joint = np.zeros((4, 4))
    joint[:2, :2], joint[2:, 2:] = below.covariance * scale, past.covariance * scale
    covariance = jacobian @ joint @ jacobian.T
    u_chi = math.sqrt(float(covariance[1, 1]))
    reason = _reason(n, k, values, u_chi=u_chi, chance=_chance(single, chi2, dof))
    if reason:
        return _refused(reason, n.size)
    residuals = np.concatenate([below.residuals, past.residuals])
    return Loading(
        found=True,
        reason="two slopes found",
        names=NAMES,
        values=values,
        covariance=covariance,
        points_below=k,
        points_past=n.size - k,
        residuals=residuals,
        chi2=chi2,
        dof=dof,
    )


def _line(n: FloatArray, P: FloatArray, u: FloatArray | None, part: slice) -> LinearFit:
    # Unit weights count as absolute here so that both lines share one variance, applied by the caller.
    spread = np.ones(n[part].shape) if u is None else u[part]
    return straight_line(n[part], P[part], standard_uncertainty=spread, absolute=True)


def _chance(single: LinearFit, chi2: float, dof: int) -> float:
    # A part in 1e13 is what rounding leaves of an exact line, whatever library adds it up.
    if float(np.max(np.abs(single.residuals))) <= 1e-13 * float(np.max(np.abs(single.values))):
        return 1.0
    return f_test(chi2_simple=single.chi2, dof_simple=dof + 2, chi2_full=chi2, dof_full=dof)


def _reason(n: FloatArray, k: int, values: FloatArray, *, u_chi: float, chance: float) -> str:
    """Return why the two lines are no loading curve, or an empty text."""
    slope, chi, meet, _ = map(float, values)
    if chance > 1e-3:
        return "one straight line describes the run; no onset is seen"
    if not slope > 0:
        return f"found a slope of {slope:.4g} below the onset, expected > 0"
    # A flat substrate has chi = 0, and noise puts it on either side.
    if not -3 * u_chi - 1e-9 <= chi < 1:
        return f"found a ratio of slopes of {chi:.4g}, expected 0 <= chi < 1"
    if not n[k - 2] <= meet <= n[k + 1]:
        return f"the two lines meet at a coverage of {meet:.5g}, expected {n[k - 2]:.5g} to {n[k + 1]:.5g} beside the break"
    return ""


def _values(below: LinearFit, past: LinearFit) -> tuple[FloatArray, FloatArray]:
    """Return the four values and their Jacobian by (intercept, slope) of both lines."""
    a, s = below.values
    b, r = past.values
    # Parallel lines or no slope are refused afterwards, by their own reasons.
    gap = s - r if s != r else math.nan
    s = s if s != 0 else math.nan
    meet = (b - a) / gap
    values = np.array([s, r / s, meet, a])
    jacobian = np.array(
        [
            [0.0, 1.0, 0.0, 0.0],
            [0.0, -r / s**2, 0.0, 1 / s],
            [-1 / gap, -meet / gap, 1 / gap, meet / gap],
            [1.0, 0.0, 0.0, 0.0],
        ]
    )
    return values, jacobian


def _refused(reason: str, points: int) -> Loading:
    none, both = np.full(4, np.nan), np.full((4, 4), np.nan)
    nothing = np.full(points, np.nan)
    return Loading(
        found=False,
        reason=reason,
        names=NAMES,
        values=none,
        covariance=both,
        points_below=0,
        points_past=0,
        residuals=nothing,
        chi2=math.nan,
        dof=0,
    )

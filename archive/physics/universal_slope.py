"""A law of proportion through points whose errors in both coordinates are partly common.

Rules: the common part is never thrown in with the points' own scatter: each source moves its points together; what a source
does to an ordinate is scaled to the fitted line, so that a common factor (an area, a mass sensitivity) neither pulls the slope
down nor spoils chi squared; only what a point has alone weighs it, so that the slope lies among the slopes of the points.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray, same_length, series

__all__ = ["Proportion", "proportion"]

_SINGULAR = 1e-10
"""Least eigenvalue of the correlation matrix of the residuals below which its inverse would be rounding."""


@dataclass(frozen=True)
class Proportion:
    """Outcome of the fit of ``y = slope x``.

    Attributes
    ----------
    slope, standard_uncertainty : float
        The uncertainty contains all sources that were given.
    chi2, probability : float
        With ``dof`` degrees of freedom; the chance of a larger chi squared if the points lie on one line. Not a number for one
        point.
    dof : int
    residuals : ndarray
        ``y - slope x`` over the standard uncertainty that the residual has, common sources and all.
    weights : ndarray
        The slope is ``weights @ y``, and ``weights @ x`` is one.
    """

    slope: float
    standard_uncertainty: float
    chi2: float
    probability: float
    dof: int
    residuals: FloatArray
    weights: FloatArray


def proportion(
    x: npt.ArrayLike,
    y: npt.ArrayLike,
    *,
    contributions_x: npt.ArrayLike,
    contributions_y: npt.ArrayLike,
) -> Proportion:
    """Return the best factor between two columns that are proportional to each other.

    Parameters
    ----------
    x, y : array_like
        Abscissae and ordinates, n >= 1, all > 0.
    contributions_x, contributions_y : array_like, shape (sources, n)
        Signed standard uncertainty that each source brings to each abscissa and ordinate; one row may touch a single point (an
        error of its own) or all of them (a common one), and both coordinates at once.

    Raises
    ------
    ValueError
        Numbers that are not above zero, shapes that do not fit, or sources that leave a residual, or a combination of
        residuals, without uncertainty.

    Notes
    -----
    A point's weight is its abscissa over the variance that it has alone: the sources that touch no other point, ``c = (slope x/y) c_y -
    slope c_x``. All weights are positive, so the slope is a mean of the points' own slopes. Every source, common ones too, is then propagated
    through these weights. Weights from the whole covariance would make the uncertainty a little smaller where the model of the common
    part is exact; where common parts are strong and not quite equal among the points they are large and of both signs, and the line
    then leaves all of its points, by an extrapolation that rests on how well the correlations are known.

    Chi squared is that of the n - 1 combinations of points from which a common slope drops out, with the covariance of those; it depends on
    no weights. A source that multiplies all y by one factor is in the uncertainty of the slope and in no residual.

    References
    ----------
    JCGM 100:2008, 5.2 (correlated input quantities). G. D'Agostini, "On the use of the covariance matrix to fit correlated data",
    Nuclear Instruments and Methods A 346, 306 (1994) (a fit that leaves its points where their errors are strongly common; from memory).
    """
    from scipy.stats import chi2 as chi2_distribution  # a second of imports that few commands need

    X, Y = series("x", x, positive=True), series("y", y, positive=True)
    same_length(x=X, y=Y)
    parts = []
    for name, given in (("contributions_x", contributions_x), ("contributions_y", contributions_y)):
        part = np.asarray(given, dtype=np.float64)
        if part.ndim != 2 or part.shape[1] != X.size:
            raise ValueError(f"{name}: found shape {part.shape}, expected (sources, {X.size})")
        parts.append(part)
    if parts[0].shape != parts[1].shape:
        raise ValueError(
            f"contributions_x, contributions_y: found {parts[0].shape[0]} and {parts[1].shape[0]} sources, expected as many in both"
        )
    # Over the slope itself, which scales all residuals alike, so that the weights do not depend on it.
    moved = parts[1] * (X / Y) - parts[0]
    relative = _covariance(moved)
    weights = _weights(X, _alone(moved))
    found = float(weights @ Y)
    covariance = found**2 * relative
    residual = Y - found * X
    dof = X.size - 1
    chi2 = _scatter(X, Y, covariance) if dof else np.nan
    return Proportion(
        slope=found,
        standard_uncertainty=float(np.sqrt(weights @ covariance @ weights)),
        chi2=chi2,
        probability=float(chi2_distribution.sf(chi2, dof)) if dof else np.nan,
        dof=dof,
        residuals=residual / np.sqrt(np.diag(covariance)),
        weights=weights,
    )


def _covariance(moved: FloatArray) -> FloatArray:
    covariance = np.asarray(moved.T @ moved)
    spread = np.sqrt(np.diag(covariance))
    if not (spread > 0).all():
        raise ValueError(f"y[{int(np.argmax(spread <= 0))}]: its residual has no uncertainty")
    if float(np.linalg.eigvalsh(covariance / np.outer(spread, spread))[0]) < _SINGULAR:
        raise ValueError(
            "contributions_y: all sources are common to the points, so nothing says how closely these should lie on one line"
        )
    return covariance


def _alone(moved: FloatArray) -> FloatArray:
    """Return the variance of each residual from the sources that touch no other point."""
    lone = np.count_nonzero(moved, axis=1) == 1
    variance = np.asarray(np.sum(np.square(moved[lone]), axis=0))
    if moved.shape[1] > 1 and not (variance > 0).all():
        raise ValueError(
            f"y[{int(np.argmax(variance <= 0))}]: no source is this point's alone, so nothing says how much it weighs"
        )
    # A single point weighs what it weighs.
    return variance if moved.shape[1] > 1 else np.ones(1)


def _weights(X: FloatArray, variance: FloatArray) -> FloatArray:
    share = X / variance
    return np.asarray(share / float(share @ X))


def _scatter(X: FloatArray, Y: FloatArray, covariance: FloatArray) -> float:
    """Return chi squared of the combinations of points in which a common slope has no part."""
    contrasts = np.linalg.qr(X[:, np.newaxis], mode="complete")[0][:, 1:]
    found = contrasts.T @ Y
    return float(found @ np.linalg.solve(contrasts.T @ covariance @ contrasts, found))

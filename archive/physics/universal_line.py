"""Crossing of a measured superfluid areal density with the universal line.

Rules: the crossing is read from a local polynomial through several points, with its uncertainty; it lies above the static
transition, by what `film_features.shift_of_crossing` says.

References
----------
D. R. Nelson, J. M. Kosterlitz, Phys. Rev. Lett. 39, 1201 (1977) (the line); the reading of the crossing is the project's own.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray, same_length, series
from archive.physics.film_static import UNIVERSAL_JUMP
from archive.physics.linear_fit import LinearFit, linear_fit

__all__ = ["UniversalCrossing", "crossing_of_universal_line"]

SLOPE_SHARE = 0.1
"""Relative uncertainty of the slope below which first-order propagation of the crossing is fair (no source)."""


@dataclass(frozen=True)
class UniversalCrossing:
    """Where the areal density falls through the universal line.

    Attributes
    ----------
    found : bool
    reason : str
    temperature, standard_uncertainty : float
        K; not a number unless found. The uncertainty is that of the local fit; scale errors of the areal density are not in it.
    areal_density : float
        On the line, kg/m^2.
    slope : float
        d(sigma_s - line)/dT there, kg m^-2 K^-1, negative.
    points : int
        Points used.
    """

    found: bool
    reason: str
    temperature: float
    standard_uncertainty: float
    areal_density: float
    slope: float
    points: int


def crossing_of_universal_line(
    temperature: npt.ArrayLike,
    areal_density: npt.ArrayLike,
    *,
    standard_uncertainty: npt.ArrayLike | None = None,
    points: int = 8,
    order: int = 2,
) -> UniversalCrossing:
    """Return where a superfluid areal density falls through the universal line.

    Parameters
    ----------
    temperature : array_like
        K, > 0, any order.
    areal_density : array_like
        kg/m^2, as an oscillator reports it.
    standard_uncertainty : array_like, optional
        Point errors, kg/m^2 (common errors move the answer as a whole and belong elsewhere). The scatter of the points about
        the local polynomial is used instead where it is larger.
    points : int
        Least number of points of the local polynomial, more than ``order + 1``. Twice as many are taken, again and again, until
        the slope at the crossing is known to a tenth.
    order : int
        Its degree, 1 or 2.

    Raises
    ------
    ValueError
        Bad arrays or numbers.

    Notes
    -----
    The place is first taken where points above the line change to points below with the fewest exceptions, so single wild points
    do not matter; then the root of the local least-squares polynomial nearest to it.
    """
    if order not in {1, 2}:
        raise ValueError(f"order: found {order}, expected 1 or 2")
    if points < order + 2:
        raise ValueError(f"points: found {points}, expected at least {order + 2}")
    T = series("temperature", temperature, positive=True)
    sigma = series("areal_density", areal_density)
    same_length(temperature=T, areal_density=sigma)
    if T.size < points:
        return _none(f"found {T.size} points, expected at least {points}")
    rising = np.argsort(T, kind="stable")
    T, excess = T[rising], (sigma - UNIVERSAL_JUMP * T)[rising]
    split = _split(excess)
    if split in {0, T.size}:
        side = "below" if split == 0 else "above"
        return _none(f"the record stays {side} the universal line")
    spread = None
    if standard_uncertainty is not None:
        given = np.broadcast_to(np.asarray(standard_uncertainty, dtype=np.float64), rising.shape)
        spread = series("standard_uncertainty", given, positive=True)[rising]
    best = _none("the points beside the crossing do not fall through the line")
    while points <= T.size:
        found, slope_share = _local(T, excess, spread, split=split, points=points, order=order)
        if found.found:
            best = found
            if slope_share < SLOPE_SHARE:
                break
        points *= 2
    return best


def _local(
    T: FloatArray, excess: FloatArray, spread: FloatArray | None, *, split: int, points: int, order: int
) -> tuple[UniversalCrossing, float]:
    """Return the crossing of the polynomial through some points about the split, and its slope's relative uncertainty."""
    place = float(T[split - 1] + T[split]) / 2
    first = min(max(split - points // 2, 0), T.size - points)
    window = slice(first, first + points)
    width = float(np.ptp(T[window])) / 2
    if width == 0:
        return _none("all points beside the crossing have one temperature"), math.inf
    local = (T[window] - place) / width
    fit = _polynomial(local, excess[window], None if spread is None else spread[window], order)
    root = _root(fit.values, limit=(float(local[0]), float(local[-1])))
    if math.isnan(root):
        return _none("the points beside the crossing do not fall through the line"), math.inf
    powers = root ** np.arange(order + 1)
    # Derivatives of the powers: 0, 1, 2 x.
    rates = np.arange(order + 1) * root ** np.maximum(np.arange(order + 1) - 1, 0)
    slope = float(fit.values @ rates)
    u = width * math.sqrt(float(powers @ fit.covariance @ powers)) / abs(slope)
    share = math.sqrt(float(rates @ fit.covariance @ rates)) / abs(slope)
    at = place + width * root
    found = UniversalCrossing(
        found=True,
        reason="crossing found",
        temperature=at,
        standard_uncertainty=u,
        areal_density=UNIVERSAL_JUMP * at,
        slope=slope / width,
        points=points,
    )
    return found, share


def _split(excess: FloatArray) -> int:
    """Return how many of the first points count as above the line, with the fewest exceptions."""
    above = excess > 0
    wrong_left = np.concatenate([[0], np.cumsum(~above)])
    wrong_right = np.concatenate([np.cumsum(above[::-1])[::-1], [0]])
    return int(np.argmin(wrong_left + wrong_right))


def _polynomial(local: FloatArray, excess: FloatArray, spread: FloatArray | None, order: int) -> LinearFit:
    design = np.vander(local, order + 1, increasing=True)
    names = ("level", "slope", "curvature")[: order + 1]
    fit = linear_fit(design, excess, names=names, standard_uncertainty=spread, absolute=spread is not None)
    if spread is not None and fit.chi2 > fit.dof:
        return LinearFit(**{**vars(fit), "covariance": fit.covariance * (fit.chi2 / fit.dof)})
    return fit


def _root(coefficients: FloatArray, *, limit: tuple[float, float]) -> float:
    """Return the root at which the polynomial falls, if it lies inside the window, or not a number."""
    level, slope, curvature = (*map(float, coefficients), 0.0)[:3]
    discriminant = slope**2 - 4 * curvature * level
    if discriminant <= 0:
        return math.nan
    # The form without cancellation; of the two roots this is the one of negative slope, -sqrt(discriminant).
    denominator = -slope + math.sqrt(discriminant)
    if denominator <= 0:
        return math.nan
    root = 2 * level / denominator
    return root if limit[0] <= root <= limit[1] else math.nan


def _none(reason: str) -> UniversalCrossing:
    nan = math.nan
    return UniversalCrossing(
        found=False,
        reason=reason,
        temperature=nan,
        standard_uncertainty=nan,
        areal_density=nan,
        slope=nan,
        points=0,
    )

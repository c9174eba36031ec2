"""Coverage intervals of drawn values, and the comparison of one with the interval of first-order propagation.

References
----------
JCGM 101:2008, Supplement 1 to the "Guide to the expression of uncertainty in measurement": propagation of distributions
using a Monte Carlo method; 7.7 (coverage intervals), 7.9.2 (numerical tolerance), 8.1 (comparison). Clauses from memory.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np
import numpy.typing as npt
from scipy.special import ndtri

__all__ = [
    "Comparison",
    "comparison",
    "numerical_tolerance",
    "shortest_interval",
    "symmetric_interval",
]

FloatArray = npt.NDArray[np.float64]


@dataclass(frozen=True)
class Comparison:
    """First order held against drawn values.

    Attributes
    ----------
    low, high : float
        Interval of first order: value less and plus k standard uncertainties, with the k of a normal distribution.
    tolerance : float
        Half a unit of the last digit kept of the standard uncertainty.
    difference : float
        The larger of the distances between the ends of the two intervals.
    numerical_uncertainty : float
        Standard uncertainty of that distance for the finite number of draws; NaN with too few of them.
    agreement : str
        ``agrees``: the ends differ by no more than the tolerance; ``differs``; ``undecided``: more draws are needed to tell.
    """

    low: float
    high: float
    tolerance: float
    difference: float
    numerical_uncertainty: float
    agreement: Literal["agrees", "differs", "undecided"]


def _covered(size: int, probability: float) -> int:
    """Return how many steps from one sorted draw to another cover the probability."""
    if not 0 < probability < 1:
        raise ValueError(f"probability: found {probability}, expected between 0 and 1")
    exact = probability * size
    # Rounding must not turn 0.95 of 100 into 95.00000000000001.
    whole = round(exact) if abs(exact - round(exact)) < 1e-9 * size else math.floor(exact + 0.5)
    if size < 2 or not 1 <= whole < size:
        raise ValueError(f"draws: found {size}, too few for a coverage interval of {probability:g}")
    return whole


def symmetric_interval(draws: FloatArray, *, probability: float = 0.95) -> tuple[float, float]:
    """Return the probabilistically symmetric coverage interval of drawn values.

    Parameters
    ----------
    draws : ndarray
        Sorted, finite.
    probability : float
        Between 0 and 1.

    Returns
    -------
    tuple of float
        Its ends, both of them drawn values.

    Raises
    ------
    ValueError
        Too few draws.

    References
    ----------
    JCGM 101:2008, 7.7.2.

    Examples
    --------
    >>> symmetric_interval(np.arange(1.0, 1001.0))
    (25.0, 975.0)
    """
    size = draws.size
    q = _covered(size, probability)
    r = max((size - q) // 2 if (size - q) % 2 == 0 else (size - q + 1) // 2, 1)
    return float(draws[r - 1]), float(draws[r - 1 + q])


def shortest_interval(draws: FloatArray, *, probability: float = 0.95) -> tuple[float, float]:
    """Return the shortest coverage interval of drawn values; the lowest of several that are equally short.

    Parameters and errors are those of `symmetric_interval`.

    References
    ----------
    JCGM 101:2008, 7.7.3.

    Examples
    --------
    >>> shortest_interval(np.array([0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 9.0]), probability=0.8)
    (0.0, 0.0)
    """
    q = _covered(draws.size, probability)
    lengths = draws[q:] - draws[: draws.size - q]
    r = int(np.argmin(lengths))
    return float(draws[r]), float(draws[r + q])


def numerical_tolerance(standard_uncertainty: float, *, digits: int) -> float:
    """Return half a unit of the last of the digits kept of a standard uncertainty.

    Parameters
    ----------
    standard_uncertainty : float
        Above 0.
    digits : int
        Significant digits kept, 1 or 2 as a rule.

    Raises
    ------
    ValueError
        An uncertainty that is not above 0, or no digit.

    References
    ----------
    JCGM 101:2008, 7.9.2.

    Examples
    --------
    >>> numerical_tolerance(0.00032, digits=2), numerical_tolerance(2.0, digits=1), numerical_tolerance(0.96, digits=1)
    (5e-06, 0.5, 0.5)
    """
    if not (standard_uncertainty > 0 and math.isfinite(standard_uncertainty)):
        raise ValueError(f"standard_uncertainty: found {standard_uncertainty}, expected > 0")
    if digits < 1:
        raise ValueError(f"digits: found {digits}, expected at least 1")
    # The text rounds first: 0.96 kept to one digit is 1, and its last digit is a whole one.
    exponent = int(f"{standard_uncertainty:.{digits - 1}e}".partition("e")[2]) - (digits - 1)
    return float(f"5e{exponent - 1}")


def comparison(
    draws: FloatArray,
    interval: tuple[float, float],
    *,
    value: float,
    standard_uncertainty: float,
    digits: int,
    probability: float = 0.95,
) -> Comparison:
    """Return whether first order agrees with an interval of drawn values, to the digits that are kept.

    Parameters
    ----------
    draws : ndarray
        Sorted, finite.
    interval : tuple of float
        The one to compare with, symmetric or shortest, of the same probability.
    value, standard_uncertainty : float
        Of first order.
    digits : int
        Significant digits of the standard uncertainty that are kept.
    probability : float

    Notes
    -----
    Clause 8.1 compares the ends as if they were exact. They are known to a standard uncertainty, taken here from the draws
    beside them (a quantile of M draws lies within the neighbours at +- sqrt(M q (1 - q)) with about 68 per cent; derived
    from the binomial distribution). A difference within two of it of the tolerance is undecided, unless the draws are many
    enough for it to be below a tenth of the tolerance (8.2 asks for a fifth, as twice a standard deviation).
    """
    k = float(ndtri(0.5 + probability / 2))
    low, high = value - k * standard_uncertainty, value + k * standard_uncertainty
    tolerance = numerical_tolerance(standard_uncertainty, digits=digits)
    apart = (abs(low - interval[0]), abs(high - interval[1]))
    difference = max(apart)
    numerical = max(_end_uncertainty(draws, end) for end in interval)
    agreement: Literal["agrees", "differs", "undecided"] = "undecided"
    if abs(difference - tolerance) > 2 * numerical or 2 * numerical <= tolerance / 5:
        agreement = "agrees" if difference <= tolerance else "differs"
    return Comparison(low, high, tolerance, difference, numerical, agreement)


def _end_uncertainty(draws: FloatArray, end: float) -> float:
    """Return the standard uncertainty of an end of an interval, NaN where no draw lies that far out."""
    size = draws.size
    at = int(np.searchsorted(draws, end))
    share = min(max((at + 0.5) / size, 0.5 / size), 1 - 0.5 / size)
    step = math.ceil(math.sqrt(size * share * (1 - share)))
    if at - step < 0 or at + step >= size:
        return math.nan
    return float(draws[at + step] - draws[at - step]) / 2

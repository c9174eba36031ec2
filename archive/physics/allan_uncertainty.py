"""How well an overlapping Allan deviation is known from a record of finite length.

Rules: for white noise of period or frequency, exactly; for other noise it is the usual first guess.
"""

from __future__ import annotations

import math

import numpy as np

__all__ = ["relative_uncertainty"]


def relative_uncertainty(count: int, factor: int) -> float:
    """Return the relative standard uncertainty of an overlapping Allan deviation of white noise.

    Parameters
    ----------
    count : int
        Readings in the record.
    factor : int
        Readings averaged in one value, 1 to half of `count`.

    Raises
    ------
    ValueError
        A factor that leaves no difference.

    Notes
    -----
    Derived: the estimator is the mean square of M = count - 2 m + 1 normal differences, whose correlation at a lag j is
    1 - 3 j/(2 m) up to j = m and -(1 - j/(2 m)) up to 2 m. The variance of a mean square of normal values is
    2/M^2 times the sum of (M - |j|) r_j^2 over all lags, relative to the square of the mean; the deviation takes half of its root.
    For m = 1 this is sqrt(3/M)/2.

    Examples
    --------
    >>> round(relative_uncertainty(301, 1), 4)
    0.05
    """
    m, M = factor, count - 2 * factor + 1
    if factor < 1 or M < 1:
        raise ValueError(f"factor: found {factor}, expected 1 to {count // 2}")
    lag = np.arange(min(2 * m, M), dtype=np.float64)
    correlation = np.where(lag <= m, 1 - 1.5 * lag / m, -(1 - lag / (2 * m)))
    terms = (M - lag) * correlation**2
    return 0.5 * math.sqrt(2 * (float(terms[0]) + 2 * float(terms[1:].sum()))) / M

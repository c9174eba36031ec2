"""Inverse of a monotonic function by Newton steps that never leave their bracket.

Rule: every element is found on its own, so a value does not depend on which others were asked for with it.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike

from archive.physics.ranges import Floats, floats

__all__ = ["monotonic_inverse"]

_LARGEST_NUMBER_OF_STEPS = 200


def monotonic_inverse(
    function: Callable[[Floats], tuple[Floats, Floats]],
    target: ArrayLike,
    *,
    low: ArrayLike,
    high: ArrayLike,
) -> Floats:
    """Return x with function(x) = target, for a function that is monotonic between `low` and `high`.

    Parameters
    ----------
    function : callable
        Takes an array x of one dimension, returns the pair (value, derivative).
    target : float or array_like
        Values wanted. NaN gives NaN.
    low, high : float or array_like
        The bracket. A target beyond the function's value at an end gives that end: check ranges before.

    Returns
    -------
    ndarray of float64
        Shape of `target`; accurate to a few units in the last place of x.

    Notes
    -----
    A Newton step that would leave the bracket, or that shrinks it by less than half, is replaced by a bisection.

    Examples
    --------
    >>> float(monotonic_inverse(lambda x: (x * x, 2 * x), 9.0, low=0.0, high=10.0))
    3.0
    """
    wanted = floats(target)
    shape = wanted.shape
    y = wanted.reshape(-1)
    a = np.broadcast_to(floats(low), shape).reshape(-1).copy()
    b = np.broadcast_to(floats(high), shape).reshape(-1).copy()
    rising = function(b)[0] >= function(a)[0]
    x = 0.5 * (a + b)
    x[np.isnan(y)] = np.nan
    active = np.flatnonzero(~np.isnan(y))
    for _ in range(_LARGEST_NUMBER_OF_STEPS):
        if not active.size:
            break
        now = x[active]
        value, slope = function(now)
        error = value - y[active]
        above = (error > 0) == rising[active]
        b[active] = np.where(above, now, b[active])
        a[active] = np.where(above, a[active], now)
        with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
            step = error / slope
        newton = now - step
        left, right = a[active], b[active]
        usable = (newton > left) & (newton < right) & (np.abs(step) <= 0.5 * (right - left))
        following = np.where(usable, newton, 0.5 * (left + right))
        following = np.where(error == 0, now, following)
        x[active] = following
        moved = np.abs(following - now) > 4 * np.spacing(np.abs(now))
        active = active[moved]
    return x.reshape(shape)[()]

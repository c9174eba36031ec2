"""Arrays from arguments, and the hard range of a formula.

Rule: a value outside the range of a formula is an error that names the argument and the index; NaN is a missing
reading, passes through and stays NaN.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["Floats", "floats", "within"]

Floats = NDArray[np.float64]
"""Array of floats, or the numpy scalar that stands for an array of no dimensions."""


def floats(values: ArrayLike) -> Floats:
    """Return the values as an array of floats.

    Parameters
    ----------
    values : float or array_like
        Anything numpy can turn into floats.

    Returns
    -------
    ndarray of float64
    """
    return np.asarray(values, dtype=np.float64)


def within(
    values: ArrayLike, name: str, *, low: float, high: float, unit: str, formula: str, hint: str = ""
) -> Floats:
    """Return the values as floats after checking that none lies outside a closed range.

    Parameters
    ----------
    values : float or array_like
        Values to check; NaN passes.
    name : str
        The argument's name, for the error.
    low, high : float
        The range, ends included.
    unit, formula, hint : str
        Unit of the values, what the range belongs to, and what a person can do instead.

    Returns
    -------
    ndarray of float64

    Raises
    ------
    ValueError
        When a value is outside; names the argument, the first index, the value and the range.

    Examples
    --------
    >>> within([1.0, 6.0], "T", low=1.25, high=5.0, unit="K", formula="the 4He equation")
    Traceback (most recent call last):
        ...
    ValueError: T[0] = 1 K is outside the range 1.25 to 5 K of the 4He equation (and 1 more value)
    """
    array = floats(values)
    outside = (array < low) | (array > high)
    if outside.any():
        flat = np.flatnonzero(outside)
        found = float(array.ravel()[flat[0]])
        index = np.unravel_index(int(flat[0]), array.shape)
        where = f"{name}[{', '.join(str(int(i)) for i in index)}]" if array.ndim else name
        others = flat.size - 1
        more = f" (and {others} more value{'s' if others > 1 else ''})" if others else ""
        advice = f"; {hint}" if hint else ""
        of_unit = f" {unit}" if unit else ""
        raise ValueError(
            f"{where} = {found:.8g}{of_unit} is outside the range {low:.8g} to {high:.8g}{of_unit} of {formula}{more}{advice}"
        )
    return array

"""Array types of the physics layer, and the one way to refuse a bad argument.

Rules: physics works on SI floats and numpy arrays; what is wrong is said with the argument's name and index.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

__all__ = ["BoolArray", "ComplexArray", "FloatArray", "same_length", "series"]

FloatArray = npt.NDArray[np.float64]
ComplexArray = npt.NDArray[np.complex128]
BoolArray = npt.NDArray[np.bool_]


def series(name: str, values: npt.ArrayLike, *, least: int = 1, positive: bool = False) -> FloatArray:
    """Return `values` as a one-dimensional array of finite floats.

    Parameters
    ----------
    name : str
        The argument's name, for the message.
    values : array_like
        One-dimensional.
    least : int
        Smallest length accepted.
    positive : bool
        Refuse values at or below zero.

    Raises
    ------
    ValueError
        Not one-dimensional, too short, not finite, or not positive where it must be.
    """
    array = np.asarray(values, dtype=np.float64)
    if array.ndim != 1:
        raise ValueError(f"{name}: found {array.ndim} dimensions, expected one")
    if array.size < least:
        raise ValueError(f"{name}: found {array.size} points, expected at least {least}")
    bad = ~np.isfinite(array) if not positive else ~(np.isfinite(array) & (array > 0))
    if bad.any():
        index = int(np.argmax(bad))
        expected = "a positive finite number" if positive else "a finite number"
        raise ValueError(f"{name}[{index}]: found {array[index]}, expected {expected}")
    return array


def same_length(**arrays: FloatArray) -> None:
    """Refuse arrays of different length.

    Raises
    ------
    ValueError
        Names the first array and the one that differs from it.
    """
    items = list(arrays.items())
    first, reference = items[0]
    for name, array in items[1:]:
        if array.shape != reference.shape:
            raise ValueError(f"{name}: found {array.size} points, expected {reference.size} as in {first}")

"""Rows that a plan names by number: from 1, and only those that there are."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

__all__ = ["chosen_rows", "row_indices", "row_numbers"]


def row_indices(numbers: Sequence[int], size: int) -> npt.NDArray[np.int64]:
    """Return the indices, from 0, of rows numbered from 1, in their order.

    Parameters
    ----------
    numbers : sequence of int
    size : int
        Rows that there are.

    Raises
    ------
    ValueError
        A number below 1 or above `size`; row 0 is not the last row.

    Examples
    --------
    >>> row_indices((1, 3), 3).tolist()
    [0, 2]
    """
    indices = np.array(numbers, dtype=np.int64) - 1
    if indices.size and (indices.min() < 0 or indices.max() >= size):
        raise ValueError(f"rows: found {indices.min() + 1} to {indices.max() + 1}, expected 1 to {size}")
    return indices


def chosen_rows(numbers: Sequence[int], size: int) -> npt.NDArray[np.bool_]:
    """Return the mask of rows that are numbered from 1.

    Raises
    ------
    ValueError
        A row that there is not.
    """
    mask = np.zeros(size, dtype=np.bool_)
    mask[row_indices(numbers, size)] = True
    return mask


def row_numbers(mask: npt.NDArray[np.bool_]) -> tuple[int, ...]:
    """Return the numbers of rows, from 1."""
    return tuple(int(row) + 1 for row in np.flatnonzero(mask))

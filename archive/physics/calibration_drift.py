"""By how much two calibrations of one thermometer differ, and whether their uncertainties allow it.

Rules: compared are the temperatures that both give for one reading, over the readings that both cover, on one scale. What
both share (the reference, the scale) cancels as far as it moves both alike.

References
----------
JCGM 100:2008 (GUM), 5.2.2: the variance of a difference with the covariance of its terms.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from archive.physics.ranges import Floats, floats

__all__ = ["CalibrationDifference", "calibration_difference"]


@dataclass(frozen=True)
class CalibrationDifference:
    """Differences of two calibrations at readings that both cover.

    Attributes
    ----------
    temperature : ndarray
        By the earlier calibration, K.
    difference : ndarray
        Later minus earlier, K.
    uncertainty : ndarray
        Standard uncertainty of the difference, K; what both share is counted once, with its sign.
    significance : float
        Largest difference over its uncertainty, by absolute value; infinite where nothing is uncertain and they differ.
    worst : int
        Index at which that is.
    """

    temperature: Floats
    difference: Floats
    uncertainty: Floats
    significance: float
    worst: int


def calibration_difference(
    earlier: ArrayLike,
    later: ArrayLike,
    *,
    earlier_parts: Mapping[str, ArrayLike],
    later_parts: Mapping[str, ArrayLike],
) -> CalibrationDifference:
    """Return later minus earlier temperatures of the same readings, with the uncertainty of the difference.

    Parameters
    ----------
    earlier, later : array_like, shape (n,)
        Temperatures in K by the two calibrations.
    earlier_parts, later_parts : mapping of str to array_like
        Signed standard contribution of each source, K, by its name; one name is one source.

    Returns
    -------
    CalibrationDifference

    Raises
    ------
    ValueError
        Nothing to compare, or arrays of different length.

    Examples
    --------
    >>> found = calibration_difference([1.0], [1.002], earlier_parts={"reference": [1e-3]}, later_parts={"reference": [1e-3], "fit": [5e-4]})
    >>> round(float(found.significance), 6)
    4.0
    """
    first, second = floats(earlier), floats(later)
    if first.ndim != 1 or first.shape != second.shape or first.size == 0:
        raise ValueError(
            f"later: found shape {second.shape}, expected that of earlier, {first.shape}, with at least one temperature"
        )
    difference = second - first
    square = np.zeros(first.shape)
    for name in sorted({*earlier_parts, *later_parts}):
        part = floats(later_parts.get(name, 0.0)) - floats(earlier_parts.get(name, 0.0))
        square = square + part**2
    uncertainty = np.sqrt(square)
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = np.where(difference == 0, 0.0, np.abs(difference) / uncertainty)
    worst = int(np.argmax(ratio))
    return CalibrationDifference(first, difference, uncertainty, float(ratio[worst]), worst)

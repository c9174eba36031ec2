"""Gravity at the lambda point: the transition temperature falls with depth, so a cell of some height has no sharp one.

Rule: the slope of the lambda line is the local one; a parabola through the whole line is 23 per cent off at saturated vapour pressure.

References
----------
Hydrostatics with the slope of the lambda line, whose sources stand at `lambda_line.LAMBDA_SLOPE`.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray
from archive.physics.constants import STANDARD_GRAVITY
from archive.physics.lambda_line import LAMBDA_SLOPE

__all__ = ["lambda_spread", "reduced_temperature_limit"]


def lambda_spread(
    height: npt.ArrayLike,
    *,
    density: npt.ArrayLike,
    gravity: float = STANDARD_GRAVITY,
    slope: npt.ArrayLike = LAMBDA_SLOPE,
) -> FloatArray:
    """Return how much lower T_lambda is at the bottom of a column of liquid than at its top, K.

    Parameters
    ----------
    height : array_like
        m, >= 0.
    density : array_like
        Of the liquid, kg/m^3.
    gravity : float
        m/s^2.
    slope : array_like
        dT_lambda/dp at the pressure of the liquid, K/Pa, < 0; left out: at saturated vapour pressure.

    Raises
    ------
    ValueError
        A height below zero.

    Notes
    -----
    ``rho g h |dT_lambda/dp|``, for a cell that is filled to its height.

    Examples
    --------
    >>> round(float(lambda_spread(0.01, density=146.15)) * 1e6, 2)
    1.27
    """
    h = np.asarray(height, dtype=np.float64)
    if np.any(h < 0):
        raise ValueError(f"height: found {float(np.nanmin(h))} m, expected >= 0")
    return np.asarray(
        -np.asarray(slope, dtype=np.float64) * np.asarray(density, dtype=np.float64) * gravity * h
    )


def reduced_temperature_limit(
    height: npt.ArrayLike,
    *,
    density: npt.ArrayLike,
    lambda_temperature: float,
    gravity: float = STANDARD_GRAVITY,
    slope: npt.ArrayLike = LAMBDA_SLOPE,
) -> FloatArray:
    """Return the |1 - T/T_lambda| inside which parts of the cell lie on both sides of the transition.

    Parameters
    ----------
    height, density, gravity, slope
        As in `lambda_spread`.
    lambda_temperature : float
        K, > 0.

    Raises
    ------
    ValueError
        A temperature not above zero, or a height below zero.

    Notes
    -----
    At n times this limit, counted from the middle of the cell, the average of a logarithm over the height departs from its value in the middle
    by 1/(24 n^2): 0.005 at three times (second-order term of the average, derived here).

    Examples
    --------
    >>> f"{float(reduced_temperature_limit(0.01, density=146.15, lambda_temperature=2.1768)):.2e}"
    '5.85e-07'
    """
    if not lambda_temperature > 0:
        raise ValueError(f"lambda_temperature: found {lambda_temperature} K, expected > 0")
    return np.asarray(
        lambda_spread(height, density=density, gravity=gravity, slope=slope) / lambda_temperature
    )

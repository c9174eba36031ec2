"""First and second sound in liquid 4He at saturated vapour pressure.

References
----------
R. J. Donnelly, C. F. Barenghi, J. Phys. Chem. Ref. Data 27, 1217 (1998). Temperatures are T90.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike
from scipy.interpolate import CubicSpline

from archive.physics import tables_helium4_liquid as table
from archive.physics.constants import T_LAMBDA
from archive.physics.helium_table import (
    FIRST_ABOVE,
    LAST_BELOW,
    checked_temperature,
    reduced_temperature,
    rows_above,
    rows_below,
    two_sides,
)
from archive.physics.ranges import Floats

__all__ = ["first_sound", "second_sound"]

_SECOND_SOUND_EXPONENT: Final = 0.387  # from memory; it only makes the interpolated quotient smooth

_first_below = CubicSpline(*rows_below(table.FIRST_SOUND))
_first_above = CubicSpline(*rows_above(table.FIRST_SOUND))


def first_sound(temperature: ArrayLike) -> Floats:
    """Return the speed of first (ordinary) sound in liquid 4He at saturated vapour pressure.

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 0.1 to 4.2221 K. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        m/s; good to 0.5 per cent. A straight line from 2.175 to 2.18 K, where the dip at the lambda point is lost.

    Raises
    ------
    ValueError
        When a temperature is outside the range.
    """
    return two_sides(
        checked_temperature(temperature, "first sound"), _first_below, _first_above, (LAST_BELOW, FIRST_ABOVE)
    )


_second_t, _u2 = rows_below(table.SECOND_SOUND)
_second_scaled = CubicSpline(
    _second_t, np.log(_u2 / reduced_temperature(_second_t) ** _SECOND_SOUND_EXPONENT)
)


def second_sound(temperature: ArrayLike) -> Floats:
    """Return the speed of second sound in liquid 4He at saturated vapour pressure.

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 0.6 to 2.1768 K. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        m/s; good to 0.5 per cent, 1 per cent below 0.7 K. Zero at the lambda point.

    Raises
    ------
    ValueError
        When a temperature is outside the range: there is no second sound in the normal liquid.

    Notes
    -----
    The speed divided by (1 - T/T_lambda)^0.387 (exponent from memory) is interpolated and held above 2.175 K.

    Examples
    --------
    >>> round(float(second_sound(1.65)), 2)
    20.37
    """
    T = checked_temperature(temperature, "second sound", low=float(_second_t[0]), high=T_LAMBDA)
    scaled = np.exp(_second_scaled(np.minimum(T, LAST_BELOW)))
    return (scaled * np.maximum(reduced_temperature(T), 0.0) ** _SECOND_SOUND_EXPONENT)[()]

"""Viscosity of liquid 4He at saturated vapour pressure, and how deep an oscillating wall drags it along.

References
----------
R. J. Donnelly, C. F. Barenghi, J. Phys. Chem. Ref. Data 27, 1217 (1998). Temperatures are T90.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike
from scipy.interpolate import CubicSpline, PchipInterpolator

from archive.physics import tables_helium4_liquid as table
from archive.physics.helium_liquid import normal_density
from archive.physics.helium_table import (
    FIRST_ABOVE,
    LAST_BELOW,
    checked_temperature,
    rows_above,
    rows_below,
    two_sides,
)
from archive.physics.ranges import Floats, within

__all__ = ["viscosity", "viscous_penetration_depth"]

_viscosity_t, _v = rows_below(table.VISCOSITY_MICROPASCAL_SECOND)
_log_viscosity_below = PchipInterpolator(_viscosity_t, np.log(_v))
_viscosity_above = CubicSpline(*rows_above(table.VISCOSITY_MICROPASCAL_SECOND))


def viscosity(temperature: ArrayLike) -> Floats:
    """Return the viscosity of liquid 4He (of its normal component below the lambda point).

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 0.8 to 4.2221 K. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        Pa s. Good to 1 per cent, to 2 per cent below 1 K and from 2.18 to 2.25 K.

    Raises
    ------
    ValueError
        When a temperature is outside the range.

    Notes
    -----
    Below about 1 K the mean free path is long and the value depends on the geometry. From 2.175 to 2.18 K a straight
    line; the change there is 1.4 per cent.

    Examples
    --------
    >>> round(float(viscosity(2.0)) * 1e6, 3)
    1.468
    """
    T = checked_temperature(temperature, "viscosity", low=float(_viscosity_t[0]))
    edges = (LAST_BELOW, FIRST_ABOVE)
    return (1e-6 * two_sides(T, lambda x: np.exp(_log_viscosity_below(x)), _viscosity_above, edges))[()]


def viscous_penetration_depth(temperature: ArrayLike, frequency: ArrayLike) -> Floats:
    """Return the depth to which an oscillating wall drags liquid 4He along.

    Parameters
    ----------
    temperature : float or array_like
        T90 in K, 1.0 to 4.2221 K.
    frequency : float or array_like
        Hz, above 0 (not angular).

    Returns
    -------
    ndarray of float64
        sqrt(2 eta/(rho_n 2 pi f)) in m, with the normal density below the lambda point.

    Raises
    ------
    ValueError
        When a temperature is outside the range or a frequency is not above 0.

    Examples
    --------
    >>> round(float(viscous_penetration_depth(2.0, 1000.0)) * 1e6, 2)
    2.41
    """
    f = within(
        frequency, "frequency", low=float(np.finfo(float).tiny), high=np.inf, unit="Hz", formula="a frequency"
    )
    return np.sqrt(viscosity(temperature) / (normal_density(temperature) * np.pi * f))[()]

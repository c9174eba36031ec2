"""The lambda line of 4He: how its lambda temperature falls with pressure.

Rules: the slope at saturated vapour pressure is known to 2 per cent; farther up there are only coarse points on a scale of 1948, which say about
where the transition lies and how steep the line is there, and are never a temperature on ITS-90.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike
from scipy.interpolate import CubicSpline

from archive.physics.constants import T_LAMBDA
from archive.physics.ranges import Floats, within

__all__ = [
    "COARSE_UNCERTAINTY",
    "LAMBDA_PRESSURE",
    "LAMBDA_SLOPE",
    "coarse_lambda_temperature",
    "lambda_slope",
]

LAMBDA_SLOPE: Final = -8.88e-8
"""dT_lambda/dp at saturated vapour pressure, K/Pa, good to about 2 per cent.

By two routes: 1.273 uK per centimetre of liquid (G. Ahlers, Physical Review 171, 275 (1968), number from memory), and the relation of Pippard,
Buckingham and Fairbank between heat capacity and expansion with the values of Donnelly and Barenghi (1998)."""

LAMBDA_PRESSURE: Final = 5042.0
"""Saturated vapour pressure at the lambda point, Pa, ITS-90."""

COARSE_UNCERTAINTY: Final = 15e-3
"""K, of a temperature of the coarse line."""

_ATMOSPHERE: Final = 101325.0
_ATMOSPHERES: Final = (3.18, 7.26, 11.1, 14.72, 18.18, 21.5, 24.62, 27.62, 29.64)
_SCALE_OF_1948: Final = (2.15, 2.1, 2.05, 2.0, 1.95, 1.9, 1.85, 1.8, 1.764)
"""C. A. Swenson, Physical Review 86, 870 (1952) (citation from memory): atm, and K on a scale of 1948 whose lambda point is 2.186 K."""
_LAMBDA_OF_1948: Final = 2.186


_fall = CubicSpline(
    np.array([LAMBDA_PRESSURE, *(_ATMOSPHERE * each for each in _ATMOSPHERES)]),
    np.array([0.0, *(each - _LAMBDA_OF_1948 for each in _SCALE_OF_1948)]),
    bc_type=((1, np.array(LAMBDA_SLOPE)), (2, np.array(0.0))),
)
"""Fall of the lambda temperature from saturated vapour pressure, K, against pressure, Pa."""


def _inside(pressure: ArrayLike) -> Floats:
    return within(
        pressure, "pressure", low=LAMBDA_PRESSURE, high=_ATMOSPHERE * _ATMOSPHERES[-1], unit="Pa", formula="the coarse lambda line"
    )  # fmt: skip


def coarse_lambda_temperature(pressure: ArrayLike) -> Floats:
    """Return about where the lambda point of 4He lies under pressure.

    Parameters
    ----------
    pressure : float or array_like
        Pa, 5042 Pa to 3.003 MPa. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        K, to 15 mK: 2.1768 K less the fall that was measured on a scale of 1948. It is no temperature on ITS-90; use it to tell the normal
        liquid from the superfluid, or for a test of plausibility.

    Raises
    ------
    ValueError
        When a pressure is outside the range.

    References
    ----------
    C. A. Swenson, Physical Review 86, 870 (1952) (citation from memory), interpolated.

    Examples
    --------
    >>> round(float(coarse_lambda_temperature(7.26 * 101325)), 4)
    2.0908
    """
    return np.asarray(T_LAMBDA + _fall(_inside(pressure)))[()]


def lambda_slope(pressure: ArrayLike) -> Floats:
    """Return dT_lambda/dp of 4He at a pressure, K/Pa.

    Parameters
    ----------
    pressure : float or array_like
        Pa, 5042 Pa to 3.003 MPa. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        Good to about 2 per cent at saturated vapour pressure, 10 per cent up to 0.3 MPa and 5 per cent above (own estimate: what rounding and
        scale of the points do to their differences).

    Raises
    ------
    ValueError
        When a pressure is outside the range.

    References
    ----------
    As `coarse_lambda_temperature`, with the slope at saturated vapour pressure of `LAMBDA_SLOPE`.

    Examples
    --------
    >>> round(float(lambda_slope(LAMBDA_PRESSURE)) * 1e8, 2)
    -8.88
    """
    return np.asarray(_fall(_inside(pressure), 1))[()]

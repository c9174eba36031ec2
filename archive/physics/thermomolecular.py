"""Pressure at the cold end of a tube from the pressure at its warm end (thermal transpiration), for 4He.

Rule: the correction is known to 10 per cent of itself, and its uncertainty travels with it.

References
----------
S. Weber, G. Schmidt, Leiden Commun. 246c (1936); use for helium: T. R. Roberts, S. G. Sydoriak, Phys. Rev. 102, 304
(1956), G. T. McConville, Cryogenics 9, 122 (1969). Equation and citations from memory; its two limits are checked.
"""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from archive.physics.ranges import Floats, within

__all__ = ["ColdPressure", "cold_pressure"]

# Mean free path times pressure at 273.15 K for 4He, Pa m: viscosity 18.6 uPa s, lambda = (eta/p) sqrt(pi R T/(2 M)).
_PATH_TIMES_PRESSURE: Final = 0.01756
_PATH_TEMPERATURE: Final = 273.15
_PATH_EXPONENT: Final = 1.147
# Pairs (weight, shift) of the equation; the first term is 0.5 ln(T1/T2).
_TERMS: Final = ((0.18131, 0.1878), (0.41284, 1.8311), (-0.15823, 4.9930))
_RELATIVE_UNCERTAINTY: Final = 0.10


class ColdPressure(NamedTuple):
    """Pressure at the cold end in Pa and its standard uncertainty from the correction, a tenth of the correction."""

    pressure: Floats
    uncertainty: Floats


def _reciprocal_knudsen(p: Floats, T: Floats, radius: Floats) -> Floats:
    """Return y = r/lambda with lambda proportional to T^1.147/p."""
    result: Floats = radius * p / (_PATH_TIMES_PRESSURE * (T / _PATH_TEMPERATURE) ** _PATH_EXPONENT)
    return result


def cold_pressure(
    pressure: ArrayLike, *, warm_temperature: ArrayLike, cold_temperature: ArrayLike, radius: ArrayLike
) -> ColdPressure:
    """Return the pressure of 4He gas at the cold end of a tube.

    Parameters
    ----------
    pressure : float or array_like
        Pressure at the warm end in Pa, above 0.
    warm_temperature, cold_temperature : float or array_like
        K, the warm end at least as warm as the cold one.
    radius : float or array_like
        Inner radius of the tube in m, above 0.

    Returns
    -------
    ColdPressure
        Between p sqrt(T_cold/T_warm), the limit of a long mean free path, and p.

    Raises
    ------
    ValueError
        When an argument is not above 0 or the cold end is the warmer.

    Notes
    -----
    A correction above 1 per cent of p deserves a warning; above 10 per cent nothing better than a tenth of the
    correction may be claimed. 3He has another mean free path and is not covered. With cold end 1 and warm end 2,
    ln(p1/p2) = 0.5 ln(T1/T2) + sum w ln((y1 + a)/(y2 + a)), y = r/lambda.

    References
    ----------
    Weber and Schmidt (1936), see the module.

    Examples
    --------
    >>> result = cold_pressure(100.0, warm_temperature=300.0, cold_temperature=1.5, radius=1e-3)
    >>> round(float(result.pressure), 2)
    95.65
    """
    tiny = float(np.finfo(float).tiny)
    p = within(pressure, "pressure", low=tiny, high=np.inf, unit="Pa", formula="a gas")
    warm = within(
        warm_temperature, "warm_temperature", low=tiny, high=np.inf, unit="K", formula="a temperature"
    )
    cold = within(
        cold_temperature, "cold_temperature", low=tiny, high=np.inf, unit="K", formula="a temperature"
    )
    r = within(radius, "radius", low=tiny, high=np.inf, unit="m", formula="a tube")
    p, warm, cold, r = np.broadcast_arrays(p, warm, cold, r)
    if (cold > warm).any():
        index = int(np.argmax((cold > warm).ravel()))
        raise ValueError(
            f"cold_temperature[{index}] = {cold.ravel()[index]:.8g} K is above the warm temperature"
        )
    missing = np.isnan(p + warm + cold + r)
    result = np.full(p.shape, np.nan)
    keep = ~missing
    result[keep] = _solve(p[keep], warm[keep], cold[keep], r[keep])
    return ColdPressure(result[()], (_RELATIVE_UNCERTAINTY * (p - result))[()])


def _solve(p: Floats, warm: Floats, cold: Floats, r: Floats) -> Floats:
    y_warm = _reciprocal_knudsen(p, warm, r)
    # The logarithm of the ratio lies between its two limits; sixty halvings leave less than its rounding.
    low, high = 0.5 * np.log(cold / warm), np.zeros_like(p)
    for _ in range(60):
        middle = 0.5 * (low + high)
        excess = middle - _right_side(middle, p=p, warm=warm, cold=cold, r=r, y_warm=y_warm)
        high = np.where(excess > 0, middle, high)
        low = np.where(excess > 0, low, middle)
    result: Floats = p * np.exp(0.5 * (low + high))
    return result


def _right_side(
    log_ratio: Floats, *, p: Floats, warm: Floats, cold: Floats, r: Floats, y_warm: Floats
) -> Floats:
    y_cold = _reciprocal_knudsen(p * np.exp(log_ratio), cold, r)
    total: Floats = 0.5 * np.log(cold / warm)
    for weight, shift in _TERMS:
        total = total + weight * np.log((y_cold + shift) / (y_warm + shift))
    return total

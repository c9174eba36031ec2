"""Temperature from the resistance of a calibrated thermometer, its sensitivity, and the way back.

Rule: nothing is extrapolated. A resistance outside the span of the calibration gives NaN and a mark, so that a long
sweep keeps the rest.

References
----------
The forms of the trade: F. Pobell, Matter and Methods at Low Temperatures, 3rd ed., Springer (2007); slopes and inverses derived here.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from archive.physics.inversion import monotonic_inverse
from archive.physics.ranges import Floats, floats, within
from archive.physics.resistance_curves import ResistanceCurve

__all__ = [
    "CurveTemperature",
    "evaluate",
    "is_monotonic",
    "log_sensitivity",
    "resistance",
    "temperature_per_resistance",
]


class CurveTemperature(NamedTuple):
    """Temperatures in K, NaN outside the calibration, and the mask that says where that was the reason."""

    temperature: Floats
    outside: NDArray[np.bool_]


def _inside(curve: ResistanceCurve, resistance: ArrayLike) -> tuple[Floats, NDArray[np.bool_]]:
    """Return R and where it lies in the span; a part in 1e12 is rounding of the ends."""
    R = floats(resistance)
    low, high = curve.resistance_span
    return R, (low * (1 - 1e-12) <= R) & (high * (1 + 1e-12) >= R)


def evaluate(
    curve: ResistanceCurve, resistance: ArrayLike, *, temperature_span: tuple[float, float] | None = None
) -> CurveTemperature:
    """Return the temperatures of a calibration curve and where there is none.

    Parameters
    ----------
    curve : ResistanceCurve
        One of the forms of this module.
    resistance : float or array_like
        Ohm. NaN gives NaN and is not marked.
    temperature_span : tuple of float, optional
        Range of the certificate in K, when narrower than the curve.

    Returns
    -------
    CurveTemperature
        `temperature` in K on the calibration's scale, `outside` true where the resistance or the temperature is outside
        the calibration (temperature NaN).

    Examples
    --------
    >>> from archive.physics.resistance_curves import HoppingCurve
    >>> curve = HoppingCurve(R0=700.0, T0=3.0, exponent=0.25, temperature_span=(0.05, 5.0))
    >>> result = evaluate(curve, [2610.127496, 1e6])
    >>> [round(float(t), 6) for t in result.temperature], result.outside.tolist()
    ([1.0, nan], [False, True])
    """
    R, inside = _inside(curve, resistance)
    T = np.full(R.shape, np.nan)
    if inside.any():
        T[inside] = np.exp(curve.log_temperature(np.log(R[inside]))[0])
    if temperature_span is not None:
        low, high = temperature_span
        with np.errstate(invalid="ignore"):
            T[(low * (1 - 1e-12) > T) | (high * (1 + 1e-12) < T)] = np.nan
    outside = np.isnan(T) & ~np.isnan(R)
    return CurveTemperature(T[()], np.asarray(outside))


def log_sensitivity(curve: ResistanceCurve, resistance: ArrayLike) -> Floats:
    """Return the dimensionless sensitivity S = d(ln R)/d(ln T).

    Parameters
    ----------
    curve : ResistanceCurve
        One of the forms of this module.
    resistance : float or array_like
        Ohm.

    Returns
    -------
    ndarray of float64
        Negative for germanium, ruthenium oxide and carbon; NaN outside the calibration.
    """
    R, inside = _inside(curve, resistance)
    S = np.full(R.shape, np.nan)
    if inside.any():
        S[inside] = 1 / curve.log_temperature(np.log(R[inside]))[1]
    return S[()]


def temperature_per_resistance(curve: ResistanceCurve, resistance: ArrayLike) -> Floats:
    """Return dT/dR of a calibration curve.

    Parameters
    ----------
    curve : ResistanceCurve
        One of the forms of this module.
    resistance : float or array_like
        Ohm.

    Returns
    -------
    ndarray of float64
        K/ohm; NaN outside the calibration.
    """
    R = floats(resistance)
    return (evaluate(curve, R).temperature / (R * log_sensitivity(curve, R)))[()]


def is_monotonic(curve: ResistanceCurve, *, points: int = 2000) -> bool:
    """Return whether dT/dR keeps one sign over the whole span, on a fine grid in ln R."""
    low, high = np.log(curve.resistance_span)
    slope = curve.log_temperature(np.linspace(low, high, points))[1]
    return bool(np.all(slope > 0) or np.all(slope < 0))


def resistance(curve: ResistanceCurve, temperature: ArrayLike) -> Floats:
    """Return the resistance that a calibration curve gives to a temperature.

    Parameters
    ----------
    curve : ResistanceCurve
        Monotonic in its span.
    temperature : float or array_like
        K, within the temperatures of the span. NaN gives NaN.

    Returns
    -------
    ndarray of float64
        Ohm.

    Raises
    ------
    ValueError
        When the curve is not monotonic or a temperature is outside.
    """
    if not is_monotonic(curve):
        raise ValueError("curve: dT/dR changes sign within the span, so two resistances fit one temperature")
    low, high = (float(x) for x in np.log(curve.resistance_span))
    ends = np.exp(curve.log_temperature(np.array([low, high]))[0])
    T = within(temperature, "temperature", low=float(ends.min()) * (1 - 1e-12), high=float(ends.max()) * (1 + 1e-12), unit="K",
               formula="this calibration")  # fmt: skip
    return np.exp(monotonic_inverse(curve.log_temperature, np.log(T), low=low, high=high))[()]

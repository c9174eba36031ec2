"""Free decay recorded as both lock-in components: Q and the frequency against the reference, without the bias of a magnitude.

Rule: X and Y are fitted together; noise in both leaves the mean of each where it is, while a magnitude is read too large.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import ComplexArray, FloatArray, same_length, series
from archive.physics.fitting import FitResult, Parameter, fit_residuals
from archive.physics.residual_tests import runs_test

__all__ = ["ComponentRingdown", "component_ringdown"]

Convention = Literal["+", "-"]


@dataclass(frozen=True)
class ComponentRingdown:
    """Outcome of the fit of a free decay in the plane.

    Attributes
    ----------
    found : bool
        False: no decaying oscillation stands out; then the numbers mean nothing.
    reason : str
    frequency_offset : float
        Hz, of the oscillation against the reference.
    quality_factor : float
    covariance : ndarray, shape (2, 2)
        Of frequency_offset and quality_factor, from the fit.
    curved : bool
        The residual is not random at the 0.1 per cent level in one of the components.
    fit : FitResult
        Parameters offset (Hz), decay_rate (1/s), in_phase, quadrature, background_x, background_y.
    """

    found: bool
    reason: str
    frequency_offset: float
    quality_factor: float
    covariance: FloatArray
    curved: bool
    fit: FitResult


def component_ringdown(
    time: npt.ArrayLike,
    x: npt.ArrayLike,
    y: npt.ArrayLike,
    *,
    frequency: float,
    convention: Convention = "+",
) -> ComponentRingdown:
    """Return Q of a free decay in both lock-in components, and how far its frequency lies from the reference.

    Parameters
    ----------
    time : array_like
        s, at least sixteen points, strictly increasing.
    x, y : array_like
        Lock-in components, one unit.
    frequency : float
        Frequency of the oscillation, Hz, > 0; for Q it need be known no better than Q itself.
    convention : {"+", "-"}
        Sign of i w t in the lock-in: with "+" the phase rises when the oscillation is faster than the reference.

    Raises
    ------
    ValueError
        Bad arrays, times out of order, a frequency at or below zero, or an unknown word.

    Notes
    -----
    ``X + iY = z e^{(2 pi i d - pi f/Q) t} + B``, d the offset; Q is pi f tau of the amplitude. The start comes from the largest
    frequency of a regular copy of the record, so the offset must be below half the rate of reading. A decay is said to be
    found when its height is above five standard uncertainties and its rate above four.

    References
    ----------
    Free decay in a frame that turns with the reference: derived.
    """
    t = series("time", time, least=16)
    z = series("x", x) + 1j * series("y", y)
    same_length(time=t, x=z.real, y=z.imag)
    if not (np.diff(t) > 0).all():
        raise ValueError("time: found values that do not increase")
    if not frequency > 0:
        raise ValueError(f"frequency: found {frequency}, expected > 0")
    if convention not in {"+", "-"}:
        raise ValueError(f"convention: found {convention!r}, expected '+' or '-'")
    turned = z if convention == "+" else np.conj(z)
    shifted = t - t[0]
    starts = sorted(_starts(shifted, turned), key=lambda start: _sum(shifted, turned, start))
    fits = (_fitted(shifted, turned, start) for start in starts)
    first = next(fits)
    best = first if first.converged else min([first, *fits], key=lambda each: (not each.converged, each.chi2))
    return _judged(best, frequency=frequency)


def _starts(t: FloatArray, z: ComplexArray) -> list[tuple[float, float, complex, complex]]:
    """Return offset, decay rate, height and background to begin with."""
    span = float(t[-1])
    regular = np.linspace(0.0, span, t.size)
    copy = np.interp(regular, t, z.real) + 1j * np.interp(regular, t, z.imag)
    level = complex(np.mean(z[-max(z.size // 10, 1) :]))
    starts = []
    for background in (level, 0j):
        padded = np.fft.fft(copy - background, 4 * t.size)
        offsets = np.fft.fftfreq(4 * t.size, span / (t.size - 1))
        offset = float(offsets[int(np.argmax(np.abs(padded)))])
        still = (z - background) * np.exp(-2j * np.pi * offset * t)
        height = complex(np.mean(still[: max(t.size // 50, 1)]))
        area = abs(complex(np.trapezoid(still, t)))
        starts += [(offset, rate, height, background) for rate in (abs(height) / max(area, 1e-300), 3 / span)]
    return starts


def _sum(t: FloatArray, z: ComplexArray, start: tuple[float, float, complex, complex]) -> float:
    offset, rate, height, background = start
    return float(np.sum(np.abs(z - height * np.exp((2j * np.pi * offset - rate) * t) - background) ** 2))


def _fitted(t: FloatArray, z: ComplexArray, start: tuple[float, float, complex, complex]) -> FitResult:
    offset, rate, height, background = start
    span, size = float(t[-1]), float(np.max(np.abs(z))) or 1.0
    parameters = [
        Parameter("offset", offset, scale=0.1 / span),
        Parameter("decay_rate", rate, 0.0, math.inf, scale=1 / span),
        Parameter("in_phase", height.real, scale=size),
        Parameter("quadrature", height.imag, scale=size),
        Parameter("background_x", background.real, scale=size),
        Parameter("background_y", background.imag, scale=size),
    ]

    def residuals(p: FloatArray) -> FloatArray:
        curve = (p[2] + 1j * p[3]) * np.exp((2j * np.pi * p[0] - p[1]) * t) + (p[4] + 1j * p[5])
        difference = z - curve
        return np.concatenate([difference.real, difference.imag])

    return fit_residuals(residuals, parameters, absolute=False, max_evaluations=2000)


def _judged(found: FitResult, *, frequency: float) -> ComponentRingdown:
    rate, u_rate = found.value("decay_rate"), found.standard_uncertainty("decay_rate")
    height = math.hypot(found.value("in_phase"), found.value("quadrature"))
    u_height = math.hypot(found.standard_uncertainty("in_phase"), found.standard_uncertainty("quadrature"))
    reason = "decay found"
    if not found.converged:
        reason = f"no decay: the fit is {found.message}"
    elif not rate > 4 * u_rate:
        reason = "no decay: the amplitude does not fall within the record"
    elif not height > 5 * u_height:
        reason = "no decay: the oscillation is not above the noise"
    good = reason == "decay found"
    quality = math.pi * frequency / rate if good else math.nan
    index = [found.names.index(name) for name in ("offset", "decay_rate")]
    jacobian = np.diag([1.0, -quality / rate]) if good else np.full((2, 2), math.nan)
    parts = np.split(np.asarray(found.residuals), 2)
    rounding = float(np.max(np.abs(found.residuals))) < 1e-9 * height
    return ComponentRingdown(
        found=good,
        reason=reason,
        frequency_offset=found.value("offset") if good else math.nan,
        quality_factor=quality,
        covariance=jacobian @ np.asarray(found.covariance)[np.ix_(index, index)] @ jacobian.T,
        curved=good and not rounding and min(runs_test(part).probability for part in parts) < 1e-3,
        fit=found,
    )

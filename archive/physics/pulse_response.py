"""Response of a resonator to a pulse: from records against time to a complex response against frequency, with its noise.

Rules: the noise is estimated from the record itself, beside every frequency; a drive that was recorded is divided out, so
that its own spectrum is never taken for a line.

References
----------
Linear response, derived here: the spectrum of the record over that of the pulse.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import ComplexArray, FloatArray, series

__all__ = ["PulseResponse", "pulse_response", "smooth_part"]

DRIVEN_SHARE = 0.1
"""Least spectral amplitude of the pulse, over its largest, at which it still drives (common practice, no source)."""

WIDEST_WINDOW = 401
"""Points over which noise and feedthrough are taken as constant, at most (common practice, no source)."""


@dataclass(frozen=True)
class PulseResponse:
    """Complex response against frequency.

    Attributes
    ----------
    frequency : ndarray
        Hz, rising in equal steps.
    response : ndarray of complex128
        Spectrum of the record over that of the pulse (unit of the record over that of the pulse), or without a pulse the
        record's Fourier integral (unit of the record times s); convention exp(+i w t).
    feedthrough : ndarray of complex128
        Smooth part of the response, its running median.
    standard_uncertainty : ndarray
        Of each component of `response`, from the scatter around `feedthrough`.
    step : float
        Distance of two frequencies, one over the length of the record, Hz.
    window : int
        Points of the running medians.
    driven : bool
        Whether a pulse was divided out; without one there is no feedthrough.
    divisor : ndarray of complex128
        What the spectrum of the record was divided by.
    """

    frequency: FloatArray
    response: ComplexArray
    feedthrough: ComplexArray
    standard_uncertainty: FloatArray
    step: float
    window: int
    driven: bool
    divisor: ComplexArray


def pulse_response(
    record: npt.ArrayLike,
    *,
    rate: float,
    pulse: npt.ArrayLike | None = None,
    low: float | None = None,
    high: float | None = None,
) -> PulseResponse:
    """Return the response of a resonator to a pulse, against frequency.

    Parameters
    ----------
    record : array_like
        Signal against time in equal steps, at least 256 points, any unit.
    rate : float
        Points per second, Hz, > 0.
    pulse : array_like, optional
        Drive over the same time, as many points; without it the record must be a free decay that begins with the record.
    low, high : float, optional
        Range of frequency, Hz; by default where the pulse has a tenth of its largest spectral amplitude, or all of it.

    Raises
    ------
    ValueError
        Bad arrays, a pulse of another length or without any amplitude, a record that does not change, or a range with fewer
        than 128 points.

    Notes
    -----
    Noise: for complex normal noise of standard deviation s in each component, the squared magnitude is exponential with
    median 2 s^2 ln 2 (derived); the running median hardly sees a line narrower than a tenth of its window. Without a pulse
    nothing is subtracted as feedthrough. No window function is applied: a decay that has not died down by the end of the
    record leaks, which the fit of a line counts, and a steady tone fills a few frequencies beside its own.

    References
    ----------
    Quotient of spectra as the response: linear response, derived.
    """
    signal = series("record", record, least=256)
    if not rate > 0 or not math.isfinite(rate):
        raise ValueError(f"rate: found {rate}, expected > 0")
    spectrum = np.fft.rfft(signal - signal.mean())
    frequency = np.asarray(np.fft.rfftfreq(signal.size, 1 / rate), dtype=np.float64)
    if pulse is None:
        divisor = np.full(spectrum.size, rate, dtype=np.complex128)
        inside = frequency > 0
    else:
        drive = series("pulse", pulse)
        if drive.size != signal.size:
            raise ValueError(f"pulse: found {drive.size} points, expected {signal.size} as in record")
        divisor = np.fft.rfft(drive)
        magnitude = np.abs(divisor)
        if not magnitude[1:].max() > 0:
            raise ValueError("pulse: found no change, expected a drive")
        driven = np.flatnonzero(magnitude[1:] >= DRIVEN_SHARE * magnitude[1:].max()) + 1
        inside = np.zeros(frequency.size, dtype=np.bool_)
        inside[driven[0] : driven[-1] + 1] = True
        # A hole in the spectrum of the pulse: nothing is known there, and nothing must be divided by zero.
        divisor = np.where(magnitude > 1e-9 * magnitude.max(), divisor, 1e-9 * magnitude.max())
    inside &= (frequency >= (0.0 if low is None else low)) & (
        frequency <= (math.inf if high is None else high)
    )
    count = int(np.count_nonzero(inside))
    if count < 128:
        raise ValueError(
            f"low, high: found {count} frequencies in the range that the pulse drives, expected at least 128"
        )
    return _with_noise(
        frequency[inside],
        spectrum[inside],
        divisor[inside],
        step=rate / signal.size,
        driven=pulse is not None,
    )


def _with_noise(
    frequency: FloatArray, spectrum: ComplexArray, divisor: ComplexArray, *, step: float, driven: bool
) -> PulseResponse:
    window = min(WIDEST_WINDOW, frequency.size // 8 * 2 + 1)
    response = spectrum / divisor
    smooth = np.zeros_like(response)
    if driven:
        smooth = _median(response.real, window) + 1j * _median(response.imag, window)
    # In the spectrum of the record the noise is smooth, even where the pulse is weak.
    power = _median(np.abs(spectrum - smooth * divisor) ** 2, window) / (2 * math.log(2))
    if not (power > 0).all():
        raise ValueError("record: found no noise in it; its uncertainty cannot be estimated")
    return PulseResponse(
        frequency=frequency,
        response=response,
        feedthrough=smooth,
        standard_uncertainty=np.sqrt(power) / np.abs(divisor),
        step=step,
        window=window,
        driven=driven,
        divisor=divisor,
    )


def smooth_part(response: ComplexArray, like: PulseResponse) -> ComplexArray:
    """Return the running median of both components of a response, or zeros where nothing was driven.

    Parameters
    ----------
    response : array_like of complex128
        At the frequencies of `like`, for instance after lines were subtracted.
    like : PulseResponse
        Tells window, and whether there can be any feedthrough.
    """
    if not like.driven:
        return np.zeros_like(response)
    return _median(response.real, like.window) + 1j * _median(response.imag, like.window)


def _median(values: FloatArray, window: int) -> FloatArray:
    from scipy.ndimage import median_filter  # a second of imports that few commands need

    return np.asarray(median_filter(values, window, mode="reflect"), dtype=np.float64)

"""Quality factor from a free decay.

Rules: whether the record is an amplitude or an energy is said by the caller, never guessed; a magnitude channel has a noise
floor that adds in quadrature.

References
----------
Free decay of a damped harmonic oscillator, derived here.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray, same_length, series
from archive.physics.fitting import FitResult, Parameter, fit
from archive.physics.linear_fit import straight_line
from archive.physics.residual_tests import runs_test

__all__ = ["Ringdown", "local_dissipation", "quality_factor", "ringdown"]

Convention = Literal["amplitude", "energy"]
Background = Literal["none", "constant", "noise floor"]


@dataclass(frozen=True)
class Ringdown:
    """Outcome of the fit of a free decay.

    Attributes
    ----------
    fit : FitResult
        Parameters height, decay_time (s) and, if fitted, baseline (added) or floor (in quadrature).
    convention : str
        "amplitude" or "energy": what decays with `decay_time`.
    quality_factor, standard_uncertainty : float
        Q and its standard uncertainty (of the fit alone).
    curved : bool
        The residual is not random at the 0.1 per cent level: the decay is no single exponential, so Q depends on amplitude.
    converged : bool
    message : str
    """

    fit: FitResult
    convention: Convention
    quality_factor: float
    standard_uncertainty: float
    curved: bool
    converged: bool
    message: str


def quality_factor(
    *, frequency: npt.ArrayLike, decay_time: npt.ArrayLike, convention: Convention
) -> FloatArray:
    """Return Q from a decay time: ``pi f tau`` of the amplitude, ``2 pi f tau`` of the energy.

    Parameters
    ----------
    frequency : array_like
        Hz.
    decay_time : array_like
        s, to 1/e.
    convention : {"amplitude", "energy"}
        What falls to 1/e.

    Examples
    --------
    >>> float(round(quality_factor(frequency=1000.0, decay_time=159.155, convention="amplitude") / 5e5, 5))
    1.0
    """
    factor = {"amplitude": math.pi, "energy": 2 * math.pi}[_checked(convention)]
    return factor * np.asarray(frequency, dtype=np.float64) * np.asarray(decay_time, dtype=np.float64)


def ringdown(
    time: npt.ArrayLike,
    signal: npt.ArrayLike,
    *,
    frequency: float,
    convention: Convention,
    background: Background = "constant",
    standard_uncertainty: npt.ArrayLike | None = None,
    absolute: bool = False,
) -> Ringdown:
    """Return the exponential fitted to a free decay, and Q.

    Parameters
    ----------
    time : array_like
        s, at least five points, strictly increasing.
    signal : array_like
        Amplitude (or energy), any unit.
    frequency : float
        Hz, > 0.
    convention : {"amplitude", "energy"}
        What `signal` is.
    background : {"none", "constant", "noise floor"}
        A constant is added; a noise floor, for a magnitude channel, adds in quadrature.
    standard_uncertainty, absolute
        As in `fitting.fit`.

    Raises
    ------
    ValueError
        Too few points, times out of order, a frequency at or below zero, an unknown word.

    Notes
    -----
    Range: Q >> 1 and a record of at least a fair part of a decay time; shorter ones give a large uncertainty, not an error.
    The decay time is kept positive by fitting the rate, so a rising record ends as "not converged" or with rate at zero.
    """
    t = series("time", time, least=5)
    y = series("signal", signal)
    same_length(time=t, signal=y)
    _checked(convention)
    if not frequency > 0:
        raise ValueError(f"frequency: found {frequency}, expected > 0")
    if not (np.diff(t) > 0).all():
        raise ValueError("time: found values that do not increase")
    span = float(t[-1] - t[0])
    shifted = t - t[0]
    height, rate, level = _start(shifted, y, background)
    names = {"none": (), "constant": ("baseline",), "noise floor": ("floor",)}
    if background not in names:
        raise ValueError(f"background: found {background!r}, expected one of {', '.join(names)}")
    size = float(np.max(np.abs(y))) or 1.0
    parameters = [
        Parameter("height", height, scale=size),
        Parameter("decay_rate", rate, 0.0, math.inf, scale=1 / span),
    ]
    lowest = 0.0 if background == "noise floor" else -math.inf
    parameters += [Parameter(name, level, lowest, scale=size) for name in names[background]]

    def model(t: FloatArray, p: FloatArray) -> FloatArray:
        decay = p[0] * np.exp(-p[1] * t)
        if background == "noise floor":
            return np.asarray(np.sqrt(decay**2 + p[2] ** 2))
        return np.asarray(decay + (p[2] if background == "constant" else 0.0))

    found = fit(model, parameters, shifted, y, standard_uncertainty=standard_uncertainty, absolute=absolute)
    return _ringdown(found, convention=convention, frequency=frequency)


def local_dissipation(
    time: npt.ArrayLike, amplitude: npt.ArrayLike, *, frequency: float, points: int
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return mean amplitude, Q^-1 and its standard uncertainty from the local slope of ln(amplitude).

    Parameters
    ----------
    time, amplitude : array_like
        s, and peak or rms amplitude > 0 with any background removed; only where it is above ten times the noise.
    frequency : float
        Hz.
    points : int
        Readings in each piece, at least three; a short last piece is left out.

    Notes
    -----
    For a decay whose Q depends on amplitude.
    """
    t = series("time", time, least=max(points, 3))
    theta = series("amplitude", amplitude, positive=True)
    same_length(time=t, amplitude=theta)
    if points < 3:
        raise ValueError(f"points: found {points}, expected at least 3")
    rows = []
    for begin in range(0, t.size - points + 1, points):
        piece = slice(begin, begin + points)
        line = straight_line(t[piece] - t[begin], np.log(theta[piece]), absolute=False)
        factor = 1 / (math.pi * frequency)
        rows.append(
            (theta[piece].mean(), -line.value("slope") * factor, line.standard_uncertainty("slope") * factor)
        )
    mean, dissipation, spread = np.array(rows).T
    return mean, dissipation, spread


def _checked(convention: Convention) -> Convention:
    if convention not in {"amplitude", "energy"}:
        raise ValueError(f"convention: found {convention!r}, expected 'amplitude' or 'energy'")
    return convention


def _start(t: FloatArray, y: FloatArray, background: Background) -> tuple[float, float, float]:
    """Return height, rate and level: level from the end of the record, rate from the area under what is above it."""
    tail = float(np.mean(y[-max(y.size // 20, 1) :]))
    level = 0.0 if background == "none" else (abs(tail) if background == "noise floor" else tail)
    # The mean of the first points, so that one bad reading does not matter.
    height = float(np.mean(y[: max(y.size // 50, 1)])) - (0.0 if background == "noise floor" else level)
    area = float(np.trapezoid(y - level, t))
    rate = height / area if area * height > 0 else 1 / float(t[-1])
    return height, rate, level


def _ringdown(found: FitResult, *, convention: Convention, frequency: float) -> Ringdown:
    names = tuple("decay_time" if name == "decay_rate" else name for name in found.names)
    rate = found.value("decay_rate")
    values, covariance = found.values.copy(), found.covariance.copy()
    index = found.names.index("decay_rate")
    decays = rate > 0 and "decay_rate" not in found.at_bound
    values[index] = 1 / rate if decays else math.inf
    jacobian = np.ones(values.size)
    jacobian[index] = -1 / rate**2 if decays else math.nan
    covariance = covariance * np.outer(jacobian, jacobian)
    q = float(quality_factor(frequency=frequency, decay_time=values[index], convention=convention))
    relative = found.standard_uncertainty("decay_rate") / rate if decays else math.nan
    converged = found.converged and decays
    message = found.message if decays else "not converged: the record does not decay"
    turned = FitResult(**{**vars(found), "names": names, "values": values, "covariance": covariance})
    # Residuals that are rounding have runs of their own.
    rounding = float(np.max(np.abs(found.residuals))) < 1e-9 * abs(found.value("height"))
    curved = not rounding and runs_test(found.residuals).probability < 1e-3
    return Ringdown(turned, convention, q, abs(q * relative), curved, converged, message)

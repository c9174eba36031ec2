"""Free decay of an oscillator whose dissipation depends on its amplitude: is there such a dependence, and what is Q at rest.

Rule: the dependence is a number with its uncertainty, found or not; that it is there is said only when the simple decay is refused.

References
----------
Free decay with a dissipation linear in the amplitude, derived here.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray
from archive.physics.fitting import FitResult, Parameter, fit
from archive.physics.residual_tests import f_test
from archive.physics.ringdown import Background, Ringdown, ringdown

__all__ = ["AmplitudeDependence", "amplitude_dependence", "amplitude_dependent_decay"]

REFUSED = 1e-4
"""Chance of the gain by luck below which the simple decay is refused (common practice, no source)."""


@dataclass(frozen=True)
class AmplitudeDependence:
    """Outcome of the comparison of two decays.

    Attributes
    ----------
    found : bool
        True: the decay with a constant Q is refused, and the numbers below describe the record better.
    quality_at_rest, quality_uncertainty : float
        Q at vanishing amplitude.
    relative_change, relative_change_uncertainty : float
        Dissipation at the largest amplitude over that at rest, minus one.
    covariance : ndarray, shape (2, 2)
        Of quality_at_rest and relative_change.
    probability : float
        Chance that the gain over a constant Q is luck.
    simple : Ringdown
        The decay with a constant Q.
    fit : FitResult
        Parameters height, decay_rate (1/s, at rest), relative_change, and baseline or floor.
    """

    found: bool
    quality_at_rest: float
    quality_uncertainty: float
    relative_change: float
    relative_change_uncertainty: float
    covariance: FloatArray
    probability: float
    simple: Ringdown
    fit: FitResult


def amplitude_dependent_decay(
    time: npt.ArrayLike, *, height: float, decay_rate: float, relative_change: float
) -> FloatArray:
    """Return the amplitude of a free decay whose dissipation is proportional to one plus a constant times the amplitude.

    Parameters
    ----------
    time : array_like
        s, from the start of the decay.
    height : float
        Amplitude at time zero, any unit.
    decay_rate : float
        1/s at vanishing amplitude, pi f/Q.
    relative_change : float
        Dissipation at `height` over that at rest, minus one; > -1.

    Notes
    -----
    Solution of ``dA/dt = -r A (1 + b A/A_0)``: ``A = A_0 e^{-r t}/(1 + b (1 - e^{-r t}))`` (derived). It is the leading term
    of any dependence that is smooth in the amplitude; a quadratic one is described to first order only.

    Examples
    --------
    >>> A = amplitude_dependent_decay([0.0, 1.0], height=2.0, decay_rate=0.5, relative_change=0.0)
    >>> [round(float(each), 4) for each in A]
    [2.0, 1.2131]
    """
    fall = np.exp(-decay_rate * np.asarray(time, dtype=np.float64))
    return np.asarray(height * fall / (1 + relative_change * (1 - fall)), dtype=np.float64)


def amplitude_dependence(
    time: npt.ArrayLike,
    amplitude: npt.ArrayLike,
    *,
    frequency: float,
    background: Background = "constant",
    standard_uncertainty: npt.ArrayLike | None = None,
) -> AmplitudeDependence:
    """Return whether the Q of a free decay depends on amplitude, and how much.

    Parameters
    ----------
    time, amplitude, frequency, background
        As in `ringdown.ringdown`; an amplitude, never an energy.
    standard_uncertainty : array_like, optional
        Of each point; relative weights, the covariance is scaled by chi2/dof.

    Raises
    ------
    ValueError
        Bad arrays, as in `ringdown.ringdown`, or fewer than eight points.

    Notes
    -----
    Compared by an F-test with the simple decay. A noise floor and a background of another form than assumed look like a
    dependence on amplitude, too: where the amplitude has fallen to them there is nothing to be learned.
    """
    simple = ringdown(
        time, amplitude, frequency=frequency, convention="amplitude", background=background,
        standard_uncertainty=standard_uncertainty,
    )  # fmt: skip
    t = np.asarray(time, dtype=np.float64)
    if t.size < 8:
        raise ValueError(f"time: found {t.size} points, expected at least 8")
    shifted = t - t[0]
    y = np.asarray(amplitude, dtype=np.float64)
    size = float(np.max(np.abs(y))) or 1.0
    rate = 1 / simple.fit.value("decay_time") if simple.converged else 1 / float(shifted[-1])
    parameters = [
        Parameter("height", simple.fit.value("height"), scale=size),
        Parameter("decay_rate", rate, 0.0, math.inf, scale=1 / float(shifted[-1])),
        Parameter("relative_change", 0.0, -0.99, 1e3, scale=0.1),
    ]
    level = [name for name in ("baseline", "floor") if name in simple.fit.names]
    parameters += [
        Parameter(name, simple.fit.value(name), 0.0 if name == "floor" else -math.inf, scale=size)
        for name in level
    ]

    def model(t: FloatArray, p: FloatArray) -> FloatArray:
        decay = amplitude_dependent_decay(t, height=p[0], decay_rate=p[1], relative_change=p[2])
        if "floor" in level:
            return np.asarray(np.hypot(decay, p[3]))
        return decay + p[3] if level else decay

    found = fit(model, parameters, shifted, y, standard_uncertainty=standard_uncertainty, absolute=False)
    return _judged(simple, found, frequency=frequency)


def _judged(simple: Ringdown, found: FitResult, *, frequency: float) -> AmplitudeDependence:
    probability = 1.0
    # Of two fits that are exact to rounding neither is better.
    exact = float(np.max(np.abs(simple.fit.residuals))) < 1e-9 * abs(simple.fit.value("height"))
    if found.converged and not exact and found.chi2 < simple.fit.chi2:
        # Not the degrees of freedom of the fits: a floor at its bound counts there as held in one and free in the other.
        points, names = simple.fit.residuals.size, len(found.names)
        probability = f_test(
            chi2_simple=simple.fit.chi2,
            dof_simple=points - names + 1,
            chi2_full=found.chi2,
            dof_full=points - names,
        )
    rate = found.value("decay_rate")
    at_rest = math.pi * frequency / rate if rate > 0 else math.inf
    index = [found.names.index(name) for name in ("decay_rate", "relative_change")]
    jacobian = np.diag([-at_rest / rate if rate > 0 else math.nan, 1.0])
    covariance = jacobian @ np.asarray(found.covariance)[np.ix_(index, index)] @ jacobian.T
    return AmplitudeDependence(
        found=probability < REFUSED,
        quality_at_rest=at_rest,
        quality_uncertainty=float(np.sqrt(covariance[0, 0])),
        relative_change=found.value("relative_change"),
        relative_change_uncertainty=float(np.sqrt(covariance[1, 1])),
        covariance=covariance,
        probability=probability,
        simple=simple,
        fit=found,
    )

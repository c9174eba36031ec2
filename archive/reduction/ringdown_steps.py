"""Steps of free decays beyond the simple one: both components, the frequency, and dissipation that depends on amplitude."""

from __future__ import annotations

import math
from typing import Literal

import numpy as np

from archive.physics.ringdown import Background
from archive.physics.ringdown_amplitude import amplitude_dependence
from archive.physics.ringdown_components import component_ringdown
from archive.reduction.background_steps import known_rows, weights
from archive.reduction.estimate import FloatArray
from archive.reduction.step import Covariance, NoParameters, Outcome, Port, Step
from schemas.base import Record
from schemas.finding import Finding

__all__ = ["RINGDOWN_STEPS", "AmplitudeParameters", "ComponentParameters"]


class AmplitudeParameters(Record):
    """On what the decay stands."""

    background: Background = "noise floor"
    """`noise floor`: for a magnitude, which a lock-in reads too large at low signal."""


class ComponentParameters(Record):
    """Sign of i w t in the lock-in."""

    convention: Literal["+", "-"] = "+"


def magnitude(_: NoParameters, *, x: FloatArray, y: FloatArray) -> Outcome:
    """Return the magnitude of two components."""
    return Outcome({"magnitude": np.hypot(x, y)})


def decay_against_amplitude(
    parameters: AmplitudeParameters,
    *,
    time: FloatArray,
    amplitude: FloatArray,
    period: float | FloatArray,
    u_amplitude: FloatArray | None,
) -> Outcome:
    """Return Q at vanishing amplitude, and how much larger the dissipation is at the start of a free decay.

    Raises
    ------
    ValueError
        Too few rows, or a fit that does not converge.
    """
    rows = known_rows(time, amplitude)
    t, y = time[rows], amplitude[rows]
    found = amplitude_dependence(
        t - t[0] if t.size else t, y, frequency=1 / float(np.nanmedian(period)), background=parameters.background,
        standard_uncertainty=weights(u_amplitude, rows),
    )  # fmt: skip
    if not found.fit.converged:
        raise ValueError(f"amplitude: the decay was not fitted: {found.fit.message}")
    findings: tuple[Finding, ...] = ()
    if found.found:
        findings = (
            Finding(
                code="amplitude-dependent-dissipation", severity="warning",
                what=f"the decay is no single exponential: a dissipation that is {found.relative_change:+.2%} at the start against rest "
                f"describes it better, by more than chance (probability {found.probability:.1g})",
                expected=f"one Q at all amplitudes; at rest it is {found.quality_at_rest:.4g}",
                remedy="quote Q with its amplitude, or drive less before the decay; look whether the background was right, which looks the same",
            ),
        )  # fmt: skip
    return Outcome(
        {"quality_factor": found.quality_at_rest, "relative_change": found.relative_change},
        covariance=Covariance(("quality_factor", "relative_change"), found.covariance),
        facts={"points": int(t.size), "probability": found.probability, "verdict": "refused" if found.found else "not refused"},
        findings=findings,
    )  # fmt: skip


def decay_of_components(
    parameters: ComponentParameters,
    *,
    time: FloatArray,
    x: FloatArray,
    y: FloatArray,
    reference_period: float | FloatArray,
) -> Outcome:
    """Return the frequency of a free decay against the lock-in's reference, and Q without the bias of a magnitude.

    Parameters
    ----------
    time, x, y : ndarray
        s, V.
    reference_period : float or ndarray
        s, of the lock-in's reference; a column must be steady.

    Raises
    ------
    ValueError
        A reference that moves, or a record that `component_ringdown` refuses.
    """
    rows = known_rows(time, x, y)
    reference = np.asarray(reference_period, dtype=np.float64)
    reference = reference[np.isfinite(reference)]
    span = float(np.ptp(time[rows])) if rows.any() else 0.0
    # The phase of the record turns against a reference that moves: a tenth of a cycle over the record.
    if reference.size > 1 and float(np.ptp(1 / reference)) * span > 0.1:
        raise ValueError("reference_period: the reference moved during the decay; fit its magnitude")
    frequency = 1 / float(np.median(reference))
    found = component_ringdown(
        time[rows] - time[rows][0] if rows.any() else time[rows], x[rows], y[rows], frequency=frequency, convention=parameters.convention
    )  # fmt: skip
    names = ("frequency_offset", "resonance_frequency", "quality_factor")
    if not found.found:
        finding = Finding(code="no-decay", severity="note", what=found.reason)
        return Outcome(
            dict.fromkeys(names, math.nan), facts={"reason": found.reason, "reference_Hz": frequency, "curved": False},
            findings=(finding,), verdicts=dict.fromkeys(names, "no decay"),
        )  # fmt: skip
    spread = np.array([[1.0, 0.0], [1.0, 0.0], [0.0, 1.0]])
    return Outcome(
        {"frequency_offset": found.frequency_offset, "resonance_frequency": frequency + found.frequency_offset, "quality_factor": found.quality_factor},
        covariance=Covariance(names, spread @ found.covariance @ spread.T),
        facts={"reason": found.reason, "reference_Hz": frequency, "curved": found.curved},
    )  # fmt: skip


_SIGNAL = "amplitude|voltage|current"
_TIME = Port("time", "array", "time of each row")

RINGDOWN_STEPS: tuple[Step, ...] = (
    Step(
        name="magnitude-of-components", version=1, function=magnitude,
        takes={"x": Port(_SIGNAL, "array", "in-phase component"), "y": Port(_SIGNAL, "array", "quadrature component")},
        yields={"magnitude": Port("same:x", "array", "magnitude of both")}, sentence="The magnitude is the root of the sum of the squares of both components.",
    ),
    Step(
        name="decay-against-amplitude", version=1, function=decay_against_amplitude, parameters=AmplitudeParameters,
        takes={"time": _TIME, "amplitude": Port(_SIGNAL, "array", "signal of the free decay"), "period": Port("period", "number", "period; its median sets the frequency")},
        yields={
            "quality_factor": Port("quality_factor", "scalar", "quality factor at vanishing amplitude"),
            "relative_change": Port("fraction", "scalar", "dissipation at the start of the decay over that at rest, minus one"),
        },
        sentence="With a dissipation that is linear in the amplitude, Q at rest is {quality_factor} and the dissipation at the start of the decay differs by {relative_change}; a single exponential is {verdict} (F-test, probability {probability}).",
        spread="refit", weights=("amplitude",),
        considered={"amplitude dependence": "The decay was tested for a dissipation that depends on amplitude; a single exponential is {verdict}."},
    ),
    Step(
        name="decay-of-components", version=1, function=decay_of_components, parameters=ComponentParameters,
        takes={
            "time": _TIME, "x": Port(_SIGNAL, "array", "in-phase component"), "y": Port(_SIGNAL, "array", "quadrature component"),
            "reference_period": Port("period", "number", "period of the lock-in's reference"),
        },
        yields={
            "frequency_offset": Port("frequency", "scalar", "frequency of the decay minus that of the reference"), "resonance_frequency": Port("frequency", "scalar", "frequency of the decay"),
            "quality_factor": Port("quality_factor", "scalar", "quality factor from both components"),
        },
        sentence="Both components were fitted together by a decaying oscillation, off the reference of {reference_Hz} Hz by {frequency_offset}, with Q = {quality_factor}: {reason}.",
        spread="refit",
    ),
)  # fmt: skip
"""Steps of this module."""

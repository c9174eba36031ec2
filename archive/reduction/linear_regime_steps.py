"""Steps of the linear regime: up to which amplitude it was found, and whether another sweep stays within it."""

from __future__ import annotations

import math

import numpy as np

from archive.physics.arrays import BoolArray
from archive.physics.linear_regime import LinearLimit, level_means, linear_limit
from archive.reduction.background_steps import known_rows, weights
from archive.reduction.estimate import FloatArray
from archive.reduction.step import NoParameters, Outcome, Port, Step
from schemas.base import Record
from schemas.finding import Finding
from schemas.sweep import Detection

__all__ = ["LINEAR_REGIME_STEPS", "RegimeParameters"]


class RegimeParameters(Record):
    """What still counts as constant (common practice, no source)."""

    period_limit: float = 1e-7
    """Relative change of the period; a tenth of a nanosecond in a millisecond."""
    dissipation_limit: float = 0.01
    """Relative change of the dissipation, that is of torque over amplitude."""
    low_share: float = 1 / 3
    """Levels below this share of the largest amplitude give the small-amplitude values."""


def linear_regime(
    parameters: RegimeParameters,
    *,
    drive: FloatArray,
    amplitude: FloatArray,
    period: FloatArray | None,
    detection: Detection | None,
    reference_signal: float | None,
    reference_velocity: float | None,
    u_amplitude: FloatArray | None,
    u_period: FloatArray | None,
) -> Outcome:
    """Return the amplitude up to which period and dissipation keep their small-amplitude values.

    Parameters
    ----------
    drive, amplitude, period : ndarray
        rms, V rms, s; a few rows for each level of drive.
    detection : Detection or None
        Its exponent p of the torque; 1 if it is not recorded.
    reference_signal, reference_velocity : float or None
        V rms and m/s rms of the reference point, for the rim speed.

    Raises
    ------
    ValueError
        Fewer than three levels, or no scatter that tells the uncertainty.
    """
    power = detection.torque_exponent if detection is not None else 1
    rows = known_rows(drive, amplitude) & (drive > 0) & (amplitude > 0)
    # On resonance the dissipation is torque over amplitude, up to a constant (driven harmonic oscillator).
    relative = np.full(drive.shape, math.nan)
    relative[rows] = drive[rows] ** power / amplitude[rows]
    u = weights(u_amplitude, rows)
    spread = None if u is None else relative[rows] * u / amplitude[rows]
    found = {
        "dissipation": _limit(
            parameters, parameters.dissipation_limit, drive, amplitude, relative, rows, spread
        )
    }
    if period is not None:
        rows = rows & known_rows(period)
        found["period"] = _limit(
            parameters, parameters.period_limit, drive, amplitude, period, rows, weights(u_period, rows)
        )
    outputs, point, verdicts = _numbers(found)
    speed = (
        math.nan
        if not reference_signal or reference_velocity is None
        else reference_velocity / reference_signal
    )
    for name, source in (("linear_velocity", "linear_amplitude"), ("tested_velocity", "tested_amplitude")):
        outputs[name], point[name] = outputs[source] * speed, point[source] * (speed if speed > 0 else 0.0)
        if source in verdicts or math.isnan(speed):
            verdicts[name] = verdicts.get(source, "no reference speed is recorded")
    words = "; ".join(f"{name}: {_words(each, name, parameters)}" for name, each in found.items())
    facts = {
        "levels": int(np.unique(np.round(drive[rows] / np.max(drive[rows]), 4)).size), "by_property": words, "low_percent": f"{100 * parameters.low_share:.2g}",
        **{f"change_of_{name}": f"{each.change / each.base:.2g}" for name, each in found.items()},
    }  # fmt: skip
    return Outcome(outputs, point=point, facts=facts, findings=_findings(found), verdicts=verdicts)


def _limit(
    parameters: RegimeParameters, share: float, drive: FloatArray, amplitude: FloatArray, value: FloatArray,
    rows: BoolArray, u: FloatArray | None,
) -> LinearLimit:  # fmt: skip
    levels = level_means(drive[rows], amplitude[rows], value[rows], standard_uncertainty=u)
    return linear_limit(
        levels, limit=share * abs(float(np.median(value[rows]))), low_share=parameters.low_share
    )


def _numbers(
    found: dict[str, LinearLimit],
) -> tuple[dict[str, float | FloatArray], dict[str, float], dict[str, str]]:
    """Return the smallest of the limits, and the largest amplitude at which everything was seen to be constant."""
    reached = [each for each in found.values() if each.state == "found"]
    first = min(reached, key=lambda each: each.amplitude, default=None)
    unresolved = [name for name, each in found.items() if each.state == "not resolved"]
    outputs: dict[str, float | FloatArray] = {"linear_amplitude": math.nan, "tested_amplitude": math.nan}
    point = {"linear_amplitude": 0.0, "tested_amplitude": 0.0}
    verdicts: dict[str, str] = {}
    if first is not None:
        outputs["linear_amplitude"], point["linear_amplitude"] = first.amplitude, first.standard_uncertainty
    else:
        verdicts["linear_amplitude"] = "not resolved" if unresolved else "not reached"
    if unresolved:
        verdicts["tested_amplitude"] = f"{' and '.join(unresolved)} not resolved"
    else:
        outputs["tested_amplitude"] = min(
            each.amplitude if each.state == "found" else each.largest for each in found.values()
        )
        if first is not None:
            point["tested_amplitude"] = first.standard_uncertainty
    return outputs, point, verdicts


def _words(found: LinearLimit, name: str, parameters: RegimeParameters) -> str:
    limit = f"{parameters.period_limit if name == 'period' else parameters.dissipation_limit:g}".replace(
        "e-0", "e-"
    )
    match found.state:
        case "found":
            return f"within {limit} of itself up to {found.amplitude:.4g} V rms"
        case "not reached":
            return f"within {limit} of itself up to the largest amplitude, {found.largest:.4g} V rms"
        case "not resolved":
            return f"a change by {limit} of itself is not resolved"


def _findings(found: dict[str, LinearLimit]) -> tuple[Finding, ...]:
    return tuple(
        Finding(
            code="linear-regime-not-resolved", severity="note",
            what=f"the {name} is not constant, or not known well enough, at the lowest levels of this drive sweep; no linear regime is seen in it",
            remedy="take lower levels and more rows at each, or set the limit in a copy of the plan",
        )
        for name, each in found.items()
        if each.state == "not resolved"
    )  # fmt: skip


def drive_within_regime(
    _: NoParameters, *, amplitude: FloatArray, linear: float | None, tested: float | None
) -> Outcome:
    """Return the largest amplitude of a sweep over that up to which the cell was found, or tested, to be linear.

    Raises
    ------
    ValueError
        No amplitude, or a drive sweep that resolved no linear regime.
    """
    known = [each for each in (linear, tested) if each is not None and math.isfinite(each) and each > 0]
    values = np.abs(amplitude[np.isfinite(amplitude)])
    if not known:
        raise ValueError("linear, tested: the drive sweep of this cell resolved no linear regime")
    if not values.size:
        raise ValueError("amplitude: found no value")
    limit, largest = min(known), float(values.max())
    ratio = largest / limit
    found = linear is not None and math.isfinite(linear)
    beyond = int(np.count_nonzero(values > limit))
    findings: tuple[Finding, ...] = ()
    if beyond:
        findings = (
            Finding(
                code="driven-beyond-linear" if found else "driven-beyond-test", severity="warning" if found else "note",
                what=f"{beyond} rows have amplitudes up to {largest:.4g} V rms, beyond "
                + (f"the linear regime of this cell ({limit:.4g} V rms)" if found else f"the largest one at which it was seen to be linear ({limit:.4g} V rms)"),
                remedy="drive less, or take a drive sweep that reaches as far, or leave these rows out with the reason",
            ),
        )  # fmt: skip
    return Outcome(
        {"ratio": ratio}, facts={"beyond": beyond, "limit_V": f"{limit:.4g}", "what": "found" if found else "tested", "largest_V": f"{largest:.4g}"}, findings=findings
    )  # fmt: skip


_SIGNAL = "amplitude|voltage|current"

LINEAR_REGIME_STEPS: tuple[Step, ...] = (
    Step(
        name="linear-regime", version=1, function=linear_regime, parameters=RegimeParameters,
        takes={
            "drive": Port("drive|voltage|current", "array", "drive of each row"), "amplitude": Port(_SIGNAL, "array", "amplitude of each row"),
            "period": Port("period", "array", "period of each row", optional=True), "detection": Port("any", "record", "drive and detection", optional=True),
            "reference_signal": Port(_SIGNAL, "scalar", "signal at the reference point", optional=True),
            "reference_velocity": Port("velocity", "scalar", "rim speed at the reference point", optional=True),
        },
        yields={
            "linear_amplitude": Port("same:amplitude", "scalar", "amplitude at which period or dissipation has changed by its limit"),
            "tested_amplitude": Port("same:amplitude", "scalar", "largest amplitude up to which both were seen to be constant"),
            "linear_velocity": Port("velocity", "scalar", "rim speed, rms, at that limit"), "tested_velocity": Port("velocity", "scalar", "rim speed, rms, up to which both were seen to be constant"),
        },
        sentence="Against the mean of the levels below {low_percent} per cent of the largest amplitude, over {levels} levels of drive: {by_property}.",
        spread="refit", weights=("amplitude", "period"),
    ),
    Step(
        name="drive-within-regime", version=1, function=drive_within_regime,
        takes={
            "amplitude": Port(_SIGNAL, "array", "amplitude of each row"), "linear": Port(_SIGNAL, "scalar", "limit of the linear regime", optional=True),
            "tested": Port(_SIGNAL, "scalar", "amplitude up to which it was tested", optional=True),
        },
        yields={"ratio": Port("number", "scalar", "largest amplitude over that up to which the cell was found or tested to be linear")},
        sentence="The largest amplitude, {largest_V} V rms, is {ratio} of that up to which the cell was {what} to be linear, {limit_V} V rms; {beyond} rows lie beyond.", spread="refit",
        # Without a drive sweep there is nothing to be compared with, which is no failure.
        one_of=("linear", "tested"),
    ),
)  # fmt: skip
"""Steps of this module."""

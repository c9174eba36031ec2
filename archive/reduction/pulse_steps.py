"""Steps of pulse responses: the pulse as it was sent, and the lines of one record."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from archive.physics.line_search import HOPELESS, Line, LineSearch, resonance_lines
from archive.physics.pulse_response import pulse_response
from archive.reduction.background_steps import known_rows
from archive.reduction.estimate import FloatArray
from archive.reduction.step import Covariance, NoParameters, Outcome, Port, Step
from schemas.base import Record
from schemas.finding import Finding

__all__ = ["PULSE_STEPS", "SLOTS", "PulseLineParameters"]

SLOTS = 4
"""Resonances, and as many tones, of one record that become results; a result needs a name of its own."""

STEADY_RATE = 1e-6
"""Largest relative change of a rate that still is one rate: rounding of a column."""


class PulseLineParameters(Record):
    """Where and how lines are looked for."""

    low_hz: float | None = None
    high_hz: float | None = None
    """Range; left out: where the pulse drives."""
    false_alarm: float = 1e-3
    """Chance that noise alone gives one line (no source)."""
    most: int = 12
    """Lines looked for, those that are no resonance included."""
    order: tuple[float, ...] | None = None
    """Frequencies of the resonances, Hz; held while inputs are shifted, so that each keeps its place."""


def pulse_as_sent(_: NoParameters, *, drive: FloatArray) -> Outcome:
    """Return the pulse as recorded, and its rms value.

    Raises
    ------
    ValueError
        A pulse with gaps, or without change.
    """
    if not np.isfinite(drive).all():
        raise ValueError(f"drive[{int(np.argmax(~np.isfinite(drive)))}]: found no value; a pulse has no gaps")
    change = drive - drive.mean()
    if not np.any(change != 0):
        raise ValueError("drive: found no change, expected a pulse")
    rms = float(np.sqrt(np.mean(change**2)))
    return Outcome(
        {"pulse": drive, "rms": rms}, facts={"points": int(drive.size), "crest": float(np.max(np.abs(change)) / rms)}
    )  # fmt: skip


def mean_temperature(
    _: NoParameters, *, first: float | FloatArray, last: float | FloatArray | None
) -> Outcome:
    """Return the temperature of a record, with the drift during it as uncertainty.

    Parameters
    ----------
    first, last : float, ndarray or None
        K; temperature before and after, or the column of one thermometer alone.

    Raises
    ------
    ValueError
        No temperature at all.
    """
    known = [np.asarray(each, dtype=np.float64).ravel() for each in (first, last) if each is not None]
    values = np.concatenate(known)
    values = values[np.isfinite(values)]
    if not values.size:
        raise ValueError("first: found no temperature")
    ends = [float(np.nanmean(each)) for each in known]
    mean = float(np.mean(ends)) if len(ends) == 2 else float(values.mean())
    half = float(np.ptp(values)) / 2
    # Whatever the temperature was during the record, it lay between: JCGM 100:2008, 4.3.7.
    return Outcome(
        {"temperature": mean}, point={"temperature": half / math.sqrt(3)}, facts={"range_mK": 2e3 * half}
    )


def pulse_lines(
    parameters: PulseLineParameters,
    *,
    signal: FloatArray,
    rate: float | FloatArray,
    pulse: FloatArray | None,
) -> Outcome:
    """Return the strongest lines of a pulse response: resonances with Q, lines too narrow to resolve, or that there are no more.

    Parameters
    ----------
    signal : ndarray
        Against time in equal steps.
    rate : float or ndarray
        Hz; a column must be one number throughout.
    pulse : ndarray or None
        Drive over the same time; None for a free decay from the first point on.

    Raises
    ------
    ValueError
        Gaps, a rate that changes, or what `pulse_response` refuses.
    """
    if not known_rows(signal).all():
        raise ValueError(
            f"signal[{int(np.argmax(~known_rows(signal)))}]: found no value; a record against time has no gaps"
        )
    one = np.asarray(rate, dtype=np.float64).ravel()
    if not (np.abs(one / one[0] - 1) <= STEADY_RATE).all():
        raise ValueError(f"rate: found {one.min():.8g} to {one.max():.8g} Hz, expected one rate")
    response = pulse_response(
        signal, rate=float(one[0]), pulse=pulse, low=parameters.low_hz, high=parameters.high_hz
    )
    search = resonance_lines(response, most=parameters.most, false_alarm=parameters.false_alarm)
    resonances = [line for line in search.lines if line.kind == "resonance"]
    tones = [line for line in search.lines if line.kind == "unresolved"]
    placed = resonances[:SLOTS] if parameters.order is None else _in_order(resonances, parameters.order)
    facts = {
        "low_Hz": f"{response.frequency[0]:.5g}", "high_Hz": f"{response.frequency[-1]:.5g}", "points": int(response.frequency.size),
        "step_Hz": response.step, "origin": "The spectrum of the record" + (" over that of the pulse" if pulse is not None else ""),
        "cut": ", with the free decay that the end of the record cut off" if pulse is not None else "",
        "resonances_at": _listed(resonances), "unresolved": _listed(tones),
        "refused": [f"{line.frequency:.5g} Hz: {line.reason}" for line in search.lines if line.kind == "refused"],
    }  # fmt: skip
    return _outcome(placed, tones[:SLOTS], facts, _findings(resonances, tones, search))


def _in_order(lines: list[Line], order: tuple[float, ...]) -> list[Line | None]:
    """Return the lines in the places of given frequencies, each the nearest one that is not off by a part in a hundred."""
    placed: list[Line | None] = []
    for frequency in order:
        near = min(lines, key=lambda line: abs(line.frequency - frequency), default=None)
        placed.append(near if near is not None and abs(near.frequency / frequency - 1) < 0.01 else None)
    return placed


def _listed(lines: list[Line]) -> str:
    return ", ".join(f"{line.frequency:.2f} Hz" for line in lines) or "none"


def _findings(resonances: list[Line], tones: list[Line], search: LineSearch) -> tuple[Finding, ...]:
    found = []
    if not resonances:
        found.append(
            Finding(
                code="no-resonance", severity="note",
                what="no line of this record is a resonance wider than the resolution; nothing was fitted",
            )
        )  # fmt: skip
    if search.given_up:
        found.append(
            Finding(
                code="search-given-up", severity="note",
                what=f"the search was given up after {HOPELESS} lines in a row that are no resonance; weaker resonances may be left",
                remedy="narrow the range (low_hz, high_hz) in a copy of the plan; if there was a pulse, give its column",
            )
        )  # fmt: skip
    elif len(resonances) > SLOTS or len(tones) > SLOTS or not search.complete:
        found.append(
            Finding(
                code="lines-left", severity="note",
                what=f"there are more lines than the {SLOTS} strongest, which are given",
                remedy="narrow the range (low_hz, high_hz) in a copy of the plan",
            )
        )  # fmt: skip
    return tuple(found)


def _outcome(
    resonances: Sequence[Line | None],
    tones: list[Line],
    facts: dict[str, object],
    findings: tuple[Finding, ...],
) -> Outcome:
    known = [line for line in resonances if line is not None]
    outputs: dict[str, float | FloatArray] = {"resonances": float(len(known))}
    point: dict[str, float] = {}
    verdicts: dict[str, str] = {}
    names: list[str] = []
    for k in range(1, SLOTS + 1):
        line = resonances[k - 1] if k <= len(resonances) else None
        places = f"frequency_{k}", f"quality_factor_{k}", f"strength_{k}"
        if line is None:
            outputs |= dict.fromkeys(places, math.nan)
            verdicts |= dict.fromkeys(places, "no resonance")
        else:
            outputs |= dict(
                zip(places, (line.frequency, line.quality_factor, math.sqrt(line.statistic)), strict=True)
            )
            names += places[:2]
        tone = f"tone_{k}"
        if k <= len(tones):
            outputs[tone], point[tone] = tones[k - 1].frequency, tones[k - 1].frequency_uncertainty
        else:
            outputs[tone], verdicts[tone] = math.nan, "no line"
    matrix = np.zeros((len(names), len(names)))
    for k, each in enumerate(known):
        matrix[2 * k : 2 * k + 2, 2 * k : 2 * k + 2] = each.covariance
    return Outcome(
        outputs, point=point, covariance=Covariance(tuple(names), matrix) if names else None,
        held={"order": tuple(line.frequency for line in known)},
        facts=facts, findings=findings, verdicts=verdicts,
    )  # fmt: skip


_YIELDS = {
    name: port
    for k in range(1, SLOTS + 1)
    for name, port in (
        (f"frequency_{k}", Port("frequency", "scalar", f"frequency of resonance {k}, by strength")),
        (f"quality_factor_{k}", Port("quality_factor", "scalar", f"quality factor of resonance {k}")),
        (f"strength_{k}", Port("number", "scalar", f"signal over noise of resonance {k}, by the filter that found it")),
        (f"tone_{k}", Port("frequency", "scalar", f"frequency of line {k} among those narrower than the resolution")),
    )
}  # fmt: skip

PULSE_STEPS: tuple[Step, ...] = (
    Step(
        name="pulse-as-sent", version=1, function=pulse_as_sent,
        takes={"drive": Port("drive|voltage|current|number", "array", "pulse against time")},
        yields={"pulse": Port("same:drive", "array", "pulse as recorded"), "rms": Port("same:drive", "scalar", "rms value over the whole record")},
        sentence="The pulse has {points} points, an rms value of {rms} and a crest factor of {crest}.", spread="refit",
    ),
    Step(
        name="mean-temperature", version=1, function=mean_temperature,
        takes={
            "first": Port("temperature", "number", "temperature before, or during"), "last": Port("temperature", "number", "temperature after", optional=True),
        },
        yields={"temperature": Port("temperature", "scalar", "temperature of the record")},
        sentence="The temperature of the record is {temperature}; its drift over {range_mK} mK is taken as a rectangular distribution.", spread="refit",
    ),
    Step(
        name="pulse-lines", version=3, function=pulse_lines, parameters=PulseLineParameters,
        takes={
            "signal": Port("amplitude|voltage|current", "array", "response against time"), "rate": Port("frequency", "number", "readings per time"),
            "pulse": Port("drive|voltage|current|number", "array", "pulse over the same time", optional=True),
        },
        yields={"resonances": Port("count", "scalar", "lines that are resonances"), **_YIELDS},
        sentence="{origin} from {low_Hz} Hz to {high_Hz} Hz was searched by matched filters for lines that noise alone gives with a chance of {false_alarm}; "
        "each was fitted by a complex Lorentzian on a background that slopes{cut}. Resonances: {resonances_at}; narrower than the resolution of {step_Hz} Hz: {unresolved}.",
        spread="refit",
    ),
)  # fmt: skip
"""Steps of this module."""

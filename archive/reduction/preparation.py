"""What happens to a channel before a plan's own steps: rows left out, gauge zero, the sheet's corrections, inverses.

Each becomes a step with its own record; the stored data are never edited.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from datetime import datetime

import numpy as np
import numpy.typing as npt

from archive.errors import BadRequest
from archive.reduction.channels import channel_estimate, rms_factor
from archive.reduction.estimate import Estimate
from archive.reduction.facts import SweepFacts
from archive.reduction.sheet_values import quantity_estimate
from archive.reduction.source import Source
from archive.reduction.sweep_steps import CorrectionParameters, LeaveOutParameters
from schemas.base import Record
from schemas.lineage import SourceEntry, Value
from schemas.quantity import Quantity
from schemas.sweep import Channel, Correction, LeftOut

__all__ = ["Preliminary", "preliminary_steps", "rows_left_out"]

_INSTANT = re.compile(r"^\d{4}-\d{2}-\d{2}[T ]")
_KINDS = {"gain": "number", "phase": "phase", "clock": "time"}


@dataclass(frozen=True)
class Preliminary:
    """One step to take on a channel before the plan's own.

    Attributes
    ----------
    step : str
        Name of the step.
    parameters : Record
    suffix : str
        What is added to the channel's name to name the result.
    correction : Estimate or None
    sources : tuple of SourceEntry
    address : str
        Where the correction stands.
    """

    step: str
    parameters: Record
    suffix: str
    correction: Estimate | None = None
    sources: tuple[SourceEntry, ...] = ()
    address: str = ""


def preliminary_steps(source: Source, facts: SweepFacts, name: str) -> list[Preliminary]:
    """Return the steps that a channel needs before the plan's own, in order."""
    found: list[Preliminary] = []
    channel = facts.channels[name]
    rows = rows_left_out(source, facts)
    if rows.rows:
        found.append(Preliminary("leave-out", rows, "kept"))
    found += _gauge_zero(facts, channel)
    corrections = [each for each in facts.sweep.corrections if each.channel == name]
    for number, each in enumerate(corrections, 1):
        found.append(
            _correction(facts, channel, each, suffix="corrected" + (str(number) if number > 1 else ""))
        )
    return found


def rows_left_out(source: Source, facts: SweepFacts) -> LeaveOutParameters:
    """Return the rows that the sheet leaves out, as ranges of row numbers with their reasons."""
    ranges: list[tuple[int, int]] = []
    reasons: list[str] = []
    for each in facts.sweep.left_out:
        if each.rows is not None:
            spans = [(max(each.rows[0], 1), min(each.rows[1], facts.entry.rows))]
        else:
            spans = _spans(_inside(source, facts, each))
        ranges += spans
        reasons += [each.reason] * len(spans)
    return LeaveOutParameters(rows=tuple(ranges), reasons=tuple(reasons))


def _inside(source: Source, facts: SweepFacts, left_out: LeftOut) -> npt.NDArray[np.bool_]:
    name = left_out.channel or ""
    kind = facts.channels[name].quantity
    values = channel_estimate(source, facts, name)[0].value
    low, high = (_bound(facts, text, kind, name) for text in (left_out.low, left_out.high))
    inside = np.isfinite(values)
    if low is not None:
        inside &= values >= low
    if high is not None:
        inside &= values <= high
    return inside


def _bound(facts: SweepFacts, text: str | None, kind: str, channel: str) -> float | None:
    if text is None:
        return None
    try:
        if kind == "instant" or _INSTANT.match(text):
            return datetime.fromisoformat(text).timestamp()
        return _on_channel(Quantity.parse(text, kind), facts.channels[channel].scale)
    except ValueError as error:
        raise BadRequest(
            f"sweep {facts.address}: the range left out of channel {channel} cannot be read: {error}",
            field=f"sweep[{facts.sweep.name}].left_out", found=text, expected=f"a {kind} with unit, or a time with offset",
        ) from None  # fmt: skip


def _on_channel(stated: Quantity, scale: str | None) -> float:
    if stated.scale is not None and stated.scale != scale:
        raise ValueError(f"it is on {stated.scale}, and the channel is on {scale or 'no scale'}")
    return stated.si


def _spans(inside: npt.NDArray[np.bool_]) -> list[tuple[int, int]]:
    edges = np.diff(np.concatenate([[0], inside.astype(np.int8), [0]]))
    firsts, lasts = np.flatnonzero(edges == 1) + 1, np.flatnonzero(edges == -1)
    return [(int(first), int(last)) for first, last in zip(firsts, lasts, strict=True)]


def _gauge_zero(facts: SweepFacts, channel: Channel) -> list[Preliminary]:
    sheet = facts.accession.sheet
    gauge = next((each for each in sheet.gauge if each.name == channel.gauge), None)
    if gauge is None:
        return []
    found: list[Preliminary] = []
    if gauge.zero is not None:
        estimate, sources = quantity_estimate(
            gauge.zero, name=f"zero of gauge {gauge.name} in {facts.cooldown}", level="run", address=f"{facts.cooldown} gauge {gauge.name}"
        )  # fmt: skip
        parameters = CorrectionParameters(
            correct="zero", stated=gauge.zero.format(), known=f"gauge {gauge.name}, zero in the sheet"
        )
        found.append(
            Preliminary(
                "apply-correction",
                parameters,
                "zeroed",
                estimate,
                sources,
                f"{facts.cooldown} gauge {gauge.name}",
            )
        )
    if gauge.relative_uncertainty is not None:
        name = f"gain of gauge {gauge.name} in {facts.cooldown}"
        entry = SourceEntry(
            name=name,
            description=f"relative standard uncertainty {gauge.relative_uncertainty:.3g}",
            level="run",
            address=f"{facts.cooldown} gauge {gauge.name}",
            stated=Value(value=1.0, uncertainty=gauge.relative_uncertainty, unit="1"),
        )
        # The doses multiply by the gain of this name and a correction divides by it: a gauge that reads low makes both larger.
        estimate = Estimate(np.asarray(1.0), "number", shared={name: np.asarray(-gauge.relative_uncertainty)})
        parameters = CorrectionParameters(
            correct="gain", stated="1", known=f"gauge {gauge.name}, relative uncertainty in the sheet"
        )
        found.append(
            Preliminary(
                "apply-correction",
                parameters,
                "gauged",
                estimate,
                (entry,),
                f"{facts.cooldown} gauge {gauge.name}",
            )
        )
    return found


def _correction(facts: SweepFacts, channel: Channel, correction: Correction, *, suffix: str) -> Preliminary:
    kind = _KINDS.get(correction.correct, channel.quantity)
    if kind == "temperature":
        kind = "temperature_difference"
    try:
        stated = Quantity.parse(correction.value, kind)
    except ValueError as error:
        raise BadRequest(
            f"sweep {facts.address}: the {correction.correct} correction of channel {correction.channel} cannot be read: {error}",
            field=f"sweep[{facts.sweep.name}].corrections", found=correction.value, expected=f"a {kind.replace('_', ' ')} with unit",
        ) from None  # fmt: skip
    # Equal words in one cooldown are one statement: the same zero of the same channel in many sweeps is one source.
    name = f"{correction.correct} of {correction.channel} in {facts.cooldown}, {stated.format()}"
    estimate, sources = quantity_estimate(stated, name=name, level="run", address=facts.address)
    if kind == channel.quantity and stated.convention is None:
        # A zero is read on the channel's own scale, which may be that of peak values.
        estimate = _times(estimate, rms_factor(facts, channel))
    parameters = CorrectionParameters(
        correct=correction.correct, stated=correction.value, known=f"{correction.known}: {correction.source}"
    )
    return Preliminary(
        "apply-correction", parameters, suffix, estimate, sources, f"{facts.address}#{correction.channel}"
    )


def _times(estimate: Estimate, factor: float) -> Estimate:
    shared = {name: part * factor for name, part in estimate.shared.items()}
    return Estimate(
        estimate.value * factor, estimate.quantity, estimate.points * factor, shared, estimate.scale
    )

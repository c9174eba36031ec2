"""A calibration record out of the reduction that found it, and its text for a cooldown sheet.

Rules: numbers are written so that they come back bit for bit; the record names the reduction in `made_from`, so that a
sheet which takes it can be held against the archive and a temperature traced to the rows of the calibration.
"""

from __future__ import annotations

import json
import math
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from archive.errors import BadRequest
from archive.reduction.calibration_sources import temperature_contributions
from archive.reduction.facts import SweepFacts, sweep_facts
from archive.reduction.source import Source
from schemas.lineage import OutputEntry, ReductionDocument, StepRecord
from schemas.thermometer import Calibration

__all__ = ["FREE_FIELDS", "calibration_from", "calibration_text", "calibration_thermometer"]

FREE_FIELDS = frozenset(
    {
        "name", "revision", "description", "valid_from", "changed", "date", "against", "uncertainty", "relative_uncertainty",
        "temperature_low", "temperature_high",
    }
)  # fmt: skip
"""What a person may write otherwise than the reduction; the range may only become narrower."""

_STEP = "calibration-fit"


def calibration_thermometer(address: str, source: Source) -> str:
    """Return the name of the thermometer that a reduction calibrates.

    Raises
    ------
    BadRequest
        The reduction fits no calibration, or its sheet does not say which thermometer was calibrated.
    """
    document = source.reduction(address)
    _fit_step(document)
    facts = sweep_facts(source, document.sweep)
    channel = facts.sweep.calibrates
    found = None if channel is None else facts.stored(channel).thermometer
    if found is None:
        raise BadRequest(
            f"the sheet of {document.sweep} does not say which thermometer its channel {channel or 'under calibration'} reads",
            field=f"channels.{channel}.thermometer" if channel else f"sweep[{facts.sweep.name}].calibrates",
            remedy="name the thermometer in the sheet, supplement the cooldown and reduce the sweep again",
        )
    return found.partition(".r")[0]


def calibration_from(address: str, source: Source, *, name: str, revision: int) -> Calibration:
    """Return the calibration record that a reduction found.

    Parameters
    ----------
    address : str
        Of a reduction with a step `calibration-fit`, e.g. ``2024-11/c01@thermometer-calibration.1``.
    source : Source
    name, revision
        Of the record.

    Raises
    ------
    BadRequest
        The reduction fits no calibration, its temperatures are on no scale, or the thermometer is not named.

    Notes
    -----
    `contribution` holds every source of the coefficients, the axes of the fit's covariance among them; together they are the
    covariance. `relative_uncertainty` sums up, as the largest value at the points, what all sources but the form make of T.
    """
    document = source.reduction(address)
    thermometer = calibration_thermometer(address, source)
    step, give = _fit_step(document)
    outputs = _outputs(document, give)
    scale = outputs["temperature_low"].scale
    if scale is None:
        raise BadRequest(
            f"the temperatures of {address} are on no named scale",
            remedy="name the scale in the sheet, supplement the cooldown and reduce the sweep again",
        )
    facts = sweep_facts(source, document.sweep)
    coefficients = source.output(address, give["coefficients"])
    content: dict[str, Any] = {
        "name": name, "revision": revision, "thermometer": thermometer, "scale": scale, "date": _day(facts, document),
        "against": _against(facts, source), "reading_unit": outputs["reading_low"].unit,
        "readings": [outputs["reading_low"].value, outputs["reading_high"].value],
        "temperature_low": f"{outputs['temperature_low'].value!r} K", "temperature_high": f"{outputs['temperature_high'].value!r} K",
        "interpolation_uncertainty": outputs["interpolation"].value, "made_from": address, "relative_uncertainty": 0.1,
        **_relation(str(step.facts["form"]), coefficients.value.tolist(), outputs, _points(document, source, step)),
    }  # fmt: skip
    rms = outputs["residual_rms"].value
    if rms:
        content["residual_rms"] = f"{rms!r} K"
    described = {entry.name: entry for entry in document.sources}
    content["contribution"] = [
        {
            "source": each, "level": described[each].level, "description": described[each].description, "address": described[each].address,
            "coefficients": part.tolist(),
        }
        for each, part in sorted(coefficients.shared.items())
    ]  # fmt: skip
    record = Calibration.model_validate_json(json.dumps(content))
    content["relative_uncertainty"] = _summary(record, _points(document, source, step))
    return Calibration.model_validate_json(json.dumps(content))


def _fit_step(document: ReductionDocument) -> tuple[StepRecord, Mapping[str, str]]:
    planned = next((each for each in document.plan.step if each.use == _STEP), None)
    step = next((each for each in document.steps if each.name == _STEP), None)
    if planned is None or step is None:
        raise BadRequest(
            f"{document.address} fits no calibration",
            found=f"plan {document.plan.address}",
            expected="a reduction by plan thermometer-calibration, or another with the step calibration-fit",
        )
    return step, planned.give


def _outputs(document: ReductionDocument, give: Mapping[str, str]) -> dict[str, OutputEntry]:
    entries = {each.name: each for each in document.outputs}
    needed = ("coefficients", "centre", "half_width", "reading_low", "reading_high", "temperature_low", "temperature_high", "residual_rms", "interpolation")  # fmt: skip
    missing = [each for each in needed if give.get(each) not in entries]
    if missing:
        raise BadRequest(
            f"plan {document.plan.address} keeps no {', '.join(missing)} of its calibration-fit",
            remedy="give these outputs in the plan and reduce again",
        )
    return {each: entries[give[each]] for each in needed}


def _points(document: ReductionDocument, source: Source, step: StepRecord) -> list[list[float]]:
    """Return the points of the fit as pairs of reading and temperature, with rising readings."""
    columns = [
        source.output(document.address, step.inputs[port].address.rpartition("#")[2]).value
        for port in ("reading", "temperature")
    ]
    return sorted([float(r), float(t)] for r, t in zip(*columns, strict=True))


def _relation(form: str, found: Sequence[float], outputs: Mapping[str, OutputEntry], points: list[list[float]]) -> dict[str, Any]:  # fmt: skip
    centre, half = outputs["centre"].value or 0.0, outputs["half_width"].value or 1.0
    match form:
        case "chebyshev":
            return {"relation": {"form": form, "logarithm": "ln", "lower": centre - half, "upper": centre + half, "coefficients": found}}  # fmt: skip
        case "log-polynomial":
            return {"relation": {"form": form, "centre": centre, "half_width": half, "coefficients": found}}
        case "curie-weiss":
            return {"relation": {"form": form, "offset": found[0], "constant": found[1], "theta": found[2]}}
    return {"relation": {"form": "spline"}, "points": points}


def _day(facts: SweepFacts, document: ReductionDocument) -> str:
    last = facts.entry.end or facts.accession.sheet.end or document.end
    return last.date().isoformat()


def _against(facts: SweepFacts, source: Source) -> str:
    reference = facts.sweep.thermometer
    if reference is None:
        return f"the reference of {facts.address}"
    stored = facts.stored(reference)
    if stored.calibration is None:
        return f"temperatures of channel {reference} in {facts.address}"
    record = source.record(stored.calibration)
    thermometer = record.thermometer if isinstance(record, Calibration) else stored.thermometer or reference
    return f"{thermometer} by {stored.calibration}, in {facts.address}"


def _summary(record: Calibration, points: list[list[float]]) -> float:
    """Return the largest relative uncertainty at the points by all sources but the form's own, to two digits, rounded up."""
    readings, temperatures = np.array(points).T
    bare = record.model_copy(update={"interpolation_uncertainty": None})
    square = sum(part**2 for _, part in temperature_contributions(bare, readings, temperatures))
    largest = max(float(np.max(np.sqrt(square) / temperatures)), 1e-12)
    step = 10.0 ** (math.floor(math.log10(largest)) - 1)
    return float(f"{math.ceil(largest / step) * step:.1e}")


def calibration_text(record: Calibration) -> str:
    """Return a calibration as TOML, ready for a cooldown sheet; every number comes back bit for bit.

    Parameters
    ----------
    record : Calibration

    Returns
    -------
    str
        A table ``[[record.calibration]]`` and its contributions.
    """
    content = json.loads(record.model_dump_json(exclude_none=True, exclude_defaults=True))
    contributions = content.pop("contribution", [])
    lines = ["[[record.calibration]]"]
    for key, value in content.items():
        if key in ("temperature_low", "temperature_high", "residual_rms", "uncertainty"):
            quantity = getattr(record, key)
            lines.append(f'{key} = "{quantity.value!r} {quantity.unit}"')
        elif key in ("date", "valid_from"):
            lines.append(f"{key} = {value}")
        else:
            lines.append(f"{key} = {_toml(value)}")
    for each in contributions:
        lines += ["", "[[record.calibration.contribution]]"]
        lines += [f"{key} = {_toml(value)}" for key, value in each.items()]
    return "\n".join(lines) + "\n"


def _toml(value: object) -> str:
    if isinstance(value, Mapping):
        return "{ " + ", ".join(f"{key} = {_toml(each)}" for key, each in value.items()) + " }"
    if isinstance(value, list):
        return "[" + ", ".join(_toml(each) for each in value) + "]"
    if isinstance(value, float):
        return repr(value)
    # A JSON string is a TOML basic string but for the delete character, which no text of a record holds.
    return json.dumps(value, ensure_ascii=False)

"""The full record of a step: sentence with its numbers, parameters, inputs with digests, facts, findings."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from datetime import datetime

import numpy as np
from pydantic import JsonValue

from archive.reduction.outputs import Found, value_of
from archive.reduction.sentence import filled, number_text, quantity_text
from archive.reduction.step import Given, Outcome, Step
from schemas.base import Record
from schemas.lineage import InputEntry, StepRecord

__all__ = ["step_record"]


def step_record(
    step: Step,
    parameters: Record,
    given: Mapping[str, Given],
    found: Sequence[Found],
    outcome: Outcome,
    *,
    named: Mapping[str, str],
    number: int,
    begin: datetime,
    end: datetime,
) -> StepRecord:
    """Return the record of a step that was carried out.

    Parameters
    ----------
    step, parameters, given, found, outcome
        What was done, with what, giving what.
    named : mapping
        Name of an output in the plan: its name in the step.
    number : int
        From 1.
    begin, end : datetime
    """
    facts = {name: as_json(value) for name, value in outcome.facts.items()}
    settings = parameters.model_dump(mode="json")
    words = {name: number_text(value) for name, value in settings.items()}
    words |= {port: quantity_text(each.estimate) for port, each in given.items() if each.estimate is not None}
    words |= {named[each.name]: each.verdict or quantity_text(each.estimate) for each in found}
    words |= {name: number_text(value) for name, value in facts.items() if not isinstance(value, dict)}
    inputs = {
        port: InputEntry(
            address=each.address,
            role=step.takes[port].description,
            digest=each.digest,
            value=None if each.estimate is None else value_of(each.estimate),
        )
        for port, each in given.items()
    }
    return StepRecord(
        number=number,
        name=step.name,
        version=step.version,
        sentence=filled(step.sentence, words),
        parameters=settings,
        inputs=inputs,
        outputs=tuple(each.name for each in found),
        citations=step.citations
        if outcome.citations is None
        else tuple(key for key in step.citations if key in outcome.citations),
        effects={effect: filled(sentence, words) for effect, sentence in step.effects.items()},
        considered={effect: filled(sentence, words) for effect, sentence in step.considered.items()},
        begin=begin,
        end=end,
        findings=outcome.findings,
        facts=facts,
    )


def as_json(value: object) -> JsonValue:
    """Return a fact as JSON; a number that is none becomes null."""
    match value:
        case None | bool() | str():
            return value
        case int() | np.integer():
            return int(value)
        case float() | np.floating():
            return float(value) if math.isfinite(value) else None
        case list() | tuple() | np.ndarray():
            return [as_json(each) for each in value]
        case dict():
            return {str(key): as_json(each) for key, each in value.items()}
    return str(value)

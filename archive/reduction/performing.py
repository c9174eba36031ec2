"""Carrying out one step: check the inputs, call, propagate, name the sources, write the record."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any

import numpy as np
from pydantic import ValidationError

from archive.errors import BadRequest, StepFailed
from archive.reduction.estimate import Estimate
from archive.reduction.outputs import Found, value_of
from archive.reduction.propagation import Propagated, fit_contributions, propagate
from archive.reduction.step import Covariance, Given, Outcome, Step
from archive.reduction.step_call import StepCall, step_call
from archive.reduction.step_record import step_record
from schemas.base import Record
from schemas.kinds import kind_of
from schemas.lineage import SourceEntry, StepRecord

__all__ = ["Performed", "perform", "step_parameters"]


@dataclass(frozen=True)
class Performed:
    """A step carried out.

    Attributes
    ----------
    record : StepRecord
    found : tuple of Found
        Outputs under their names in the plan.
    sources : tuple of SourceEntry
        Sources that arose here.
    outcome : Outcome
        As the step's function gave it.
    call : StepCall
        The function with everything that is not a number fixed.
    covariance : dict
        Names (in the plan) and matrix of what was fitted; empty if nothing was.
    """

    record: StepRecord
    found: tuple[Found, ...]
    sources: tuple[SourceEntry, ...]
    outcome: Outcome
    call: StepCall
    covariance: dict[str, Any] = field(default_factory=dict)


def step_parameters(step: Step, chosen: Mapping[str, Any], *, place: str) -> Record:
    """Return the parameters of a step, defaults filled in.

    Raises
    ------
    BadRequest
        A parameter that the step does not have, or of a wrong kind.
    """
    try:
        return step.parameters.model_validate_json(json.dumps(dict(chosen)))
    except ValidationError as error:
        fault = error.errors()[0]
        known = ", ".join(step.parameters.model_fields) or "nothing"
        raise BadRequest(
            f"{place}, step {step.name}: {fault['msg']}",
            field=".".join(str(part) for part in fault["loc"]) or None,
            expected=f"one of the step's parameters: {known}",
            remedy="correct `set` in the plan",
        ) from None


def perform(
    step: Step,
    parameters: Record,
    given: Mapping[str, Given],
    give: Mapping[str, str],
    *,
    number: int,
    reduction: str,
    fits: int,
    clock: Callable[[], datetime],
) -> Performed:
    """Return a step carried out on its inputs.

    Parameters
    ----------
    step : Step
    parameters : Record
    given : mapping of str to Given
        Inputs that exist, by port.
    give : mapping of str to str
        Outputs to keep: name in the step, name in the plan.
    number : int
        Of the step in the reduction, from 1.
    reduction : str
        Address of the reduction, for the names of sources.
    fits : int
        Sources of fits named before in this reduction.
    clock : callable
        The only clock.

    Raises
    ------
    StepFailed
        The physics refused; its words, with step and sweep.
    BadRequest
        An input of a wrong kind.
    """
    begin = clock()
    place = f"{reduction}, step {number} ({step.name})"
    _check_inputs(step, given, place)
    for output in give:
        if output not in step.yields:
            raise BadRequest(f"{place} has no output {output!r}", expected=f"one of {', '.join(step.yields)}")
    estimates = {port: each.estimate for port, each in given.items() if each.estimate is not None}
    call = step_call(step, parameters, given, estimates)
    try:
        spread = propagate(call, estimates, elementwise=step.spread == "elementwise")
        joint = _joint_covariance(spread)
        axes = [] if joint is None else fit_contributions(joint)
    except (ValueError, ArithmeticError) as error:
        raise StepFailed(
            f"{place} could not give its results: {error}",
            remedy="see the inputs with `stillroom trace`, leave out what is wrong in the sheet, or set the step's parameters in a plan of your own",
        ) from None
    sources = _renamed(spread, reduction)
    own = len(sources)
    sources += [
        SourceEntry(name=f"{reduction} fit {fits + k}", description=f"fit of step {number} ({step.name})", level="run", address=reduction)
        for k in range(len(axes))
    ]  # fmt: skip
    _add_axes(spread, axes, [each.name for each in sources[own:]])
    scale = _scale(estimates, place)
    found = []
    for output, name in give.items():
        estimate = _estimate(step, output, spread, estimates, scale)
        if estimate.scalar and float(estimate.points) > 0:
            # A scalar's own noise gets a name, so that two numbers made from it stay correlated.
            entry = SourceEntry(
                name=f"{reduction}#{name}",
                description=f"own uncertainty of {name}",
                level="run",
                address=f"{reduction}#{name}",
                stated=value_of(
                    Estimate(estimate.value, estimate.quantity, estimate.points, scale=estimate.scale)
                ),
            )
            sources.append(entry)
            estimate = Estimate(
                estimate.value,
                estimate.quantity,
                shared={**estimate.shared, entry.name: estimate.points},
                scale=estimate.scale,
            )
        verdict = spread.outcome.verdicts.get(output)
        found.append(Found(name, step.yields[output].description, estimate, number, verdict))
    record = step_record(
        step,
        parameters,
        given,
        found,
        spread.outcome,
        named={name: output for output, name in give.items()},
        number=number,
        begin=begin,
        end=clock(),
    )
    return Performed(
        record, tuple(found), tuple(sources), spread.outcome, call, _covariance(spread.outcome, give)
    )


def _joint_covariance(spread: Propagated) -> Covariance | None:
    """Return the covariance of a fit, with that of the single readings which a fit to scalars has averaged.

    A run of doses brings two sources a dose that nothing else shares; past the fit, as many axes as results hold them all.
    """
    fitted = spread.outcome.covariance
    readings = sorted(
        {name for parts in spread.shared.values() for name in parts if name.startswith("reading ")}
    )
    if (
        fitted is None
        or not readings
        or any(spread.outcome.array(name).ndim for name in fitted.names if "[" not in name)
    ):
        return fitted
    matrix = np.array(fitted.matrix, dtype=np.float64)
    parts = [spread.shared.get(name, {}) for name in fitted.names]
    columns = np.array([[float(part.pop(reading, 0.0)) for reading in readings] for part in parts])
    return Covariance(fitted.names, matrix + columns @ columns.T)


def _renamed(spread: Propagated, reduction: str) -> list[SourceEntry]:
    """Return the step's own sources, those named ``own ...`` after the reduction, which the step cannot know."""
    found = []
    for entry in spread.outcome.sources:
        if entry.name.startswith("own "):
            name = f"{reduction} {entry.name[4:]}"
            for parts in spread.shared.values():
                if entry.name in parts:
                    parts[name] = parts.pop(entry.name)
            found.append(entry.model_copy(update={"name": name, "address": reduction}))
        else:
            found.append(entry)
    return found


def _check_inputs(step: Step, given: Mapping[str, Given], place: str) -> None:
    for name, port in step.takes.items():
        each = given.get(name)
        if each is None:
            if not port.optional:
                raise BadRequest(f"{place} lacks its input {name}: {port.description}")
            continue
        if port.form == "record":
            continue
        estimate = each.estimate
        if estimate is None:
            raise BadRequest(
                f"{place}: input {name} ({each.address}) is no number", expected=port.description
            )
        if port.quantity != "any" and estimate.quantity not in port.quantity.split("|"):
            raise BadRequest(
                f"{place}: input {name} ({each.address}) is {kind_of(estimate.quantity).words}",
                expected=" or ".join(kind_of(each).words for each in port.quantity.split("|")),
                remedy="name another channel or output in the plan",
            )
        if (port.form == "scalar" and not estimate.scalar) or (port.form == "array" and estimate.scalar):
            raise BadRequest(
                f"{place}: input {name} ({each.address}) is {'one number' if estimate.scalar else 'a column'}",
                expected=port.form,
            )


def _add_axes(spread: Propagated, axes: list[dict[str, float]], names: list[str]) -> None:
    for source, axis in zip(names, axes, strict=True):
        for target, part in axis.items():
            output, _, index = target.partition("[")
            if output not in spread.shared:
                continue
            shape = spread.outcome.array(output).shape
            parts = spread.shared[output].setdefault(source, np.zeros(shape))
            if index:
                parts[int(index.rstrip("]"))] += part
            else:
                spread.shared[output][source] = parts + part


def _scale(estimates: Mapping[str, Estimate], place: str) -> str | None:
    scales = {estimate.scale: port for port, estimate in estimates.items() if estimate.scale is not None}
    if len(scales) > 1:
        listed = ", ".join(f"{port} on {scale}" for scale, port in sorted(scales.items(), key=str))
        raise BadRequest(
            f"{place}: its temperatures are on different scales: {listed}",
            expected="one scale",
            remedy="convert one of them first (step temperature-on-scale)",
        )
    return next(iter(scales), None)


def _estimate(
    step: Step, output: str, spread: Propagated, estimates: Mapping[str, Estimate], scale: str | None
) -> Estimate:
    quantity = step.yields[output].quantity
    if quantity.startswith("same:"):
        quantity = estimates[quantity[5:]].quantity
    elif quantity.startswith("area-of:"):
        quantity = {"amount": "area", "specific_amount": "specific_area"}[estimates[quantity[8:]].quantity]
    own = spread.outcome.scales.get(output, scale) if quantity == "temperature" else None
    return Estimate(spread.outcome.array(output), quantity, spread.point[output], spread.shared[output], own)


def _covariance(outcome: Outcome, give: Mapping[str, str]) -> dict[str, Any]:
    if outcome.covariance is None:
        return {}

    def renamed(name: str) -> str:
        head, bracket, rest = name.partition("[")
        return give.get(head, head) + bracket + rest

    names = [renamed(name) for name in outcome.covariance.names]
    return {"names": names, "matrix": np.asarray(outcome.covariance.matrix).tolist()}

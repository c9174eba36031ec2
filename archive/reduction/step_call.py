"""A step's function with everything fixed that is no number: what is shifted, drawn and sent to other processes."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from archive.reduction.estimate import Estimate, FloatArray
from archive.reduction.step import Given, Outcome, Step
from schemas.base import Record

__all__ = ["StepCall", "step_call"]


@dataclass(frozen=True)
class StepCall:
    """A step's function with its parameters, records and weights fixed, so that only numbers are left to be given.

    Attributes
    ----------
    step : Step
    parameters : Record
    fixed : dict
        Records, weights, kinds and scales, by argument.
    """

    step: Step
    parameters: Record
    fixed: dict[str, object]

    def __call__(self, values: Mapping[str, FloatArray], held: Mapping[str, Any]) -> Outcome:
        """Return the outcome for input values and held choices."""
        chosen = self.parameters.model_copy(update=dict(held)) if held else self.parameters
        numbers = {
            port: _number(value) for port, value in values.items() if self.step.takes[port].form != "record"
        }
        return self.step.function(chosen, **numbers, **self.fixed)


def step_call(
    step: Step, parameters: Record, given: Mapping[str, Given], estimates: Mapping[str, Estimate]
) -> StepCall:
    """Return a step's function with its records, weights, kinds and scales fixed.

    Parameters
    ----------
    step : Step
    parameters : Record
    given : mapping of str to Given
        Inputs that exist, by port.
    estimates : mapping of str to Estimate
        Those of them that are numbers.
    """
    fixed: dict[str, object] = {}
    for port, declared in step.takes.items():
        each = given.get(port)
        if declared.form == "record" or each is None:
            fixed[port] = (
                None if each is None else (each.record if each.record is not None else each.estimate)
            )
    for port in step.weights:
        fixed[f"u_{port}"] = estimates[port].points if port in estimates else None
    for port in step.kinds:
        fixed[f"{port}_kind"] = estimates[port].quantity if port in estimates else None

    for port in step.scales:
        fixed[f"{port}_scale"] = estimates[port].scale if port in estimates else None
    for port in step.estimates:
        fixed[f"{port}_estimate"] = estimates.get(port)
    return StepCall(step, parameters, fixed)


def _number(value: FloatArray) -> float | FloatArray:
    return float(value) if value.ndim == 0 else value

"""One trial: every input drawn once from its distribution, and the steps of a reduction done with what was drawn.

A source of uncertainty gets one number in a trial, common to all that share it; what nothing shares gets a number for each
element. Contributions are those the records and steps state; a step's own sources act at the size that they have in the
trial, not in the reduction.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np

from archive.reduction.estimate import FloatArray
from archive.reduction.own_scatter import OwnParts
from archive.reduction.step import Outcome
from archive.reduction.step_call import StepCall

__all__ = ["Drawing", "DrawnInput", "DrawnStep", "Trial", "trial"]


@dataclass(frozen=True)
class DrawnInput:
    """An input from outside: best estimate, what only its elements share with nothing, and contributions by source."""

    key: str
    value: FloatArray
    point: FloatArray | None
    shared: dict[str, FloatArray]


@dataclass(frozen=True)
class DrawnStep:
    """A step, with the choices that are held and what is drawn of its own uncertainty.

    `stated` are the contributions that it stated in the reduction: a fit that is only moved, with its choices held, may
    state none. `known` is its outcome where nothing that it takes is drawn: a ledger of doses is not added up again in every trial.
    """

    label: str
    call: StepCall
    takes: dict[str, str]
    gives: dict[str, str]
    held: dict[str, Any]
    renamed: dict[str, str]
    own: OwnParts
    stated: dict[str, dict[str, FloatArray]]
    known: Outcome | None = None


@dataclass(frozen=True)
class Drawing:
    """Everything that a trial needs.

    Attributes
    ----------
    seed : int
    inputs : tuple of DrawnInput
    steps : tuple of DrawnStep
    sources : tuple of (str, bool)
        Names, and whether the distribution is rectangular.
    results : tuple of str
        Keys of the scalars that are kept.
    """

    seed: int
    inputs: tuple[DrawnInput, ...]
    steps: tuple[DrawnStep, ...]
    sources: tuple[tuple[str, bool], ...]
    results: tuple[str, ...]


@dataclass(frozen=True)
class Trial:
    """Outcome of one trial.

    Attributes
    ----------
    values : ndarray
        Of the results; NaN where there is none.
    failed : str or None
        Label of the first step that gave no result.
    reason : str
        What it said.
    """

    values: FloatArray
    failed: str | None = None
    reason: str = ""


def trial(drawing: Drawing, index: int) -> Trial:
    """Return the results of one trial.

    Parameters
    ----------
    drawing : Drawing
    index : int
        Number of the trial, from 0; its random numbers depend on the seed and on this number alone.
    """
    rng = np.random.Generator(np.random.PCG64(np.random.SeedSequence(drawing.seed, spawn_key=(index,))))
    z = _Numbers(drawing.sources, rng)
    values = {each.key: _drawn(each, z, rng) for each in drawing.inputs}
    failed, reason = None, ""
    # A drawn value may leave the domain of a logarithm; the row has no value then, as in the reduction.
    with np.errstate(all="ignore"):
        for step in drawing.steps:
            if any(key not in values for key in step.takes.values()):
                continue
            try:
                outcome = step.known or step.call(
                    {port: values[key] for port, key in step.takes.items()}, step.held
                )
            except (ValueError, ArithmeticError) as error:
                failed, reason = failed or step.label, reason or str(error)
                continue
            values |= _given(step, outcome, z, rng)
    found = [float(values[key]) if key in values else math.nan for key in drawing.results]
    return Trial(np.array(found), failed, reason)


class _Numbers(dict[str, float]):
    """One number of unit variance for each source."""

    def __init__(self, sources: tuple[tuple[str, bool], ...], rng: np.random.Generator) -> None:
        super().__init__()
        self.rng = rng
        for name, rectangular in sources:
            self[name] = math.sqrt(3) * (2 * rng.random() - 1) if rectangular else rng.standard_normal()

    def __missing__(self, name: str) -> float:
        """Draw for a source that the reduction did not meet, and a step met with drawn inputs."""
        self[name] = self.rng.standard_normal()
        return self[name]


def _drawn(each: DrawnInput, z: _Numbers, rng: np.random.Generator) -> FloatArray:
    value = each.value
    for name, part in each.shared.items():
        value = value + z[name] * part
    if each.point is not None:
        value = value + each.point * rng.standard_normal(value.shape)
    return np.asarray(value)


def _given(step: DrawnStep, outcome: Outcome, z: _Numbers, rng: np.random.Generator) -> dict[str, FloatArray]:
    """Return the outputs of a step, moved by what the step itself is uncertain about."""
    moved = {output: np.array(outcome.array(output)) for output in outcome.outputs}
    for output in moved:
        for name, part in (outcome.shared.get(output) or step.stated.get(output, {})).items():
            factor = step.own.sources.get(name, 0.0 if name in step.renamed else 1.0)
            if factor:
                moved[output] = moved[output] + factor * z[step.renamed.get(name, name)] * np.asarray(part)
    for output, spread in step.own.points.items():
        moved[output] = moved[output] + spread * rng.standard_normal(spread.shape)
    for axis in step.own.axes:
        number = rng.standard_normal()
        for target, part in axis.items():
            output, _, at = target.partition("[")
            if at:
                moved[output][int(at.rstrip("]"))] += number * part
            else:
                moved[output] = moved[output] + number * part
    return {key: moved[output] for output, key in step.gives.items()}

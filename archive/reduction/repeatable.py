"""A reduction as one function of its inputs, kept while it is carried out, so that it can be repeated with drawn ones.

Rules: the steps, their parameters, records, weights and held choices are those of the reduction; only numbers are drawn.
A number that a step takes is either an input from outside, drawn once however many steps take it, or what an earlier step
gave in the same trial.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from itertools import count

import numpy as np

from archive.reduction.estimate import Estimate
from archive.reduction.performing import Performed
from archive.reduction.step import Given, Outcome
from archive.reduction.step_call import StepCall
from schemas.lineage import SourceEntry

__all__ = ["Evaluation", "Repeatable", "Repeated"]


@dataclass(frozen=True)
class Evaluation:
    """One step of the reduction.

    Attributes
    ----------
    label : str
        Number and name, for people.
    call : StepCall
    takes, gives : dict of str to str
        Which value each port takes, and under which name each output is kept.
    estimates : dict of str to Estimate
        What the step took, by port.
    outcome : Outcome
        What it gave, unshifted.
    renamed : dict of str to str
        Names in the reduction of the sources that the step calls its own.
    """

    label: str
    call: StepCall
    takes: dict[str, str]
    gives: dict[str, str]
    estimates: dict[str, Estimate]
    outcome: Outcome
    renamed: dict[str, str]


@dataclass(frozen=True)
class Repeated:
    """A reduction that can be repeated.

    Attributes
    ----------
    inputs : dict of str to Estimate
        What came from outside.
    evaluations : tuple of Evaluation
        In the order carried out.
    sources : dict of str to SourceEntry
        All sources of uncertainty met on the way.
    """

    inputs: dict[str, Estimate]
    evaluations: tuple[Evaluation, ...]
    sources: dict[str, SourceEntry]


@dataclass
class Repeatable:
    """Gathers a reduction while it is carried out.

    Parameters
    ----------
    reduction : str
        Its address.
    """

    reduction: str
    inputs: dict[str, Estimate] = field(default_factory=dict)
    evaluations: list[Evaluation] = field(default_factory=list)

    def add(self, done: Performed, given: Mapping[str, Given], give: Mapping[str, str]) -> None:
        """Note a step that was carried out."""
        takes = {port: self._key(each) for port, each in given.items() if each.estimate is not None}
        own = {
            name: f"{self.reduction} {name[4:]}"
            for parts in done.outcome.shared.values()
            for name in parts
            if name.startswith("own ")
        }
        self.evaluations.append(
            Evaluation(
                label=f"step {done.record.number} ({done.record.name})",
                call=done.call,
                takes=takes,
                gives={output: f"{self.reduction}#{name}" for output, name in give.items()},
                estimates={port: each.estimate for port, each in given.items() if each.estimate is not None},
                outcome=done.outcome,
                renamed=own,
            )
        )

    def finished(self, sources: Mapping[str, SourceEntry]) -> Repeated:
        """Return the whole."""
        return Repeated(dict(self.inputs), tuple(self.evaluations), dict(sources))

    def _key(self, given: Given) -> str:
        estimate = given.estimate
        assert estimate is not None  # noqa: S101 - records are fixed in the call
        if given.address.startswith(f"{self.reduction}#"):
            return given.address
        # All values of one record stand at the record's address.
        for number in count(1):
            key = given.address if number == 1 else f"{given.address} ({number})"
            known = self.inputs.setdefault(key, estimate)
            if known is estimate or _same(known, estimate):
                return key
        raise AssertionError  # pragma: no cover - count has no end


def _same(first: Estimate, second: Estimate) -> bool:
    return (
        first.quantity == second.quantity
        and np.array_equal(first.value, second.value, equal_nan=True)
        and np.array_equal(first.points, second.points, equal_nan=True)
        and first.shared.keys() == second.shared.keys()
    )

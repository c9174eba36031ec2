"""Steps carried out one after the other on numbers that a test gives, as the runner would: for worked examples."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime
from types import SimpleNamespace
from typing import Any

import numpy as np

from archive.reduction.estimate import Estimate
from archive.reduction.outputs import output_entry
from archive.reduction.performing import perform
from archive.reduction.repeatable import Repeatable
from archive.reduction.step import Given, Outcome, Port, Step
from archive.reduction.steps import step_named
from schemas.base import Record
from schemas.lineage import SourceEntry

__all__ = ["ADDRESS", "Done", "formula", "number", "rectangular", "worked"]

ADDRESS = "2026-03/s001@example.1"


def number(value: float, u: float, source: str, kind: str = "number") -> Estimate:
    """Return a scalar with one source."""
    return Estimate(np.array(value), kind, shared={source: np.array(u)} if u else {})


def rectangular(name: str) -> SourceEntry:
    """Return a source of rectangular distribution."""
    return SourceEntry(name=name, description="stated limits", level="run", distribution="rectangular")


def formula(function: Any, inputs: Sequence[str], outputs: Sequence[str], *, form: str = "scalar") -> Step:
    """Return a step from a function of numbers that gives a number for each output."""

    def call(_: Record, **given: Any) -> Outcome:
        return Outcome(dict(zip(outputs, function(**given), strict=True)))

    return Step(
        name="formula", version=1, function=call, takes={name: Port("any", form, name) for name in inputs},
        yields={name: Port("number", form, name) for name in outputs}, sentence="computed",
    )  # fmt: skip


@dataclass
class Done:
    """What was carried out."""

    estimates: dict[str, Estimate]
    outcome: Any


def worked(
    steps: Sequence[tuple[Step | str, Mapping[str, Any], Mapping[str, Any], Mapping[str, str]]],
    sources: Sequence[SourceEntry] = (),
) -> Done:
    """Return steps carried out: each with parameters, what it takes (estimate, record, or name of an output) and gives."""
    noted = Repeatable(ADDRESS)
    estimates: dict[str, Estimate] = {}
    entries = []
    known = {each.name: each for each in sources}
    fits = 0
    for count, (named, chosen, take, give) in enumerate(steps, 1):
        step = step_named(named) if isinstance(named, str) else named
        given = {}
        for port, what in take.items():
            if isinstance(what, str):
                given[port] = Given(f"{ADDRESS}#{what}", estimates[what])
            elif isinstance(what, Estimate):
                given[port] = Given(f"input {id(what)}", what)
            elif what is not None:
                given[port] = Given("record", record=what)
        done = perform(
            step, step.parameters(**chosen), given, give, number=count, reduction=ADDRESS, fits=fits, clock=lambda: datetime(2026, 4, 1, tzinfo=UTC)
        )  # fmt: skip
        fits += sum(" fit " in each.name for each in done.sources)
        for each in done.sources:
            known.setdefault(each.name, each)
        noted.add(done, given, give)
        for found in done.found:
            estimates[found.name] = found.estimate
            entries.append(output_entry(found))
    document = SimpleNamespace(address=ADDRESS, outputs=tuple(entries), sources=tuple(known.values()))
    return Done(estimates, SimpleNamespace(document=document, repeated=noted.finished(known)))

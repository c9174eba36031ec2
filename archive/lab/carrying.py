"""Reductions carried out by a crew and sealed one after the other, in the order of the work.

What rests on what is cut into waves: nothing in a wave rests on anything else in it, so its parts may be computed at once;
the next wave begins when all of this one is sealed. Numbers, digests and the order of what is sealed do not depend on who
computes.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, replace
from datetime import datetime
from graphlib import CycleError, TopologicalSorter
from typing import Any, TypeVar

from numpy.typing import NDArray

from archive.errors import ArchiveError, Stopped
from archive.lab.crew import Hands
from archive.lab.effective import EffectiveSource
from archive.lab.monte_carlo import answers, with_monte_carlo
from archive.lab.outcomes import ReduceOutcome
from archive.lab.repeating import same_inputs
from archive.lab.source import LabSource
from archive.reduction.monte_carlo import Request
from archive.reduction.needs import NeedAddresses
from archive.reduction.outputs import Stored
from archive.reduction.runner import run
from schemas.lineage import ReductionDocument
from schemas.plan import Plan

__all__ = ["Seal", "Task", "counted", "quiet", "sealed", "waves"]

Seal = Callable[[ReductionDocument, Mapping[str, tuple[NDArray[Any], dict[str, str]]]], None]

_Part = TypeVar("_Part")


def quiet(sentence: str) -> None:
    """Say nothing."""


@dataclass(frozen=True)
class Task:
    """One plan to be carried out on one sweep.

    Attributes
    ----------
    sweep : str
        Its address.
    plan : Plan
    clock : callable
    request : Request or None
        For trials beside it.
    needs : callable, optional
        Takes what is read and gives the reductions to rest on; else the newest.
    progress : callable
        Told of trials, where they run in this process.
    """

    sweep: str
    plan: Plan
    clock: Callable[[], datetime]
    request: Request | None
    needs: Callable[[EffectiveSource], NeedAddresses] | None = None
    progress: Callable[[str], None] = quiet


@dataclass(frozen=True)
class _Computed:
    """What came of a task; arrays are there if it is to be sealed."""

    outcome: ReduceOutcome
    arrays: Stored | None = None


def waves(
    work: Sequence[_Part], *, name: Callable[[_Part], str], below: Mapping[str, Collection[str]]
) -> list[list[_Part]]:
    """Work cut into waves, each in the order given.

    Parameters
    ----------
    work : sequence
    name : callable
        Gives the name of a part's plan.
    below : mapping
        For each name of a plan, those of plans that it may rest on.

    Examples
    --------
    >>> waves(["film 1", "cell 1", "cell 2"], name=lambda part: part[:4], below={"film": {"cell"}})
    [['cell 1', 'cell 2'], ['film 1']]

    Plans that rest on themselves, or on each other, are carried out one by one:

    >>> waves(["cell 1", "cell 2"], name=lambda part: part[:4], below={"cell": {"cell"}})
    [['cell 1'], ['cell 2']]
    """
    sorter = TopologicalSorter(below)
    try:
        sorter.prepare()
    except CycleError:
        return [[part] for part in work]
    level: dict[str, int] = {}
    while sorter.is_active():
        ready = sorter.get_ready()
        level |= dict.fromkeys(ready, len(set(level.values())))
        sorter.done(*ready)
    found: dict[int, list[_Part]] = {}
    for part in work:
        found.setdefault(level.get(name(part), 0), []).append(part)
    return [found[key] for key in sorted(found)]


def sealed(
    hands: Hands,
    tasks: Iterable[Task],
    *,
    seal: Seal,
    progress: Callable[[str], None],
    already: int = 0,
    of: int,
) -> Iterator[ReduceOutcome]:
    """Yield the outcome of each task of a wave, in their order, each when it is sealed.

    Parameters
    ----------
    hands : Hands
    tasks : iterable of Task
    seal, progress : callable
    already, of : int
        Tasks before these, and in all, as progress tells them.

    Notes
    -----
    Nothing is sealed when a reduction repeats the newest that counts.
    """
    # Work in this process begins when it is asked for, and its trials tell how far they are.
    waiting = [replace(each, progress=progress) if hands.here else each for each in tasks]
    made = hands.each(_computed, waiting)
    for number, task in enumerate(waiting, already + 1):
        progress(f"{task.sweep} by {task.plan.name} ({number} of {of})")
        computed = next(made)
        outcome = computed.outcome
        if computed.arrays is not None and outcome.document is not None:
            try:
                seal(outcome.document, computed.arrays)
            except ArchiveError as problem:
                outcome = ReduceOutcome(sweep=task.sweep, plan=task.plan.address, problem=problem)
        yield outcome


@contextmanager
def counted(outcomes: Collection[ReduceOutcome], of: int) -> Iterator[None]:
    """Say how far the work had come when the person stops it.

    Raises
    ------
    Stopped
        In the place of KeyboardInterrupt.
    """
    try:
        yield
    except KeyboardInterrupt:
        done = sum(each.document is not None for each in outcomes)
        raise Stopped(f"{done} of {of} reductions are made and sealed") from None


def _computed(source: EffectiveSource, task: Task) -> _Computed:
    """Carry out one task; nothing is written."""
    plan, address = task.plan, task.sweep
    try:
        earlier = source.reductions(plan.name, address)
        newest = earlier[-1] if earlier else None
        # A number is given once, also when the reduction that has it is withdrawn.
        last = max((each.number for each in source.lab.reductions(plan.name, address)), default=0)
        made = run(
            plan,
            address,
            source,
            number=last + 1,
            clock=task.clock,
            supersedes=None if newest is None else newest.address,
            needs=None if task.needs is None else task.needs(source),
        )
        if newest is not None and _same(source.lab, newest, made.document) and answers(newest, task.request):
            return _Computed(ReduceOutcome(address, plan.address, newest.address, newest, already=True))
        document = with_monte_carlo(made, task.request, clock=task.clock, progress=task.progress)
    except ArchiveError as problem:
        return _Computed(ReduceOutcome(sweep=address, plan=plan.address, problem=problem))
    return _Computed(ReduceOutcome(address, plan.address, document.address, document), made.arrays)


def _same(source: LabSource, old: ReductionDocument, new: ReductionDocument) -> bool:
    """Whether a reduction repeats the one before: same plan, same inputs, same outputs to the bit."""
    return (
        old.plan_digest == new.plan_digest
        and [(entry.name, entry.digest, entry.uncertainty) for entry in old.outputs]
        == [(entry.name, entry.digest, entry.uncertainty) for entry in new.outputs]
        and [(step.name, step.version) for step in old.steps]
        == [(step.name, step.version) for step in new.steps]
        and same_inputs(source, old.inputs, new.inputs)
    )

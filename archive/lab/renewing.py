"""Stale reductions made anew, those that others rest on first."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Mapping
from datetime import datetime
from functools import partial

from archive.errors import BadRequest, UnknownAddress
from archive.lab.carrying import Seal, Task, counted, sealed, waves
from archive.lab.crew import Crew
from archive.lab.effective import EffectiveSource
from archive.lab.outcomes import ReduceOutcome
from archive.lab.reducing import current_plans
from archive.lab.source import LabSource
from archive.lab.stale import Stale, stale
from archive.reduction.facts import sweep_facts
from archive.reduction.monte_carlo import Request
from archive.reduction.needs import gathered_reductions
from archive.reduction.replay import recorded_needs
from schemas.address import parse_address
from schemas.lineage import ReductionDocument
from schemas.plan import Plan

__all__ = ["reduce_stale"]


def reduce_stale(
    source: LabSource,
    cooldown: str | None,
    *,
    clock: Callable[[], datetime],
    seal: Seal,
    progress: Callable[[str], None],
    crew: Crew,
    request: Request | None = None,
) -> list[ReduceOutcome]:
    """Stale reductions of a cooldown, or of all, carried out anew with the newest revisions that hold.

    Parameters
    ----------
    source : LabSource
    cooldown : str or None
        Name of a cooldown, or the address of a sweep; stale reductions that its own rest on are renewed with them.
    clock, seal, progress, crew, request
        As in `archive.lab.reducing.reduce`.

    Notes
    -----
    A reduction rests afterwards on the reductions of the same sweeps as before, each in its newest number.
    """
    every = stale(source)
    chosen = _chosen(source, every, cooldown)
    plans = {plan.name: plan for plan in current_plans(source)}
    reading = EffectiveSource(source, newest=True)
    work = [_Renewal(each, source, plans) for each in chosen]
    below: dict[str, set[str]] = defaultdict(set)
    for each in work:
        below[each.plan.name] |= each.below()
    outcomes: list[ReduceOutcome] = []
    failed: set[str] = set()
    with counted(outcomes, len(work)), crew.at_work(reading) as hands:
        for wave in waves(work, name=lambda each: each.plan.name, below=below):
            tasks = []
            for each in wave:
                problem = _hindrance(reading, each.document, each.plan, failed)
                if problem is None:
                    needs = partial(_needs_now, each.document.address, each.plan)
                    tasks.append(Task(each.document.sweep, each.plan, clock, request, needs))
                else:
                    failed.add(each.key)
                    outcomes.append(ReduceOutcome(each.document.sweep, each.plan.address, problem=problem))
            for outcome in sealed(
                hands, tasks, seal=seal, progress=progress, already=len(outcomes), of=len(work)
            ):
                outcomes.append(outcome)
                if outcome.problem is not None:
                    failed.add(f"{outcome.sweep}@{outcome.plan.partition('.r')[0]}")
    return outcomes


class _Renewal:
    """A stale reduction, and the plan by which it is made anew."""

    def __init__(self, old: Stale, source: LabSource, plans: Mapping[str, Plan]) -> None:
        self.document = source.reduction(old.reduction)
        self.plan = _newest(plans.get(old.plan), self.document.plan)
        self.key = f"{old.sweep}@{old.plan}"

    def below(self) -> set[str]:
        """Return names of plans that it rested on, or may rest on now."""
        used = {parse_address(each.address).plan for each in self.document.inputs}
        return {need.plan for need in self.plan.needs.values()} | {name for name in used if name is not None}


def _hindrance(
    reading: EffectiveSource, document: ReductionDocument, plan: Plan, failed: set[str]
) -> BadRequest | None:
    """Why a reduction cannot be made anew at all: its plan is withdrawn, or what it rests on could not be made anew."""
    if plan.address in reading.withdrawn:
        return BadRequest(f"plan {plan.address} is withdrawn: {reading.withdrawn[plan.address]}")
    for entry in document.inputs:
        parsed = parse_address(entry.address)
        if f"{parsed.sweep}@{parsed.plan}" in failed:
            return BadRequest(
                f"it rests on {parsed.reduction}, which is stale and could not be made anew",
                remedy="see why that one could not; this one stays as it is, stale",
            )
    return None


def _newest(current: Plan | None, recorded: Plan) -> Plan:
    return recorded if current is None or current.revision < recorded.revision else current


def _chosen(source: LabSource, every: list[Stale], cooldown: str | None) -> list[Stale]:
    if cooldown is None:
        return every
    head, _, sweep = cooldown.partition("/")
    if not source.index.sweeps(head, withdrawn=True):
        known = ", ".join(source.cooldowns()) or "none yet"
        raise UnknownAddress(f"there is no cooldown {head} in this archive", expected=f"one of: {known}")
    if sweep and not any(row.name == sweep for row in source.index.sweeps(head, withdrawn=True)):
        raise UnknownAddress(f"there is no sweep {cooldown} in this archive")
    by_address = {each.reduction: each for each in every}
    by_key = {(each.sweep, each.plan): each for each in every}
    wanted: dict[str, None] = {}
    waiting = [
        each for each in every if (each.sweep == cooldown if sweep else each.sweep.startswith(f"{head}/"))
    ]
    while waiting:
        each = waiting.pop()
        if each.reduction in wanted:
            continue
        wanted[each.reduction] = None
        for entry in source.reduction(each.reduction).inputs:
            parsed = parse_address(entry.address)
            below = by_address.get(parsed.reduction or "") or by_key.get(
                (parsed.sweep or "", parsed.plan or "")
            )
            if below is not None:
                waiting.append(below)
    return [each for each in every if each.reduction in wanted]


def _needs_now(old: str, plan: Plan, reading: EffectiveSource) -> dict[str, str | list[str]]:
    """For each need, the newest reduction of the sweep that served it before; needs that nothing serves are left open."""
    document = reading.reduction(old)
    found: dict[str, str | list[str]] = {}
    try:
        recorded = recorded_needs(document, reading)
    except BadRequest:
        recorded = {}
    for name, address in recorded.items():
        # A need of many is gathered anew, so that what came in meanwhile is taken along.
        if name not in plan.needs or not isinstance(address, str) or plan.needs[name].many:
            continue
        parsed = parse_address(address)
        newest = reading.reductions(parsed.plan or "", parsed.sweep or "")
        if newest and parsed.plan == plan.needs[name].plan:
            found[name] = newest[-1].address
    # Told or left out: an optional need of many that is not told would be taken for one that nothing served.
    try:
        every = gathered_reductions(plan, sweep_facts(reading, document.sweep), reading)
    except BadRequest:
        return found
    return found | {
        name: [each.address for each in many] for name, many in every.items() if plan.needs[name].optional
    }

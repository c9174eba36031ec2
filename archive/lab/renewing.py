"""Stale reductions made anew, those that others rest on first."""

from __future__ import annotations

from collections.abc import Callable
from datetime import datetime

from archive.errors import BadRequest, UnknownAddress
from archive.lab.effective import EffectiveSource
from archive.lab.outcomes import ReduceOutcome
from archive.lab.reducing import Seal, current_plans, reduce_one
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
    request: Request | None = None,
) -> list[ReduceOutcome]:
    """Stale reductions of a cooldown, or of all, carried out anew with the newest revisions that hold.

    Parameters
    ----------
    source : LabSource
    cooldown : str or None
        Name of a cooldown, or the address of a sweep; stale reductions that its own rest on are renewed with them.
    clock, seal, progress, request
        As in `archive.lab.reducing.reduce`.

    Notes
    -----
    A reduction rests afterwards on the reductions of the same sweeps as before, each in its newest number.
    """
    every = stale(source)
    chosen = _chosen(source, every, cooldown)
    plans = {plan.name: plan for plan in current_plans(source)}
    reading = EffectiveSource(source, newest=True)
    outcomes: list[ReduceOutcome] = []
    failed: set[str] = set()
    for number, each in enumerate(chosen, 1):
        progress(f"{each.sweep} by {each.plan} ({number} of {len(chosen)})")
        document = source.reduction(each.reduction)
        plan = _newest(plans.get(each.plan), document.plan)
        problem = _hindrance(reading, document, plan, failed)
        if problem is None:
            needs = _needs_now(reading, document, plan)
            outcomes.append(reduce_one(reading, each.sweep, plan, clock, seal, request, progress, needs))
        else:
            outcomes.append(ReduceOutcome(each.sweep, plan.address, problem=problem))
        if outcomes[-1].problem is not None:
            failed.add(f"{each.sweep}@{each.plan}")
    return outcomes


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


def _needs_now(
    reading: EffectiveSource, document: ReductionDocument, plan: Plan
) -> dict[str, str | list[str]]:
    """For each need, the newest reduction of the sweep that served it before; needs that nothing serves are left open."""
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

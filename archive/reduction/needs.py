"""Which other reductions a plan rests on, and what to say when one is missing."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from archive.errors import BadRequest
from archive.reduction.facts import SweepFacts
from archive.reduction.planning import applies, shipped_plans
from archive.reduction.source import Source
from schemas.lineage import AccessionDocument, ReductionDocument, SweepEntry
from schemas.plan import Need, Plan

__all__ = ["needed_reductions"]


def needed_reductions(
    plan: Plan, facts: SweepFacts, source: Source, given: Mapping[str, str] | None = None
) -> dict[str, ReductionDocument]:
    """Return the reduction that serves each need of a plan.

    Parameters
    ----------
    plan : Plan
    facts : SweepFacts
    source : Source
    given : mapping, optional
        Addresses of reductions to take, by the plan's name for the need; a replay gives them all.

    Returns
    -------
    dict
        The newest fitting reduction for each need; optional needs that nothing serves are left out.

    Raises
    ------
    BadRequest
        A need that nothing serves, with the command that makes it.
    """
    found: dict[str, ReductionDocument] = {}
    for name, need in plan.needs.items():
        if given is not None and name in given:
            found[name] = _given(source, plan, need, given[name])
            continue
        best = _newest(need, facts, source)
        if best is not None:
            found[name] = best
        elif not need.optional:
            raise _missing(plan, need, facts, source)
    return found


def _given(source: Source, plan: Plan, need: Need, address: str) -> ReductionDocument:
    document = source.reduction(address)
    if document.plan.name != need.plan:
        raise BadRequest(
            f"{address} is a reduction of plan {document.plan.name}",
            expected=f"one of plan {need.plan}, on which plan {plan.name} rests",
        )
    return document


def _newest(need: Need, facts: SweepFacts, source: Source) -> ReductionDocument | None:
    for group in _related(need, facts, source):
        documents = [document for address in group for document in source.reductions(need.plan, address)]
        if documents:
            return max(documents, key=lambda document: (document.end, document.address))
    return None


def _related(need: Need, facts: SweepFacts, source: Source) -> Iterator[list[str]]:
    """Yield groups of related sweeps, the nearest group first."""
    if need.relation == "same-sweep":
        yield [facts.address]
        return
    same = _same_sample if need.relation == "same-sample-any-cooldown" else _same
    same_elsewhere = _same_sample if need.relation == "same-sample-any-cooldown" else _same_name
    yield [
        f"{facts.cooldown}/{entry.name}"
        for entry in _sweeps(source.accessions(facts.cooldown))
        if same(entry, facts)
    ]
    if need.relation.endswith("-any-cooldown"):
        for cooldown in reversed(source.cooldowns()):
            if cooldown != facts.cooldown:
                yield [
                    f"{cooldown}/{entry.name}"
                    for entry in _sweeps(source.accessions(cooldown))
                    if same_elsewhere(entry, facts)
                ]


def _sweeps(accessions: list[AccessionDocument]) -> list[SweepEntry]:
    newest = {entry.name: entry for accession in accessions for entry in accession.sweeps}
    return [newest[name] for name in sorted(newest)]


def _same(entry: SweepEntry, facts: SweepFacts) -> bool:
    return entry.cell is not None and entry.cell == facts.entry.cell


def _same_name(entry: SweepEntry, facts: SweepFacts) -> bool:
    """Whether the cell is the same thing, in whatever revision it was described."""
    return _same_thing(facts.entry.cell, entry.cell)


def _same_sample(entry: SweepEntry, facts: SweepFacts) -> bool:
    """Whether the gas is the same, in whatever revision it was described; the cell may be another one."""
    return _same_thing(facts.entry.sample, entry.sample)


def _same_thing(here: str | None, there: str | None) -> bool:
    return here is not None and there is not None and here.partition(".r")[0] == there.partition(".r")[0]


def _missing(plan: Plan, need: Need, facts: SweepFacts, source: Source) -> BadRequest:
    cell = facts.entry.cell or "no cell"
    wanted = next((each for each in shipped_plans() if each.name == need.plan), None)
    candidates = [
        f"{facts.cooldown}/{entry.name}"
        for entry in _sweeps(source.accessions(facts.cooldown))
        if wanted is not None and _same(entry, facts) and applies(wanted, entry)
    ]
    if need.relation == "same-sweep":
        candidates = [facts.address]
    thing = "gas" if need.relation == "same-sample-any-cooldown" else "cell"
    remedy = (
        f"run `stillroom reduce {candidates[0]} --plan {need.plan}` first"
        if candidates
        else f"ingest a sweep that plan {need.plan} is for (same {thing}), and reduce it first"
    )
    return BadRequest(
        f"plan {plan.name} on {facts.address} rests on a reduction by plan {need.plan}, and there is none for {cell}",
        expected=f"a reduction by plan {need.plan} of a sweep related by {need.relation}",
        remedy=remedy,
    )

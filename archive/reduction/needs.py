"""Which other reductions a plan rests on, and what to say when one is missing."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

from archive.errors import BadRequest
from archive.reduction.facts import SweepFacts
from archive.reduction.planning import applies, shipped_plans
from archive.reduction.source import Source
from schemas.lineage import AccessionDocument, ReductionDocument, SweepEntry
from schemas.liquid import Liquid
from schemas.plan import Need, Plan

__all__ = ["NeedAddresses", "gathered_reductions", "needed_reductions"]

SAME_PRESSURE = 0.02
"""Share by which two pressures may differ and still be the same for bulk liquid (common practice, no source)."""

NeedAddresses = Mapping[str, str | Sequence[str]]
"""Addresses of reductions by the plan's name for a need; several for a need of many."""


def needed_reductions(
    plan: Plan, facts: SweepFacts, source: Source, given: NeedAddresses | None = None
) -> dict[str, ReductionDocument]:
    """Return the reduction that serves each need of a plan; needs of many are left to `gathered_reductions`.

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
        if need.many:
            continue
        if given is not None and name in given:
            (address,) = _addresses(given[name])
            found[name] = _given(source, plan, need, address)
            continue
        if given is not None and need.optional:
            # What a recorded reduction did without, its repetition does without, too.
            continue
        best = _newest(need, facts, source)
        if best is not None:
            found[name] = best
        elif not need.optional:
            raise _missing(plan, need, facts, source)
    return found


def gathered_reductions(
    plan: Plan, facts: SweepFacts, source: Source, given: NeedAddresses | None = None
) -> dict[str, tuple[ReductionDocument, ...]]:
    """Return the reductions that serve each need of many, in the order of cooldowns and sweeps.

    Parameters
    ----------
    plan, facts, source, given
        As in `needed_reductions`.

    Returns
    -------
    dict
        Of each related sweep the newest fitting reduction, if it has one of the outputs that the plan asks for; sweeps of
        later cooldowns are left out, and optional needs that nothing serves.

    Raises
    ------
    BadRequest
        A need that nothing serves, with the command that makes it.
    """
    found: dict[str, tuple[ReductionDocument, ...]] = {}
    cooldowns = source.cooldowns()
    for name, need in plan.needs.items():
        if not need.many:
            continue
        if given is not None and name in given:
            documents = [_given(source, plan, need, address) for address in _addresses(given[name])]
        elif given is not None and need.optional:
            continue
        else:
            documents = _newest_of_each(plan, name, need, facts, source)
        if documents:
            documents.sort(key=lambda each: (cooldowns.index(each.cooldown), each.sweep))
            found[name] = tuple(documents)
        elif not need.optional:
            raise _missing(plan, need, facts, source)
    return found


def _addresses(given: str | Sequence[str]) -> tuple[str, ...]:
    return (given,) if isinstance(given, str) else tuple(given)


def _newest_of_each(
    plan: Plan, name: str, need: Need, facts: SweepFacts, source: Source
) -> list[ReductionDocument]:
    """Return the newest reduction of every related sweep that has one of the outputs that the plan takes."""
    texts = (one for step in plan.step for text in step.take.values() for one in text.split(" | "))
    wanted = {text.partition("#")[2] for text in texts if text.startswith(f"need:{name}#")}
    known = source.cooldowns()
    so_far = set(known[: known.index(facts.cooldown) + 1])
    found = []
    for address in dict.fromkeys(each for group in _related(need, facts, source) for each in group):
        documents = source.reductions(need.plan, address)
        if address.partition("/")[0] in so_far and documents:
            newest = max(documents, key=lambda document: (document.end, document.address))
            if wanted & {output.name for output in newest.outputs}:
                found.append(newest)
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
    if need.relation == "same-dose":
        yield [
            f"{facts.cooldown}/{entry.name}"
            for entry in _sweeps(source.accessions(facts.cooldown))
            if _same(entry, facts) and _same_filling(entry, facts)
        ]
        return
    of_gas = need.relation in ("same-sample-any-cooldown", "same-liquid-any-cooldown")
    same = _same_sample if of_gas else _same
    same_elsewhere = _same_sample if of_gas else _same_name
    yield [
        f"{facts.cooldown}/{entry.name}"
        for entry in _of_liquid(need, facts, source.accessions(facts.cooldown))
        if same(entry, facts)
    ]
    if need.relation.endswith("-any-cooldown"):
        for cooldown in reversed(source.cooldowns()):
            if cooldown != facts.cooldown:
                yield [
                    f"{cooldown}/{entry.name}"
                    for entry in _of_liquid(need, facts, source.accessions(cooldown))
                    if same_elsewhere(entry, facts)
                ]


def _sweeps(accessions: list[AccessionDocument]) -> list[SweepEntry]:
    newest = {entry.name: entry for accession in accessions for entry in accession.sweeps}
    return [newest[name] for name in sorted(newest)]


def _of_liquid(need: Need, facts: SweepFacts, accessions: list[AccessionDocument]) -> list[SweepEntry]:
    """Return the sweeps; where the need is of the same liquid, those whose liquid was under the same pressure."""
    entries = _sweeps(accessions)
    if need.relation != "same-liquid-any-cooldown":
        return entries
    stated = {sweep.name: sweep.liquid for accession in accessions for sweep in accession.sheet.sweep}
    return [each for each in entries if _same_pressure(stated.get(each.name), facts.sweep.liquid)]


def _same_pressure(one: Liquid | None, other: Liquid | None) -> bool:
    """Whether both are at about the same pressure, or both at their own vapour pressure."""
    if one is None or other is None:
        return one is other
    return abs(one.pressure.si - other.pressure.si) <= SAME_PRESSURE * abs(other.pressure.si)


def _same(entry: SweepEntry, facts: SweepFacts) -> bool:
    return entry.cell is not None and entry.cell == facts.entry.cell


def _same_filling(entry: SweepEntry, facts: SweepFacts) -> bool:
    """Whether the same helium was in the cell: the same last dose, or none at all."""
    return (entry.after_dose, entry.empty_cell) == (facts.entry.after_dose, facts.entry.empty_cell)


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
    things = {"same-sample-any-cooldown": "gas", "same-liquid-any-cooldown": "gas at the same pressure"}
    thing = things.get(need.relation, "cell")
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

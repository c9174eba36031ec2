"""Reductions over a whole cooldown, their repetition, and the index made anew."""

from __future__ import annotations

import json
from collections import Counter
from collections.abc import Callable, Collection, Iterator
from datetime import datetime
from pathlib import Path

from archive.errors import BadRequest, DamagedFile, MissingFile, UnknownAddress
from archive.index import Entry, Index
from archive.lab.carrying import Seal, Task, counted, sealed, waves
from archive.lab.crew import Crew
from archive.lab.effective import EffectiveSource
from archive.lab.monte_carlo import repeated
from archive.lab.outcomes import ReduceOutcome, ReplayReport
from archive.lab.source import LabSource, document_of
from archive.reduction.added_plans import added_plans
from archive.reduction.monte_carlo import Request
from archive.reduction.planning import load_plan, plan_depth, plans_for, shipped_plans
from archive.reduction.replay import replay as repeat
from archive.store.durable import archive_lock
from archive.store.local import LocalStore
from archive.store.plain_text import plain_text
from schemas.address import parse_address
from schemas.plan import Plan

__all__ = ["current_plans", "plans", "rebuilt_index", "reduce", "replay"]

_LARGEST_PLAN = 5_000_000  # bytes, as for a sheet


def plans(source: LabSource) -> list[Plan]:
    """Shipped plans, those of this archive's reductions, and those of the laboratory's packages, by name and revision."""
    known = {plan.address: plan for plan in shipped_plans()}
    for own in source.own_plans():
        known.setdefault(own.address, own)
    for content in source.index.plans():
        plan = Plan.model_validate_json(json.dumps(content))
        known.setdefault(plan.address, plan)
    for added in added_plans():
        known.setdefault(added.address, added)
    return [known[address] for address in sorted(known)]


def current_plans(source: LabSource) -> list[Plan]:
    """The newest revision of each plan that is shipped, came in as a revision or is added; withdrawn ones are passed over.

    Raises
    ------
    BadRequest
        If a plan of the laboratory's packages is not what this archive knows under its name and revision.
    """
    withdrawn = {row.target for row in source.index.withdrawals()}
    best: dict[str, Plan] = {}
    for added in added_plans():
        _check_revision(source, added)
    for plan in [*shipped_plans(), *source.own_plans(), *added_plans()]:
        older = plan.name not in best or best[plan.name].revision < plan.revision
        if plan.address not in withdrawn and older:
            best[plan.name] = plan
    return [best[name] for name in sorted(best)]


def _chosen(source: LabSource, plan: str | Path | None) -> tuple[list[Plan], list[Plan]]:
    """Plans that may be carried out, and those that can serve needs."""
    known = current_plans(source)
    if plan is None:
        return known, known
    path = Path(plan)
    if path.suffix == ".toml":
        try:
            text = plain_text(path, at_most=_LARGEST_PLAN)
        except (OSError, UnicodeDecodeError) as error:
            raise BadRequest("the plan file cannot be read", file=str(path), found=str(error)) from None
        own = load_plan(text, file=str(path))
        _check_revision(source, own)
        return [own], [*known, own]
    withdrawn = {row.target: row.sentence() for row in source.index.withdrawals()}
    fitting = [each for each in plans(source) if str(plan) in (each.name, each.address)]
    kept = [each for each in fitting if each.address not in withdrawn]
    if fitting and not kept:
        raise BadRequest(f"plan {fitting[-1].address} is withdrawn: {withdrawn[fitting[-1].address]}")
    fitting = kept
    if not fitting:
        names = ", ".join(sorted({each.name for each in plans(source)}))
        raise BadRequest(
            f"there is no plan {plan}", expected=f"one of: {names}, or a file such as my-plan.toml"
        )
    return [max(fitting, key=lambda each: each.revision)], known


def _check_revision(source: LabSource, plan: Plan) -> None:
    """A plan that differs from the one known under the same name and revision is refused."""
    for other in plans(source):
        if other.address == plan.address and other != plan:
            raise BadRequest(
                f"another plan is known as {plan.address}",
                remedy=f"give yours another name, or revision {plan.revision + 1}",
            )


def reduce(
    source: LabSource,
    cooldown: str,
    *,
    plan: str | Path | None,
    sweep: str | None,
    clock: Callable[[], datetime],
    seal: Seal,
    progress: Callable[[str], None],
    crew: Crew,
    request: Request | None = None,
) -> list[ReduceOutcome]:
    """Plans carried out on the sweeps of a cooldown, each after what it rests on; see `Archive.reduce`."""
    if "/" in cooldown:
        cooldown, _, sweep = cooldown.partition("/")
    reading = EffectiveSource(source)
    rows = source.index.sweeps(cooldown)
    asked_for = cooldown if sweep is None else f"{cooldown}/{sweep.rpartition('/')[2]}"
    try:
        why = reading.why_withdrawn(asked_for)
    except ValueError:
        why = None  # what is no address is told below, as what is not here
    if why is not None:
        raise BadRequest(f"{asked_for} is withdrawn: {why}", remedy="what is withdrawn is not reduced")
    if not rows:
        known = ", ".join(source.cooldowns()) or "none yet"
        raise UnknownAddress(f"there is no cooldown {cooldown} in this archive", expected=f"one of: {known}")
    name = None if sweep is None else sweep.rpartition("/")[2]
    if name is not None and name not in {row.name for row in rows}:
        raise UnknownAddress(
            f"there is no sweep {cooldown}/{name}", expected=f"one of: {', '.join(row.name for row in rows)}"
        )
    allowed, known_plans = _chosen(source, plan)
    work: list[tuple[int, int, str, Plan]] = []
    closing: dict[tuple[str, str | None], str] = {}
    count: Counter[tuple[str, str | None]] = Counter()
    for position, row in enumerate(rows):
        document = reading.holding(cooldown, row.name)
        written = next(each for each in document.sheet.sweep if each.name == row.name)
        entry = next(each for each in document.sweeps if each.name == row.name)
        cell = None if entry.cell is None else source.find_record(entry.cell)
        substrate = None if entry.substrate is None else source.find_record(entry.substrate)
        fitting = plans_for(written, cell, substrate, allowed)
        work += [(plan_depth(each, known_plans), position, row.address, each) for each in fitting]
        closing |= {(each.name, row.cell): row.address for each in fitting}
        count.update((each.name, row.cell) for each in fitting)
    cells = {row.address: row.cell for row in rows}
    # A plan that sums up a cell's sweeps is carried out on the last of them where there are enough, unless it is asked for by name.
    asked = name is not None and plan is not None
    work = [
        item
        for item in work
        if (name is None or item[2] == f"{cooldown}/{name}")
        and (
            not item[3].applies.last
            or asked
            or (
                closing[key := (item[3].name, cells[item[2]])] == item[2]
                and count[key] >= item[3].applies.least
            )
        )
    ]
    if not work:
        raise BadRequest(
            f"no plan {'here ' if plan is None else ''}is for {'this sweep' if name else 'any sweep of ' + cooldown}",
            found="" if plan is None else str(plan),
            remedy="stillroom plans tells what each plan is for",
        )
    below = {
        each.name: {need.plan for need in each.needs.values()}
        for each in [*known_plans, *(item[3] for item in work)]
    }
    ordered = [(address, each) for _, _, address, each in sorted(work, key=lambda item: item[:3])]
    outcomes: list[ReduceOutcome] = []
    with counted(outcomes, len(ordered)), crew.at_work(reading) as hands:
        for wave in waves(ordered, name=lambda item: item[1].name, below=below):
            tasks = [Task(address, each, clock, request) for address, each in wave]
            for outcome in sealed(
                hands, tasks, seal=seal, progress=progress, already=len(outcomes), of=len(ordered)
            ):
                outcomes.append(outcome)  # noqa: PERF402 - counted while it grows
    return outcomes


def replay(source: LabSource, address: str, *, clock: Callable[[], datetime]) -> ReplayReport:
    """A reduction computed again from raw and compared with what was sealed."""
    document = source.reduction(parse_address(address).reduction or address)
    again = repeat(document, EffectiveSource(source, recorded=document), clock=clock)
    unequal = [each for each in again.differences if not each.equal]
    held = document.monte_carlo
    drawn = None if held is None else repeated(again.outcome, held) == held
    return ReplayReport(
        address=document.address,
        identical=not unequal and drawn is not False,
        monte_carlo_identical=drawn,
        outputs=len(again.differences),
        largest_difference={each.name: each.relative for each in unequal},
        shifts={each.name: each.in_uncertainties for each in unequal if each.in_uncertainties is not None},
        changed_inputs=again.changed_inputs,
        changed_software=again.changed_software,
    )


def rebuilt_index(
    root: Path, address: str, store: LocalStore, *, progress: Callable[[int, int, str], None] | None = None
) -> dict[str, int]:
    """Counts of an index made anew from the sealed files; see `Archive.rebuild_index`."""
    keys = store.keys()
    recorded: dict[str, tuple[str, int]] = {}

    def entries() -> Iterator[Entry]:
        for number, key in enumerate(sorted(keys, key=lambda key: ("@" in key, key))):
            if progress is not None:
                progress(number, len(keys), key)
            # A file that still has its recorded digest needs no second look inside.
            damage = store.verify(key, recorded.get(key, (None, 0))[0])
            if damage:
                raise DamagedFile(
                    f"a sealed file is damaged: {damage[0].what}; the index stays as it was",
                    file=key,
                    field=damage[0].dataset,
                    remedy="bring the file back from a copy, or move away what does not belong there; then rebuild "
                    "the index again",
                )
            sealed = store.describe(key)
            yield key, sealed.sha256, sealed.size, document_of(key, store.document(key))

    def rebuilt(index: Index) -> dict[str, int]:
        with index:
            recorded.update(index.sealed_files())
            _refuse_loss(recorded, keys)
            index.rebuild(entries())
            return index.statistics()

    with archive_lock(root):
        old = None
        try:
            old = Index.open(address)
            counts = rebuilt(old)
        except (DamagedFile, MissingFile) as error:
            _refuse_loss(recorded, keys)
            # Every sealed file is read once before the old index is moved, so that a damaged one changes nothing.
            for _ in entries():
                pass
            if isinstance(error, DamagedFile) or old is not None:
                Index.set_aside(address)
            counts = rebuilt(Index.create(address))
    if progress is not None:
        progress(len(keys), len(keys), "")
    return counts


def _refuse_loss(recorded: Collection[str], keys: Collection[str]) -> None:
    """Refuse to forget a sealed file that the old index records and that is gone: the index is all that tells of it."""
    lost = sorted(set(recorded) - set(keys))
    if lost:
        raise MissingFile(
            "a sealed file that the index records is missing; the index stays as it was",
            file=lost[0],
            found=f"{len(lost)} missing",
            remedy="bring it back from a copy; if it is lost for good, move the old index to where it is kept, then "
            "rebuild the index again",
        )

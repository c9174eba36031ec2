"""Which reductions rest on something that is read otherwise now, and what that is."""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass, field

from archive.errors import UnknownAddress
from archive.index import InputRow, ReductionRow
from archive.lab.reducing import current_plans
from archive.lab.repeating import repeats
from archive.lab.revisions import Revisions
from archive.lab.source import LabSource
from schemas.acts import AmendmentDocument, RevisionDocument
from schemas.address import parse_address

__all__ = ["Stale", "StaleReason", "newly_stale", "stale"]


@dataclass(frozen=True)
class StaleReason:
    """One thing that a reduction rests on and that is read otherwise now.

    Attributes
    ----------
    kind : str
        `record`, `plan`, `accession`, `amendment`, `reduction` or `withdrawn`.
    used : str
        Address of what was used; empty where an amendment came in addition.
    now : str or None
        Address of what is to be used now, if there is something.
    text : str
        The same in words.
    """

    kind: str
    used: str
    now: str | None
    text: str


@dataclass(frozen=True)
class Stale:
    """A current reduction that would be another one now."""

    reduction: str
    sweep: str
    plan: str
    reasons: tuple[StaleReason, ...] = field(default=())


def stale(
    source: LabSource,
    *,
    cooldown: str | None = None,
    extra: RevisionDocument | AmendmentDocument | None = None,
) -> list[Stale]:
    """Current reductions that rest on something read otherwise now, those that others rest on first.

    Parameters
    ----------
    source : LabSource
    cooldown : str, optional
        Only reductions of this cooldown.
    extra : RevisionDocument or AmendmentDocument, optional
        An act that is not sealed, to see what it would do.

    Raises
    ------
    UnknownAddress
        If there is no such cooldown.
    """
    if cooldown is not None and cooldown not in (names := source.cooldowns()):
        raise UnknownAddress(
            f"there is no cooldown {cooldown} in this archive",
            expected=f"one of: {', '.join(names) or 'none yet'}",
        )
    known = _Known(source, extra)
    reasons: dict[str, list[StaleReason]] = {}
    # What rests on a stale reduction is stale, too; the rows are gone through until nothing is added.
    found = -1
    while found != len(reasons):
        found = len(reasons)
        for row in known.rows:
            if said := known.reasons(row, reasons):
                reasons[row.address] = said
    ordered = _ordered([row for row in known.rows if row.address in reasons], known)
    return [
        Stale(row.address, row.sweep, row.plan, tuple(reasons[row.address]))
        for row in ordered
        if cooldown is None or row.cooldown == cooldown
    ]


def newly_stale(source: LabSource, extra: RevisionDocument | AmendmentDocument) -> list[Stale]:
    """Reductions that an act not yet sealed makes stale, and that are not so already, with the new reasons."""
    before = {each.reduction: set(each.reasons) for each in stale(source)}
    found = []
    for each in stale(source, extra=extra):
        new = tuple(reason for reason in each.reasons if reason not in before.get(each.reduction, set()))
        if new:
            found.append(Stale(each.reduction, each.sweep, each.plan, new))
    return found


class _Known:
    """What has to be known of all reductions at once, asked for once."""

    def __init__(self, source: LabSource, extra: RevisionDocument | AmendmentDocument | None) -> None:
        index = source.index
        self._source = source
        self._compared: dict[tuple[str, str, str], bool] = {}
        self.rows = index.reductions(newest_only=True)
        self.newest = {(row.sweep, row.plan): row.address for row in self.rows}
        self.inputs: dict[str, list[InputRow]] = defaultdict(list)
        for each in index.current_inputs():
            self.inputs[each.reduction].append(each)
        self.made_from = {
            each.address: str(each.content["made_from"])
            for each in index.records(kind="calibration")
            if each.content.get("made_from")
        }
        self.holders = index.sweep_holders()
        self.borne = dict(index.amended_sweeps())
        self.plans = {plan.name: plan for plan in current_plans(source)}
        revision = extra if isinstance(extra, RevisionDocument) else None
        self.revisions = Revisions(source, newest=True, extra=revision)
        self.withdrawn = self.revisions.withdrawn
        if isinstance(extra, AmendmentDocument):
            for sweep in extra.sweeps:
                self.borne[sweep] = (*self.borne.get(sweep, ()), extra.address)
        self.plan_revisions = {name: plan.revision for name, plan in self.plans.items()}
        if revision is not None and revision.kind == "plan":
            name = revision.address.partition(".r")[0]
            number = parse_address(revision.address).number or 0
            self.plan_revisions[name] = max(self.plan_revisions.get(name, 0), number)

    def reasons(self, row: ReductionRow, stale_now: dict[str, list[StaleReason]]) -> list[StaleReason]:
        """Why a reduction is stale; nothing if it is not."""
        found: list[StaleReason] = [*self._plan(row), *self._amendments(row)]
        for each in self.inputs[row.address]:
            parsed = parse_address(each.address)
            if parsed.kind == "record":
                found += [
                    *self._record(row, each.address),
                    *self._origin(each.address, stale_now),
                ]
            elif each.role == "accession":
                found += self._accession(row, each.address)
            elif parsed.reduction is not None:
                found += self._reduction(parsed.reduction, stale_now, parsed.part)
        return list(dict.fromkeys(found))

    def _plan(self, row: ReductionRow) -> list[StaleReason]:
        newest = self.plan_revisions.get(row.plan)
        number = parse_address(row.plan_address).number or 0
        if newest is None or newest <= number:
            return self._gone(row.plan_address)
        now = f"{row.plan}.r{newest}"
        return [StaleReason("plan", row.plan_address, now, f"plan {row.plan_address} became {now}")]

    def _gone(self, address: str) -> list[StaleReason]:
        if address not in self.withdrawn:
            return []
        why = f"{address} is withdrawn: {self.withdrawn[address]}"
        return [StaleReason("withdrawn", address, None, why)]

    def _amendments(self, row: ReductionRow) -> list[StaleReason]:
        used = {each.address for each in self.inputs[row.address] if each.role == "amendment"}
        bearing = self.borne.get(row.sweep, ())
        found = [
            StaleReason("amendment", "", each, f"amendment {each} bears on {row.sweep}")
            for each in bearing
            if each not in used
        ]
        return found + [reason for each in sorted(used) for reason in self._gone(each)]

    def _record(self, row: ReductionRow, address: str) -> list[StaleReason]:
        holding = self.revisions.holding(row.cooldown, address)
        if holding.address == address:
            return self._gone(address)
        because = holding.because or f"{holding.address} holds now"
        return [StaleReason("record", address, holding.address, because)]

    def _origin(self, address: str, stale_now: dict[str, list[StaleReason]]) -> list[StaleReason]:
        """Why the reduction that a calibration was made from is another one now."""
        made_from = self.made_from.get(address)
        if made_from is None:
            return []
        return [
            StaleReason(each.kind, address, None, f"calibration {address} was made from it: {each.text}")
            for each in self._reduction(made_from, stale_now)
        ]

    def _accession(self, row: ReductionRow, address: str) -> list[StaleReason]:
        gone, now = self._gone(address), self.holders.get(row.sweep)
        if gone or now in (None, address):
            return gone
        return [StaleReason("accession", address, now, f"{now} holds {row.sweep} anew")]

    def _reduction(
        self, address: str, stale_now: dict[str, list[StaleReason]], output: str | None = None
    ) -> list[StaleReason]:
        parsed = parse_address(address)
        now = self.newest.get((parsed.sweep or "", parsed.plan or ""))
        if now is not None and now != address:
            if address in self.withdrawn or not self._repeats(address, now, output):
                return [StaleReason("reduction", address, now, f"{address} became {now}")]
            address = now
        if now is None:
            return [StaleReason("withdrawn", address, None, f"{address} does not count any more")]
        if address in stale_now:
            return [StaleReason("reduction", address, None, f"{address}, on which it rests, is stale")]
        return []

    def _repeats(self, old: str, now: str, output: str | None) -> bool:
        """Whether a newer reduction gave to the bit what was taken from an older one, uncertainties and what they share too."""
        if output is None:
            return False
        if (old, now, output) not in self._compared:
            self._compared[old, now, output] = repeats(self._source, old, now, output)
        return self._compared[old, now, output]


def _ordered(rows: list[ReductionRow], known: _Known) -> list[ReductionRow]:
    """Rows such that what others rest on comes first; else by sweep and plan."""
    by_address = {row.address: row for row in rows}
    by_key = {(row.sweep, row.plan): row for row in rows}
    done: dict[str, ReductionRow] = {}

    def add(row: ReductionRow) -> None:
        if row.address in done or row.address in waiting:
            return
        waiting.add(row.address)
        for each in known.inputs[row.address]:
            parsed = parse_address(each.address)
            below = by_address.get(parsed.reduction or "") or by_key.get(
                (parsed.sweep or "", parsed.plan or "")
            )
            if below is not None:
                add(below)
        done[row.address] = row

    waiting: set[str] = set()
    for row in rows:
        add(row)
    return list(done.values())

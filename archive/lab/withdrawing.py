"""Withdrawing: something is marked as not to be used any more, and why; nothing is taken away."""

from __future__ import annotations

from collections.abc import Callable
from datetime import datetime

from archive.errors import BadRequest, UnknownAddress
from archive.index import WithdrawalRow
from archive.lab.act_outcomes import WithdrawOutcome
from archive.lab.amending import sequence_of
from archive.lab.effective import EffectiveSource
from archive.lab.journaling import acting_role
from archive.lab.reducing import plans
from archive.lab.source import LabSource, key_of
from archive.reduction.software import software
from schemas.acts import AmendmentDocument, WithdrawalDocument
from schemas.address import Address, parse_address
from schemas.lineage import SweepEntry

__all__ = ["withdraw"]

Seal = Callable[[WithdrawalDocument], None]

_INSTEAD = {
    "output": "withdraw the reduction that gave it",
    "channel": "amend the cooldown with use = false and why_not for that channel, or withdraw the sweep",
    "raw": "withdraw the accession that it came in with",
}
_SHORTEST = 8


def withdraw(
    source: LabSource,
    text: str,
    *,
    why: str,
    by: str | None,
    clock: Callable[[], datetime],
    seal: Seal,
) -> WithdrawOutcome:
    """Withdrawal of what an address names; see `Archive.withdraw`.

    Raises
    ------
    BadRequest
        If it is no thing that can be withdrawn, or is withdrawn already, or the reason or role is missing.
    UnknownAddress
        If the archive holds no such thing.
    """
    try:
        address = parse_address(text)
    except ValueError as error:
        raise BadRequest(str(error), field="ADDRESS") from None
    if len(why.strip()) < _SHORTEST:
        raise BadRequest("the reason is too short to help anybody later", field="--why", found=repr(why))
    role = (by or acting_role() or "").strip()
    if len(role) < 2:
        raise BadRequest(
            "it is not said by whom",
            field="--by",
            expected="a role, such as `data steward`",
            remedy="give --by ROLE, or set STILLROOM_ROLE",
        )
    _require(source, address)
    known = source.index.withdrawals(counting=False)
    held = next((row for row in known if row.target == text and row.counts), None)
    if held is not None:
        raise BadRequest(
            f"{text} is withdrawn already: {held.sentence()}",
            remedy=f"to take that back: stillroom withdraw {held.address}",
        )
    document = _document(source, address, known, why=why.strip(), by=role, made=clock())
    resting = _resting(source, text)
    seal(document)
    restored = None if address.kind != "withdrawal" else _target(known, text)
    return WithdrawOutcome(document.address, text, resting if restored is None else (), restored)


def _document(
    source: LabSource, address: Address, known: list[WithdrawalRow], *, why: str, by: str, made: datetime
) -> WithdrawalDocument:
    outside = address.kind == "record" or address.revision is not None
    head = address.text.rpartition(".w")[0] if address.revision is not None else address.text
    prefix = f"{head if outside else address.head}.w"
    number = 1 + sum(row.address.startswith(prefix) for row in known)
    cooldown = None if outside else address.head
    accessions = [] if cooldown is None else source.accessions(cooldown)
    return WithdrawalDocument(
        format="stillroom-withdrawal/1",
        address=f"{prefix}{number}",
        target=address.text,
        cooldown=cooldown,
        number=number,
        sequence=number if cooldown is None else sequence_of(source, cooldown),
        rests_on=accessions[-1].address if accessions else None,
        why=why,
        by=by,
        made=made,
        entries=_entries(source, address, known),
        software=software(),
    )


def _require(source: LabSource, address: Address) -> None:
    """Refuse what is not there, and what cannot be withdrawn."""
    if address.kind in _INSTEAD:
        raise BadRequest(f"a {address.kind} is not withdrawn by itself", remedy=_INSTEAD[address.kind])
    match address.kind:
        case "name" if not source.index.accessions(address.head):
            if source.index.records(name=address.head):
                raise BadRequest(
                    f"{address.text} has revisions, and one of them is withdrawn, not all",
                    remedy=f"name the revision, such as {address.text}.r1",
                )
            raise UnknownAddress(f"there is no cooldown {address.text} in this archive")
        case "item":
            _require_sweep(source, address)
        case "reduction":
            source.reduction(address.text)
        case "record":
            rows = source.index.records(name=address.text)
            if not rows and address.text not in {plan.address for plan in plans(source)}:
                raise UnknownAddress(f"there is no record or plan {address.text} in this archive")
        case "accession" | "amendment" | "withdrawal":
            if not source.store.contains(key_of(address.text)):
                raise UnknownAddress(f"there is no {address.kind} {address.text} in this archive")
            _require_first_level(source, address)


def _require_sweep(source: LabSource, address: Address) -> None:
    for accession in source.accessions(address.head):
        if any(dose.name == address.item for dose in accession.doses):
            raise BadRequest(
                f"{address.text} is a dose, and a dose is not withdrawn",
                remedy="amend the cooldown: the dose's `crossed_out` says why it does not count",
            )
    source.holding(address.head, address.item or "")


def _require_first_level(source: LabSource, address: Address) -> None:
    if address.kind != "withdrawal":
        return
    target = _target(source.index.withdrawals(counting=False), address.text)
    if target is not None and parse_address(target).kind == "withdrawal":
        raise BadRequest(
            f"{address.text} took the withdrawal {target} back, and that cannot be taken back again",
            remedy="withdraw the thing itself anew",
        )


def _target(known: list[WithdrawalRow], address: str) -> str | None:
    return next((row.target for row in known if row.address == address), None)


def _resting(source: LabSource, text: str) -> tuple[str, ...]:
    """Reductions that rest on a thing, however far down."""
    found: dict[str, None] = {}
    waiting = [text]
    while waiting:
        for address in source.index.resting_on(waiting.pop()):
            if address not in found:
                found[address] = None
                waiting.append(address)
    return tuple(sorted(found))


def _entries(source: LabSource, address: Address, known: list[WithdrawalRow]) -> tuple[SweepEntry, ...]:
    """How sweeps are found from now on, where an amendment is withdrawn or counts again."""
    target = address.text if address.kind == "amendment" else _target(known, address.text)
    if target is None or parse_address(target).kind != "amendment":
        return ()
    amendment = source.document(key_of(target))
    if not isinstance(amendment, AmendmentDocument):
        return ()
    back = address.kind == "withdrawal"
    reading = EffectiveSource(
        source, extra=amendment if back else None, passed_over=frozenset() if back else frozenset({target})
    )
    holders = {
        entry.name: entry
        for accession in reading.accessions(amendment.cooldown)
        for entry in accession.sweeps
    }
    names = [sweep.partition("/")[2] for sweep in amendment.sweeps]
    return tuple(holders[name] for name in names if name in holders)

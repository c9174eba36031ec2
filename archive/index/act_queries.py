"""Every SELECT on revisions, amendments and withdrawals."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache, lru_cache

from sqlalchemy import and_, bindparam, or_, select

from archive.index.act_tables import Amendment, AmendmentSweep, ReplacedRecord, Revision, Withdrawal
from archive.index.conditions import part_of
from archive.index.found import newest_reduction, withdrawal_counts, withdrawn
from archive.index.queries import Query
from archive.index.tables import Reduction, ReductionInput
from schemas.address import parse_address

__all__ = [
    "amendments",
    "amendments_of_sweeps",
    "inputs",
    "newest_among",
    "replaced_records",
    "resting_on",
    "revisions",
    "withdrawals",
]


@cache
def withdrawals(*, counting: bool) -> Query:
    """Withdrawals by target and number; only those that were not themselves withdrawn, or all."""
    found = select(
        Withdrawal.address,
        Withdrawal.key,
        Withdrawal.target,
        Withdrawal.cooldown,
        Withdrawal.number,
        Withdrawal.why,
        Withdrawal.by,
        Withdrawal.made,
        withdrawal_counts().label("counts"),
    ).order_by(Withdrawal.target, Withdrawal.number, Withdrawal.address)
    return found.where(withdrawal_counts()) if counting else found


@lru_cache(maxsize=64)
def amendments(cooldown: str | None) -> Query:
    """Amendments by cooldown and number; `counts` when not withdrawn."""
    found = select(
        Amendment.address,
        Amendment.key,
        Amendment.cooldown,
        Amendment.number,
        Amendment.because,
        Amendment.by,
        Amendment.made,
        (~withdrawn(Amendment.address)).label("counts"),
    ).order_by(Amendment.cooldown, Amendment.number)
    return found if cooldown is None else found.where(Amendment.cooldown == cooldown)


@cache
def amendments_of_sweeps(*, some: bool = False) -> Query:
    """Sweep and amendment, for each that counts, by sweep and number; of the sweeps `addresses` only if `some`."""
    found = (
        select(AmendmentSweep.sweep, AmendmentSweep.amendment)
        .join(Amendment, Amendment.address == AmendmentSweep.amendment)
        .where(~withdrawn(Amendment.address))
        .order_by(AmendmentSweep.sweep, Amendment.number)
    )
    return found.where(AmendmentSweep.sweep.in_(bindparam("addresses", expanding=True))) if some else found


@lru_cache(maxsize=64)
def revisions(name: str | None) -> Query:
    """Revisions that came in outside a cooldown, by name and number; `counts` when not withdrawn."""
    found = select(
        Revision.address,
        Revision.key,
        Revision.kind,
        Revision.name,
        Revision.revision,
        Revision.digest,
        Revision.supersedes,
        Revision.because,
        Revision.by,
        Revision.made,
        (~withdrawn(Revision.address)).label("counts"),
    ).order_by(Revision.kind, Revision.name, Revision.revision)
    return found if name is None else found.where(Revision.name == name)


@lru_cache(maxsize=64)
def replaced_records(cooldown: str | None = None) -> Query:
    """What the current reductions took in place of what the sheet names, the newest reduction last."""
    found = (
        select(
            Reduction.cooldown, ReplacedRecord.reduction, ReplacedRecord.instead_of, ReplacedRecord.address
        )
        .join(Reduction, Reduction.address == ReplacedRecord.reduction)
        .where(newest_reduction())
        .order_by(Reduction.cooldown, Reduction.end, ReplacedRecord.reduction, ReplacedRecord.instead_of)
    )
    return found if cooldown is None else found.where(Reduction.cooldown == cooldown)


@cache
def inputs() -> Query:
    """Inputs of the current reductions, by reduction and place."""
    return (
        select(ReductionInput.reduction, ReductionInput.address, ReductionInput.role, ReductionInput.digest)
        .join(Reduction, Reduction.address == ReductionInput.reduction)
        .where(newest_reduction())
        .order_by(ReductionInput.reduction, ReductionInput.position)
    )


def resting_on(address: str) -> Query:
    """Reductions that took something from an address or a part of it, or followed it if it is a plan."""
    parsed = parse_address(address)
    column = ReductionInput.address
    condition = part_of(column, address)
    if parsed.kind == "item":
        # "A" follows "@" in the order of bytes: what was made of a sweep.
        condition = or_(condition, and_(column >= f"{address}@", column < f"{address}A"))
    elif parsed.kind == "name":
        # "/" follows "." and "0" follows "/": everything of a cooldown.
        condition = and_(column >= f"{address}.", column < f"{address}0")
    # A set made once; asked for each reduction anew it would be gone through as often as there are reductions.
    took = Reduction.address.in_(select(ReductionInput.reduction).where(condition))
    return (
        select(Reduction.address)
        .where(or_(took, Reduction.plan_address == address) if parsed.kind == "record" else took)
        .order_by(Reduction.address)
    )


def newest_among(addresses: Sequence[str]) -> Query:
    """Those of some reductions that are current."""
    return (
        select(Reduction.sweep, Reduction.address)
        .where(newest_reduction(), Reduction.address.in_(addresses))
        .order_by(Reduction.sweep, Reduction.address)
    )

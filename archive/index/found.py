"""Sweeps as they are found: with the values that amendments left, and without what is withdrawn.

Rules: an act bears on the accession that was the newest when it was made and on older ones; a later accession of the same
sweep has the last word in a search. A withdrawal counts unless it was itself withdrawn. Conditions are built once: building one costs
more than asking a small archive.
"""

from __future__ import annotations

from functools import cache
from typing import Any

from sqlalchemy import ColumnElement, and_, case, exists, or_
from sqlalchemy.orm import aliased

from archive.index.act_tables import AmendedSweep, Withdrawal
from archive.index.tables import Reduction, Sweep

__all__ = [
    "column_found",
    "last_amended",
    "newest_reduction",
    "newest_sweep",
    "withdrawal_counts",
    "withdrawn",
    "withdrawn_reduction",
]


@cache
def withdrawal_counts() -> ColumnElement[bool]:
    """Whether a row of `withdrawal` is not itself withdrawn."""
    back = aliased(Withdrawal)
    return ~exists().where(back.target == Withdrawal.address)


def withdrawn(*addresses: Any) -> ColumnElement[bool]:
    """Whether one of some columns holds the address of something withdrawn."""
    said, back = aliased(Withdrawal), aliased(Withdrawal)
    return exists().where(
        or_(*(said.target == address for address in addresses)),
        ~exists().where(back.target == said.address),
    )


@cache
def newest_sweep(*, withdrawn_too: bool = False) -> ColumnElement[bool]:
    """Whether a row of `sweep` is held by the newest accession that has that sweep.

    Parameters
    ----------
    withdrawn_too : bool
        False: withdrawn accessions, cooldowns and sweeps are as if they were not there.
    """
    later = aliased(Sweep)
    if withdrawn_too:
        return ~exists().where(later.address == Sweep.address, later.number > Sweep.number)
    return and_(
        ~exists().where(
            later.address == Sweep.address, later.number > Sweep.number, ~withdrawn(later.accession)
        ),
        ~withdrawn(Sweep.accession, Sweep.address, Sweep.cooldown),
    )


@cache
def withdrawn_reduction() -> ColumnElement[bool]:
    """Whether a reduction is withdrawn, by itself or with its sweep or cooldown."""
    return withdrawn(Reduction.address, Reduction.sweep, Reduction.cooldown)


@cache
def newest_reduction() -> ColumnElement[bool]:
    """Whether a reduction counts, no later one of this plan on this sweep does, and none that does supersedes it."""
    later, replacing = aliased(Reduction), aliased(Reduction)
    return and_(
        ~exists().where(
            later.sweep == Reduction.sweep,
            later.plan == Reduction.plan,
            later.number > Reduction.number,
            ~withdrawn(later.address),
        ),
        ~exists().where(replacing.supersedes == Reduction.address, ~withdrawn(replacing.address)),
        ~withdrawn_reduction(),
    )


@cache
def last_amended() -> ColumnElement[bool]:
    """Whether a row of `amended_sweep` says how a row of `sweep` is found; to join the two by."""
    later = aliased(AmendedSweep)
    return and_(
        AmendedSweep.sweep == Sweep.address,
        AmendedSweep.number >= Sweep.number,
        ~exists().where(later.sweep == AmendedSweep.sweep, later.sequence > AmendedSweep.sequence),
    )


def column_found(name: str, *, amended: bool) -> Any:
    """Column of a sweep by its name in `sweep`, with the amended value in its place where there is one.

    Parameters
    ----------
    name : str
    amended : bool
        Whether anything is amended at all: without, the plain column can use its index.
    """
    plain = getattr(Sweep, name)
    over = getattr(AmendedSweep, name, None)
    if not amended or over is None or name in ("sweep", "number"):
        return plain
    return case((AmendedSweep.act.is_not(None), over), else_=plain)

"""The SELECTs of a life story: what was found of a long-lived thing, in which cooldowns it was used, what rests on it.

The rules are those of `archive.index.queries`.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Final, Literal

from sqlalchemy import and_, func, or_, select

from archive.index.act_tables import AmendedSweep
from archive.index.conditions import named, part_of
from archive.index.found import (
    column_found,
    last_amended,
    newest_reduction,
    newest_sweep,
    withdrawn_reduction,
)
from archive.index.queries import Query
from archive.index.tables import Channel, Output, Reduction, ReductionInput, Sweep, SweepThermometer

__all__ = ["Role", "life_results", "resting_reductions", "uses"]

Role = Literal["cell", "substrate", "sample", "thermometer", "calibration"]
"""As what a sweep names a thing."""

_OF_CHANNELS: Final[dict[str, tuple[Any, Any]]] = {
    "thermometer": (SweepThermometer, SweepThermometer.thermometer),
    "calibration": (Channel, Channel.calibration),
}
"""What a sweep has several of: the table, and its column."""


def life_results(
    role: Literal["cell", "substrate"], name: str, results: Sequence[str], *, amended: bool
) -> Query:
    """Headline results of some names that current reductions found of a cell's or a substrate's sweeps, in order of time."""
    column = column_found(role, amended=amended)
    found = (
        select(
            Output.reduction,
            Reduction.cooldown,
            Reduction.sweep,
            Output.name,
            Output.quantity,
            Output.unit,
            Output.description,
            Output.scale,
            Output.value,
            Output.uncertainty,
            Output.verdict,
            column.label("record"),
            Sweep.begin,
            Sweep.empty_cell,
        )
        .join(Reduction, Reduction.address == Output.reduction)
        .join(Sweep, Sweep.address == Reduction.sweep)
        .where(
            named(column, name),
            newest_sweep(),
            newest_reduction(),
            Output.rows.is_(None),
            Output.headline.is_not(None),
            Output.name.in_(results),
        )
        .order_by(Sweep.begin, Output.reduction, Output.position)
    )
    return found.outerjoin(AmendedSweep, last_amended()) if amended else found


def uses(role: Role, name: str, *, amended: bool) -> Query:
    """Cooldowns with the revisions that their sweeps name, how many sweeps do, and when these began and ended, in order of time."""
    table, column = _OF_CHANNELS.get(role, (None, None))
    if column is None:
        column = column_found(role, amended=amended)
    count = func.count(Sweep.address.distinct())
    begin, end = func.min(Sweep.begin, type_=Sweep.begin.type), func.max(Sweep.end, type_=Sweep.end.type)
    found = select(Sweep.cooldown, column, count, begin, end).select_from(Sweep)
    if table is not None:
        found = found.join(table, and_(table.accession == Sweep.accession, table.sweep == Sweep.name))
    elif amended:
        found = found.outerjoin(AmendedSweep, last_amended())
    return (
        found.where(named(column, name), newest_sweep())
        .group_by(Sweep.cooldown, column)
        .order_by(begin, Sweep.cooldown, column)
    )


def resting_reductions(address: str, most: int) -> Query:
    """Reductions that took a record, or followed it if it is a plan, whether each is current, and whether it is withdrawn."""
    took = Reduction.address.in_(
        select(ReductionInput.reduction).where(part_of(ReductionInput.address, address))
    )
    order = (Reduction.cooldown, Reduction.plan, Reduction.sweep, Reduction.number)
    # Whether one is current is asked of those alone that are told.
    told = select(Reduction.address).where(or_(took, Reduction.plan_address == address)).order_by(*order)
    return (
        select(
            Reduction.address,
            Reduction.cooldown,
            Reduction.plan,
            newest_reduction().label("newest"),
            withdrawn_reduction().label("withdrawn"),
        )
        .where(Reduction.address.in_(told.limit(most)))
        .order_by(*order)
    )

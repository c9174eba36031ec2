"""Every SELECT of lists of sweeps (what a search asks, with its sub-selects, is spelt in `archive.index.conditions`).

The rules are those of `archive.index.queries`.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from functools import cache, lru_cache
from typing import Any

from sqlalchemy import (
    ColumnElement,
    UnaryExpression,
    and_,
    bindparam,
    or_,
    select,
)
from sqlalchemy.sql.operators import custom_op

from archive.index.act_tables import AmendedSweep, Withdrawal
from archive.index.answers import SearchQuery, SweepRow
from archive.index.columns import REAL
from archive.index.conditions import search_conditions
from archive.index.found import (
    column_found,
    last_amended,
    newest_reduction,
    newest_sweep,
)
from archive.index.queries import Query
from archive.index.tables import (
    Channel,
    Output,
    Reduction,
    Sweep,
    SweepThermometer,
)

__all__ = [
    "SORTS",
    "anything_amended",
    "anything_withdrawn",
    "channel_names",
    "many",
    "search",
    "sweep_results",
    "sweeps",
    "thermometers",
    "walked",
    "walks",
]

_BUILT = 512  # statements kept, since building one costs more than asking a small archive

_SWEEP = {
    **{
        name: name
        for name in ("address", "cooldown", "name", "kind", "accession", "cell", "substrate", "sample")
    },
    **{name: name for name in ("empty_cell", "after_dose", "begin", "end", "direction", "rows")},
    "coverage": "coverage_mol_per_m2",
    "coverage_uncertainty": "coverage_uncertainty_mol_per_m2",
    "temperature_low": "temperature_low_K",
    "temperature_high": "temperature_high_K",
    "scale": "scale",
}
"""What a list of sweeps shows, and the column of `sweep` that holds it."""

SORTS: dict[str, tuple[str, ...]] = {
    "date": ("begin",),
    "coverage": ("coverage_mol_per_m2", "begin"),
    "temperature": ("temperature_low_K", "temperature_high_K"),
    "cell": ("cell", "coverage_mol_per_m2", "begin"),
    "name": ("cooldown", "name"),
}
"""Columns of each order that a search can have."""


def _sweeps(*, amended: bool) -> Query:
    columns = (column_found(name, amended=amended).label(label) for label, name in _SWEEP.items())
    found = select(*columns)
    return found.outerjoin(AmendedSweep, last_amended()) if amended else found


def search(query: SearchQuery, *, amended: bool = False, last: SweepRow | None = None) -> Query:
    """Sweeps that satisfy a search.

    Parameters
    ----------
    query : SearchQuery
    amended : bool
        Whether anything is amended at all.
    last : SweepRow, optional
        The sweep behind which the answer begins.
    """
    order: list[Any] = []
    for name in SORTS[query.sort]:
        column = column_found(name, amended=amended)
        # The engines disagree on where NULL sorts: said outright, it is last.
        order += [column.is_(None), column.desc() if query.descending else column.asc()]
    conditions = search_conditions(query, amended=amended)
    found = _sweeps(amended=amended).where(*conditions).order_by(*order, Sweep.address)
    if last is not None:
        found = found.where(_behind(query, last, amended=amended))
    # SQLite has no offset without a limit; SQLAlchemy then writes the limit -1.
    return found.limit(query.limit).offset(query.offset or None)


_MANY = 1_000


def walks(query: SearchQuery) -> bool:
    """Whether a search is for a cell, and perhaps a window of coverage, by date: then `walked` may be the shorter way."""
    free = SearchQuery(
        cell=query.cell,
        coverage=query.coverage,
        descending=query.descending,
        limit=query.limit,
        offset=query.offset,
        after=query.after,
        withdrawn=query.withdrawn,
    )
    one_cell = query.cell is not None and "." in query.cell
    return query == free and one_cell and query.limit is not None and query.limit + query.offset <= _MANY // 2


def many(query: SearchQuery) -> Query:
    """Return one row if very many sweeps lie in the cell and the window of a search; no more of them are looked at than that."""
    found = select(Sweep.coverage_mol_per_m2).where(
        Sweep.cell == query.cell, *_window(query, Sweep.coverage_mol_per_m2)
    )
    return found.limit(1).offset(_MANY - 1)


def _window(query: SearchQuery, column: Any) -> Iterator[ColumnElement[bool]]:
    low, high = query.coverage or (None, None)
    if query.coverage is not None:
        yield column.is_not(None)
    if low is not None:
        yield column >= low
    if high is not None:
        yield column <= high


def walked(query: SearchQuery, *, last: SweepRow | None = None) -> Query:
    """Sweeps that satisfy a search and have a date, found by going through their cell by date.

    Notes
    -----
    Short where very many sweeps satisfy it: sorting all of them to show fifty takes longer than meeting fifty on the way. SQLite cannot
    know how many that are, and would go by coverage; the sign before the column, which changes no value, keeps it from that.
    """
    order = Sweep.begin.desc() if query.descending else Sweep.begin.asc()
    unindexed = UnaryExpression(Sweep.coverage_mol_per_m2.expression, operator=custom_op("+"), type_=REAL)
    conditions = search_conditions(replace(query, coverage=None), amended=False)
    found = _sweeps(amended=False).where(*conditions, *_window(query, unindexed), Sweep.begin.is_not(None))
    if last is not None:
        found = found.where(_behind(query, last, amended=False))
    return found.order_by(order, Sweep.address).limit(query.limit).offset(query.offset or None)


def _behind(query: SearchQuery, last: SweepRow, *, amended: bool) -> ColumnElement[bool]:
    """Whether a sweep stands behind another in the order of a search: by the first column in which the two differ."""
    shown = {column: label for label, column in _SWEEP.items()}
    behind: ColumnElement[bool] = Sweep.address > last.address
    for name in reversed(SORTS[query.sort]):
        column = column_found(name, amended=amended)
        value = getattr(last, shown[name])
        if value is None:
            # It stands among those without a value, which come last.
            behind = and_(column.is_(None), behind)
            continue
        further = column < value if query.descending else column > value
        behind = or_(further, column.is_(None), and_(column == value, behind))
    return behind


@lru_cache(maxsize=_BUILT)
def sweeps(
    *,
    cooldown: str | None = None,
    address: str | None = None,
    accession: str | None = None,
    amended: bool = False,
    withdrawn_too: bool = False,
) -> Query:
    """Sweeps of a cooldown, or one sweep, in the newest version; or all sweeps as one accession holds them."""
    if accession is not None:
        return _sweeps(amended=False).where(Sweep.accession == accession).order_by(Sweep.address)
    found = _sweeps(amended=amended).order_by(Sweep.address)
    found = found.where(newest_sweep(withdrawn_too=withdrawn_too))
    if cooldown is not None:
        found = found.where(Sweep.cooldown == cooldown)
    return found if address is None else found.where(Sweep.address == address)


@cache
def anything_amended() -> Query:
    """One row if any sweep is amended."""
    return select(AmendedSweep.act).limit(1)


@cache
def anything_withdrawn() -> Query:
    """One row if anything was ever withdrawn."""
    return select(Withdrawal.address).limit(1)


@cache
def thermometers() -> Query:
    """Return accession, sweep and thermometer of the sweeps `addresses`, in all their versions."""
    return (
        select(Sweep.accession, Sweep.address, SweepThermometer.thermometer)
        .join(
            Sweep, and_(Sweep.accession == SweepThermometer.accession, Sweep.name == SweepThermometer.sweep)
        )
        .where(Sweep.address.in_(bindparam("addresses", expanding=True)))
        .order_by(Sweep.accession, Sweep.address, SweepThermometer.position)
    )


@cache
def channel_names() -> Query:
    """Return accession, sweep and channel of the sweeps `addresses`, in all their versions."""
    return (
        select(Sweep.accession, Sweep.address, Channel.name)
        .join(Sweep, and_(Sweep.accession == Channel.accession, Sweep.name == Channel.sweep))
        .where(Sweep.address.in_(bindparam("addresses", expanding=True)))
        .order_by(Sweep.accession, Sweep.address, Channel.position)
    )


@cache
def sweep_results() -> Query:
    """Results of the newest reductions of the sweeps `addresses`, headline ones first within a plan."""
    return (
        select(Reduction.sweep, Output.name, Output.value, Output.uncertainty, Output.unit, Output.verdict)
        .join(Output, Output.reduction == Reduction.address)
        .where(
            Reduction.sweep.in_(bindparam("addresses", expanding=True)),
            Output.rows.is_(None),
            newest_reduction(),
        )
        .order_by(
            Reduction.sweep, Output.headline.is_(None), Reduction.plan, Output.headline, Output.position
        )
    )

"""The SELECTs of the plane: columns only, so that a hundred thousand sweeps can be looked at.

The rules are those of `archive.index.queries`.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from functools import cache
from typing import Any

from sqlalchemy import ColumnElement, and_, exists, false, func, literal, or_, select, type_coerce, union

from archive.index.act_tables import AmendedSweep, Revision
from archive.index.answers import SearchQuery
from archive.index.columns import COUNT, TEXT
from archive.index.conditions import search_conditions
from archive.index.found import (
    column_found,
    last_amended,
    newest_reduction,
    newest_sweep,
    withdrawn,
    withdrawn_reduction,
)
from archive.index.queries import Query
from archive.index.tables import Channel, Dose, Output, Record, Reduction, SealedFile, Sweep

__all__ = [
    "cells_and_substrates",
    "dosed_spans",
    "plane_results",
    "plane_spans",
    "plane_sweeps",
    "record_contents",
    "sealed_count",
]

_COLUMNS: dict[str, Any] = {
    "address": None,
    "kind": None,
    "cell": None,
    "substrate": None,
    # As they are stored: a hundred thousand conversions take longer than the rest of the answer.
    "begin": TEXT,
    "empty_cell": COUNT,
    "coverage_mol_per_m2": None,
    "coverage_uncertainty_mol_per_m2": None,
    "temperature_low_K": None,
    "temperature_high_K": None,
}


def plane_sweeps(
    query: SearchQuery,
    *,
    amended: bool,
    anything_withdrawn: bool,
    cells: Sequence[str] | None = None,
    between: tuple[float, float] | None = None,
) -> Query:
    """Sweeps that satisfy a search, by coverage and address; order, limit and offset of the search do not count.

    Parameters
    ----------
    query : SearchQuery
    amended : bool
        Whether anything is amended at all.
    anything_withdrawn : bool
        Whether anything is withdrawn at all; asking each sweep takes longer than all the rest.
    cells : sequence of str, optional
        All cells that any sweep names; only those sweeps of them, and of none, whose coverage lies between two ends, or that state
        none, where no ends are given.
    between : (float, float), optional
        Coverages in mol/m^2, ends included.
    """
    reduced: Any = exists().where(Reduction.sweep == Sweep.address)
    taken_back: Any = false()
    if anything_withdrawn:
        reduced = reduced.where(~withdrawn_reduction())
        taken_back = withdrawn(Sweep.accession, Sweep.address, Sweep.cooldown)
    else:
        query = replace(query, withdrawn=True)
    columns = [
        column if kind is None else type_coerce(column, kind)
        for name, kind in _COLUMNS.items()
        for column in (column_found(name, amended=amended),)
    ]
    found = select(*columns, reduced, taken_back).where(*search_conditions(query, amended=amended))
    coverage = column_found("coverage_mol_per_m2", amended=amended)
    if cells is not None:
        found = found.where(_looked_up(coverage, cells, between, amended=amended))
    if amended:
        found = found.outerjoin(AmendedSweep, last_amended())
    return found.order_by(coverage.is_(None), coverage, Sweep.address)


def _looked_up(
    coverage: Any, cells: Sequence[str], between: tuple[float, float] | None, *, amended: bool
) -> ColumnElement[bool]:
    """Condition that the index of cell and coverage answers: without a cell, SQLite goes through every sweep."""
    condition: ColumnElement[bool] = coverage.is_(None) if between is None else coverage.between(*between)
    if amended:
        return condition
    return or_(and_(Sweep.cell.in_(cells), condition), and_(Sweep.cell.is_(None), condition))


def plane_results(
    names: Sequence[str], *, low: float | None = None, high: float | None = None, headline: bool = True
) -> Query:
    """Results of these names, of current reductions, by sweep, reduction and place.

    Parameters
    ----------
    names : sequence of str
    low, high : float, optional
        Ends in SI, included.
    headline : bool
        Only what a plan names as its headline.
    """
    found = (
        select(
            Reduction.sweep,
            Output.reduction,
            Output.name,
            Output.quantity,
            Output.value_si,
            Output.uncertainty_si,
        )
        .join(Reduction, Reduction.address == Output.reduction)
        .where(
            Output.name.in_(names),
            Output.value_si.is_not(None),
            Output.rows.is_(None),
            newest_reduction(),
        )
        .order_by(Reduction.sweep, Output.reduction, Output.headline, Output.position)
    )
    if headline:
        found = found.where(Output.headline.is_not(None))
    if low is not None:
        found = found.where(Output.value_si >= low)
    return found if high is None else found.where(Output.value_si <= high)


def plane_spans(quantity: str) -> Query:
    """Sweep, unit, least and largest value of each channel in use of one quantity, by sweep and place."""
    return (
        select(Sweep.address, Channel.unit, Channel.low, Channel.high)
        .join(Sweep, and_(Sweep.accession == Channel.accession, Sweep.name == Channel.sweep))
        .where(
            Channel.quantity == quantity,
            Channel.low.is_not(None),
            Channel.high.is_not(None),
            Channel.use == True,  # noqa: E712 - a column
            newest_sweep(withdrawn_too=True),
        )
        .order_by(Sweep.address, Channel.position)
    )


@cache
def sealed_count() -> Query:
    """How many sealed files there are: none is ever taken away, so this tells whether anything has come in."""
    return select(func.count(SealedFile.key))


def record_contents(addresses: Sequence[str]) -> Query:
    """Address and content of some records, wherever they came in."""
    held = select(Record.address, Record.content).where(Record.address.in_(addresses))
    outside = select(Revision.address, Revision.content).where(Revision.address.in_(addresses))
    both = union(held, outside).subquery()
    return select(both).order_by(both.c.address)


@cache
def cells_and_substrates() -> Query:
    """Every pair of cell and substrate that a sweep names, and when the first such sweep began."""
    return (
        select(Sweep.cell, Sweep.substrate, func.min(Sweep.begin, type_=Sweep.begin.type))
        .group_by(Sweep.cell, Sweep.substrate)
        .order_by(Sweep.cell, Sweep.substrate)
    )


@cache
def dosed_spans() -> Query:
    """Sweep, unit, least and largest coverage of the doses taken during each sweep that states no coverage itself."""
    return (
        select(
            Sweep.address,
            literal("mol/m^2"),
            func.min(Dose.running_coverage_mol_per_m2),
            func.max(Dose.running_coverage_mol_per_m2),
        )
        .join(Dose, Dose.accession == Sweep.accession)
        .where(
            Sweep.coverage_mol_per_m2.is_(None),
            Dose.running_coverage_mol_per_m2.is_not(None),
            Dose.at.between(Sweep.begin, Sweep.end),
            newest_sweep(withdrawn_too=True),
        )
        .group_by(Sweep.address)
        .order_by(Sweep.address)
    )

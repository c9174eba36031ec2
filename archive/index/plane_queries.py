"""The SELECTs of the plane: columns only, so that a hundred thousand sweeps can be looked at.

The rules are those of `archive.index.queries`.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache

from sqlalchemy import and_, exists, func, literal, select

from archive.index.act_tables import AmendedSweep
from archive.index.answers import SearchQuery
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
from archive.index.tables import Channel, Dose, Output, Reduction, Sweep

__all__ = ["cells_and_substrates", "dosed_spans", "plane_results", "plane_spans", "plane_sweeps"]

_COLUMNS = (
    "address",
    "kind",
    "cell",
    "substrate",
    "begin",
    "empty_cell",
    "coverage_mol_per_m2",
    "coverage_uncertainty_mol_per_m2",
    "temperature_low_K",
    "temperature_high_K",
)


def plane_sweeps(query: SearchQuery, *, amended: bool, anything_withdrawn: bool) -> Query:
    """Sweeps that satisfy a search, by coverage and address; order, limit and offset of the search do not count.

    Parameters
    ----------
    query : SearchQuery
    amended : bool
        Whether anything is amended at all.
    anything_withdrawn : bool
        Whether anything is withdrawn at all; asking each sweep takes longer than all the rest.
    """
    reduced = exists().where(Reduction.sweep == Sweep.address)
    if anything_withdrawn:
        reduced = reduced.where(~withdrawn_reduction())
        taken_back = withdrawn(Sweep.accession, Sweep.address, Sweep.cooldown)
    found = select(
        *(column_found(name, amended=amended).label(name) for name in _COLUMNS),
        reduced.label("reduced"),
        *((taken_back.label("withdrawn"),) if anything_withdrawn else ()),
    ).where(*search_conditions(query, amended=amended))
    coverage = column_found("coverage_mol_per_m2", amended=amended)
    if amended:
        found = found.outerjoin(AmendedSweep, last_amended())
    return found.order_by(coverage.is_(None), coverage, Sweep.address)


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

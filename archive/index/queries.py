"""Every SELECT of the index but lists of sweeps, the plane, life stories and acts, which have modules of their own.

Rules: each query has a full order, so that an answer never depends on the engine; sweeps and records are shown once, in
the version of the newest (for records: with the earliest) accession that holds them.
"""

from __future__ import annotations

from functools import lru_cache
from typing import Any

from sqlalchemy import (
    ColumnElement,
    Select,
    Table,
    and_,
    cast,
    exists,
    func,
    null,
    or_,
    select,
    union_all,
)
from sqlalchemy.orm import InstrumentedAttribute

from archive.index.act_tables import AmendedSweep, Revision
from archive.index.conditions import named, part_of
from archive.index.found import (
    column_found,
    last_amended,
    newest_reduction,
    newest_sweep,
    withdrawn_reduction,
)
from archive.index.tables import (
    Accession,
    Cooldown,
    Dose,
    Finding,
    Output,
    Plan,
    RawFile,
    Record,
    Reduction,
    ReductionInput,
    SealedFile,
    Step,
    Sweep,
)

__all__ = [
    "Query",
    "accessions",
    "all_rows",
    "cooldown_names",
    "cooldown_newest",
    "cooldowns",
    "dependents",
    "doses",
    "finding_counts",
    "findings",
    "plan_known",
    "plans",
    "raw_files",
    "records",
    "reductions",
    "result_quantities",
    "results",
    "sealed_file",
    "sealed_files",
    "statistics",
]

_BUILT = 512  # statements kept, since building one costs more than asking a small archive

Query = Select[*tuple[Any, ...]]
"""A SELECT of any columns."""


def all_rows(table: Table) -> Query:
    """Every row of a table, by its key."""
    return select(table).order_by(*table.primary_key.columns)


def sealed_files(under: str = "") -> Query:
    """Key, digest and size of every sealed file whose key begins so."""
    found = select(SealedFile.key, SealedFile.sha256, SealedFile.size).order_by(SealedFile.key)
    # A range, since a pattern could not use the key's own order; a prefix ends with a solidus, and "0" follows it.
    return found.where(SealedFile.key >= under, SealedFile.key < f"{under[:-1]}0") if under else found


def sealed_file(key: str) -> Query:
    """Address, digest and size of one sealed file."""
    return select(SealedFile.address, SealedFile.sha256, SealedFile.size).where(SealedFile.key == key)


def cooldown_newest(name: str) -> Query:
    """Return number of the newest accession of a cooldown."""
    return select(Cooldown.newest).where(Cooldown.name == name)


def plan_known(address: str, digest: str) -> Query:
    """Return the plan, if it is recorded."""
    return select(Plan.name).where(Plan.address == address, Plan.digest == digest)


def _count(column: InstrumentedAttribute[Any], *where: Any) -> Any:
    return select(func.count(column)).where(*where).scalar_subquery()


def accessions(cooldown: str | None) -> Query:
    """Return accessions with their counts, by cooldown and number."""

    def of(severity: str, *, waived: bool) -> Any:
        return _count(
            Finding.key, Finding.key == Accession.key, Finding.severity == severity, Finding.waived == waived
        )

    found = select(
        Accession.address,
        Accession.cooldown,
        Accession.number,
        Accession.key,
        Accession.accessioned,
        Accession.supplements,
        Accession.differences,
        Accession.stillroom,
        _count(Sweep.name, Sweep.accession == Accession.address).label("sweeps"),
        _count(Dose.name, Dose.accession == Accession.address).label("doses"),
        _count(Record.address, Record.accession == Accession.address).label("records"),
        _count(RawFile.name, RawFile.accession == Accession.address).label("raw_files"),
        _total(RawFile.size, RawFile.accession == Accession.address).label("raw_bytes"),
        of("warning", waived=False).label("warnings"),
        _count(Finding.key, Finding.key == Accession.key, Finding.waived == True).label("waived"),  # noqa: E712 - a column
        of("note", waived=False).label("notes"),
    ).order_by(Accession.cooldown, Accession.number)
    return found if cooldown is None else found.where(Accession.cooldown == cooldown)


def _total(column: InstrumentedAttribute[int], *where: Any) -> Any:
    # The sum of bigints is a numeric on PostgreSQL.
    total = cast(func.coalesce(func.sum(column), 0), column.type)
    return select(total).where(*where).scalar_subquery()


def cooldowns() -> Query:
    """Cooldowns with their counts, by begin."""
    # Counted for all at once: asked for each cooldown anew, SQLite goes through every reduction each time.
    accessions = _by_cooldown(Accession, func.count())
    sweeps = _by_cooldown(Sweep, func.count(func.distinct(Sweep.name)))
    reductions = _by_cooldown(Reduction, func.count())
    return (
        select(
            Cooldown.name,
            Accession.address.label("newest_accession"),
            Cooldown.begin,
            Cooldown.end,
            Cooldown.outcome,
            Cooldown.purpose,
            Cooldown.next_step,
            Cooldown.cryostat,
            Cooldown.cell,
            Cooldown.licence,
            func.coalesce(accessions.c.many, 0).label("accessions"),
            func.coalesce(sweeps.c.many, 0).label("sweeps"),
            func.coalesce(reductions.c.many, 0).label("reductions"),
        )
        .outerjoin(Accession, and_(Accession.cooldown == Cooldown.name, Accession.number == Cooldown.newest))
        .outerjoin(accessions, accessions.c.cooldown == Cooldown.name)
        .outerjoin(sweeps, sweeps.c.cooldown == Cooldown.name)
        .outerjoin(reductions, reductions.c.cooldown == Cooldown.name)
        .order_by(Cooldown.begin.is_(None), Cooldown.begin, Cooldown.name)
    )


def _by_cooldown(table: type[Accession | Sweep | Reduction], many: Any) -> Any:
    return select(table.cooldown, many.label("many")).group_by(table.cooldown).subquery()


def cooldown_names() -> Query:
    """Names of cooldowns."""
    return select(Cooldown.name).order_by(Cooldown.name)


def plans() -> Query:
    """Content of every plan that a reduction followed, by address."""
    return select(Plan.content).order_by(Plan.address, Plan.digest)


def result_quantities(name: str) -> Query:
    """Quantities that scalar results of a name have."""
    return (
        select(Output.quantity)
        .where(Output.name == name, Output.rows.is_(None))
        .distinct()
        .order_by(Output.quantity)
    )


@lru_cache(maxsize=_BUILT)
def records(name: str | None, kind: str | None) -> Query:
    """Revisions of records, each with the earliest accession that holds it, by kind, name and revision.

    Those that came in outside a cooldown, and that no accession holds, have none.
    """
    # Ranked at one go: asked of each row whether one came before it, the work grows as the square of the accessions that hold it.
    place = func.row_number().over(
        partition_by=(Record.address, Record.digest), order_by=(Accession.accessioned, Accession.address)
    )
    ranked = select(Record.accession, Record.address, place.label("place")).join(
        Accession, Accession.address == Record.accession
    )
    if name is not None:
        ranked = ranked.where(named(Record.address, name))
    if kind is not None:
        ranked = ranked.where(Record.kind == kind)
    first = ranked.subquery()
    shown = ("name", "revision", "kind", "address", "digest", "content")
    held = (
        select(*(getattr(Record, column) for column in shown), Record.accession)
        .join(first, and_(first.c.accession == Record.accession, first.c.address == Record.address))
        .where(first.c.place == 1)
    )
    same = exists().where(Record.address == Revision.address, Record.digest == Revision.digest)
    outside = select(*(getattr(Revision, column) for column in shown), null().label("accession")).where(
        Revision.kind != "plan", ~same
    )
    if name is not None:
        outside = outside.where(named(Revision.address, name))
    if kind is not None:
        outside = outside.where(Revision.kind == kind)
    both = union_all(held, outside).subquery()
    return select(both).order_by(both.c.kind, both.c.name, both.c.revision, both.c.digest)


@lru_cache(maxsize=_BUILT)
def reductions(
    *,
    cooldown: str | None = None,
    sweep: str | None = None,
    plan: str | None = None,
    step: str | None = None,
    newest_only: bool = False,
) -> Query:
    """Reductions, by sweep, plan and number."""
    found = (
        select(
            Reduction.address,
            Reduction.cooldown,
            Reduction.sweep,
            Reduction.plan,
            Reduction.plan_address,
            Reduction.number,
            Reduction.key,
            Reduction.begin,
            Reduction.end,
            Reduction.supersedes,
            Reduction.stillroom,
            newest_reduction().label("newest"),
            Plan.title,
            withdrawn_reduction().label("withdrawn"),
        )
        .join(Plan, and_(Plan.address == Reduction.plan_address, Plan.digest == Reduction.plan_digest))
        .order_by(Reduction.sweep, Reduction.plan, Reduction.number)
    )
    if cooldown is not None:
        found = found.where(_of_cooldown(cooldown))
    if sweep is not None:
        found = found.where(Reduction.sweep == sweep)
    if plan is not None:
        found = found.where((Reduction.plan_address if "." in plan else Reduction.plan) == plan)
    if step is not None:
        found = found.where(exists().where(Step.reduction == Reduction.address, Step.name == step))
    return found.where(newest_reduction()) if newest_only else found


def _of_cooldown(cooldown: str) -> ColumnElement[bool]:
    """Whether a reduction is of a cooldown: a range of sweeps, which have an index. "0" follows the solidus."""
    return and_(Reduction.sweep >= f"{cooldown}/", Reduction.sweep < f"{cooldown}0")


@lru_cache(maxsize=_BUILT)
def results(
    *,
    name: str | None,
    cooldown: str | None,
    sweep: str | None,
    newest_only: bool,
    amended: bool = False,
    withdrawn_too: bool = False,
) -> Query:
    """Scalar results with cell and coverage of their sweep, by sweep, plan, number and place in the plan."""
    taken_back = withdrawn_reduction()
    found = (
        select(
            Output.reduction,
            Reduction.cooldown,
            Reduction.sweep,
            Reduction.plan,
            Output.name,
            Output.quantity,
            Output.unit,
            Output.ucum,
            Output.description,
            Output.scale,
            Output.value,
            Output.uncertainty,
            Output.value_si,
            Output.uncertainty_si,
            Output.verdict,
            newest_reduction().label("newest"),
            Output.headline.is_not(None).label("headline"),
            column_found("cell", amended=amended).label("cell"),
            column_found("coverage_mol_per_m2", amended=amended).label("coverage"),
            column_found("coverage_uncertainty_mol_per_m2", amended=amended).label("coverage_uncertainty"),
            taken_back.label("withdrawn"),
        )
        .join(Reduction, Reduction.address == Output.reduction)
        .outerjoin(Sweep, and_(Sweep.address == Reduction.sweep, newest_sweep(withdrawn_too=withdrawn_too)))
        .where(Output.rows.is_(None))
        .order_by(Reduction.sweep, Reduction.plan, Reduction.number, Output.position)
    )
    if name is not None:
        found = found.where(Output.name == name)
    if cooldown is not None:
        found = found.where(_of_cooldown(cooldown))
    if sweep is not None:
        found = found.where(Reduction.sweep == sweep)
    if amended:
        found = found.outerjoin(AmendedSweep, last_amended())
    if withdrawn_too:
        return found.where(or_(newest_reduction(), taken_back)) if newest_only else found
    return found.where(newest_reduction()) if newest_only else found.where(~taken_back)


def raw_files(*, sha256: str | None, cooldown: str | None) -> Query:
    """Raw files, by accession and name."""
    found = (
        select(
            RawFile.accession, Accession.cooldown, RawFile.name, RawFile.sha256, RawFile.size, RawFile.role
        )
        .join(Accession, Accession.address == RawFile.accession)
        .order_by(Accession.cooldown, Accession.number, RawFile.name)
    )
    if sha256 is not None:
        found = found.where(RawFile.sha256 == sha256)
    return found if cooldown is None else found.where(Accession.cooldown == cooldown)


def doses(cooldown: str) -> Query:
    """Return the gas ledger of a cooldown as its newest accession with doses holds it, in order."""
    newest = (
        select(func.max(Accession.number))
        .join(Dose, Dose.accession == Accession.address)
        .where(Accession.cooldown == cooldown)
        .scalar_subquery()
    )
    return (
        select(
            Dose.accession,
            Dose.name,
            Dose.at,
            Dose.act,
            Dose.counted,
            Dose.amount_mol.label("amount"),
            Dose.amount_uncertainty_mol.label("amount_uncertainty"),
            Dose.running_amount_mol.label("running_amount"),
            Dose.running_amount_uncertainty_mol.label("running_amount_uncertainty"),
            Dose.running_coverage_mol_per_m2.label("running_coverage"),
            Dose.running_coverage_uncertainty_mol_per_m2.label("running_coverage_uncertainty"),
            Dose.method,
        )
        .join(Accession, Accession.address == Dose.accession)
        .where(Accession.cooldown == cooldown, Accession.number == newest)
        .order_by(Dose.position)
    )


def findings(*, address: str | None, code: str | None, severity: str | None) -> Query:
    """Return findings of accessions and reductions, by address, step and place in its list."""
    found = (
        select(
            SealedFile.address,
            Finding.step,
            Finding.code,
            Finding.severity,
            Finding.what,
            Finding.place,
            Finding.waived,
            Finding.content,
        )
        .join(SealedFile, SealedFile.key == Finding.key)
        .order_by(SealedFile.address, Finding.step, Finding.position)
    )
    for column, value in ((SealedFile.address, address), (Finding.code, code), (Finding.severity, severity)):
        if value is not None:
            found = found.where(column == value)
    return found


def finding_counts() -> Query:
    """Return how many findings there are of each severity and code, waived and not."""
    kinds = (Finding.severity, Finding.code, Finding.waived)
    return select(*kinds, func.count()).group_by(*kinds).order_by(*kinds)


def dependents(address: str) -> Query:
    """Reductions that took something from an address, or from one of its parts."""
    return (
        select(ReductionInput.reduction)
        .where(part_of(ReductionInput.address, address))
        .distinct()
        .order_by(ReductionInput.reduction)
    )


def statistics() -> Query:
    """Return counts of what the archive holds, as one row."""
    newest = newest_sweep(withdrawn_too=True)
    return select(
        _counted_all(Cooldown.name, "cooldowns"),
        _counted_all(Accession.address, "accessions"),
        _count(Sweep.name, newest).label("sweeps"),
        _total(Sweep.rows, newest).label("rows"),
        select(func.count()).select_from(_record_addresses()).scalar_subquery().label("records"),
        _counted_all(RawFile.name, "raw_files"),
        _total(RawFile.size).label("raw_bytes"),
        select(func.count(func.distinct(Plan.address))).scalar_subquery().label("plans"),
        _counted_all(Reduction.address, "reductions"),
        _count(Output.name, Output.rows.is_(None)).label("results"),
        _counted_all(SealedFile.key, "sealed_files"),
        _total(SealedFile.size).label("sealed_bytes"),
    )


def _record_addresses() -> Any:
    outside = select(Revision.address).where(Revision.kind != "plan")
    return select(Record.address).union(outside).subquery()


def _counted_all(column: InstrumentedAttribute[Any], label: str) -> Any:
    return _count(column).label(label)

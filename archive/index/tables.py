"""The tables of the index.

Rules
-----
* Keys are natural (addresses, names, positions): a row never depends on the order in which files were recorded.
* Every row stems from one sealed file, except those of `cooldown`, which show the newest accession's sheet.
* Numbers are in SI where a column's name says so, else in the unit that stands beside them.
"""

from __future__ import annotations

from datetime import datetime
from typing import Any, ClassVar

from sqlalchemy import CheckConstraint, ForeignKey, ForeignKeyConstraint, Index, MetaData, UniqueConstraint
from sqlalchemy.orm import DeclarativeBase, Mapped, mapped_column

from archive.index.columns import COUNT, FLAG, JSON, REAL, TEXT, TIME

__all__ = [
    "STRICT",
    "Accession",
    "Base",
    "Channel",
    "Cooldown",
    "Dose",
    "Finding",
    "Output",
    "Plan",
    "RawFile",
    "Record",
    "Reduction",
    "ReductionInput",
    "SealedFile",
    "Step",
    "Sweep",
    "SweepThermometer",
]

STRICT = {"sqlite_strict": True}


class Base(DeclarativeBase):
    """Base of all tables; constraints have names, so that a migration can speak of them."""

    metadata = MetaData(
        naming_convention={
            "ix": "ix_%(table_name)s_%(column_0_N_name)s",
            "uq": "uq_%(table_name)s_%(column_0_N_name)s",
            "ck": "ck_%(table_name)s_%(constraint_name)s",
            "fk": "fk_%(table_name)s_%(column_0_N_name)s",
            "pk": "pk_%(table_name)s",
        }
    )
    type_annotation_map: ClassVar = {
        str: TEXT,
        int: COUNT,
        float: REAL,
        bool: FLAG,
        datetime: TIME,
        Any: JSON,
    }


class SealedFile(Base):
    """A sealed file of the store, with its fixity."""

    __tablename__ = "sealed_file"
    key: Mapped[str] = mapped_column(primary_key=True)
    document: Mapped[str]
    address: Mapped[str]
    sha256: Mapped[str]
    size: Mapped[int]
    __table_args__ = (
        UniqueConstraint("address"),
        CheckConstraint(
            "document IN ('accession', 'reduction', 'revision', 'amendment', 'withdrawal')", name="document"
        ),
        STRICT,
    )


class Cooldown(Base):
    """A cooldown as its newest accession tells it; only the name when no accession of it is recorded."""

    __tablename__ = "cooldown"
    name: Mapped[str] = mapped_column(primary_key=True)
    newest: Mapped[int | None]
    begin: Mapped[datetime | None]
    end: Mapped[datetime | None]
    outcome: Mapped[str | None]
    purpose: Mapped[str | None]
    next_step: Mapped[str | None]
    cryostat: Mapped[str | None]
    cell: Mapped[str | None]
    licence: Mapped[str | None]
    __table_args__ = (STRICT,)


class Accession(Base):
    """One act of ingest."""

    __tablename__ = "accession"
    address: Mapped[str] = mapped_column(primary_key=True)
    cooldown: Mapped[str] = mapped_column(ForeignKey("cooldown.name"))
    number: Mapped[int]
    key: Mapped[str] = mapped_column(ForeignKey("sealed_file.key"))
    accessioned: Mapped[datetime]
    supplements: Mapped[str | None]
    sheet_file: Mapped[str]
    differences: Mapped[Any]
    stillroom: Mapped[str]
    __table_args__ = (UniqueConstraint("cooldown", "number"), UniqueConstraint("key"), STRICT)


class RawFile(Base):
    """One raw file, kept verbatim in the accession's sealed file."""

    __tablename__ = "raw_file"
    accession: Mapped[str] = mapped_column(ForeignKey("accession.address"), primary_key=True)
    name: Mapped[str] = mapped_column(primary_key=True)
    sha256: Mapped[str] = mapped_column(index=True)
    size: Mapped[int]
    role: Mapped[str]
    __table_args__ = (STRICT,)


class Record(Base):
    """One revision of a long-lived thing, as one accession holds it."""

    __tablename__ = "record"
    accession: Mapped[str] = mapped_column(ForeignKey("accession.address"), primary_key=True)
    address: Mapped[str] = mapped_column(primary_key=True)
    name: Mapped[str]
    revision: Mapped[int]
    kind: Mapped[str]
    digest: Mapped[str]
    content: Mapped[Any]
    __table_args__ = (Index(None, "name", "revision"), Index(None, "address"), STRICT)


class Sweep(Base):
    """One sweep as one accession holds it; the newest version is the one of the highest accession number."""

    __tablename__ = "sweep"
    accession: Mapped[str] = mapped_column(ForeignKey("accession.address"), primary_key=True)
    name: Mapped[str] = mapped_column(primary_key=True)
    address: Mapped[str]
    cooldown: Mapped[str] = mapped_column(ForeignKey("cooldown.name"))
    number: Mapped[int]
    kind: Mapped[str]
    cell: Mapped[str | None]
    substrate: Mapped[str | None]
    sample: Mapped[str | None]
    empty_cell: Mapped[bool]
    after_dose: Mapped[str | None]
    begin: Mapped[datetime | None]
    end: Mapped[datetime | None]
    direction: Mapped[str]
    rows: Mapped[int]
    amount_mol: Mapped[float | None]
    coverage_mol_per_m2: Mapped[float | None]
    coverage_uncertainty_mol_per_m2: Mapped[float | None]
    temperature_low_K: Mapped[float | None]  # noqa: N815 - K is the unit
    temperature_high_K: Mapped[float | None]  # noqa: N815 - K is the unit
    scale: Mapped[str | None]
    text: Mapped[str]
    __table_args__ = (
        UniqueConstraint("address", "number"),
        Index(None, "cell", "coverage_mol_per_m2", "begin"),
        Index(None, "cell", "begin", "coverage_mol_per_m2"),
        Index(None, "cooldown", "name"),
        STRICT,
    )


class SweepThermometer(Base):
    """A thermometer that a sweep was taken with."""

    __tablename__ = "sweep_thermometer"
    accession: Mapped[str] = mapped_column(primary_key=True)
    sweep: Mapped[str] = mapped_column(primary_key=True)
    position: Mapped[int] = mapped_column(primary_key=True)
    thermometer: Mapped[str] = mapped_column(index=True)
    __table_args__ = (
        ForeignKeyConstraint(["accession", "sweep"], ["sweep.accession", "sweep.name"]),
        STRICT,
    )


class Channel(Base):
    """One column of a sweep."""

    __tablename__ = "channel"
    accession: Mapped[str] = mapped_column(primary_key=True)
    sweep: Mapped[str] = mapped_column(primary_key=True)
    name: Mapped[str] = mapped_column(primary_key=True)
    position: Mapped[int]
    quantity: Mapped[str]
    unit: Mapped[str]
    ucum: Mapped[str]
    description: Mapped[str]
    scale: Mapped[str | None]
    thermometer: Mapped[str | None]
    calibration: Mapped[str | None] = mapped_column(index=True)
    low: Mapped[float | None]
    high: Mapped[float | None]
    missing: Mapped[int]
    use: Mapped[bool]
    digest: Mapped[str]
    __table_args__ = (
        ForeignKeyConstraint(["accession", "sweep"], ["sweep.accession", "sweep.name"]),
        STRICT,
    )


class Dose(Base):
    """One line of the gas ledger."""

    __tablename__ = "dose"
    accession: Mapped[str] = mapped_column(ForeignKey("accession.address"), primary_key=True)
    name: Mapped[str] = mapped_column(primary_key=True)
    position: Mapped[int]
    at: Mapped[datetime]
    act: Mapped[str]
    counted: Mapped[bool]
    amount_mol: Mapped[float | None]
    amount_uncertainty_mol: Mapped[float | None]
    running_amount_mol: Mapped[float | None]
    running_amount_uncertainty_mol: Mapped[float | None]
    running_coverage_mol_per_m2: Mapped[float | None]
    running_coverage_uncertainty_mol_per_m2: Mapped[float | None]
    method: Mapped[str]
    __table_args__ = (STRICT,)


class Finding(Base):
    """A finding of an accession, a reduction (step 0) or one of its steps."""

    __tablename__ = "finding"
    key: Mapped[str] = mapped_column(ForeignKey("sealed_file.key"), primary_key=True)
    step: Mapped[int] = mapped_column(primary_key=True)
    position: Mapped[int] = mapped_column(primary_key=True)
    code: Mapped[str] = mapped_column(index=True)
    severity: Mapped[str]
    what: Mapped[str]
    place: Mapped[str | None]
    waived: Mapped[bool]
    content: Mapped[Any]
    __table_args__ = (STRICT,)


class Plan(Base):
    """A plan that a reduction followed."""

    __tablename__ = "plan"
    address: Mapped[str] = mapped_column(primary_key=True)
    digest: Mapped[str] = mapped_column(primary_key=True)
    name: Mapped[str]
    revision: Mapped[int]
    title: Mapped[str]
    content: Mapped[Any]
    __table_args__ = (STRICT,)


class Reduction(Base):
    """A plan carried out on a sweep."""

    __tablename__ = "reduction"
    address: Mapped[str] = mapped_column(primary_key=True)
    key: Mapped[str] = mapped_column(ForeignKey("sealed_file.key"))
    cooldown: Mapped[str] = mapped_column(ForeignKey("cooldown.name"))
    sweep: Mapped[str]
    plan: Mapped[str]
    number: Mapped[int]
    plan_address: Mapped[str]
    plan_digest: Mapped[str]
    supersedes: Mapped[str | None] = mapped_column(index=True)
    begin: Mapped[datetime]
    end: Mapped[datetime]
    stillroom: Mapped[str]
    __table_args__ = (
        UniqueConstraint("sweep", "plan", "number"),
        UniqueConstraint("key"),
        ForeignKeyConstraint(["plan_address", "plan_digest"], ["plan.address", "plan.digest"]),
        Index(None, "plan", "cooldown"),
        STRICT,
    )


class ReductionInput(Base):
    """Something that a reduction took from outside itself."""

    __tablename__ = "reduction_input"
    reduction: Mapped[str] = mapped_column(ForeignKey("reduction.address"), primary_key=True)
    position: Mapped[int] = mapped_column(primary_key=True)
    address: Mapped[str] = mapped_column(index=True)
    role: Mapped[str]
    digest: Mapped[str | None]
    value: Mapped[float | None]
    uncertainty: Mapped[float | None]
    unit: Mapped[str | None]
    scale: Mapped[str | None]
    __table_args__ = (STRICT,)


class Step(Base):
    """The record of one step of a reduction."""

    __tablename__ = "step"
    reduction: Mapped[str] = mapped_column(ForeignKey("reduction.address"), primary_key=True)
    number: Mapped[int] = mapped_column(primary_key=True)
    name: Mapped[str]
    version: Mapped[int]
    sentence: Mapped[str]
    parameters: Mapped[Any]
    begin: Mapped[datetime]
    end: Mapped[datetime]
    __table_args__ = (Index(None, "name", "version"), STRICT)


class Output(Base):
    """An output of a reduction: an array (it has rows) or a scalar result (it has none)."""

    __tablename__ = "output"
    reduction: Mapped[str] = mapped_column(ForeignKey("reduction.address"), primary_key=True)
    name: Mapped[str] = mapped_column(primary_key=True)
    position: Mapped[int]
    headline: Mapped[int | None]
    step: Mapped[int]
    quantity: Mapped[str]
    unit: Mapped[str]
    ucum: Mapped[str]
    description: Mapped[str]
    scale: Mapped[str | None]
    rows: Mapped[int | None]
    value: Mapped[float | None]
    uncertainty: Mapped[float | None]
    value_si: Mapped[float | None]
    uncertainty_si: Mapped[float | None]
    verdict: Mapped[str | None]
    digest: Mapped[str]
    __table_args__ = (Index(None, "name", "value_si"), STRICT)

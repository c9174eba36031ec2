"""The tables of what was done after the fact: revisions, amendments, withdrawals.

The rules are those of `archive.index.tables`: natural keys, and every row stems from one sealed file.
"""

from __future__ import annotations

from datetime import datetime
from typing import Any

from sqlalchemy import ForeignKey, Index, UniqueConstraint
from sqlalchemy.orm import Mapped, mapped_column

from archive.index.tables import STRICT, Base

__all__ = [
    "AmendedSweep",
    "Amendment",
    "AmendmentSweep",
    "ReplacedRecord",
    "Revision",
    "Withdrawal",
]


class ReplacedRecord(Base):
    """A record that a reduction took in place of the one that the sheet names."""

    __tablename__ = "replaced_record"
    reduction: Mapped[str] = mapped_column(ForeignKey("reduction.address"), primary_key=True)
    instead_of: Mapped[str] = mapped_column(primary_key=True)
    address: Mapped[str]
    because: Mapped[str]
    __table_args__ = (STRICT,)


class Revision(Base):
    """A revision of a record or plan that came in outside a cooldown."""

    __tablename__ = "revision"
    address: Mapped[str] = mapped_column(primary_key=True)
    key: Mapped[str] = mapped_column(ForeignKey("sealed_file.key"))
    kind: Mapped[str]
    name: Mapped[str]
    revision: Mapped[int]
    digest: Mapped[str]
    content: Mapped[Any]
    supersedes: Mapped[str | None] = mapped_column(index=True)
    because: Mapped[str]
    by: Mapped[str]
    made: Mapped[datetime]
    stillroom: Mapped[str]
    __table_args__ = (UniqueConstraint("key"), Index(None, "name", "revision"), STRICT)


class Amendment(Base):
    """An amendment of a cooldown's sheet."""

    __tablename__ = "amendment"
    address: Mapped[str] = mapped_column(primary_key=True)
    key: Mapped[str] = mapped_column(ForeignKey("sealed_file.key"))
    cooldown: Mapped[str] = mapped_column(ForeignKey("cooldown.name"))
    number: Mapped[int]
    because: Mapped[str]
    by: Mapped[str]
    made: Mapped[datetime]
    differences: Mapped[Any]
    stillroom: Mapped[str]
    __table_args__ = (UniqueConstraint("cooldown", "number"), UniqueConstraint("key"), STRICT)


class AmendmentSweep(Base):
    """A sweep that an amendment bears on."""

    __tablename__ = "amendment_sweep"
    amendment: Mapped[str] = mapped_column(ForeignKey("amendment.address"), primary_key=True)
    sweep: Mapped[str] = mapped_column(primary_key=True, index=True)
    __table_args__ = (STRICT,)


class AmendedSweep(Base):
    """A sweep as a search finds it after an amendment, or after the withdrawal of one; the last in sequence counts."""

    __tablename__ = "amended_sweep"
    act: Mapped[str] = mapped_column(ForeignKey("sealed_file.address"), primary_key=True)
    sweep: Mapped[str] = mapped_column(primary_key=True)
    sequence: Mapped[int]
    number: Mapped[int]
    coverage_mol_per_m2: Mapped[float | None]
    coverage_uncertainty_mol_per_m2: Mapped[float | None]
    temperature_low_K: Mapped[float | None]  # noqa: N815 - K is the unit
    temperature_high_K: Mapped[float | None]  # noqa: N815 - K is the unit
    cell: Mapped[str | None]
    substrate: Mapped[str | None]
    sample: Mapped[str | None]
    empty_cell: Mapped[bool]
    after_dose: Mapped[str | None]
    direction: Mapped[str]
    __table_args__ = (Index(None, "sweep", "sequence"), STRICT)


class Withdrawal(Base):
    """Something that is not to be used any more, and why; nothing is taken away."""

    __tablename__ = "withdrawal"
    address: Mapped[str] = mapped_column(primary_key=True)
    key: Mapped[str] = mapped_column(ForeignKey("sealed_file.key"))
    target: Mapped[str] = mapped_column(index=True)
    cooldown: Mapped[str | None]
    number: Mapped[int]
    why: Mapped[str]
    by: Mapped[str]
    made: Mapped[datetime]
    stillroom: Mapped[str]
    __table_args__ = (UniqueConstraint("key"), STRICT)

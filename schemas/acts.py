"""What is done after the fact: revisions of records and plans, amendments of a cooldown, withdrawals.

Each is a sheet that a person writes (or a line of a command), and a document that a sealed file keeps for ever. Nothing
that was sealed before is changed by them: a revision stands beside the earlier ones, an amendment beside the sheet, and
what is withdrawn stays where it is, with the reason.
"""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import AwareDatetime, Field, JsonValue, StringConstraints, model_validator

from schemas.base import Name, Record, Reference, Text
from schemas.cooldown import Records
from schemas.finding import Finding
from schemas.lineage import DoseEntry, RecordKind, Sha256, Software, SweepEntry
from schemas.plan import Plan

__all__ = [
    "AmendmentDocument",
    "AmendmentSheet",
    "Change",
    "Difference",
    "LeftOutRows",
    "RevisionDocument",
    "RevisionSheet",
    "UseCalibration",
    "UseRecord",
    "WithdrawalDocument",
]

Why = Annotated[Text, StringConstraints(min_length=8)]
Role = Annotated[str, StringConstraints(min_length=2, max_length=200)]
FieldPath = Annotated[str, StringConstraints(pattern=r"^[A-Za-z0-9_][A-Za-z0-9_.-]*$", max_length=200)]


class Difference(Record):
    """One field that differs between two contents."""

    field: str = Field(description="Path of the field, e.g. `relation.coefficients[3]`.")
    before: str | None = Field(default=None, description="What stood there; none when nothing did.")
    after: str | None = Field(default=None, description="What stands there now; none when nothing does.")


class RevisionSheet(Record):
    """`stillroom-revision/1`: one new revision of a long-lived thing or of a plan, outside a cooldown."""

    format: Literal["stillroom-revision/1"]
    by: Role | None = Field(default=None, description="Role of the person, e.g. `data steward`.")
    because: Why | None = Field(
        default=None, description="Why; left out: what the record says under `changed`."
    )
    supersedes: Reference | None = Field(
        default=None,
        description="Revision in whose place this one stands, also in cooldowns that are over: `RX-2-cal.r1`.",
    )
    record: Records = Field(default_factory=lambda: Records())
    plan: Plan | None = None

    @model_validator(mode="after")
    def _one_thing(self) -> RevisionSheet:
        count = sum(len(getattr(self.record, kind)) for kind in Records.model_fields) + (
            self.plan is not None
        )
        if count != 1:
            raise ValueError(
                f"a revision sheet holds one record or plan, and this one holds {count}; write one file for each"
            )
        return self


class RevisionDocument(Record):
    """What the sealed file of a revision says about itself."""

    format: Literal["stillroom-revision/1"]
    address: str
    kind: RecordKind | Literal["plan"]
    digest: Sha256
    content: dict[str, JsonValue]
    supersedes: str | None = None
    because: str
    by: str
    made: AwareDatetime
    previous: str | None = Field(default=None, description="The newest revision before this one.")
    differences: tuple[Difference, ...] = ()
    findings: dict[str, tuple[Finding, ...]] = Field(
        default_factory=dict,
        description="What the checks found with it and had not found before, by each cooldown that is read otherwise.",
    )
    sheet_file: str
    software: Software


class Change(Record):
    """A value of the sheet that is to be read otherwise."""

    address: str = Field(
        description="Dose, sweep, channel or cooldown: `2026-03/d03`, `2026-03/s017#period`."
    )
    field: FieldPath = Field(
        description="Field of it, parts joined by dots: `amount`, `detection.bias`, `gauge.PG1.zero`."
    )
    value: JsonValue = Field(default=None, description="What is to stand there.")
    remove: bool = Field(default=False, description="True: nothing is to stand there.")
    was: JsonValue = Field(
        default=None, description="What the sheet says there; filled in when the amendment is sealed."
    )

    @model_validator(mode="after")
    def _one_of_both(self) -> Change:
        if self.remove == (self.value is not None):
            raise ValueError("give the new value, or remove = true, one of both")
        return self


class UseCalibration(Record):
    """A calibration that holds for a thermometer in this cooldown."""

    thermometer: Reference
    use: Reference
    sweeps: tuple[Name, ...] = Field(default=(), description="Only in these sweeps; left out: in all.")


class UseRecord(Record):
    """A revision of a cell, substrate, sample or cryostat that holds in this cooldown."""

    instead_of: Reference
    use: Reference


class LeftOutRows(Record):
    """Rows of a sweep that are kept and not reduced with."""

    sweep: Name
    rows: tuple[int, int] = Field(description="First and last data row, from 1.")
    reason: Annotated[Text, StringConstraints(min_length=3)]
    data: Sha256 | None = Field(
        default=None,
        description="Digest of the rows that were meant; filled in when the amendment is sealed.",
    )


class AmendmentSheet(Record):
    """`stillroom-amendment/1`: what is to be read otherwise in a cooldown that is sealed."""

    format: Literal["stillroom-amendment/1"]
    cooldown: Name
    by: Role | None = Field(default=None, description="Role of the person, e.g. `data steward`.")
    because: Why
    change: tuple[Change, ...] = ()
    calibration: tuple[UseCalibration, ...] = ()
    use: tuple[UseRecord, ...] = ()
    left_out: tuple[LeftOutRows, ...] = ()

    @model_validator(mode="after")
    def _something(self) -> AmendmentSheet:
        if not (self.change or self.calibration or self.use or self.left_out):
            raise ValueError(
                "the amendment amends nothing; add [[change]], [[calibration]], [[use]] or [[left_out]]"
            )
        return self


class AmendmentDocument(Record):
    """What the sealed file of an amendment says about itself."""

    format: Literal["stillroom-amendment/1"]
    address: str
    cooldown: str
    number: int = Field(ge=1)
    sequence: int = Field(ge=1, description="Place among the amendments and withdrawals of the cooldown.")
    rests_on: str = Field(description="Newest accession of the cooldown when it was made.")
    because: str
    by: str
    made: AwareDatetime
    change: tuple[Change, ...] = ()
    calibration: tuple[UseCalibration, ...] = ()
    use: tuple[UseRecord, ...] = ()
    left_out: tuple[LeftOutRows, ...] = ()
    sweeps: tuple[str, ...] = Field(default=(), description="Addresses of the sweeps that it bears on.")
    differences: tuple[Difference, ...] = ()
    entries: tuple[SweepEntry, ...] = Field(
        default=(), description="These sweeps as they are found from now on."
    )
    doses: tuple[DoseEntry, ...] = Field(default=(), description="The gas ledger as it stands from now on.")
    findings: tuple[Finding, ...] | None = Field(
        default=None,
        description="What the checks found with it and had not found before; none: they were not run again.",
    )
    sheet_file: str
    software: Software


class WithdrawalDocument(Record):
    """What the sealed file of a withdrawal says about itself."""

    format: Literal["stillroom-withdrawal/1"]
    address: str
    target: str = Field(description="What is withdrawn; it stays in the archive.")
    cooldown: str | None = None
    number: int = Field(ge=1)
    sequence: int = Field(
        ge=1, description="Place among the amendments and withdrawals of the cooldown, or of the revision."
    )
    rests_on: str | None = Field(
        default=None, description="Newest accession of the cooldown when it was made."
    )
    why: str
    by: str
    made: AwareDatetime
    entries: tuple[SweepEntry, ...] = Field(
        default=(), description="Sweeps as they are found from now on, where an amendment is withdrawn."
    )
    software: Software

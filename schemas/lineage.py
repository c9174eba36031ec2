"""What is written into sealed files about themselves: accessions, reductions, and the record of every step.

These documents are the archive's memory: the index is built from them alone.
"""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import AwareDatetime, Field, JsonValue, StringConstraints

from schemas.base import Record
from schemas.cell import Cell, Cryostat
from schemas.cooldown import CooldownSheet
from schemas.finding import Finding
from schemas.monte_carlo import MonteCarlo
from schemas.plan import Plan
from schemas.substrate import Sample, Substrate
from schemas.sweep import SweepKind
from schemas.thermometer import Calibration, Thermometer

__all__ = [
    "AccessionDocument",
    "AnyRecord",
    "ChannelEntry",
    "DoseEntry",
    "InputEntry",
    "OutputEntry",
    "RawFileEntry",
    "RecordEntry",
    "RecordKind",
    "ReductionDocument",
    "Sha256",
    "Software",
    "SourceEntry",
    "StepRecord",
    "SweepEntry",
    "Value",
]

Sha256 = Annotated[str, StringConstraints(pattern=r"^[0-9a-f]{64}$")]
AnyRecord = Cryostat | Cell | Substrate | Sample | Thermometer | Calibration
RecordKind = Literal["cryostat", "cell", "substrate", "sample", "thermometer", "calibration"]


class Value(Record):
    """A number with its uncertainty and unit, as programs read it."""

    value: float | None
    uncertainty: float | None = None
    unit: str
    scale: str | None = None


class Software(Record):
    """What wrote a file."""

    stillroom: str
    python: str
    platform: str
    packages: dict[str, str]


class RawFileEntry(Record):
    """One raw file, kept verbatim."""

    name: str
    sha256: Sha256
    size: int = Field(ge=0)
    role: Literal["sheet", "sweep", "other"]


class ChannelEntry(Record):
    """One channel of a sweep as stored (in the unit of the file)."""

    name: str
    quantity: str
    unit: str
    ucum: str
    description: str
    scale: str | None = None
    thermometer: str | None = Field(default=None, description="Address of the thermometer's revision.")
    calibration: str | None = Field(default=None, description="Address of the calibration in force.")
    low: float | None = Field(
        default=None, description="Smallest value in `unit`; none when no number is there."
    )
    high: float | None = None
    missing: int = Field(default=0, description="Rows without a value.")
    use: bool = True
    digest: Sha256 = Field(description="SHA-256 of the stored array.")


class SweepEntry(Record):
    """One sweep of an accession, with what search needs to know of it."""

    name: str
    kind: SweepKind
    files: tuple[str, ...]
    rows: int = Field(ge=0)
    first_lines: dict[str, int] = Field(
        default_factory=dict, description="File line of the first data row, per file."
    )
    channels: tuple[ChannelEntry, ...]
    cell: str | None = Field(default=None, description="Address of the cell's revision.")
    substrate: str | None = None
    sample: str | None = None
    empty_cell: bool = False
    after_dose: str | None = None
    doses: tuple[str, ...] = ()
    thermometers: tuple[str, ...] = ()
    begin: AwareDatetime | None = None
    end: AwareDatetime | None = None
    direction: str = "none"
    temperature_low: Value | None = None
    temperature_high: Value | None = None
    amount: Value | None = Field(
        default=None, description="Helium in the cell's system during the sweep, mol."
    )
    coverage: Value | None = Field(default=None, description="Amount over area during the sweep, mol/m^2.")


class DoseEntry(Record):
    """One line of the gas ledger."""

    name: str
    at: AwareDatetime
    act: Literal["add", "remove", "recover"]
    counted: bool
    amount: Value
    running_amount: Value
    running_coverage: Value | None = None
    method: str = Field(
        description="How the amount was obtained: equation, second virial coefficient, gauge zero."
    )


class RecordEntry(Record):
    """One record with the revision that holds in this accession."""

    kind: RecordKind
    address: str
    digest: Sha256
    content: dict[str, JsonValue]


class AccessionDocument(Record):
    """What an accession's sealed file says about itself."""

    format: Literal["stillroom-accession/1"]
    address: str
    cooldown: str
    number: int = Field(ge=1)
    accessioned: AwareDatetime
    supplements: str | None = Field(
        default=None, description="Address of the accession that this one adds to."
    )
    differences: tuple[str, ...] = Field(
        default=(), description="What differs from the accession before, in words."
    )
    sheet: CooldownSheet
    sheet_file: str
    records: tuple[RecordEntry, ...]
    sweeps: tuple[SweepEntry, ...]
    doses: tuple[DoseEntry, ...] = ()
    raw_files: tuple[RawFileEntry, ...]
    findings: tuple[Finding, ...] = ()
    cautions: tuple[dict[str, JsonValue], ...] = ()
    software: Software


class InputEntry(Record):
    """Something that a reduction took from outside itself."""

    address: str
    role: str
    digest: Sha256 | None = None
    value: Value | None = None
    instead_of: str | None = Field(
        default=None, description="What the sheet names, where something else was taken."
    )
    because: str | None = Field(default=None, description="Why this one was taken.")


class SourceEntry(Record):
    """One source of uncertainty that several numbers share."""

    name: str
    description: str
    level: Literal["run", "cell", "laboratory"] = Field(description="Whom it is common to.")
    address: str | None = None
    distribution: Literal["normal", "rectangular"] = Field(
        default="normal",
        description="Of the values that the source may have: JCGM 100:2008, 4.3.7, for rectangular.",
    )
    stated: Value | None = Field(
        default=None,
        description="What is uncertain, with its standard uncertainty, where that is one number.",
    )


class OutputEntry(Record):
    """One output of a reduction: an array or a scalar result."""

    name: str
    quantity: str
    unit: str
    ucum: str = ""
    description: str
    step: int = Field(ge=1, description="Number of the step that gave it, from 1.")
    scale: str | None = None
    rows: int | None = Field(default=None, description="Length of an array; none for a scalar.")
    value: float | None = Field(
        default=None, description="Value of a scalar in `unit`; none when there is none."
    )
    uncertainty: float | None = Field(default=None, description="Combined standard uncertainty of a scalar.")
    point: float | None = Field(default=None, description="The part of it that nothing else shares.")
    shared: dict[str, float] = Field(
        default_factory=dict, description="Signed contribution of each shared source, in `unit`."
    )
    verdict: str | None = Field(
        default=None, description="A word instead of a number, e.g. `no resonance in range`."
    )
    digest: Sha256 = Field(description="SHA-256 of the stored array, or of the scalar as one float64.")


class StepRecord(Record):
    """The full record of one step."""

    number: int = Field(ge=1)
    name: str
    version: int
    sentence: str = Field(description="What was done, with the actual numbers, for the methods appendix.")
    parameters: dict[str, JsonValue] = Field(description="All of them, defaults too.")
    inputs: dict[str, InputEntry]
    outputs: tuple[str, ...]
    citations: tuple[str, ...] = ()
    effects: dict[str, str] = Field(
        default_factory=dict, description="Known effects that this step treats: effect, sentence."
    )
    considered: dict[str, str] = Field(
        default_factory=dict,
        description="Known effects that this step looked for without correcting anything: effect, sentence.",
    )
    begin: AwareDatetime
    end: AwareDatetime
    findings: tuple[Finding, ...] = ()
    facts: dict[str, JsonValue] = Field(
        default_factory=dict,
        description="Numbers the step has to say beyond its outputs: orders, chi^2, counts.",
    )


class ReductionDocument(Record):
    """What a reduction's sealed file says about itself."""

    format: Literal["stillroom-reduction/1"]
    address: str
    cooldown: str
    sweep: str
    number: int = Field(ge=1)
    plan: Plan
    plan_digest: Sha256
    inputs: tuple[InputEntry, ...]
    steps: tuple[StepRecord, ...]
    outputs: tuple[OutputEntry, ...]
    sources: tuple[SourceEntry, ...] = ()
    covariances: dict[str, Any] = Field(
        default_factory=dict, description="Covariance of fitted parameters: names, matrix."
    )
    supersedes: str | None = None
    monte_carlo: MonteCarlo | None = Field(
        default=None, description="The plan repeated with drawn inputs, where that was asked for."
    )
    findings: tuple[Finding, ...] = ()
    begin: AwareDatetime
    end: AwareDatetime
    software: Software

"""What the index is asked, and what it answers: plain frozen records, free of the database."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime
from typing import Any, Literal, NamedTuple

__all__ = [
    "AccessionRow",
    "CooldownRow",
    "DoseRow",
    "FindingRow",
    "RawFileRow",
    "RecordRow",
    "ReductionRow",
    "ResultCondition",
    "ResultRow",
    "SearchQuery",
    "SweepResult",
    "SweepRow",
]


@dataclass(frozen=True)
class ResultCondition:
    """A bound on a result of the newest reductions.

    Parameters
    ----------
    name : str
        Name of the result, e.g. `T_KT`.
    low, high : float, optional
        Bounds in the SI unit of its quantity, both included; with neither, the result must be there as a number.
    """

    name: str
    low: float | None = None
    high: float | None = None


@dataclass(frozen=True)
class SearchQuery:
    """What to search for; everything that is given must hold.

    Parameters
    ----------
    coverage : (float or None, float or None), optional
        Range of the coverage in mol/m^2, ends included, either end open.
    temperature : (float or None, float or None), optional
        Range in K that the sweep's own range overlaps; compared as numbers, whatever the scale.
    scale : str, optional
        Temperature scale of the sweep or of one of its channels.
    cell, substrate, sample, thermometer : str, optional
        Name (all revisions) or address (`TO-4.r2`).
    kind : str, optional
        Kind of sweep.
    plan : str, optional
        Name or address of a plan that a reduction of the sweep followed.
    empty_cell : bool, optional
        Only runs of the empty cell, or only others.
    since, until : datetime, optional
        The sweep ends at or after, begins at or before; with offset.
    results : tuple of ResultCondition
        Bounds on results.
    text : str, optional
        Words that all occur in the sweep's names, descriptions, notes and purpose; case does not count.
    cooldown : str, optional
        Name of the cooldown.
    sort : {"date", "coverage", "temperature", "cell", "name"}
        Order; sweeps without that value come last either way, equal ones by address.
    descending : bool
        Largest first.
    limit, offset : int
        At most so many sweeps (None: all), after so many left out.
    after : str, optional
        Only sweeps that stand behind the one with this address, in the order that is asked for: the next page of a list.
    withdrawn : bool
        Withdrawn sweeps too, marked.
    """

    coverage: tuple[float | None, float | None] | None = None
    temperature: tuple[float | None, float | None] | None = None
    scale: str | None = None
    cell: str | None = None
    substrate: str | None = None
    sample: str | None = None
    thermometer: str | None = None
    kind: str | None = None
    plan: str | None = None
    empty_cell: bool | None = None
    since: datetime | None = None
    until: datetime | None = None
    results: tuple[ResultCondition, ...] = ()
    text: str | None = None
    cooldown: str | None = None
    sort: Literal["date", "coverage", "temperature", "cell", "name"] = "date"
    descending: bool = False
    limit: int | None = 200
    offset: int = 0
    withdrawn: bool = False
    after: str | None = None


class SweepResult(NamedTuple):
    """A result as a list of sweeps shows it, in its own unit."""

    name: str
    value: float | None
    uncertainty: float | None
    unit: str
    verdict: str | None


@dataclass(frozen=True)
class SweepRow:
    """One sweep: coverage in mol/m^2, temperatures in K, results of the newest reductions (headline ones first)."""

    address: str
    cooldown: str
    name: str
    kind: str
    accession: str
    cell: str | None
    substrate: str | None
    sample: str | None
    empty_cell: bool
    after_dose: str | None
    begin: datetime | None
    end: datetime | None
    direction: str
    rows: int
    coverage: float | None
    coverage_uncertainty: float | None
    temperature_low: float | None
    temperature_high: float | None
    scale: str | None
    thermometers: tuple[str, ...] = ()
    results: tuple[SweepResult, ...] = ()
    channels: tuple[str, ...] = ()
    withdrawn: str | None = None
    """Why it is withdrawn, if it is."""
    amended: tuple[str, ...] = ()
    """Addresses of the amendments that bear on it and count."""
    flagged: tuple[str, ...] = ()
    """Its newest reductions that rest on something withdrawn."""


@dataclass(frozen=True)
class CooldownRow:
    """A cooldown as its newest accession tells it, with counts (sweeps once each, in their newest version)."""

    name: str
    newest_accession: str | None
    begin: datetime | None
    end: datetime | None
    outcome: str | None
    purpose: str | None
    next_step: str | None
    cryostat: str | None
    cell: str | None
    licence: str | None
    accessions: int
    sweeps: int
    reductions: int


@dataclass(frozen=True)
class AccessionRow:
    """An accession with counts of what came in; `warnings` are those that no waiver accepted."""

    address: str
    cooldown: str
    number: int
    key: str
    accessioned: datetime
    supplements: str | None
    differences: tuple[str, ...]
    stillroom: str
    sweeps: int
    doses: int
    records: int
    raw_files: int
    raw_bytes: int
    warnings: int
    waived: int
    notes: int


@dataclass(frozen=True)
class RawFileRow:
    """A raw file and where it is kept."""

    address: str
    accession: str
    cooldown: str
    name: str
    sha256: str
    size: int
    role: str


@dataclass(frozen=True)
class RecordRow:
    """A revision of a long-lived thing; `accession` is the earliest one that holds it, None if it came in by itself."""

    name: str
    revision: int
    kind: str
    address: str
    digest: str
    content: dict[str, Any]
    accession: str | None


@dataclass(frozen=True)
class DoseRow:
    """A line of the gas ledger, amounts in mol and coverage in mol/m^2, as the newest accession holds it."""

    address: str
    accession: str
    name: str
    at: datetime
    act: str
    counted: bool
    amount: float | None
    amount_uncertainty: float | None
    running_amount: float | None
    running_amount_uncertainty: float | None
    running_coverage: float | None
    running_coverage_uncertainty: float | None
    method: str


@dataclass(frozen=True)
class FindingRow:
    """A finding with the accession or reduction that it belongs to; step 0 is the whole."""

    address: str
    step: int
    code: str
    severity: str
    what: str
    place: str | None
    waived: bool
    content: dict[str, Any]


@dataclass(frozen=True)
class ReductionRow:
    """A reduction; `newest` when no later one of its plan on its sweep exists and none supersedes it."""

    address: str
    cooldown: str
    sweep: str
    plan: str
    plan_address: str
    number: int
    key: str
    begin: datetime
    end: datetime
    supersedes: str | None
    stillroom: str
    newest: bool
    title: str
    withdrawn: bool = False


@dataclass(frozen=True)
class ResultRow:
    """A scalar result in its own unit and in SI, with cell and coverage (mol/m^2) of its sweep's newest version.

    The SI values are None where `schemas` does not know the quantity or its unit.
    """

    reduction: str
    cooldown: str
    sweep: str
    plan: str
    name: str
    quantity: str
    unit: str
    ucum: str
    description: str
    scale: str | None
    value: float | None
    uncertainty: float | None
    value_si: float | None
    uncertainty_si: float | None
    verdict: str | None
    newest: bool
    headline: bool
    cell: str | None
    coverage: float | None
    coverage_uncertainty: float | None
    withdrawn: bool = False
    flagged: bool = False
    """Whether its reduction rests on something withdrawn."""

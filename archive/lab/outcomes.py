"""What the door answers: reports of checks, ingests, reductions and replays."""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import Any, Literal

from archive.errors import ArchiveError
from archive.intake.reading import Reading
from schemas.finding import Finding
from schemas.lineage import ReductionDocument

__all__ = ["CheckReport", "IngestOutcome", "ReduceOutcome", "ReplayReport"]


@dataclass(frozen=True)
class CheckReport:
    """All that checking a cooldown folder found.

    Attributes
    ----------
    findings : tuple of Finding
        Sorted by file, line and severity; a waived warning carries its waiver.
    cautions : tuple of dict
        Cautions of the gas that may be trapped, and their like.
    summary : dict
        Counts of what was read: sweeps, files, rows, doses.
    """

    findings: tuple[Finding, ...]
    cautions: tuple[dict[str, Any], ...] = ()
    summary: dict[str, int | str] = field(default_factory=dict)
    reading: Reading | None = field(default=None, repr=False, compare=False)

    def _count(self, severity: str) -> int:
        return sum(finding.severity == severity and finding.waived is None for finding in self.findings)

    @property
    def errors(self) -> int:
        """Number of errors."""
        return self._count("error")

    @property
    def warnings(self) -> int:
        """Number of warnings that nobody waived."""
        return self._count("warning")

    @property
    def notes(self) -> int:
        """Number of notes."""
        return self._count("note")

    @property
    def waived(self) -> int:
        """Number of waived warnings."""
        return sum(finding.waived is not None for finding in self.findings)


@dataclass(frozen=True)
class IngestOutcome:
    """What an ingest did: `ingested`, `supplement`, `already` or `refused`."""

    state: Literal["ingested", "supplement", "already", "refused"]
    address: str | None
    report: CheckReport
    differences: tuple[str, ...] = ()


@dataclass(frozen=True)
class ReduceOutcome:
    """One reduction made, or why it could not be made."""

    sweep: str
    plan: str
    address: str | None = None
    document: ReductionDocument | None = None
    problem: ArchiveError | None = None
    already: bool = False
    """True if the newest reduction of this plan has the same inputs and outputs; nothing was sealed."""


@dataclass(frozen=True)
class ReplayReport:
    """A reduction computed again from raw.

    Attributes
    ----------
    identical : bool
        Every array and result has the digest that was sealed.
    largest_difference : dict of str to float
        Per output that differs, the largest relative difference.
    shifts : dict of str to float
        Per scalar that differs, the change in units of its standard uncertainty.
    changed_inputs, changed_software
        What is not as it was when the reduction was made.
    monte_carlo_identical : bool or None
        The Monte Carlo run drew the same numbers and found the same; None if the reduction has none.
    """

    address: str
    identical: bool
    outputs: int
    largest_difference: dict[str, float] = field(default_factory=dict)
    shifts: dict[str, float] = field(default_factory=dict)
    changed_inputs: tuple[str, ...] = ()
    changed_software: dict[str, tuple[str, str]] = field(default_factory=dict)
    monte_carlo_identical: bool | None = None

    def moved(self, fraction: float) -> dict[str, float]:
        """Results that moved by more than a fraction of their standard uncertainty, or are lost: name to shift in that unit.

        Examples
        --------
        >>> ReplayReport("2026-03/s017@film-transition.2", False, 3, shifts={"T_KT": -0.4, "b": 0.01}).moved(0.1)
        {'T_KT': -0.4}
        """
        lost = {name: math.inf for name, far in self.largest_difference.items() if math.isnan(far)}
        return {**lost, **{name: shift for name, shift in self.shifts.items() if abs(shift) > fraction}}

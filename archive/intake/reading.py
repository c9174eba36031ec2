"""A cooldown folder as read: the sheet, its records, every table, every file's digest, and what was wrong.

Rules: one pass over the folder finds every fault it can reach. What is kept in memory for the checks is bounded: a
very long sweep is thinned there, never in the archive. Tables in memory are in SI units, times in POSIX seconds;
tables in the archive are in the units of the file.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from archive.intake.sheet import SheetReading
from schemas.cell import Cell
from schemas.cooldown import CooldownSheet
from schemas.finding import Finding
from schemas.lineage import AnyRecord, DoseEntry, RawFileEntry
from schemas.substrate import Substrate
from schemas.sweep import Channel, Detection, Sweep
from schemas.thermometer import Calibration, Thermometer

__all__ = ["LISTED", "ChannelFacts", "Reading", "SweepTable"]

LISTED = 100
"""Places of one fault in a sweep that are kept."""


@dataclass
class ChannelFacts:
    """What streaming over one channel found; every row counted, whatever was kept in memory.

    Attributes
    ----------
    low, high : float
        Smallest and largest value in the unit of the file; NaN if there is none.
    missing : int
        Rows without a value (sentinels and kept NaN).
    sentinels : int
        Rows that hold a sentinel.
    reversed_at, repeated_at : list of (int, int)
        File of the sweep, from 0, and line in it at which a time runs backwards or repeats (the first hundred).
    digest : str
        SHA-256 of the stored array.
    """

    low: float = float("nan")
    high: float = float("nan")
    missing: int = 0
    sentinels: int = 0
    reversed_at: list[tuple[int, int]] = field(default_factory=list)
    repeated_at: list[tuple[int, int]] = field(default_factory=list)
    digest: str = ""


@dataclass
class SweepTable:
    """The rows of one sweep.

    Attributes
    ----------
    sweep : Sweep
        As the sheet states it.
    number : int
        Its position in the sheet from 0; `sweep[number + 1]` in a finding's field.
    channels : dict of str to Channel
        The layout's channels and its own, merged.
    columns : dict of str to ndarray
        Per channel, in SI units (times: POSIX seconds), NaN where there is no value; every `stride`-th row.
    lines : ndarray of int64
        File line of each kept row.
    file_numbers : ndarray of int64
        Which of `sweep.files` each kept row stands in.
    rows, stride : int
        Rows of the sweep, and how far apart the kept ones are (1: all are kept).
    facts : dict of str to ChannelFacts
        Per channel.
    temperature, temperature_uncertainty : ndarray or None
        Temperature of the counting thermometer per kept row in K on `scale`; NaN outside its calibration.
    outside_calibration : ndarray of bool or None
        Rows whose reading lies outside the calibration.
    scale : str or None
        Scale of `temperature`.
    calibration : Calibration or None
        Calibration that gave it.
    """

    sweep: Sweep
    number: int
    channels: dict[str, Channel]
    columns: dict[str, NDArray[np.float64]]
    lines: NDArray[np.int64]
    file_numbers: NDArray[np.int64]
    rows: int
    stride: int
    facts: dict[str, ChannelFacts]
    first_lines: dict[str, int] = field(default_factory=dict)
    temperature: NDArray[np.float64] | None = None
    temperature_uncertainty: NDArray[np.float64] | None = None
    outside_calibration: NDArray[np.bool_] | None = None
    scale: str | None = None
    calibration: Calibration | None = None

    @property
    def name(self) -> str:
        """Name of the sweep."""
        return self.sweep.name

    def of_kind(self, quantity: str) -> str | None:
        """Name of the first usable channel of a quantity kind."""
        for name, channel in self.channels.items():
            if channel.quantity == quantity and channel.use:
                return name
        return None

    def values(self, quantity: str) -> NDArray[np.float64] | None:
        """Column of the first usable channel of a quantity kind."""
        name = self.of_kind(quantity)
        return None if name is None else self.columns.get(name)

    @property
    def time(self) -> NDArray[np.float64] | None:
        """Time stamps in POSIX seconds, if the sweep has them."""
        return self.values("instant")

    def where(self, row: int) -> tuple[str, int]:
        """File and line of a kept row."""
        return self.sweep.files[int(self.file_numbers[row])], int(self.lines[row])


@dataclass
class Reading:
    """Everything that was read from a cooldown folder."""

    folder: Path
    sheet_reading: SheetReading
    findings: list[Finding] = field(default_factory=list)
    records: dict[str, AnyRecord] = field(default_factory=dict)
    tables: dict[str, SweepTable] = field(default_factory=dict)
    raw_files: dict[str, RawFileEntry] = field(default_factory=dict)
    ledger: list[DoseEntry] = field(default_factory=list)

    @property
    def sheet(self) -> CooldownSheet:
        """The sheet; only to be asked for when it is valid."""
        sheet = self.sheet_reading.sheet
        if sheet is None:
            raise ValueError("the sheet of this folder is not valid")
        return sheet

    def record(self, reference: str | None) -> AnyRecord | None:
        """Record that a reference names: by address, or by name in its newest revision here."""
        if reference is None:
            return None
        if reference in self.records:
            return self.records[reference]
        named = [record for record in self.records.values() if record.name == reference]
        return max(named, key=lambda record: record.revision, default=None)

    def cell_of(self, sweep: Sweep) -> Cell | None:
        """Cell that a sweep was taken in."""
        record = self.record(self.sheet.cell_of(sweep))
        return record if getattr(record, "free_volume", False) is not False else None  # type: ignore[return-value]

    def substrate_of(self, sweep: Sweep) -> Substrate | None:
        """Substrate inside that cell."""
        cell = self.cell_of(sweep)
        record = self.record(None if cell is None else cell.substrate)
        return record if isinstance(record, Substrate) else None

    def detection_of(self, sweep: Sweep) -> Detection | None:
        """Drive and detection of a sweep."""
        return self.sheet.detection_of(sweep)

    def thermometer_of(self, channel: Channel) -> Thermometer | None:
        """Thermometer that a channel reads."""
        record = self.record(channel.thermometer)
        return record if isinstance(record, Thermometer) else None

    def calibration_of(self, channel: Channel) -> Calibration | None:
        """Calibration in force for a channel: the one it names, else the only or newest one of its thermometer."""
        if channel.calibration is not None:
            record = self.record(channel.calibration)
            return record if isinstance(record, Calibration) else None
        thermometer = self.thermometer_of(channel)
        if thermometer is None:
            return None
        own = [
            record
            for record in self.records.values()
            if isinstance(record, Calibration)
            and record.thermometer in (thermometer.name, thermometer.address)
        ]
        return max(own, key=lambda record: (record.date, record.revision), default=None)

    def line(self, *path: str | int) -> int:
        """Line of a key path in the sheet."""
        return self.sheet_reading.line(*path)

    def by_severity(self) -> Mapping[str, int]:
        """Number of findings of each severity; a waived warning counts as waived."""
        counts = {"error": 0, "warning": 0, "note": 0, "waived": 0}
        for finding in self.findings:
            counts["waived" if finding.waived else finding.severity] += 1
        return counts

"""A sealed cooldown checked again as it is read after an amendment, or with another revision of a record.

Rules
-----
* The checks are those of an ingest, over the sealed columns, with the sheet as amended and the records that hold.
* New is what no check found in the same place before, whatever numbers it told; what was waived stays waived.
"""

from __future__ import annotations

import os
from collections import Counter
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from archive.errors import ArchiveError
from archive.intake.beside import Beside
from archive.intake.dialect import Block
from archive.intake.examine import examined
from archive.intake.gather import Gatherer
from archive.intake.reading import Reading, SweepTable
from archive.intake.sheet import LineMap, SheetReading
from archive.intake.thresholds import Thresholds
from archive.lab.checking import earlier_runs
from archive.lab.effective import EffectiveSource
from archive.lab.source import LabSource, key_of
from archive.reduction.record_kinds import record_kind
from schemas.acts import RevisionDocument
from schemas.cooldown import CooldownSheet, Records
from schemas.finding import Finding
from schemas.lineage import AccessionDocument, AnyRecord, SweepEntry
from schemas.quantity import unit_factor
from schemas.sweep import Channel, Sweep

__all__ = ["findings_of_revision", "new_findings"]

_NO_FOLDER = Path(os.devnull)
"""Where the files lay once is not known here; checks of what else lies there have nothing to say."""


def findings_of_revision(
    source: LabSource, document: RevisionDocument, record: AnyRecord, thresholds: Thresholds
) -> dict[str, tuple[Finding, ...]]:
    """What the checks find only with a revision that is not sealed yet, by cooldown; cooldowns that it leaves alone are not in it."""
    before = EffectiveSource(source, newest=True)
    # Why it was revised may be said beside the record.
    told = record.model_copy(update={"changed": record.changed or document.because})
    after = EffectiveSource(source.with_record(told), newest=True, extra=document)
    found: dict[str, tuple[Finding, ...]] = {}
    for cooldown in before.cooldowns():
        try:
            if before.accessions(cooldown) == after.accessions(cooldown):
                continue
        except ArchiveError as problem:
            found[cooldown] = (_unchecked(cooldown, problem),)
            continue
        found[cooldown] = new_findings(before, after, cooldown, thresholds)
    return found


def new_findings(
    before: EffectiveSource, after: EffectiveSource, cooldown: str, thresholds: Thresholds
) -> tuple[Finding, ...]:
    """What the checks find in a cooldown as it is read after an act, and did not find before it.

    Parameters
    ----------
    before, after : EffectiveSource
        The archive without and with the act.
    cooldown : str
    thresholds : Thresholds
        Limits of the checks.

    Returns
    -------
    tuple of Finding
        In order; a warning that says so if the checks could not be run.
    """
    try:
        known = Counter(_place(each) for each in _findings(before, cooldown, thresholds))
        found = []
        for each in _findings(after, cooldown, thresholds):
            known[_place(each)] -= 1
            if known[_place(each)] < 0:
                found.append(each)
    except (ArchiveError, ValueError) as problem:
        return (_unchecked(cooldown, problem),)
    return tuple(found)


def _place(each: Finding) -> tuple[object, ...]:
    return each.code, each.severity, each.waived, each.file, each.field, each.place, each.column


def _unchecked(cooldown: str, problem: Exception) -> Finding:
    return Finding(
        code="not-checked-again",
        severity="warning",
        what=f"the checks of {cooldown} could not be run again: {problem}",
        place=cooldown,
        remedy="run: stillroom fixity",
    )


def _findings(source: EffectiveSource, cooldown: str, thresholds: Thresholds) -> list[Finding]:
    accessions = source.accessions(cooldown)
    holders = {entry.name: each.address for each in accessions for entry in each.sweeps}
    found: dict[str, Finding] = {}
    for accession in reversed(accessions):
        held = {name for name, holder in holders.items() if holder == accession.address}
        if held or accession is accessions[-1]:
            reading = _Sealed(source, accession).reading(held)
            told, _ = examined(reading, thresholds, earlier=earlier_runs(source.lab, reading))
            found |= {each.model_dump_json(): each for each in told}
    return sorted(found.values(), key=lambda each: each.order)


@dataclass(frozen=True)
class _Sealed:
    """An accession as it is read, to be made a reading of, as if its folder lay there."""

    source: EffectiveSource
    accession: AccessionDocument

    def reading(self, held: set[str]) -> Reading:
        """The reading, with the tables of the sweeps that are named."""
        file = self.accession.sheet_file
        raw = self.source.lab.store.raw(key_of(self.accession.address), file)
        text = b"".join(raw).decode("utf-8", errors="replace")
        records = self._records()
        sheet = self._sheet(records)
        reading = Reading(
            folder=_NO_FOLDER,
            sheet_reading=SheetReading(file, text, sheet, (), LineMap(text)),
            records=records,
            raw_files={each.name: each for each in self.accession.raw_files},
        )
        entries = {each.name: each for each in self.accession.sweeps if each.name in held}
        for number, sweep in enumerate(sheet.sweep):
            if sweep.name in entries:
                channels = _channels(sheet, sweep, entries[sweep.name])
                reading.tables[sweep.name] = self._table(number, sweep, channels, entries[sweep.name])
        return reading

    def _records(self) -> dict[str, AnyRecord]:
        """Under each address that the sheet may name, the record that holds in its place."""
        found: dict[str, AnyRecord] = {}
        for entry in self.accession.records:
            holding = self.source.revisions.holding(self.accession.cooldown, entry.address).address
            record = self.source.lab.find_record(holding) or self.source.lab.find_record(entry.address)
            if record is not None:
                found[entry.address] = record
        for each in self.accession.sweeps:
            cell = found.get(each.cell or "")
            named = getattr(cell, "substrate", None)
            substrate = None if each.substrate is None else self.source.lab.find_record(each.substrate)
            if named is not None and substrate is not None:
                found[named] = substrate
        return found

    def _sheet(self, records: dict[str, AnyRecord]) -> CooldownSheet:
        """The amended sheet, naming what holds and with the records that hold in it, so that they are looked at, too."""
        sheet = self.accession.sheet
        entries = {each.name: each for each in self.accession.sweeps}
        sweeps = tuple(
            each.model_copy(update={"cell": entry.cell, "sample": entry.sample})
            if (entry := entries.get(each.name)) is not None
            else each
            for each in sheet.sweep
        )
        written: dict[str, dict[str, AnyRecord]] = {kind: {} for kind in Records.model_fields}
        for record in records.values():
            written[record_kind(record)][record.address] = record
        own = sheet.record.model_copy(update={kind: tuple(each.values()) for kind, each in written.items()})
        return sheet.model_copy(update={"sweep": sweeps, "record": own})

    def _table(
        self, number: int, sweep: Sweep, channels: dict[str, Channel], entry: SweepEntry
    ) -> SweepTable:
        factors = {
            name: 1.0 if each.quantity == "instant" else unit_factor(each.unit or "", each.quantity)
            for name, each in channels.items()
        }
        read = {name: self._column(sweep.name, name) for name in (*channels, "source_line", "source_file")}
        lines, files = read.pop("source_line").astype(np.int64), read.pop("source_file").astype(np.int64)
        with Beside() as beside:
            gatherer = Gatherer(channels, factors, None, beside)
            for file in np.unique(files):
                chosen = files == file
                columns = {name: values[chosen] for name, values in read.items()}
                gatherer.add(Block(int(lines[chosen][0]), columns, lines[chosen], {}), int(file))
            table = gatherer.finished(number, sweep)
        table.first_lines = dict(entry.first_lines)
        return table

    def _column(self, sweep: str, name: str) -> np.ndarray:
        return np.asarray(self.source.lab.column(self.accession.address, sweep, name))


def _channels(sheet: CooldownSheet, sweep: Sweep, entry: SweepEntry) -> dict[str, Channel]:
    held = {each.name: each for each in entry.channels}
    return {
        name: each.model_copy(
            update={"thermometer": held[name].thermometer, "calibration": held[name].calibration}
        )
        for name, each in sheet.channels_of(sweep).items()
        if name in held
    }

"""A cooldown as reports tell it: amended, with the records that hold, and with what is withdrawn marked, not hidden."""

from __future__ import annotations

import json
from collections.abc import Sequence
from pathlib import Path
from typing import Any

from archive.errors import ArchiveError
from archive.intake.cautions import cautions
from archive.intake.reading import Reading
from archive.intake.sheet import LineMap, SheetReading
from archive.lab.effective import EffectiveSource
from archive.lab.source import LabSource
from schemas.address import parse_address
from schemas.lineage import AccessionDocument, AnyRecord

__all__ = ["read_for_reports", "withdrawn_in"]


def read_for_reports(source: LabSource, cooldown: str) -> list[AccessionDocument]:
    """Accessions of a cooldown, oldest first, as they are to be read.

    Withdrawn accessions are left out unless all are; withdrawn sweeps stay, to be marked.
    """
    reading = EffectiveSource(source, withdrawn_too=True)
    every = reading.accessions(cooldown)
    kept = [each for each in every if each.address not in reading.withdrawn] or every
    sealed = {each.address: each for each in source.accessions(cooldown)}
    return [_told(source, sealed[each.address], each) for each in kept]


def _told(source: LabSource, sealed: AccessionDocument, read: AccessionDocument) -> AccessionDocument:
    """An accession whose sheet names the cell and gas that hold, and whose cautions rest on the amended values."""
    if read is sealed:
        return read
    sheet = read.sheet.model_copy(
        update={
            "cell": _holding(read, "cell", read.sheet.cell),
            "sample": _holding(read, "sample", read.sheet.sample),
        }
    )
    sweeps = tuple(
        each if each.cell is None else each.model_copy(update={"cell": _holding(read, "cell", each.cell)})
        for each in sheet.sweep
    )
    found = read.model_copy(update={"sheet": sheet.model_copy(update={"sweep": sweeps})})
    return found.model_copy(update={"cautions": _cautions(source, found)})


def _holding(read: AccessionDocument, kind: str, stated: str | None) -> str | None:
    name = (stated or "").partition(".r")[0]
    used = {getattr(entry, kind) for entry in read.sweeps} - {None}
    return next((each for each in sorted(used) if each.partition(".r")[0] == name), stated)


def _cautions(source: LabSource, read: AccessionDocument) -> tuple[dict[str, Any], ...]:
    """Cautions as at ingest, from the amended sheet, records and ledger; a caution is never older than its numbers."""
    records: dict[str, AnyRecord] = {}
    for entry in read.records:
        record = source.find_record(entry.address)
        if record is not None:
            records[entry.address] = record
    reading = Reading(
        folder=Path(),
        sheet_reading=SheetReading(read.sheet_file, "", read.sheet, (), LineMap("")),
        records=records,
        ledger=list(read.doses),
    )
    return tuple(json.loads(each.model_dump_json(exclude_none=True)) for each in cautions(reading))


def withdrawn_in(
    source: LabSource, accessions: Sequence[AccessionDocument]
) -> tuple[dict[str, str], dict[str, tuple[str, ...]]]:
    """Why each thing of a cooldown, and each record it uses, is withdrawn; and what rests on something withdrawn.

    Parameters
    ----------
    source : LabSource
    accessions : sequence of AccessionDocument
        Of one cooldown.
    """
    if not accessions:
        return {}, {}
    cooldown = accessions[-1].cooldown
    why = {row.target: row.sentence() for row in source.index.withdrawals()}
    if not why:
        return {}, {}
    used = {entry.address for accession in accessions for entry in accession.records}
    own = {each: said for each, said in why.items() if each in used or _belongs(each, cooldown)}
    for row in source.index.reductions(cooldown=cooldown):
        # What is made of a withdrawn sweep is withdrawn with it.
        if row.withdrawn:
            own.setdefault(row.address, why.get(row.sweep) or why.get(cooldown) or "with its sweep")
    resting = source.index.flagged()
    return own, {
        each: on for each, on in resting.items() if parse_address(each).head == cooldown and each not in own
    }


def _belongs(address: str, cooldown: str) -> bool:
    try:
        parsed = parse_address(address)
    except ArchiveError:
        return False
    return parsed.head == cooldown and parsed.kind not in ("record", "withdrawal") and parsed.revision is None

"""The ingest transaction: a checked cooldown folder becomes one sealed accession, whole or not at all.

Order: read sheet -> compare with what the archive holds -> read and stage everything -> check -> seal -> index. Before
the seal an interruption leaves nothing but staging, which the next open sweeps; after it the sealed file alone is
enough to complete the index.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from datetime import datetime
from pathlib import Path
from typing import Any, Literal

from archive.intake.folder import SHEET_NAME, Archived, Progress, read_cooldown
from archive.intake.paths import path_inside
from archive.intake.reading import Reading
from archive.intake.sheet import SheetReading, read_sheet
from archive.intake.summary import record_entries, sweep_entries
from archive.reduction.sheet_of_sweep import sheet_of_sweep
from archive.store.interface import Column, SealedFile, Store, TableWriter, Writer
from schemas.cooldown import CooldownSheet
from schemas.finding import Finding
from schemas.lineage import AccessionDocument, Software

__all__ = ["Examination", "IngestOutcome", "ingest", "records_differ"]

_CHUNK = 1 << 20

Examine = Callable[[Reading], "Examination"]


@dataclass(frozen=True)
class Examination:
    """What checks and cautions said of a reading."""

    findings: tuple[Finding, ...]
    cautions: tuple[dict[str, Any], ...] = ()


@dataclass(frozen=True)
class IngestOutcome:
    """What an ingest did.

    Attributes
    ----------
    state : str
        `ingested` (a first accession), `supplement` (a later one), `already` (nothing differs), `refused`
        (findings of error level; nothing was stored).
    address : str or None
        The accession made, or the one that already holds all this.
    """

    state: Literal["ingested", "supplement", "already", "refused"]
    address: str | None
    findings: tuple[Finding, ...] = ()
    cautions: tuple[dict[str, Any], ...] = ()
    differences: tuple[str, ...] = ()
    document: AccessionDocument | None = None
    sealed: SealedFile | None = None
    reading: Reading | None = field(default=None, repr=False)


@dataclass(frozen=True)
class _Plan:
    """Which part of a folder goes into the accession about to be made."""

    number: int
    differences: tuple[str, ...] = ()
    files: frozenset[str] | None = None
    sweeps: frozenset[str] | None = None


class _Selective:
    """Writer that lets through what an accession is to hold, and swallows the rest."""

    def __init__(self, writer: Writer, plan: _Plan) -> None:
        self._writer = writer
        self._plan = plan

    def raw(self, name: str, blocks: Any, *, media_type: str = "application/octet-stream") -> str:
        if self._plan.files is None or name in self._plan.files:
            return self._writer.raw(name, blocks, media_type=media_type)
        digest = hashlib.sha256()
        for block in blocks:
            digest.update(block)
        return digest.hexdigest()

    def table(self, group: str, columns: Sequence[Column], *, index: str | None = None) -> TableWriter:
        if self._plan.sweeps is None or group.removeprefix("sweeps/") in self._plan.sweeps:
            return self._writer.table(group, columns, index=index)
        return _Nowhere()

    def array(self, path: str, data: Any, attributes: Mapping[str, Any]) -> None:
        self._writer.array(path, data, attributes)

    def document(self, text: str) -> None:
        self._writer.document(text)

    def seal(self) -> SealedFile:
        return self._writer.seal()

    def abandon(self) -> None:
        self._writer.abandon()


class _Nowhere:
    rows = 0

    def append(self, block: Mapping[str, Any]) -> None:
        """Swallow rows of a sweep that an earlier accession already holds."""


def ingest(
    folder: Path,
    *,
    store: Store,
    earlier: Callable[[str], Sequence[AccessionDocument]],
    archived: Archived,
    examine: Examine,
    clock: Callable[[], datetime],
    software: Software,
    progress: Progress = lambda sentence: None,
) -> IngestOutcome:
    """Accession made from a cooldown folder; nothing is stored if anything is wrong.

    Parameters
    ----------
    folder : Path
        The cooldown folder.
    store : Store
        Where the sealed file goes.
    earlier : callable
        Accessions of a cooldown by name, oldest first.
    archived : callable
        Record of the archive for a reference, or None.
    examine : callable
        Checks and cautions over the reading; it also adds temperatures and the ledger to it.
    clock, software
        Time of the accession and what made it, for the document.

    Raises
    ------
    AlreadySealed
        If another process sealed the same accession meanwhile.
    """
    sheet_reading = read_sheet(folder / SHEET_NAME)
    if sheet_reading.sheet is None:
        return IngestOutcome("refused", None, sheet_reading.findings)
    documents = earlier(sheet_reading.sheet.name)
    plan = _plan(folder, sheet_reading, documents)
    if plan is None:
        return IngestOutcome("already", documents[-1].address, differences=())
    name = sheet_reading.sheet.name
    address = f"{name}.a{plan.number}"
    with store.writer(f"{name}/{address}") as writer:
        reading = read_cooldown(folder, archived=archived, sink=_Selective(writer, plan), progress=progress)
        progress("checking")
        reading.findings.extend(records_differ(reading, archived))
        examination = examine(reading)
        if any(finding.severity == "error" for finding in examination.findings):
            writer.abandon()
            return IngestOutcome("refused", None, examination.findings, examination.cautions, reading=reading)
        document = AccessionDocument(
            format="stillroom-accession/1",
            address=address,
            cooldown=name,
            number=plan.number,
            accessioned=clock(),
            supplements=documents[-1].address if documents else None,
            differences=plan.differences,
            sheet=reading.sheet,
            sheet_file=SHEET_NAME,
            records=record_entries(reading),
            sweeps=tuple(
                entry for entry in sweep_entries(reading) if plan.sweeps is None or entry.name in plan.sweeps
            ),
            doses=tuple(reading.ledger),
            raw_files=tuple(
                entry
                for entry in reading.raw_files.values()
                if plan.files is None or entry.name in plan.files
            ),
            findings=examination.findings,
            cautions=examination.cautions,
            software=software,
        )
        writer.document(document.model_dump_json(indent=1))
        progress("sealing")
        sealed = writer.seal()
    return IngestOutcome(
        "supplement" if documents else "ingested",
        address,
        examination.findings,
        examination.cautions,
        plan.differences,
        document,
        sealed,
        reading,
    )


def _plan(folder: Path, reading: SheetReading, documents: Sequence[AccessionDocument]) -> _Plan | None:
    """What is to be stored; None if the archive already holds all of it."""
    if not documents:
        return _Plan(number=1)
    sheet = reading.sheet
    if sheet is None:
        return None
    held = {entry.name: entry.sha256 for document in documents for entry in document.raw_files}
    named = {SHEET_NAME, *(name for sweep in sheet.sweep for name in sweep.files), *sheet.other_files}
    differences: list[str] = []
    files: set[str] = set()
    for name in sorted(named):
        digest = _file_digest(folder, name)
        if digest is None or digest == held.get(name):
            continue
        files.add(name)
        kind = "changed" if name in held else "added"
        differences.append(
            f"file {name} {kind}: SHA-256 {_short(held.get(name))} -> {_short(digest)}"
            if name in held
            else f"file {name} {kind}: SHA-256 {_short(digest)}"
        )
    if not files:
        return None
    last = documents[-1].sheet
    before = {sweep.name: _definition(last, sweep.name) for sweep in last.sweep}
    sweeps: set[str] = set()
    for sweep in sheet.sweep:
        if sweep.name not in before:
            differences.append(f"sweep {sweep.name} added")
        elif changed := _changed(before[sweep.name], _definition(sheet, sweep.name)):
            differences.append(
                f"sweep {sweep.name}: its description in the sheet changed ({', '.join(changed)})"
            )
        elif not files.intersection(sweep.files):
            continue
        sweeps.add(sweep.name)
    differences += [
        f"sweep {name} is no longer in the sheet; what was sealed stays"
        for name in before
        if name not in {sweep.name for sweep in sheet.sweep}
    ]
    # A sweep is stored whole where it is stored, so that one accession holds all files of it.
    files |= {name for sweep in sheet.sweep if sweep.name in sweeps for name in sweep.files}
    return _Plan(documents[-1].number + 1, tuple(differences), frozenset(files), frozenset(sweeps))


def _definition(sheet: CooldownSheet, name: str) -> dict[str, str]:
    """All that a sheet says of a sweep, doses that it has seen too, as texts to be compared."""
    return {
        what: json.dumps(said, sort_keys=True, default=lambda record: record.model_dump(mode="json"))
        for what, said in sheet_of_sweep(sheet, name).items()
    }


def _changed(before: Mapping[str, str], now: Mapping[str, str]) -> list[str]:
    """What is said otherwise, in words."""
    return [what.replace("_", " ") for what in now if now[what] != before[what]]


def _file_digest(folder: Path, name: str) -> str | None:
    path = path_inside(folder, name)
    if isinstance(path, str):
        return None  # reading will say why
    try:
        with path.open("rb") as stream:
            return hashlib.file_digest(stream, "sha256").hexdigest()
    except OSError:
        return None


def _short(digest: str | None) -> str:
    return "none" if digest is None else digest[:16]


def records_differ(reading: Reading, archived: Archived) -> list[Finding]:
    """Records whose content is not what the archive holds under the same revision."""
    findings: list[Finding] = []
    for record in reading.sheet.records:
        held = archived(record.address)
        if held is None:
            continue
        mine, theirs = record.model_dump(mode="json"), held.model_dump(mode="json")
        findings.extend(
            Finding(
                code="record-differs",
                severity="error",
                what=f"{record.address} is in the archive with another {name}",
                file=SHEET_NAME,
                field=f"{record.address}.{name}",
                place=record.address,
                found=_value(mine.get(name)),
                expected=_value(theirs.get(name)),
                remedy=f"correct the sheet, or make it revision {record.revision + 1} and say what changed",
            )
            for name in sorted({*mine, *theirs})
            if mine.get(name) != theirs.get(name)
        )
    return findings


def _value(content: object) -> str:
    if isinstance(content, dict) and "text" in content:
        content = content["text"]
    text = json.dumps(content, ensure_ascii=False)
    return text if len(text) <= 200 else text[:197] + "..."

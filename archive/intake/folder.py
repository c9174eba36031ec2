"""Reading a cooldown folder whole: sheet, records, every file once, every fault.

Rules: a path in a sheet stays inside the folder, links included. A file is hashed from the very bytes that are parsed;
when it is also being sealed, it is read a second time and both digests must agree.
"""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterator
from pathlib import Path

from archive.errors import BadRequest
from archive.intake.bad_cells import report_cells
from archive.intake.beside import Beside
from archive.intake.dialect import ColumnRequest
from archive.intake.gather import Gatherer, stored_columns
from archive.intake.own_readers import own_reader
from archive.intake.paths import path_inside
from archive.intake.reading import Reading
from archive.intake.sheet import read_sheet
from archive.intake.sources import is_array_source, read_array_source
from archive.intake.tables import TableReader
from archive.store.interface import Writer
from archive.store.names import is_key
from schemas.finding import Finding
from schemas.kinds import KINDS
from schemas.lineage import AnyRecord, RawFileEntry
from schemas.quantity import unit_factor
from schemas.sweep import Channel, Sweep

__all__ = ["SHEET_NAME", "read_cooldown"]

SHEET_NAME = "cooldown.toml"
_CHUNK = 1 << 20

Archived = Callable[[str], AnyRecord | None]
Progress = Callable[[str], None]


def read_cooldown(
    folder: Path,
    *,
    archived: Archived = lambda reference: None,
    sink: Writer | None = None,
    progress: Progress = lambda sentence: None,
) -> Reading:
    """Everything a cooldown folder holds, with every fault that reading finds.

    Parameters
    ----------
    folder : Path
        Folder with `cooldown.toml`.
    archived : callable
        Record of the archive for a reference that the sheet does not describe itself, or None.
    sink : Writer, optional
        Sealed file being written; raw bytes and tables go there as they are read.
    progress : callable
        Told what is being read.

    Returns
    -------
    Reading
        With findings; tables of files without faults. Temperatures, ledger and checks are added by others.
    """
    reading = Reading(folder=folder, sheet_reading=read_sheet(folder / SHEET_NAME))
    reading.findings.extend(reading.sheet_reading.findings)
    if reading.sheet_reading.sheet is None:
        return reading
    _check_name(reading)
    _take_records(reading, archived)
    _keep_raw(reading, SHEET_NAME, "sheet", sink, field=None, line=1)
    with Beside() as beside:
        for number, sweep in enumerate(reading.sheet.sweep):
            progress(f"reading {sweep.name}")
            _read_sweep(reading, number, sweep, sink, beside)
    for number, name in enumerate(reading.sheet.other_files):
        _keep_raw(
            reading,
            name,
            "other",
            sink,
            field=f"other_files[{number + 1}]",
            line=reading.line("other_files", number),
        )
    return reading


def _check_name(reading: Reading) -> None:
    name = reading.sheet.name
    if not is_key(f"{name}/{name}.a1"):
        reading.findings.append(
            Finding(
                code="sheet-field",
                severity="error",
                what="no folder can have this name on every system, so no cooldown can either",
                file=SHEET_NAME,
                line=reading.line("name"),
                field="name",
                found=name,
                remedy="give the cooldown another name, e.g. 2026-03",
            )
        )


def _take_records(reading: Reading, archived: Archived) -> None:
    sheet = reading.sheet
    for record in sheet.records:
        if record.address in reading.records:
            reading.findings.append(
                Finding(
                    code="record-twice",
                    severity="error",
                    what=f"{record.address} is described twice in this sheet",
                    file=SHEET_NAME,
                    place=record.address,
                    remedy="keep one, or raise the revision number of the later one",
                )
            )
        reading.records[record.address] = record
    wanted = _references(reading)
    while wanted:
        reference = wanted.pop()
        if reading.record(reference) is not None:
            continue
        held = archived(reference)
        if held is not None:
            reading.records[held.address] = held
            wanted |= _references(reading)


def _references(reading: Reading) -> set[str]:
    """Every record that the sheet or its records name, not yet at hand."""
    sheet = reading.sheet
    named: set[str | None] = {sheet.cryostat, sheet.cell, sheet.sample}
    named |= {reference for sweep in sheet.sweep for reference in (sweep.cell, sweep.sample)}
    named |= {dose.sample for dose in sheet.dose}
    for sweep in sheet.sweep:
        for channel in sheet.channels_of(sweep).values():
            named |= {channel.thermometer, channel.calibration}
    for record in reading.records.values():
        named |= {getattr(record, "substrate", None), getattr(record, "thermometer", None)}
    return {reference for reference in named if reference is not None and reading.record(reference) is None}


def _fault(reading: Reading, name: str, why: str, *, field: str | None, line: int) -> None:
    reading.findings.append(
        Finding(
            code="file-unreadable",
            severity="error",
            what=f"the file {name} {why}",
            file=SHEET_NAME,
            line=line,
            field=field,
            remedy="correct the name, or bring the file into the folder",
        )
    )


def _keep_raw(
    reading: Reading, name: str, role: str, sink: Writer | None, *, field: str | None, line: int
) -> Path | None:
    path = path_inside(reading.folder, name)
    if isinstance(path, str):
        _fault(reading, name, path, field=field, line=line)
        return None
    if name in reading.raw_files:
        return path
    size = 0

    def chunks() -> Iterator[bytes]:
        nonlocal size
        with path.open("rb") as stream:
            while chunk := stream.read(_CHUNK):
                size += len(chunk)
                yield chunk

    try:
        if sink is None:
            digest = hashlib.sha256()
            for chunk in chunks():
                digest.update(chunk)
            sha256 = digest.hexdigest()
        else:
            sha256 = sink.raw(name, chunks())
    except OSError as error:
        _fault(reading, name, f"cannot be read ({error.strerror})", field=field, line=line)
        return None
    reading.raw_files[name] = RawFileEntry.model_validate(
        {"name": name, "sha256": sha256, "size": size, "role": role}
    )
    return path


def _requests(channels: dict[str, Channel]) -> list[ColumnRequest]:
    return [
        ColumnRequest(
            name=name,
            column=channel.column,
            kind="time" if channel.quantity == "instant" else "number",
            sentinels=channel.sentinels,
            nan=channel.nan,
        )
        for name, channel in channels.items()
    ]


def _factors(
    reading: Reading, number: int, sweep: Sweep, channels: dict[str, Channel]
) -> dict[str, float] | None:
    """SI factor per channel; None if a unit or quantity cannot be what the sheet says."""
    factors: dict[str, float] = {}
    whole = True
    for name, channel in channels.items():
        if channel.quantity == "instant":
            factors[name] = 1.0
            continue
        in_sweep = name in sweep.channels
        path: tuple[str | int, ...] = (
            ("sweep", number, "channels", name)
            if in_sweep
            else ("layout", str(sweep.layout), "channels", name)
        )
        try:
            factors[name] = unit_factor(channel.unit or "", channel.quantity)
        except ValueError as error:
            whole = False
            finding = Finding(
                code="channel-unit",
                severity="error",
                what=str(error),
                file=SHEET_NAME,
                line=reading.line(*path, "unit" if channel.quantity in KINDS else "quantity"),
                field=f"sweep[{number + 1}].channels.{name}"
                if in_sweep
                else f"layout.{sweep.layout}.channels.{name}",
                place=f"{sweep.name}#{name}" if in_sweep else None,
                remedy="write the quantity and the unit that the column has",
            )
            if finding not in reading.findings:
                reading.findings.append(finding)
    return factors if whole else None


def _read_sweep(reading: Reading, number: int, sweep: Sweep, sink: Writer | None, beside: Beside) -> None:
    channels = reading.sheet.channels_of(sweep)
    if sweep.layout is not None and sweep.layout not in reading.sheet.layout:
        reading.findings.append(
            Finding(
                code="unknown-name",
                severity="error",
                what=f"the layout {sweep.layout!r} is not described in this sheet",
                file=SHEET_NAME,
                line=reading.line("sweep", number, "layout"),
                field=f"sweep[{number + 1}].layout",
                place=sweep.name,
                expected=", ".join(reading.sheet.layout) or "a table [layout.NAME]",
                remedy="add the layout or correct its name",
            )
        )
        return
    factors = _factors(reading, number, sweep, channels)
    paths: list[Path | None] = [
        _keep_raw(
            reading,
            name,
            "sweep",
            sink,
            field=f"sweep[{number + 1}].files",
            line=reading.line("sweep", number, "files"),
        )
        for name in sweep.files
    ]
    if factors is None or None in paths:
        return
    instants = [name for name, channel in channels.items() if channel.quantity == "instant"]
    table = (
        None
        if sink is None
        else sink.table(
            f"sweeps/{sweep.name}", stored_columns(channels), index=instants[0] if instants else None
        )
    )
    gatherer = Gatherer(channels, factors, table, beside)
    first_lines: dict[str, int] = {}
    whole = True
    for file_number, (name, path) in enumerate(zip(sweep.files, paths, strict=True)):
        if path is None:
            continue
        before = gatherer.rows
        try:
            whole &= _read_file(reading, sweep, name, path, gatherer, file_number, first_lines, beside)
        except BadRequest as error:
            whole = False
            reading.findings.append(
                Finding(
                    code="file-unreadable",
                    severity="error",
                    what=error.what,
                    file=error.file or name,
                    line=error.line,
                    column=None if error.column is None else str(error.column),
                    field=error.field,
                    place=sweep.name,
                    found=error.found,
                    expected=error.expected,
                    remedy=error.remedy or "correct the dialect or the column in the sheet",
                )
            )
        if whole and gatherer.rows == before:
            whole = False
            reading.findings.append(
                Finding(
                    code="file-empty",
                    severity="error",
                    what="there is no row of data in this file",
                    file=name,
                    place=sweep.name,
                    remedy="bring the whole file, or take it out of the sweep",
                )
            )
    if whole:
        reading.tables[sweep.name] = gatherer.finished(number, sweep)
        reading.tables[sweep.name].first_lines = first_lines


def _tell_reader(reading: Reading, sweep: Sweep, name: str) -> None:
    """Keep with what was read that the laboratory's own code read it, and which: only with it the file is read again."""
    reader = own_reader(name)
    if reader is not None:
        reading.findings.append(
            Finding(
                code="own-reader",
                severity="note",
                what=f"this file was read by the laboratory's reader {reader.name} version {reader.version}",
                file=name,
                place=sweep.name,
                found=reader.package or None,
                remedy="keep the package that brings the reader; the raw bytes are kept here",
            )
        )


def _read_file(
    reading: Reading,
    sweep: Sweep,
    name: str,
    path: Path,
    gatherer: Gatherer,
    file_number: int,
    first_lines: dict[str, int],
    beside: Beside,
) -> bool:
    """Rows of one file into the gatherer; whether every cell was as it should be."""
    requests = _requests(gatherer.channels)
    if is_array_source(name):
        _tell_reader(reading, sweep, name)
        block = read_array_source(path, name, requests)
        first_lines[name] = int(block.lines[0]) if len(block.lines) else 1
        gatherer.add(block, file_number)
        report_cells(reading, sweep, name, block.bad_cells, block.bad_cell_count, len(block.lines))
        return not block.bad_cell_count
    digest = beside.digest()
    with path.open("rb") as stream:
        reader = TableReader(
            stream, file=name, dialect=reading.sheet.dialect_of(sweep), columns=requests, tee=[digest.update]
        )
        for block in beside.ahead(reader.blocks()):
            if len(block.lines):
                first_lines.setdefault(name, int(block.lines[0]))
            gatherer.add(block, file_number)
    report_cells(reading, sweep, name, reader.bad_cells, reader.bad_cell_count, reader.rows)
    # After a fault the reader may have stopped before the end.
    if not reader.bad_cell_count and digest.hexdigest() != reading.raw_files[name].sha256:
        reading.findings.append(
            Finding(
                code="file-changed",
                severity="error",
                what="the file changed while it was being read",
                file=name,
                place=sweep.name,
                remedy="wait until nothing writes to it any more, then try again",
            )
        )
        return False
    return not reader.bad_cell_count

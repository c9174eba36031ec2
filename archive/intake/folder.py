"""Reading a cooldown folder whole: sheet, records, every file once, every fault.

Rules: a path in a sheet stays inside the folder, links included. A file is hashed from the very bytes that are parsed;
when it is also being sealed, it is read a second time and both digests must agree.
"""

from __future__ import annotations

import hashlib
import math
from collections.abc import Callable, Iterator
from pathlib import Path, PurePosixPath
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from archive.errors import BadRequest
from archive.intake.dialect import BadCell, Block, ColumnRequest
from archive.intake.reading import LISTED, ChannelFacts, Reading, SweepTable
from archive.intake.sheet import read_sheet
from archive.intake.sources import read_array_source
from archive.intake.tables import TableReader
from archive.store.interface import Column, TableWriter, Writer
from archive.store.names import is_key
from schemas.finding import Finding
from schemas.kinds import KINDS
from schemas.lineage import AnyRecord, RawFileEntry
from schemas.quantity import unit_factor
from schemas.sweep import Channel, Sweep
from schemas.units import ucum

__all__ = ["SHEET_NAME", "folder_files", "path_inside", "read_cooldown"]

SHEET_NAME = "cooldown.toml"
KEPT_ROWS = 1_000_000
"""Rows of one sweep kept in memory for the checks; beyond that every second, fourth, ... row is kept."""
_CHUNK = 1 << 20
_ARRAY_SUFFIXES = (".npy", ".npz", ".h5", ".hdf5")
_SHOWN_CELLS = 1000
_EVERYWHERE = 20
"""As many rows with one and the same fault are not listed one by one when hardly a row is without it."""

Archived = Callable[[str], AnyRecord | None]
Progress = Callable[[str], None]


class _Digest(Protocol):
    def update(self, data: bytes, /) -> None: ...
    def hexdigest(self) -> str: ...


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
    for number, sweep in enumerate(reading.sheet.sweep):
        progress(f"reading {sweep.name}")
        _read_sweep(reading, number, sweep, sink)
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


def folder_files(folder: Path) -> Iterator[str]:
    """Names of the files below a folder, relative with forward slashes, sorted; hidden ones are left out."""
    for path in sorted(folder.rglob("*")):
        relative = path.relative_to(folder)
        if path.is_file() and not any(part.startswith(".") for part in relative.parts):
            yield relative.as_posix()


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


def path_inside(folder: Path, name: str) -> Path | str:
    """Path of a file that a sheet names, or why it cannot be read, as the rest of a sentence."""
    pure = PurePosixPath(name)
    if pure.is_absolute() or ".." in pure.parts or ":" in name.partition("/")[0]:
        return "leads out of the cooldown folder"
    if str(pure) != name:
        # Two spellings of one path would be two raw files.
        return f"is spelled in a roundabout way; write {pure}"
    return _file_at(folder.joinpath(*pure.parts), folder)


def _file_at(path: Path, folder: Path) -> Path | str:
    try:
        resolved = path.resolve(strict=True)
    except (OSError, RuntimeError):  # RuntimeError: a link that leads to itself, before Python 3.13
        return "is not there"
    if not resolved.is_relative_to(folder.resolve()):
        return "is a link that leads out of the cooldown folder"
    if not resolved.is_file():
        return "is not a file"
    # On a file system that folds case, a sheet could name one file in two spellings.
    if path.name not in {entry.name for entry in path.parent.iterdir()}:
        return "is spelled differently on disk"
    return path


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
    digest = hashlib.sha256()
    size = 0

    def chunks() -> Iterator[bytes]:
        nonlocal size
        with path.open("rb") as stream:
            while chunk := stream.read(_CHUNK):
                digest.update(chunk)
                size += len(chunk)
                yield chunk

    try:
        if sink is None:
            for _ in chunks():
                pass
        else:
            sink.raw(name, chunks())
    except OSError as error:
        _fault(reading, name, f"cannot be read ({error.strerror})", field=field, line=line)
        return None
    reading.raw_files[name] = RawFileEntry.model_validate(
        {"name": name, "sha256": digest.hexdigest(), "size": size, "role": role}
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


class _Gatherer:
    """Rows of one sweep as they stream by: statistics of all, values of some, all of them to the sealed file."""

    def __init__(
        self, channels: dict[str, Channel], factors: dict[str, float], table: TableWriter | None
    ) -> None:
        self.channels = channels
        self.factors = factors
        self.table = table
        self.facts = {name: ChannelFacts() for name in channels}
        self.digests: dict[str, _Digest] = {name: hashlib.sha256() for name in channels}
        self.kept: dict[str, list[NDArray[np.float64]]] = {name: [] for name in channels}
        self.lines: list[NDArray[np.int64]] = []
        self.file_numbers: list[NDArray[np.int64]] = []
        self.rows = 0
        self.stride = 1
        self._last_time: dict[str, float] = {}

    def add(self, block: Block, file_number: int) -> None:
        """Take one block of rows."""
        count = len(block.lines)
        if count == 0:
            return
        numbers = np.full(count, file_number, dtype=np.int64)
        chosen = slice((-self.rows) % self.stride, None, self.stride)
        for name in self.channels:
            values = np.ascontiguousarray(block.columns[name], dtype=np.float64)
            self._count(name, values, block, file_number)
            self.digests[name].update(values.tobytes())
            self.kept[name].append(values[chosen] * self.factors[name])
        self.lines.append(block.lines[chosen])
        self.file_numbers.append(numbers[chosen])
        if self.table is not None:
            columns = {name: block.columns[name] for name in self.channels}
            self.table.append({**columns, "source_line": block.lines, "source_file": numbers})
        self.rows += count
        while sum(map(len, self.lines)) > KEPT_ROWS:
            self._thin()

    def _thin(self) -> None:
        self.stride *= 2
        self.lines = [np.concatenate(self.lines)[::2]]
        self.file_numbers = [np.concatenate(self.file_numbers)[::2]]
        self.kept = {name: [np.concatenate(parts)[::2]] for name, parts in self.kept.items()}

    def _count(self, name: str, values: NDArray[np.float64], block: Block, file_number: int) -> None:
        facts = self.facts[name]
        present = values[np.isfinite(values)]
        facts.missing += len(values) - len(present)
        facts.sentinels += int(np.count_nonzero(block.sentinel.get(name, np.zeros(0, dtype=bool))))
        if len(present):
            facts.low = float(np.fmin(facts.low, present.min()))
            facts.high = float(np.fmax(facts.high, present.max()))
        if self.channels[name].quantity == "instant" and len(present):
            lines = block.lines[np.isfinite(values)]
            before = self._last_time.get(name, -math.inf)
            step = np.diff(np.concatenate(([before], present)))
            for places, odd in ((facts.reversed_at, step < 0), (facts.repeated_at, step == 0)):
                places.extend((file_number, int(line)) for line in lines[odd][: LISTED - len(places)])
            self._last_time[name] = float(present[-1])

    def finished(self, number: int, sweep: Sweep) -> SweepTable:
        """Table of the checks."""
        for name, facts in self.facts.items():
            facts.digest = self.digests[name].hexdigest()
        return SweepTable(
            sweep=sweep,
            number=number,
            channels=self.channels,
            columns={
                name: np.concatenate(parts) if parts else np.zeros(0) for name, parts in self.kept.items()
            },
            lines=np.concatenate(self.lines) if self.lines else np.zeros(0, dtype=np.int64),
            file_numbers=np.concatenate(self.file_numbers)
            if self.file_numbers
            else np.zeros(0, dtype=np.int64),
            rows=self.rows,
            stride=self.stride,
            facts=self.facts,
        )


def _columns(channels: dict[str, Channel]) -> list[Column]:
    columns = [
        Column(
            name=name,
            dtype="float64",
            unit="s" if channel.quantity == "instant" else (channel.unit or "1"),
            ucum="s" if channel.quantity == "instant" else ucum(channel.unit or "1"),
            quantity=channel.quantity,
            description=_description(name, channel),
        )
        for name, channel in channels.items()
    ]
    line = Column(
        "source_line", "int64", "1", "1", "count", "Line of the raw file that this row stands in, from 1."
    )
    file = Column("source_file", "int64", "1", "1", "count", "Which of the sweep's files, from 0.")
    return [*columns, line, file]


def _description(name: str, channel: Channel) -> str:
    parts = [channel.description or name.replace("_", " ")]
    if channel.quantity == "instant":
        parts.append("POSIX seconds since 1970-01-01T00:00:00Z")
    for label, value in (
        ("scale", channel.scale),
        ("convention", channel.convention),
        ("instrument", channel.instrument),
        ("thermometer", channel.thermometer),
    ):
        if value:
            parts.append(f"{label}: {value}")
    if not channel.use:
        parts.append(f"not to be used: {channel.why_not}")
    return "; ".join(parts)


def _read_sweep(reading: Reading, number: int, sweep: Sweep, sink: Writer | None) -> None:
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
        else sink.table(f"sweeps/{sweep.name}", _columns(channels), index=instants[0] if instants else None)
    )
    gatherer = _Gatherer(channels, factors, table)
    first_lines: dict[str, int] = {}
    whole = True
    for file_number, (name, path) in enumerate(zip(sweep.files, paths, strict=True)):
        if path is None:
            continue
        before = gatherer.rows
        try:
            whole &= _read_file(reading, sweep, name, path, gatherer, file_number, first_lines)
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


def _read_file(
    reading: Reading,
    sweep: Sweep,
    name: str,
    path: Path,
    gatherer: _Gatherer,
    file_number: int,
    first_lines: dict[str, int],
) -> bool:
    """Rows of one file into the gatherer; whether every cell was as it should be."""
    requests = _requests(gatherer.channels)
    if path.name.lower().endswith(_ARRAY_SUFFIXES):
        block = read_array_source(path, name, requests)
        first_lines[name] = int(block.lines[0]) if len(block.lines) else 1
        gatherer.add(block, file_number)
        _report_cells(reading, sweep, name, block.bad_cells, block.bad_cell_count, len(block.lines))
        return not block.bad_cell_count
    digest = hashlib.sha256()
    with path.open("rb") as stream:
        reader = TableReader(
            stream, file=name, dialect=reading.sheet.dialect_of(sweep), columns=requests, tee=[digest.update]
        )
        for block in reader.blocks():
            if len(block.lines):
                first_lines.setdefault(name, int(block.lines[0]))
            gatherer.add(block, file_number)
    _report_cells(reading, sweep, name, reader.bad_cells, reader.bad_cell_count, reader.rows)
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


def _report_cells(
    reading: Reading, sweep: Sweep, name: str, cells: list[BadCell], count: int, rows: int
) -> None:
    """Findings of the bad cells: each one, or one for all when the same fault stands in almost every row."""
    lines = rows + sum(not cell.column for cell in cells)  # a line that is wrong as a whole is no row
    alike: dict[str, list[BadCell]] = {}
    for cell in cells[:_SHOWN_CELLS]:
        alike.setdefault(f"{cell.column}{cell.why}", []).append(cell)
    listed = 0
    for group in alike.values():
        everywhere = len(group) > _EVERYWHERE and len(group) > 0.9 * min(lines, _SHOWN_CELLS / len(alike))
        for cell in group[:1] if everywhere else group:
            more = f", and so it is in {len(group) - 1} or more further rows" if everywhere else ""
            reading.findings.append(
                Finding(
                    code="bad-cell",
                    severity="error",
                    what=f"{cell.why}{more}",
                    file=name,
                    line=cell.line or None,
                    column=cell.column or None,
                    place=sweep.name,
                    found=repr(cell.found),
                    remedy=_cell_remedy(cell, everywhere=everywhere),
                )
            )
        listed += len(group)
    if count > listed:
        reading.findings.append(
            Finding(
                code="bad-cell",
                severity="error",
                what=f"{count} cells of this file cannot be read; the first {listed} are listed",
                file=name,
                place=sweep.name,
                remedy="a wrong dialect makes every row wrong: look at the delimiter and the decimal mark first",
            )
        )


def _cell_remedy(cell: BadCell, *, everywhere: bool) -> str:
    if everywhere:
        return "look at the dialect first: delimiter, decimal mark, form and zone of the times"
    if not cell.column:
        return "bring a whole copy of the file, or correct the dialect in the sheet"
    if not cell.column[0].isdigit():  # a column that was asked for, not the place of a cell
        return "correct the column in the sheet, or the delimiter and the header of its dialect"
    return "name the cell as a sentinel, or bring a whole copy of the file"

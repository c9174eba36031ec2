"""What a text table seems to be, for the draft of a sheet: every guess with its reason, every doubt said.

Rules: a guess is read off the file and nothing else. Where two readings are possible the draft says so and the person
decides; no unit, zone or quantity is made up.
"""

from __future__ import annotations

import zlib
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from archive.errors import BadRequest
from archive.intake.dialect import ColumnRequest
from archive.intake.guess_columns import ColumnGuess, guessed_columns, shared_time_format
from archive.intake.guess_layout import guessed_layout
from archive.intake.tables import TableReader
from schemas.sweep import Dialect

__all__ = ["ColumnGuess", "TableGuess", "guess_table"]

HEAD_BYTES: Final = 256 << 10


@dataclass(frozen=True)
class TableGuess:
    """What a text table seems to be.

    Parameters
    ----------
    file : str
        Name of the file.
    dialect : schemas.sweep.Dialect
        The most likely dialect.
    why : dict of str to str
        Reason per field of the dialect.
    columns : tuple of ColumnGuess
        In the order of the file.
    rows : int
        Rows of data in the whole file.
    bad_cells : int
        Cells of the whole file that do not fit the guess.
    time_span : tuple of float or None
        First and last POSIX time in seconds, if a column of time stamps names instants.
    doubts : tuple of str
        What the person has to decide or look at.
    """

    file: str
    dialect: Dialect
    why: dict[str, str]
    columns: tuple[ColumnGuess, ...]
    rows: int
    bad_cells: int
    time_span: tuple[float, float] | None
    doubts: tuple[str, ...]


def guess_table(path: Path) -> TableGuess:
    """Return what a text table seems to be.

    Parameters
    ----------
    path : pathlib.Path
        File, packed with gzip or not. Its beginning is looked at; then all of it is read with the guessed dialect.

    Raises
    ------
    BadRequest
        If the file is empty, or is no text, or has no rows of cells.
    """
    layout = guessed_layout(_head(path), file=path.name)
    columns = guessed_columns(layout)
    time_format, time_doubts = shared_time_format(columns)
    dialect = Dialect(**layout.fields, time_format=time_format)
    doubts = [*layout.doubts, *time_doubts]
    instants = time_format in {"iso8601", "epoch"} and not any(column.needs_zone for column in columns)
    requests = [
        ColumnRequest(
            name=str(column.number),
            column=column.number,
            kind=column.kind if column.kind != "time" or instants else "text",
            sentinels=column.sentinels,
            nan="keep",
        )
        for column in columns
    ]
    rows, bad, ends = _read_through(path, dialect, requests)
    if bad:
        doubts.append(f"{bad} cells of the whole file do not fit this guess; the check names them")
    filled = tuple(
        column.with_ends(
            _shown(ends.get(str(column.number), (None, None))[0]),
            _shown(ends.get(str(column.number), (None, None))[1]),
        )
        for column in columns
    )
    span = None
    for column in columns:
        if column.kind == "time" and instants and str(column.number) in ends:
            first, last = ends[str(column.number)]
            span = (float(first), float(last))
            break
    return TableGuess(path.name, dialect, layout.why, filled, rows, bad, span, tuple(doubts))


def _head(path: Path) -> bytes:
    """Return the beginning of the unpacked file, cut after its last whole line."""
    with path.open("rb") as stream:
        head = stream.read(HEAD_BYTES)
        more = bool(stream.read(1))
    if head.startswith(b"\x1f\x8b"):
        unpack = zlib.decompressobj(wbits=31)
        try:
            head = unpack.decompress(head, HEAD_BYTES)
        except zlib.error as error:
            raise BadRequest(f"the packed data are damaged ({error})", file=path.name) from None
        more = more or not unpack.eof
    for mark in (b"\n", b"\r"):
        if more and mark in head:
            return head[: head.rfind(mark) + 1]
    return head


def _read_through(
    path: Path, dialect: Dialect, requests: list[ColumnRequest]
) -> tuple[int, int, dict[str, tuple[Any, Any]]]:
    """Return rows, bad cells, and per column the first and last value that is one."""
    ends: dict[str, tuple[Any, Any]] = {}
    with path.open("rb") as source:
        reader = TableReader(source, file=path.name, dialect=dialect, columns=requests)
        for block in reader.blocks():
            for name, values in block.columns.items():
                there = _present(values)
                if len(there):
                    ends[name] = (ends[name][0] if name in ends else values[there[0]], values[there[-1]])
    return reader.rows, reader.bad_cell_count, ends


def _present(values: npt.NDArray[Any]) -> npt.NDArray[np.int64]:
    if values.dtype == object:
        return np.flatnonzero(values != "")
    return np.flatnonzero(np.isfinite(values))


def _shown(value: Any) -> str | None:
    return None if value is None else value if isinstance(value, str) else repr(float(value))

"""Writers of the text files that the instrument programs of the invented laboratory leave behind.

Rules: four programs, four ways to write a table; fixed formats, so that the same numbers give the same bytes; a
value that the instrument could not give is written as that instrument's overflow mark, 9.9E37.
"""

from __future__ import annotations

import gzip
from collections.abc import Sequence
from dataclasses import dataclass, field
from datetime import UTC, datetime, tzinfo
from typing import TYPE_CHECKING, Final

import numpy as np

if TYPE_CHECKING:
    import numpy.typing as npt

__all__ = ["Column", "comma_table", "compressed", "latin_table", "semicolon_table", "space_table"]

OVERFLOW: Final = "9.9E37"
"""What a digital meter sends when it has no value."""


@dataclass(frozen=True)
class Column:
    """One column of numbers.

    Attributes
    ----------
    name, unit : str
        As the program heads it.
    values : ndarray
    digits : int
        Decimals written.
    missing : ndarray of int
        Rows without a value.
    """

    name: str
    unit: str
    values: npt.NDArray[np.float64]
    digits: int
    missing: npt.NDArray[np.int64] = field(default_factory=lambda: np.zeros(0, dtype=np.int64))

    def cells(self) -> list[str]:
        """Return the cells as text, with a decimal point."""
        cells = [f"{value:.{self.digits}f}" for value in self.values]
        for row in self.missing:
            cells[int(row)] = OVERFLOW
        return cells


def comma_table(times: Sequence[datetime], columns: Sequence[Column], *, zone: tzinfo) -> bytes:
    """Return a comma table with a row of names and a row of units; stamps are local with their offset."""
    stamps = [time.astimezone(zone).isoformat(timespec="seconds") for time in times]
    head = [
        ",".join(["time", *(column.name for column in columns)]),
        ",".join(["", *(column.unit for column in columns)]),
    ]
    return _joined(head, stamps, columns, ",", "utf-8")


def semicolon_table(times: Sequence[datetime], columns: Sequence[Column], *, zone: tzinfo) -> bytes:
    """Return a semicolon table with decimal commas, CRLF line ends and local stamps that do not tell their offset."""
    stamps = [time.astimezone(zone).strftime("%d.%m.%Y %H:%M:%S") for time in times]
    head = [";".join(["Datum", *(f"{column.name} [{column.unit}]" for column in columns)])]
    return _joined(head, stamps, columns, ";", "utf-8", comma=True, end="\r\n")


def space_table(
    times: Sequence[datetime], columns: Sequence[Column], *, remarks: Sequence[str] = ()
) -> bytes:
    """Return a table in blanks, its names in a comment line, with seconds since 1970 (UTC)."""
    stamps = [f"{time.astimezone(UTC).timestamp():.1f}" for time in times]
    head = [
        *(f"# {remark}" for remark in remarks),
        " ".join(["# t_s", *(f"{column.name}_{column.unit}" for column in columns)]),
    ]
    return _joined(head, stamps, columns, "  ", "utf-8")


def latin_table(times: Sequence[datetime], columns: Sequence[Column], *, zone: tzinfo, title: str) -> bytes:
    """Return a tab table in Latin-1 with a title line above the header, as the sorption set's program exports it."""
    stamps = [time.astimezone(zone).strftime("%Y-%m-%d %H:%M") for time in times]
    head = [title, "\t".join(["time", *(f"{column.name} ({column.unit})" for column in columns)])]
    return _joined(head, stamps, columns, "\t", "latin-1")


def compressed(data: bytes) -> bytes:
    """Return gzip bytes without a time of writing, so that they depend on the content alone."""
    return gzip.compress(data, compresslevel=9, mtime=0)


def _joined(
    head: Sequence[str],
    stamps: Sequence[str],
    columns: Sequence[Column],
    delimiter: str,
    encoding: str,
    *,
    comma: bool = False,
    end: str = "\n",
) -> bytes:
    cells = [column.cells() for column in columns]
    if comma:
        cells = [[cell.replace(".", ",") for cell in column] for column in cells]
    rows = [delimiter.join(row) for row in zip(stamps, *cells, strict=True)]
    return (end.join([*head, *rows]) + end).encode(encoding)

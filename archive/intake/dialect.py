"""What is asked of a text table and what it answers: the dialect's faults, column requests, blocks, bad cells.

Rules: the dialect is the record of the sheet (`schemas.sweep.Dialect`). Two readings of one file must never both be
possible, so a dialect whose marks overlap is refused before the first byte is read.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any, Final, Literal

import numpy as np
import numpy.typing as npt

from archive.errors import BadRequest
from schemas.sweep import Dialect

__all__ = ["BadCell", "BadCells", "Block", "ColumnRequest", "dialect_faults", "require_usable"]

DETAILED: Final = 10_000
"""Bad cells that are kept word for word; beyond that they are only counted."""

SHOWN: Final = 80
"""Characters of a bad cell that are shown; a screen line holds no more."""


@dataclass(frozen=True)
class ColumnRequest:
    """One channel to be read from a source.

    Parameters
    ----------
    name : str
        Channel name; the key of the column in a `Block`.
    column : str or int
        Name in the header, or number from 1. In an HDF5 or NumPy source also the path of a data set.
    kind : {"number", "time", "text"}
        What the cells are.
    sentinels : tuple of str
        Cells that mean `no value`. One that reads as a number is compared by value, so that `9.9E37` also finds
        `9.900000E+37`; any other is compared as text, without the blanks around it.
    nan : {"keep", "error"}
        Whether an empty or NaN cell is kept as NaN or reported.
    """

    name: str
    column: str | int
    kind: Literal["number", "time", "text"]
    sentinels: tuple[str, ...] = ()
    nan: Literal["keep", "error"] = "error"


@dataclass(frozen=True)
class BadCell:
    """A cell, or a whole line when `column` is empty, that cannot be what the sheet says it is.

    Parameters
    ----------
    file : str
        File as the sheet names it.
    line : int
        Line number from 1; in an HDF5 or NumPy source the row from 1, or 0 for the whole source.
    column : str
        Number and, if the table has a header, name of the column: `2 "T (K)"`.
    found, why : str
        What stood there (at most 80 characters of it), and what is wrong with it.
    """

    file: str
    line: int
    column: str
    found: str
    why: str


@dataclass
class Block:
    """Some rows of a source, in the order of the file.

    Parameters
    ----------
    first_line : int
        Line number of the first line of the block, data or not.
    columns : dict of str to numpy.ndarray
        Per channel float64 numbers, float64 POSIX seconds, or an object array of `str`. A sentinel, a kept NaN and
        a bad cell are all NaN (text: empty); only the sentinel is marked in `sentinel`.
    lines : numpy.ndarray of int64, shape (rows,)
        Line number of every row.
    sentinel : dict of str to numpy.ndarray of bool
        Per channel, which rows hold a sentinel.
    bad_cells, bad_cell_count : list of BadCell, int
        Filled for sources that are read at once (`archive.intake.sources`); a `TableReader` keeps its own.
    """

    first_line: int
    columns: dict[str, npt.NDArray[Any]]
    lines: npt.NDArray[np.int64]
    sentinel: dict[str, npt.NDArray[np.bool_]]
    bad_cells: list[BadCell] = field(default_factory=list)
    bad_cell_count: int = 0


class BadCells:
    """Bad cells of one file in file order: the first ten thousand in detail, all of them counted."""

    def __init__(self, file: str) -> None:
        self.file = file
        self.detailed: list[BadCell] = []
        self.count = 0
        self._waiting: list[tuple[int, int, str, str, str]] = []

    def add(self, line: int, number: int, column: str, found: str, why: str) -> None:
        """Note one bad cell; `number` is its column from 1, or 0 for the whole line."""
        self._waiting.append((line, number, column, found, why))

    def settle(self) -> None:
        """Take over what was noted since the last call, sorted by line and column."""
        self.count += len(self._waiting)
        free = DETAILED - len(self.detailed)
        if free > 0:
            self._waiting.sort(key=lambda cell: cell[:2])
            for line, _, column, found, why in self._waiting[:free]:
                short = found if len(found) <= SHOWN else found[: SHOWN - 3] + "..."
                self.detailed.append(BadCell(self.file, line, column, short, why))
        self._waiting.clear()


def dialect_faults(dialect: Dialect) -> list[tuple[str, str]]:
    """Return every contradiction inside a dialect as (field, sentence).

    Parameters
    ----------
    dialect : schemas.sweep.Dialect
        As the sheet states it.

    Returns
    -------
    list of tuple of str
        Empty for a dialect that can be read in one way only.

    Examples
    --------
    >>> [name for name, _ in dialect_faults(Dialect(delimiter=",", decimal=","))]
    ['decimal']
    """
    delimiter = " \t" if dialect.delimiter == "space" else dialect.delimiter
    faults = []
    if dialect.decimal == dialect.delimiter:
        faults.append(
            (
                "decimal",
                "a comma cannot separate both the cells and the decimals: `1,5,2` has three readings; "
                "if the cells are separated by something else, name it as the delimiter",
            )
        )
    if dialect.comment is not None:
        if dialect.comment[0] in delimiter + "\r\n":
            faults.append(("comment", "the comment mark begins with the delimiter or a line end"))
        if dialect.comment[0] in "+-.0123456789":
            faults.append(("comment", "the comment mark begins like a number"))
        if dialect.comment[0] == dialect.quote:
            faults.append(("comment", "the comment mark begins with the quotation mark"))
    if dialect.header_comment and dialect.comment is None:
        faults.append(
            ("header_comment", "the header is said to stand in a comment, but there is no comment mark")
        )
    if dialect.header_comment and dialect.header_rows == 0:
        faults.append(("header_comment", "the header is said to stand in a comment, but header_rows is 0"))
    if dialect.names is not None:
        twice = sorted({name for name in dialect.names if dialect.names.count(name) > 1})
        if twice:
            faults.append(("names", f"names stand twice: {', '.join(twice)}"))
        if not dialect.names:
            faults.append(("names", "the list of names is empty; leave it out or name every column"))
    return faults


def require_usable(dialect: Dialect, columns: Sequence[ColumnRequest], *, file: str) -> None:
    """Refuse a dialect or a list of columns that contradicts itself.

    Raises
    ------
    BadRequest
        Naming all contradictions at once.
    """
    faults = [f"{name}: {why}" for name, why in dialect_faults(dialect)]
    names = [request.name for request in columns]
    faults += [
        f"channel {name} is asked for twice" for name in sorted({n for n in names if names.count(n) > 1})
    ]
    if faults:
        raise BadRequest(
            "; ".join(faults),
            file=file,
            field="dialect",
            remedy="correct the dialect of this file in the sheet",
        )

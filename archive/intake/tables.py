"""Text tables read block by block: columns as arrays, and every cell that is not what the sheet says.

Rules: the bytes are read once; a row keeps its line number; nothing is dropped, repaired or guessed in silence. What
cannot be read is a `BadCell` (a whole line if it cannot be split into cells), its value is NaN, and reading goes on,
so that one pass finds everything. Cells must end on their line: a quoted line break is reported, not read.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Iterator, Sequence
from pathlib import Path
from typing import Any, BinaryIO

import numpy as np
import numpy.typing as npt
import pyarrow as pa
from pyarrow import csv

from archive.intake.columns import checked_column, stands_as_read
from archive.intake.dialect import DETAILED, BadCell, BadCells, Block, ColumnRequest, require_usable
from archive.intake.header import Header
from archive.intake.lines import BLOCK_BYTES, LineBlocks
from archive.intake.rows import Rows
from archive.intake.timestamps import TimeStamps
from schemas.sweep import Dialect

__all__ = ["TableReader", "read_header"]

_REFUSED = re.compile(r"^In CSV column #(\d+): ")
_ONE_BY_ONE = 3  # columns that are taken for text one by one, each after a reading that was refused
_BLOCKS_AS_TEXT = 8  # blocks until a column that was taken for text is tried as numbers again


class TableReader:
    """Reader of the asked columns of one text table.

    Parameters
    ----------
    source : binary file or iterable of bytes
        The file's bytes, packed with gzip or not; read once by `blocks`.
    file : str
        Name for messages.
    dialect : schemas.sweep.Dialect
        How the table is written.
    columns : sequence of ColumnRequest
        What is asked for; columns that nobody asks for are not looked into.
    tee : sequence of callables, optional
        Each gets every byte of the source as it stands in the file, in order, once.
    block_bytes : int, optional
        About how many bytes are parsed at once. It bounds the memory and changes no result.

    Attributes
    ----------
    bad_cells : list of BadCell
        The first ten thousand, in file order. Complete after `blocks` has ended, like the following.
    bad_cell_count : int
        All of them.
    rows : int
        Rows of data that could be split into cells.
    header : tuple of str
        Column names from the dialect or the first header line; empty without either.
    header_lines : tuple of tuple of str
        All header lines, split into cells.

    Raises
    ------
    BadRequest
        If dialect or columns contradict themselves, or a time column lacks its format or zone.

    Notes
    -----
    A column that the file does not have is reported and comes as NaN (text: empty), so that the others are still
    checked. If `blocks` is left before its end, the listeners have not had the whole file.
    """

    def __init__(
        self,
        source: BinaryIO | Iterable[bytes],
        *,
        file: str,
        dialect: Dialect,
        columns: Sequence[ColumnRequest],
        tee: Sequence[Callable[[bytes], object]] = (),
        block_bytes: int = BLOCK_BYTES,
    ) -> None:
        require_usable(dialect, columns, file=file)
        self._file = file
        self._dialect = dialect
        self._columns = tuple(columns)
        self._lines = LineBlocks(source, listeners=tee, block_bytes=block_bytes)
        self._bad = BadCells(file)
        self._rows = Rows(dialect, lambda line, found, why: self._bad.add(line, 0, "", found, why))
        self._stamps = (
            TimeStamps(
                time_format=dialect.time_format,
                time_zone=dialect.time_zone,
                fold=dialect.fold,
                decimal=dialect.decimal,
            )
            if any(request.kind == "time" for request in columns)
            else None
        )
        self._header = Header(dialect, self._rows, self._bad)
        self._places: dict[str, int] | None = None
        self._texts: dict[str, int] = {}
        self.rows = 0

    @property
    def header(self) -> tuple[str, ...]:
        """Column names, once the first block has been read; empty without any."""
        return self._header.names

    @property
    def header_lines(self) -> tuple[tuple[str, ...], ...]:
        """All header lines, split into cells."""
        return self._header.lines

    @property
    def _placed(self) -> dict[str, int]:
        return self._places or {}

    @property
    def bad_cells(self) -> list[BadCell]:
        """The first ten thousand bad cells, in file order."""
        return self._bad.detailed

    @property
    def bad_cell_count(self) -> int:
        """Number of all bad cells."""
        return self._bad.count

    def blocks(self) -> Iterator[Block]:
        """Yield the table in blocks of rows, in file order; to be called once."""
        line = 1
        for first, data in self._lines:
            line = first + data.count(b"\n")
            picked, lines = self._rows.pick(*self._header.strip(data, first))
            if not len(lines):
                self._bad.settle()
                continue
            if self._places is None:
                self._places = self._found_columns(picked[: picked.index(b"\n")])
            block = self._block(picked, lines, first)
            self.rows += len(block.lines)
            self._bad.settle()
            yield block
        if self._lines.fault is not None:
            self._bad.add(self._lines.fault[0], 0, "", *self._lines.fault[1:])
        elif self._header.pending:
            self._bad.add(
                line, 0, "", "", f"the file ends where {self._header.pending} more header lines were expected"
            )
        elif not self.rows and not self._bad.count:
            self._bad.add(line, 0, "", "", "the table ends here without a row of data")
        self._bad.settle()

    def _found_columns(self, first_row: bytes) -> dict[str, int]:
        self._header.settle_width(first_row)
        places = {request.name: self._header.place(request.column) for request in self._columns}
        found = {name: place for name, place in places.items() if place is not None}
        self._header.refuse_data(self._columns, found)
        return found

    def _block(self, data: bytes, lines: npt.NDArray[np.int64], first: int) -> Block:
        table, lines = self._table(data, lines)
        self._settle_texts()
        block = Block(first_line=first, columns={}, lines=lines, sentinel={})
        for request in self._columns:
            place = self._placed.get(request.name)
            if place is None:
                values: npt.NDArray[Any] = (
                    np.full(len(lines), "", object) if request.kind == "text" else np.full(len(lines), np.nan)
                )
                mask = np.zeros(len(lines), dtype=np.bool_)
            else:
                values, mask = self._column(request, table.column(str(place)).combine_chunks(), place, lines)
            block.columns[request.name] = values
            block.sentinel[request.name] = mask
        return block

    def _table(self, data: bytes, lines: npt.NDArray[np.int64]) -> tuple[pa.Table, npt.NDArray[np.int64]]:
        """Return the asked columns, as numbers where all cells of one allow it, else as text; ragged rows are reported."""
        # Most columns are clean in most blocks: then Arrow reads the numbers itself, many times faster than through text.
        # Its refusal costs a reading, so that after a few columns all that are left are taken for text.
        table: pa.Table | None = None
        while table is None:
            try:
                table, ragged = self._parsed(data)
            except pa.ArrowInvalid as error:
                told = _REFUSED.search(str(error))
                column = str(told[1]) if told else ""
                if column not in self._numbers:
                    return self._nothing(lines, str(error))
                self._take_as_text({column})
                continue
            if unclean := self._unclean(table):
                self._take_as_text(unclean)
                table = None
        if table.num_rows + len(ragged) != len(lines):
            return self._nothing(lines, f"{table.num_rows + len(ragged)} rows on {len(lines)} lines")
        return table, self._without_ragged(ragged, lines)

    @property
    def _numbers(self) -> set[str]:
        """Columns that are asked for as numbers alone and not known to hold anything else; by their place."""
        # One column can be asked for twice, as text and as number; then it is read as text.
        other = {self._placed.get(request.name) for request in self._columns if request.kind != "number"}
        return {str(place) for place in self._placed.values() if place not in other} - self._texts.keys()

    def _take_as_text(self, columns: set[str]) -> None:
        if len(self._texts) + len(columns) > _ONE_BY_ONE:
            columns = self._numbers
        self._texts |= dict.fromkeys(columns, _BLOCKS_AS_TEXT)

    def _settle_texts(self) -> None:
        """Give columns that held something else than numbers another chance after some blocks."""
        self._texts = {column: left - 1 for column, left in self._texts.items() if left > 1}

    def _nothing(self, lines: npt.NDArray[np.int64], why: str) -> tuple[pa.Table, npt.NDArray[np.int64]]:
        # No table is known that comes here: `Rows` leaves no line that could be split in two ways. If one does,
        # none of its rows may be taken for read.
        sentence = f"begins {len(lines)} rows, to line {lines[-1]}, that cannot be read ({why})"
        self._bad.add(int(lines[0]), 0, "", "", sentence)
        nothing = {str(place): pa.array([], pa.string()) for place in self._placed.values()}
        return pa.table(nothing), lines[:0]

    def _parsed(self, data: bytes) -> tuple[pa.Table, list[tuple[int, int, str]]]:
        ragged: list[tuple[int, int, str]] = []

        def skip(row: Any) -> str:
            ragged.append((row.number, row.actual_columns, row.text))
            return "skip"

        types = {str(place): pa.string() for place in self._placed.values()} or {"0": pa.string()}
        types |= dict.fromkeys(self._numbers, pa.float64())
        quote = self._dialect.quote
        table = csv.read_csv(
            pa.BufferReader(data),
            read_options=csv.ReadOptions(
                use_threads=False,  # row numbers are only given then
                block_size=len(data) + 1,
                column_names=[str(place) for place in range(self._header.width)],
            ),
            parse_options=csv.ParseOptions(
                delimiter=self._rows.delimiter,
                quote_char=quote if quote is not None else False,
                double_quote=quote is not None,
                escape_char=False,
                newlines_in_values=False,
                ignore_empty_lines=False,
                invalid_row_handler=skip,
            ),
            convert_options=csv.ConvertOptions(
                column_types=types,
                include_columns=list(types),
                null_values=[],
                strings_can_be_null=False,
                decimal_point=self._dialect.decimal,
                check_utf8=False,  # `Rows` has checked it
            ),
        )
        return table, ragged

    def _unclean(self, table: pa.Table) -> set[str]:
        """Return the columns of which a number cannot stand as Arrow read it."""
        asked = {
            str(self._placed[request.name]): request
            for request in self._columns
            if request.kind == "number" and request.name in self._placed
        }
        return {place for place, request in asked.items() if not stands_as_read(request, table.column(place))}

    def _without_ragged(
        self, ragged: list[tuple[int, int, str]], lines: npt.NDArray[np.int64]
    ) -> npt.NDArray[np.int64]:
        keep = np.ones(len(lines), dtype=np.bool_)
        for number, cells, text in ragged:
            keep[number - 1] = False
            why = f"has {cells} cells where the table has {self._header.width}"
            if cells == self._header.width + 1 and text.rstrip().endswith(self._rows.delimiter):
                why += "; the last is empty, after a delimiter at the end of the line"
            if cells == 2 * self._header.width and self._rows.delimiter == ",":
                why += (
                    "; twice as many, as if decimal commas stood between commas; these cannot be told apart"
                )
            self._bad.add(int(lines[number - 1]), 0, "", text, why)
        return lines[keep]

    def _column(
        self, request: ColumnRequest, cells: Any, place: int, lines: npt.NDArray[np.int64]
    ) -> tuple[npt.NDArray[Any], npt.NDArray[np.bool_]]:
        values, mask, faults = checked_column(
            request, cells, decimal=self._dialect.decimal, stamps=self._stamps
        )
        label = self._header.label(place)
        for count, index in enumerate(sorted(faults)):
            found = cells[index].as_py() if count < DETAILED else ""
            self._bad.add(int(lines[index]), place + 1, label, found, faults[index])
        return values, mask


def read_header(path: Path, dialect: Dialect) -> tuple[str, ...]:
    """Return the column names of a text table, from the dialect or its first header line.

    Parameters
    ----------
    path : pathlib.Path
        File, packed with gzip or not.
    dialect : schemas.sweep.Dialect
        How the table is written.

    Returns
    -------
    tuple of str
        Empty if the table has no names.

    Raises
    ------
    BadRequest
        If the dialect contradicts itself.
    """
    with path.open("rb") as source:
        reader = TableReader(source, file=path.name, dialect=dialect, columns=())
        next(reader.blocks(), None)
        return reader.header

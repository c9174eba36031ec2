"""The lines above the rows of a text table: what is skipped, the column names, and where a column stands.

Rules: the dialect says how many lines are which. Column names are compared as they stand, without the blanks around
them; a name that stands twice cannot be asked for.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from archive.intake.cells import parsed_number
from archive.intake.dialect import BadCells, ColumnRequest
from archive.intake.rows import Rows, split_cells
from schemas.sweep import Dialect

__all__ = ["Header"]


class Header:
    """Header of one table, filled from its first lines.

    Parameters
    ----------
    dialect : schemas.sweep.Dialect
        How the table is written.
    rows : Rows
        Recodes lines and knows comments.
    bad : BadCells
        Gets what is wrong with the header.
    """

    def __init__(self, dialect: Dialect, rows: Rows, bad: BadCells) -> None:
        self._dialect = dialect
        self._rows = rows
        self._bad = bad
        self._line = 1
        self._places: list[int] = []
        self.names: tuple[str, ...] = dialect.names or ()
        self.lines: tuple[tuple[str, ...], ...] = ()
        self.width = 0

    @property
    def pending(self) -> int:
        """Number of header lines still to come."""
        return self._dialect.header_rows - len(self.lines)

    def strip(self, data: bytes, first: int) -> tuple[bytes, int]:
        """Take the header's part of a block; return the rest and the line number where it begins."""
        skip = self._dialect.skip_rows
        line, place = first, 0
        while place < len(data) and (line <= skip or self.pending):
            end = data.index(b"\n", place)
            if line > skip:
                self._take(data[place:end], line)
            line, place = line + 1, end + 1
        return data[place:], line

    def _take(self, raw: bytes, line: int) -> None:
        dialect = self._dialect
        recoded = self._rows.recoded(raw + b"\n")[:-1]
        commented = self._rows.is_comment_or_blank(recoded)
        if not recoded.strip() or (commented and not dialect.header_comment):
            return
        text = recoded.decode("utf-8", "backslashreplace")
        if not self._rows.is_text(recoded):
            self._bad.add(line, 0, "", text, "is not UTF-8; if the file is Latin-1, state it as the encoding")
        if dialect.header_comment and commented:
            text = text.lstrip().removeprefix(dialect.comment or "").lstrip(" ")
        elif dialect.header_comment and not self.lines:
            self._bad.add(
                line, 0, "", text, f"is the header, but does not begin with {dialect.comment} as stated"
            )
        cells = tuple(split_cells(text, delimiter=self._rows.delimiter, quote=dialect.quote))
        if not self.lines:
            self._line = line
            self.names = dialect.names or cells
        self._places.append(line)
        self.lines = (*self.lines, cells)

    def settle_width(self, first_row: bytes) -> None:
        """Take the width of the table from its names, or from the first row if there are none."""
        row = first_row.decode("utf-8", "backslashreplace")
        cells = split_cells(row, delimiter=self._rows.delimiter, quote=self._dialect.quote)
        self.width = len(self.names) or len(cells)

    def place(self, column: str | int) -> int | None:
        """Return the index from 0 of a column; report it and return None if there is no such single column."""
        if isinstance(column, int):
            if 1 <= column <= self.width:
                return column - 1
            why = f"the table has {self.width} columns and no number {column}"
        else:
            count = self.names.count(column.strip())
            if count == 1:
                return self.names.index(column.strip())
            if count:
                why = f"{count} columns have this name; ask for one of them by its number"
            elif self.names:
                why = "no column has this name"
            else:
                why = "the table has no header; ask for its columns by number, or state their names in the dialect"
        found = ", ".join(self.names) or f"{self.width} columns without a header"
        self._bad.add(self._line, 0, str(column), found, why)
        return None

    def refuse_data(self, columns: Sequence[ColumnRequest], places: Mapping[str, int]) -> None:
        """Report header lines that read as a row of data, which would be lost without a word.

        Notes
        -----
        Names and units never read as numbers throughout. Channel numbers may, so a line of whole numbers passes.
        """
        named_here = self._dialect.names is None and any(isinstance(each.column, str) for each in columns)
        numeric = [places[each.name] for each in columns if each.kind == "number" and each.name in places]
        for line, cells in list(zip(self._places, self.lines, strict=True))[named_here:]:
            values = [cells[place] for place in numeric if place < len(cells)]
            parsed = [parsed_number(value, decimal=self._dialect.decimal) for value in values]
            if values and None not in parsed and any(self._dialect.decimal in value for value in values):
                why = f"reads as a row of data, but counts among the {self._dialect.header_rows} header lines"
                self._bad.add(line, 0, "", ", ".join(cells), why)

    def label(self, place: int) -> str:
        """Return number and name of a column for a message."""
        return f'{place + 1} "{self.names[place]}"' if self.names else str(place + 1)

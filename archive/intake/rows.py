"""Rows of data out of a block of lines, with their line numbers.

Rules: blank lines and comment lines are left out, and so is every line that cannot be split into cells in just one
way; each of the latter is named. What remains can be given to a fast reader, which then cannot lose a line.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import Final, Literal

import numpy as np
import numpy.typing as npt

from schemas.sweep import Dialect

__all__ = ["Rows", "split_cells"]

Note = Callable[[int, str, str], None]
"""Called with line number, what stood there, and why it is no row."""

_NEWLINE: Final = 10
_BLANKS: Final = re.compile(rb"[ \t]+")
_BLANKS_OR_QUOTED: Final = {
    mark: re.compile(rb"(%b[^%b\n]*%b)|[ \t]+" % (mark, mark, mark)) for mark in (b'"', b"'")
}


class Rows:
    """Picker of the rows of one table.

    Parameters
    ----------
    dialect : schemas.sweep.Dialect
        How the table is written.
    note : callable
        Told of every line that is no row and should be one.
    """

    def __init__(self, dialect: Dialect, note: Note) -> None:
        self._note = note
        self._latin = dialect.encoding == "latin-1"
        self._space = dialect.delimiter == "space"
        self.delimiter = " " if self._space else dialect.delimiter
        self._blank = b" " if self.delimiter == "\t" else b" \t"
        self._comment = None if dialect.comment is None else dialect.comment.encode()
        self._quote = None if dialect.quote is None else dialect.quote.encode()
        self._well_quoted = None if dialect.quote is None else _well_quoted(self.delimiter, dialect.quote)

    def pick(self, data: bytes, first_line: int) -> tuple[bytes, npt.NDArray[np.int64]]:
        """Return the rows of a block and the line number of each.

        Parameters
        ----------
        data : bytes
            Whole lines, each with LF.
        first_line : int
            Line number of the first.

        Returns
        -------
        data : bytes
            The rows as UTF-8; white space between cells is one blank if white space separates them.
        lines : numpy.ndarray of int64
            Line numbers.
        """
        data = self.recoded(data)
        bytes_ = np.frombuffer(data, dtype=np.uint8)
        ends = np.flatnonzero(bytes_ == _NEWLINE)
        starts = np.concatenate(([0], ends[:-1] + 1))
        keep = np.ones(len(ends), dtype=np.bool_)
        self._drop_blank_and_comment(data, starts, ends, keep)
        for index, why in self._unreadable(data, starts, ends, keep):
            keep[index] = False
            found = data[starts[index] : ends[index]].decode("utf-8", "backslashreplace")
            self._note(first_line + index, found, why)
        if not keep.all():
            data = bytes_[np.repeat(keep, ends + 1 - starts)].tobytes()
        return data, first_line + np.flatnonzero(keep)

    def recoded(self, data: bytes) -> bytes:
        """Return a block as UTF-8 with one blank between cells that white space separates."""
        if self._latin and not data.isascii():
            data = data.decode("latin-1").encode()
        return self._single_blanks(data) if self._space else data

    def _single_blanks(self, data: bytes) -> bytes:
        if self._quote is not None and self._quote in data:
            data = _BLANKS_OR_QUOTED[self._quote].sub(lambda found: found[1] or b" ", data)
        else:
            data = data.replace(b"\t", b" ")
            while b"  " in data:
                data = data.replace(b"  ", b" ")
        return data.removeprefix(b" ").replace(b"\n ", b"\n").replace(b" \n", b"\n")

    def is_comment_or_blank(self, line: bytes) -> bool:
        """Whether a line, without its line end, holds nothing or only a comment."""
        bare = line.lstrip(self._blank)
        return not bare or (self._comment is not None and bare.startswith(self._comment))

    def _drop_blank_and_comment(
        self,
        data: bytes,
        starts: npt.NDArray[np.int64],
        ends: npt.NDArray[np.int64],
        keep: npt.NDArray[np.bool_],
    ) -> None:
        if not len(ends):
            return
        first = np.frombuffer(data, dtype=np.uint8)[starts]
        marks = b"\n" + self._blank + (b"" if self._comment is None else self._comment[:1])
        for index in np.flatnonzero(np.isin(first, np.frombuffer(marks, dtype=np.uint8))).tolist():
            if self.is_comment_or_blank(data[starts[index] : ends[index]]):
                keep[index] = False

    def _unreadable(
        self,
        data: bytes,
        starts: npt.NDArray[np.int64],
        ends: npt.NDArray[np.int64],
        keep: npt.NDArray[np.bool_],
    ) -> list[tuple[int, str]]:
        """Return index and reason of every line that cannot be split in one way."""
        text = self.is_text(data)
        quoted = self._quote is not None and self._quote in data
        if text and not quoted and b"\x00" not in data and b"\r" not in data:
            return []
        faults = []
        for index, (start, end) in enumerate(zip(starts.tolist(), ends.tolist(), strict=True)):
            line = data[start:end]
            why = self._fault(line, keep=bool(keep[index]), text=text)
            if why is not None:
                faults.append((index, why))
        return faults

    def _fault(self, line: bytes, *, keep: bool, text: bool) -> str | None:
        if b"\x00" in line:
            return "holds zero bytes, as a file has that was being written when the power failed"
        if not text and not self.is_text(line):
            return "is not UTF-8; if the file is Latin-1, state it as the encoding"
        return self._row_fault(line) if keep else None

    def _row_fault(self, line: bytes) -> str | None:
        if b"\r" in line:
            return "holds a carriage return that ends no line"
        if self._quote is not None and self._quote in line and self._well_quoted is not None:
            if line.count(self._quote) % 2:
                return "has a quotation mark without its partner; a quoted cell with a line break inside is not supported"
            if not self._well_quoted.match(line.decode()):
                return "has a quotation mark inside a cell; a quoted cell must be quoted from delimiter to delimiter"
        return None

    @staticmethod
    def is_text(data: bytes) -> bool:
        """Whether bytes are UTF-8."""
        if data.isascii():
            return True
        try:
            data.decode()
        except UnicodeDecodeError:
            return False
        return True


def _well_quoted(delimiter: str, quote: str) -> re.Pattern[str]:
    mark, between = re.escape(quote), re.escape(delimiter)
    cell = f"(?:{mark}[^{mark}]*(?:{mark}{mark}[^{mark}]*)*{mark}|[^{mark}{between}]*)"
    return re.compile(f"^{cell}(?:{between}{cell})*$")


def split_cells(line: str, *, delimiter: str, quote: Literal['"', "'"] | None) -> list[str]:
    """Return the cells of one line, unquoted, without the blanks around them.

    Parameters
    ----------
    line : str
        Without its line end.
    delimiter : str
        One character.
    quote : str or None
        Quotation mark; doubled inside a quoted cell it stands for itself (RFC 4180 section 2, rule 7).

    Examples
    --------
    >>> split_cells('T (K), "P, raw (s)"', delimiter=",", quote='"')
    ['T (K)', 'P, raw (s)']
    """
    if quote is None or quote not in line:
        return [cell.strip() for cell in line.split(delimiter)]
    mark, between = re.escape(quote), re.escape(delimiter)
    pattern = rf"[ ]*{mark}([^{mark}]*(?:{mark}{mark}[^{mark}]*)*){mark}[ ]*(?={between}|$)|([^{between}]*)"
    cells, place = [], 0
    compiled = re.compile(pattern)
    while True:
        found = compiled.match(line, place)
        if found is None:  # the second branch matches anywhere, so this is only for the reader of types
            break
        cells.append(found[2].strip() if found[1] is None else found[1].replace(quote * 2, quote).strip())
        if found.end() >= len(line):
            break
        place = found.end() + 1
    return cells

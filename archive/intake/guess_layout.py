"""Delimiter, decimals, comments and header of a text table, read off its first lines.

Rules: a layout is likely when the body of the head splits into rows of one width whose cells are numbers. Two layouts
that do this equally well are both named.
"""

from __future__ import annotations

import re
from collections import Counter
from dataclasses import dataclass
from typing import Any, Final, Literal

from archive.errors import BadRequest
from archive.intake.cells import parsed_number
from archive.intake.headings import holds_units
from archive.intake.rows import split_cells

__all__ = ["Layout", "guessed_layout", "is_value"]

Delimiter = Literal[",", ";", "\t", "space", "|"]
Decimal = Literal[".", ","]

BODY_LINES: Final = 500
_QUOTE: Final = '"'
# Tried in this order; the first of equals is proposed and the others are named as doubts.
_CANDIDATES: Final[tuple[tuple[Delimiter, Decimal], ...]] = (
    ("\t", "."),
    ("\t", ","),
    (";", "."),
    (";", ","),
    ("|", "."),
    ("|", ","),
    (",", "."),
    ("space", "."),
    ("space", ","),
)
_COMMENTS: Final = ("#", "%", "!", "//", "*")
_STAMP: Final = re.compile(
    r"^[0-9]{1,4}[-./ ][0-9A-Za-z]{1,9}[-./ ][0-9]{1,4}([ T_][0-9:.,-]{4,20} ?([AP]M|Z|[+-][0-9:]{2,6})?)?$"
    r"|^[0-9]{8}[ T_][0-9]{6}Z?$|^[0-9]{1,2}:[0-9]{2}(:[0-9]{2}([.,][0-9]*)?)?$",
    re.IGNORECASE,
)
_THOUSANDS: Final = re.compile(
    r"^[+-]?[0-9]{1,3}(,[0-9]{3})+\.[0-9]*$|^[+-]?[0-9]{1,3}([,.'’ ][0-9]{3}){2,}([,.][0-9]*)?$"
)
_ABSENT: Final = frozenset(
    {"", "nan", "ovld", "ovl", "overload", "ol", "----", "--", "n/a", "na", "null", "inf", "-inf", "+inf"}
)


@dataclass(frozen=True)
class Layout:
    """Guessed fields of a dialect with reasons and doubts, the heading lines, and the rows of the head."""

    fields: dict[str, Any]
    why: dict[str, str]
    doubts: tuple[str, ...]
    headings: tuple[tuple[str, ...], ...]
    rows: tuple[tuple[str, ...], ...]


def is_value(cell: str, decimal: Decimal) -> bool:
    """Whether a cell can stand among measured values: a number, a time stamp, or a word for `no value`."""
    return is_number(cell, decimal) or bool(_STAMP.match(cell)) or cell.strip().lower() in _ABSENT


def is_number(cell: str, decimal: Decimal) -> bool:
    """Whether a cell is a number in these decimals (in decimal commas a point is none)."""
    if decimal == "," and "." in cell:
        return False
    return parsed_number(cell, decimal=decimal) is not None


def guessed_layout(head: bytes, *, file: str) -> Layout:
    """Return the layout of a table from its first bytes.

    Parameters
    ----------
    head : bytes
        Whole lines, unpacked.
    file : str
        Name for messages.

    Raises
    ------
    BadRequest
        If the bytes are no text, or hold no rows of cells.
    """
    why: dict[str, str] = {}
    doubts: list[str] = []
    text, encoding = _decoded(head, file, why, doubts)
    lines = text.replace("\r\n", "\n").replace("\r", "\n").split("\n")
    if lines and not lines[-1]:
        lines.pop()
    comment = _comment(lines, why)
    numbered = [
        (index, line)
        for index, line in enumerate(lines)
        if line.strip() and not (comment and line.lstrip().startswith(comment))
    ]
    if not numbered:
        raise BadRequest("this file holds no rows", file=file, expected="a text table")
    delimiter, decimal, width = _best([line for _, line in numbered], file, why, doubts)
    cells = [(index, tuple(_cells(line, delimiter))) for index, line in numbered]
    begin = _first_row(cells, width, decimal)
    headings, skip = _headings(cells[:begin], width)
    fields: dict[str, Any] = {
        "delimiter": delimiter,
        "decimal": decimal,
        "comment": comment or "#",
        "encoding": encoding,
        "quote": _QUOTE,
        "skip_rows": 0,
        "header_rows": len(headings),
    }
    if skip is not None:
        # Lines are skipped by their number in the file, comments and blank lines among them.
        fields["skip_rows"] = skip
        why["skip_rows"] = f"lines 1 to {skip} are neither comments nor rows of {width} cells"
    if headings:
        why["header_rows"] = (
            f"{len(headings)} lines of {width} cells stand over the first row that holds values"
        )
    else:
        headings = _commented_heading(lines[: cells[begin][0]], width, fields, why)
        if not headings:
            why["header_rows"] = "no line of column names stands over the first row"
            doubts.append("the table names no columns; ask for them by number, or state their names")
    if begin and delimiter == "," and 2 * len(cells[begin - 1][1]) == width:
        doubts.append(
            "the rows have twice as many cells as the line above them: decimal commas between commas, perhaps, "
            "which cannot be read; save the table with another delimiter"
        )
    rows = tuple(row for _, row in cells[begin : begin + BODY_LINES] if len(row) == width)
    return Layout(fields, why, tuple(doubts), headings, rows)


def _decoded(head: bytes, file: str, why: dict[str, str], doubts: list[str]) -> tuple[str, str]:
    if b"\x00" in head:
        raise BadRequest("this file holds zero bytes", file=file, expected="a text table in UTF-8 or Latin-1")
    try:
        text = head.decode("utf-8-sig")
    except UnicodeDecodeError:
        why["encoding"] = "the beginning is not UTF-8, and Latin-1 can be read from any bytes"
        doubts.append(
            "the encoding is taken for Latin-1 only because it is not UTF-8; look at letters such as µ and Ω"
        )
        return head.decode("latin-1"), "latin-1"
    why["encoding"] = (
        "it begins with a UTF-8 mark" if head.startswith(b"\xef\xbb\xbf") else "the beginning is UTF-8"
    )
    return text, "utf-8"


def _comment(lines: list[str], why: dict[str, str]) -> str | None:
    for mark in _COMMENTS:
        count = sum(line.lstrip().startswith(mark) for line in lines)
        if count:
            why["comment"] = f"{count} of the first {len(lines)} lines begin with {mark}"
            return mark
    why["comment"] = "no line begins with a usual comment mark"
    return None


def _cells(line: str, delimiter: Delimiter) -> list[str]:
    if delimiter == "space":
        return split_cells(" ".join(line.split()), delimiter=" ", quote=_QUOTE)
    return split_cells(line, delimiter=delimiter, quote=_QUOTE)


def _best(
    lines: list[str], file: str, why: dict[str, str], doubts: list[str]
) -> tuple[Delimiter, Decimal, int]:
    """Return delimiter, decimals and width of the layout that makes the most cells into values."""
    body = lines[max(1, len(lines) // 3) :][:BODY_LINES] or lines
    scored = []
    for order, (delimiter, decimal) in enumerate(_CANDIDATES):
        rows = [_cells(line, delimiter) for line in body]
        width, alike = Counter(len(row) for row in rows).most_common(1)[0]
        kept = [cell for row in rows if len(row) == width for cell in row]
        values = sum(is_value(cell, decimal) for cell in kept) / len(kept)
        commas = any("," in cell for cell in kept)
        if decimal == "," and not commas:
            continue  # then decimal point says the same
        scored.append(
            (round(alike / len(rows) * values, 3), min(width, 2), -order, delimiter, decimal, width)
        )
    scored.sort(reverse=True)
    share, _, _, delimiter, decimal, width = scored[0]
    if share < 0.25:
        raise BadRequest(
            "no delimiter makes rows of values from these lines",
            file=file,
            expected="a table with comma, semicolon, tab, bar or white space between its cells",
        )
    why["delimiter"] = f"{_spoken(delimiter)} splits the lines into {width} cells, {share:.0%} of them values"
    why["decimal"] = "some numbers have a comma" if decimal == "," else "numbers have a point, or no decimals"
    doubts += _other_readings(scored, body)
    return delimiter, decimal, width


def _other_readings(
    scored: list[tuple[float, int, int, Delimiter, Decimal, int]], body: list[str]
) -> list[str]:
    share, _, _, delimiter, decimal, width = scored[0]
    rows = [_cells(line, delimiter) for line in body]
    doubts = []
    for score, _, _, other, mark, count in scored[1:]:
        # One column of whole lines is a reading too, if every line is then a number: `1,5`.
        likely = score >= 0.99 * share and score > 0.9 and (count > 1 or mark == ",")
        if not likely or (mark == decimal and [_cells(line, other) for line in body] == rows):
            continue
        what = (
            "one column with decimal comma"
            if count == 1
            else f"{count} columns between {_spoken(other)} marks"
        )
        sentence = (
            f"it can also be read as {what}{'' if count == 1 else f' with decimal {_spoken(mark)}'}; "
            f"proposed are {width} columns with {_spoken(delimiter)} and decimal {_spoken(decimal)}"
        )
        if sentence not in doubts:
            doubts.append(sentence)
    cells = [cell for row in rows for cell in row]
    if any(_THOUSANDS.match(cell) for cell in cells):
        doubts.append("some cells look like numbers with thousands separators, which are not read")
    if decimal == "," and any("." in cell and is_number(cell, ".") for cell in cells):
        doubts.append("numbers with decimal points stand among numbers with decimal commas")
    return doubts


def _spoken(mark: str) -> str:
    return {",": "comma", ";": "semicolon", "\t": "tab", "space": "white space", "|": "bar", ".": "point"}[
        mark
    ]


def _first_row(cells: list[tuple[int, tuple[str, ...]]], width: int, decimal: Decimal) -> int:
    """Return the index of the first line that has the table's width and a value in it."""
    for index, (_, row) in enumerate(cells):
        if len(row) == width and any(cell and is_value(cell, decimal) for cell in row):
            return index
    return 0


def _headings(
    above: list[tuple[int, tuple[str, ...]]], width: int
) -> tuple[tuple[tuple[str, ...], ...], int | None]:
    """Return the heading lines right above the first row, and the number of lines to skip above them, if any."""
    whole = [len(row) == width for _, row in above]
    count = 0
    if whole and whole[-1]:
        two = len(above) > 1 and whole[-2] and all(above[-2][1]) and holds_units(above[-1][1])
        count = 2 if two else 1
    begin = len(above) - count
    return tuple(row for _, row in above[begin:]), above[begin - 1][0] + 1 if begin else None


def _commented_heading(
    above: list[str], width: int, fields: dict[str, Any], why: dict[str, str]
) -> tuple[tuple[str, ...], ...]:
    """Take the last comment line above the first row for the header, if it has as many cells as the rows."""
    comment = fields["comment"]
    places = [index for index, line in enumerate(above) if line.lstrip().startswith(comment)]
    if not places:
        return ()
    text = above[places[-1]].lstrip().removeprefix(comment).lstrip(" ")
    heading = tuple(_cells(text, fields["delimiter"]))
    if len(heading) != width or (width == 1 and len(text.split()) > 3):
        return ()
    fields |= {"header_rows": 1, "header_comment": True, "skip_rows": places[-1]}
    why["header_comment"] = f"the comment in line {places[-1] + 1} has {width} cells like the rows below it"
    why["skip_rows"] = "the lines above that comment"
    why["header_rows"] = "the header is that comment"
    return (heading,)

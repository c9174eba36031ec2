"""Kind, unit text and words for `no value` of the columns of a table, read off its first rows."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Final, Literal

import pyarrow as pa

from archive.intake.cells import parsed_number
from archive.intake.guess_layout import Decimal, Layout, is_number
from archive.intake.headings import unit_text
from archive.intake.timestamps import TimeStamps

__all__ = ["ColumnGuess", "guessed_columns", "shared_time_format"]

# Formats that are tried, in this order, with a zone that has no clock changes just to see whether they fit.
_FORMATS: Final = (
    "iso8601",
    "%d.%m.%Y %H:%M:%S",
    "%d.%m.%Y %H:%M:%S.%f",
    "%d.%m.%Y %H:%M",
    "%d/%m/%Y %H:%M:%S",
    "%m/%d/%Y %H:%M:%S",
    "%d/%m/%Y %H:%M",
    "%m/%d/%Y %H:%M",
    "%m/%d/%Y %I:%M:%S %p",
    "%d/%m/%Y %I:%M:%S %p",
    "%Y/%m/%d %H:%M:%S",
    "%Y/%m/%d %H:%M",
    "%Y%m%d %H%M%S",
    "%Y%m%dT%H%M%S",
    "%d-%b-%Y %H:%M:%S",
    "%d %b %Y %H:%M:%S",
    "%Y-%m-%d_%H-%M-%S",
)
# SCPI-1999 volume 1, section 7.2.1.4: 9.9E37 stands for infinity (overload) and 9.91E37 for not-a-number.
_OVERFLOWS: Final = (9.9e37, -9.9e37, 9.91e37)
_FILLERS: Final = (-9999.0, -999.0, -99999.0)
_TIME_WORDS: Final = re.compile(r"time|epoch|stamp|unix|date|^t$|zeit", re.IGNORECASE)
# 2001-09-09 to 2033-05-18, a range that seconds since 1970 keep to during the life of this laboratory's files.
_EPOCHS: Final = (1.0e9, 2.0e9)


@dataclass(frozen=True)
class ColumnGuess:
    """What one column seems to be.

    Parameters
    ----------
    number : int
        From 1.
    heading : str or None
        Cell of the header line as it stands.
    name, unit : str, str or None
        Heading without its unit, and the unit text; None where none is marked.
    kind : {"number", "time", "text"}
        What its cells are.
    why : str
        Reasons for kind and unit.
    time_format : str or None
        Of a column of time stamps; None if several fit.
    needs_zone : bool
        The stamps carry no offset, so that their zone has to be stated.
    sentinels : tuple of str
        Cells that probably mean `no value`, as they stand in the file.
    first, last : str or None
        First and last value of the whole file; times as POSIX seconds where they name instants.
    """

    number: int
    heading: str | None
    name: str
    unit: str | None
    kind: Literal["number", "time", "text"]
    why: str
    time_format: str | None = None
    needs_zone: bool = False
    time_formats: tuple[str, ...] = ()
    sentinels: tuple[str, ...] = ()
    first: str | None = None
    last: str | None = None

    def with_ends(self, first: str | None, last: str | None) -> ColumnGuess:
        """Return the same guess with first and last value."""
        return replace(self, first=first, last=last)


def guessed_columns(layout: Layout) -> tuple[ColumnGuess, ...]:
    """Return what every column of a table seems to be.

    Parameters
    ----------
    layout : Layout
        Guessed layout with headings and first rows.
    """
    width = len(layout.rows[0])
    guesses = []
    for index in range(width):
        heading = layout.headings[0][index] if layout.headings else None
        name, unit, why_unit = unit_text(heading) if heading else ("", None, "there is no heading")
        if unit is None and len(layout.headings) > 1 and layout.headings[1][index]:
            unit, why_unit = layout.headings[1][index].strip("()[] "), "it stands in the second header line"
        cells = [row[index] for row in layout.rows]
        guess = _kind(index + 1, heading, name, cells, layout.fields["decimal"])
        guesses.append(replace(guess, unit=unit, why=f"{guess.why}; unit: {why_unit}"))
    return tuple(guesses)


def _kind(number: int, heading: str | None, name: str, cells: list[str], decimal: Decimal) -> ColumnGuess:
    filled = [cell for cell in cells if cell.strip() and cell.strip().lower() != "nan"]
    plain = ColumnGuess(number, heading, name or str(number), None, "text", f"{len(filled)} cells are words")
    if not filled:
        return replace(plain, why="all cells looked at are empty")
    numeric = [cell for cell in filled if is_number(cell, decimal)]
    formats = _fitting_formats(filled) if len(numeric) < len(filled) else ()
    if formats:
        zone = formats[0] != "iso8601" or not _with_offset(filled)
        why = f"all {len(filled)} cells looked at are time stamps of the form {' or '.join(formats)}"
        single = formats[0] if len(formats) == 1 else None
        return replace(plain, kind="time", why=why, time_format=single, needs_zone=zone, time_formats=formats)
    words = sorted({cell.strip() for cell in filled if not is_number(cell, decimal)})
    if len(numeric) < len(filled) / 2 or len(words) > 3:
        return plain
    values = [value for cell in numeric if (value := parsed_number(cell, decimal=decimal)) is not None]
    if (
        len(values) == len(filled)
        and min(values) >= _EPOCHS[0]
        and max(values) < _EPOCHS[1]
        and _TIME_WORDS.search(heading or "")
    ):
        why = "the heading speaks of time and the numbers are seconds since 1970 for dates from 2001 to 2033"
        return replace(plain, kind="time", why=why, time_format="epoch", time_formats=("epoch",))
    marks = tuple(
        dict.fromkeys(
            cell.strip() for cell in numeric if parsed_number(cell, decimal=decimal) in _OVERFLOWS + _FILLERS
        )
    )
    why = f"{len(numeric)} of {len(filled)} cells looked at are numbers"
    sentinels = (*words, *(mark for mark in marks if len(set(values)) > 1))
    if sentinels:
        why += f"; {', '.join(sentinels)} may mean `no value`"
    return replace(plain, kind="number", why=why, sentinels=sentinels)


def _fitting_formats(cells: Sequence[str]) -> tuple[str, ...]:
    texts = pa.array(list(cells), pa.string())
    return tuple(
        form for form in _FORMATS if not TimeStamps(time_format=form, time_zone="UTC").seconds(texts)[1]
    )


def _with_offset(cells: Sequence[str]) -> bool:
    return not TimeStamps(time_format="iso8601").seconds(pa.array(list(cells), pa.string()))[1]


def shared_time_format(columns: Sequence[ColumnGuess]) -> tuple[str | None, list[str]]:
    """Return the one time format of a table, and what is doubtful about its times."""
    times = [column for column in columns if column.kind == "time"]
    doubts = []
    for column in times:
        if len(column.time_formats) > 1:
            doubts.append(
                f"column {column.number}: the time stamps fit {' and '.join(column.time_formats)}; state which one is meant"
            )
        if column.needs_zone:
            doubts.append(
                f"column {column.number}: the time stamps carry no offset from UTC; state their zone"
            )
    formats = {column.time_format for column in times if column.time_format is not None}
    if len(formats) > 1:
        doubts.append(
            f"the columns of time stamps have different formats ({', '.join(sorted(formats))}); a table has one"
        )
        return None, doubts
    return (formats.pop() if formats else None), doubts

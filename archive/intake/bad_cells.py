"""Findings of cells that cannot be read: each one, or one for all when hardly a row is without the fault."""

from __future__ import annotations

from archive.intake.dialect import DETAILED, BadCell
from archive.intake.reading import Reading
from schemas.finding import Finding
from schemas.sweep import Sweep

__all__ = ["report_cells"]

_SHOWN_CELLS = DETAILED
_EVERYWHERE = 20
"""As many rows with one and the same fault are not listed one by one when hardly a row is without it."""


def report_cells(
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

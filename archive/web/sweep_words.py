"""What a row of a list says of a sweep."""

from __future__ import annotations

from archive.index import SweepRow
from archive.reports.numbers import absent, shown_value
from schemas.lineage import Value

__all__ = ["marks_of_row", "shown_coverage", "temperature_span"]


def marks_of_row(row: SweepRow) -> list[str]:
    """Return what was said of a sweep after it was sealed, as sentences."""
    marks = [f"withdrawn: {row.withdrawn}"] if row.withdrawn else []
    marks += [f"amended by {', '.join(row.amended)}"] if row.amended else []
    return marks + [f"{each} rests on something withdrawn" for each in row.flagged]


def shown_coverage(row: SweepRow) -> str:
    """Return the coverage as it is printed, in the unit people like to read."""
    if row.coverage is None:
        return str(absent("nr"))
    value = Value(value=row.coverage, uncertainty=row.coverage_uncertainty, unit="mol/m^2")
    return str(shown_value(value, "coverage"))


def temperature_span(row: SweepRow) -> str:
    """Return the range of temperatures, with an arrow where it was gone through in one direction."""
    ends = [end for end in (row.temperature_low, row.temperature_high) if end is not None]
    if not ends:
        return str(absent("nr"))
    texts = list(dict.fromkeys(f"{end:.4g}" for end in ends))
    if row.direction == "down":
        texts.reverse()
    arrow = {"up": " \u2192 ", "down": " \u2192 ", "both": " \u2194 "}.get(row.direction, "\u2013")
    return f"{arrow.join(texts)} K"

"""Marks of a methods appendix: a short name printed behind each sentence and figure, and the table of what each rests on.

Rules: `s1`, `s2` and so on in the order of the page, figures `f1`, `f2`; printed as `#s1`, so that a person can type it behind
the folder of the appendix: ``stillroom trace appendix#s1``.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from archive.reports.appendix_tables import Table, head, narrow

__all__ = ["marks_table", "with_marks"]


def with_marks(sections: Sequence[Mapping[str, Any]]) -> list[dict[str, Any]]:
    """Return the sections of an appendix with a mark for each sentence, step and figure.

    Parameters
    ----------
    sections : sequence of mapping
        With `sentences`, `steps` (each with `lines`) and `figures`, in the order of the page.

    Returns
    -------
    list of dict
        The sections with `marks` beside `sentences` and, in each block, beside `lines`, and `figure_marks`.
    """
    told = drawn = 0
    found = []
    for section in sections:
        marks = [f"s{told + number}" for number in range(1, len(section["sentences"]) + 1)]
        told += len(marks)
        blocks = []
        for block in section["steps"]:
            own = [f"s{told + number}" for number in range(1, len(block["lines"]) + 1)]
            told += len(own)
            blocks.append({**block, "marks": own})
        figures = [f"f{drawn + number}" for number in range(1, len(section["figures"]) + 1)]
        drawn += len(figures)
        found.append({**section, "marks": marks, "steps": blocks, "figure_marks": figures})
    return found


def marks_table(sections: Sequence[Mapping[str, Any]]) -> Table:
    """Return the table of what stands behind each mark, one row for each record in the order of its first mark."""
    behind: dict[str, list[str]] = {}
    for section in sections:
        for mark, (_, said) in zip(section["marks"], section["sentences"], strict=True):
            behind.setdefault(said.record, []).append(f"#{mark}")
        for block in section["steps"]:
            if block["marks"]:
                steps = f"{block['record']}, one mark a step"
                behind.setdefault(steps, []).append(_range(block["marks"]))
        for mark, figure in zip(section["figure_marks"], section["figures"], strict=True):
            behind.setdefault("; ".join(figure.sources), []).append(f"#{mark}")
    rows = tuple((narrow(record), narrow(", ".join(marks))) for record, marks in behind.items())
    caption = (
        "What stands behind the marks of sentences (s) and figures (f); with the folder of this appendix before it, as in "
        "appendix#s1, stillroom trace leads from a mark to raw files and lines."
    )
    return Table("marks", caption, ((head("record"), 60), (head("marks"), 40)), rows)


def _range(marks: Sequence[str]) -> str:
    return f"#{marks[0]}" if len(marks) == 1 else f"#{marks[0]} to #{marks[-1]}"

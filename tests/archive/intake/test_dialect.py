"""Contradictions of a dialect, and the bounded list of bad cells."""

from __future__ import annotations

from typing import Any

import pytest

from archive.errors import BadRequest
from archive.intake.dialect import DETAILED, BadCells, ColumnRequest, dialect_faults, require_usable
from schemas.sweep import Dialect

FAULTS = {
    "none": ({}, []),
    "none, decimal comma": ({"delimiter": ";", "decimal": ","}, []),
    "two commas": ({"decimal": ","}, ["decimal"]),
    "comment with the delimiter": ({"delimiter": "|", "comment": "||"}, ["comment"]),
    "comment of a blank": ({"delimiter": "space", "comment": "\t#"}, ["comment"]),
    "comment of a digit": ({"comment": "1"}, ["comment"]),
    "comment of the quote": ({"comment": '"'}, ["comment"]),
    "header in no comment": ({"header_comment": True, "comment": None}, ["header_comment"]),
    "header of no lines": ({"header_comment": True, "header_rows": 0}, ["header_comment"]),
    "names twice": ({"names": ("T", "P", "T")}, ["names"]),
    "no names": ({"names": ()}, ["names"]),
    "several": ({"decimal": ",", "comment": ",", "names": ("a", "a")}, ["decimal", "comment", "names"]),
}


@pytest.mark.parametrize(("dialect", "expected"), FAULTS.values(), ids=FAULTS.keys())
def test_contradictions_are_all_found(dialect: dict[str, Any], expected: list[str]) -> None:
    assert [name for name, _ in dialect_faults(Dialect(**dialect))] == expected


def test_contradictions_are_refused_together() -> None:
    columns = [ColumnRequest("t", 1, "number"), ColumnRequest("t", 2, "number")]
    with pytest.raises(BadRequest) as refused:
        require_usable(Dialect(decimal=","), columns, file="a.csv")
    assert "decimal" in refused.value.what
    assert "channel t is asked for twice" in refused.value.what
    assert refused.value.file == "a.csv"


def test_bad_cells_are_sorted_counted_and_bounded() -> None:
    bad = BadCells("a.csv")
    for line in range(DETAILED + 5, 0, -1):
        bad.add(line, 2, "2", "x", "why")
        bad.add(line, 1, "1", "y" * 100, "why")
    bad.settle()
    bad.add(9999, 0, "", "", "later")
    bad.settle()
    assert bad.count == 2 * (DETAILED + 5) + 1
    assert len(bad.detailed) == DETAILED
    assert [(cell.line, cell.column) for cell in bad.detailed[:3]] == [(1, "1"), (1, "2"), (2, "1")]
    assert bad.detailed[0].found == "y" * 77 + "..."

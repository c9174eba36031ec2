"""What is guessed of a table, and that doubts are said."""

from __future__ import annotations

import gzip
from pathlib import Path
from typing import Any

import pytest

from archive.errors import BadRequest
from archive.intake.guess import TableGuess, guess_table
from archive.intake.headings import unit_text


def guess(tmp_path: Path, content: str | bytes, name: str = "log.csv") -> TableGuess:
    """Return the guess for a table with this content."""
    path = tmp_path / name
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    return guess_table(path)


LAYOUTS = {
    "comma": ("T,P\n1,2.5\n3,4\n", {}, 2),
    "comma, quoted": ('T,"P, raw"\n1,2.5\n3,4\n', {}, 2),
    "semicolon, decimal comma": ("T;P\n1,5;2,5\n3,5;4,5\n", {"delimiter": ";", "decimal": ","}, 2),
    "semicolon, point": ("T;P\n1.5;2.5\n3.5;4.5\n", {"delimiter": ";"}, 2),
    "tab": ("T\tP\n1.5\t2\n3\t4\n", {"delimiter": "\t"}, 2),
    "tab, decimal comma": ("T\tP\n1,5\t2\n3\t4,5\n", {"delimiter": "\t", "decimal": ","}, 2),
    "white space": ("  T   P\n 1.5   2\n  3   4\n", {"delimiter": "space"}, 2),
    "no header": ("1,2,3\n4,5,6\n", {"header_rows": 0}, 2),
    "units row": ("T,P\nmK,s\n1,2\n3,4\n", {"header_rows": 2}, 2),
    "comments": ("# log of a run\nT,P\n1,2\n3,4\n", {}, 2),
    "percent comments": ("% log\nT,P\n1,2\n% pause\n3,4\n", {"comment": "%"}, 2),
    "header in a comment": ("# log\n# T (K), P (s)\n1,2\n3,4\n", {"header_comment": True, "skip_rows": 1}, 2),
    "lines above": ("Instrument 7\nserial 3\n\nT,P\n1,2\n3,4\n", {"skip_rows": 2}, 2),
    "latin-1": ("T (µK),P\n1,2\n3,4\n".encode("latin-1"), {"encoding": "latin-1"}, 2),
    "byte order mark": (b"\xef\xbb\xbfT,P\n1,2\n3,4\n", {}, 2),
    "packed": (gzip.compress(b"T,P\n1,2\n3,4\n"), {}, 2),
    "carriage returns": ("T,P\r1,2\r3,4\r", {}, 2),
}


@pytest.mark.parametrize(("content", "dialect", "rows"), LAYOUTS.values(), ids=LAYOUTS.keys())
def test_layouts(tmp_path: Path, content: str | bytes, dialect: dict[str, Any], rows: int) -> None:
    found = guess(tmp_path, content)
    assert found.dialect.model_dump(exclude_defaults=True) == dialect
    assert (found.rows, found.bad_cells) == (rows, 0)
    assert set(found.why) >= {"delimiter", "decimal", "encoding", "comment", "header_rows"}


def test_columns_with_units_kinds_and_ends(tmp_path: Path) -> None:
    content = (
        "when,T (mK),R [Ohm],Period/ms,p_Pa,remark\n"
        "2026-03-02T09:10:00Z,10.5,1,1,9.9E37,start\n"
        "2026-03-02T09:10:01Z,10.6,OVLD,2,3,\n"
        "2026-03-02T09:10:02Z,10.7,2,3,4,end of it\n"
    )
    found = guess(tmp_path, content)
    assert [column.unit for column in found.columns] == [None, "mK", "Ohm", "ms", "Pa", None]
    assert [column.name for column in found.columns] == ["when", "T", "R", "Period", "p", "remark"]
    assert [column.kind for column in found.columns] == ["time", *["number"] * 4, "text"]
    assert [column.sentinels for column in found.columns] == [(), (), ("OVLD",), (), ("9.9E37",), ()]
    assert (found.columns[1].first, found.columns[1].last) == ("10.5", "10.7")
    assert (found.columns[4].first, found.columns[4].last) == ("3.0", "4.0")
    assert (found.columns[5].first, found.columns[5].last) == ("start", "end of it")
    assert found.dialect.time_format == "iso8601"
    assert found.time_span is not None
    assert found.time_span[1] - found.time_span[0] == 2.0
    assert found.doubts == ()
    assert all(column.why for column in found.columns)


DOUBTS = {
    "one column or two": ("1,5\n2,5\n", "one column with decimal comma"),
    "day or month first": ("t,T\n03/02/2026 10:00:00,1\n04/02/2026 10:00:00,2\n", "state which one is meant"),
    "no zone": ("t,T\n2026-03-02 10:00:00,1\n2026-03-02 10:00:01,2\n", "state their zone"),
    "no names": ("1 2\n3 4\n", "names no columns"),
    "Latin-1": (b"T (\xb5K),P\n1,2\n", "only because it is not UTF-8"),
    "thousands": ('T;P\n"1,234,567.5";1\n"2,345,678.5";2\n', "thousands"),
    "decimal commas between commas": ("T,P\n1,5,2,5\n1,6,2,6\n", "twice as many cells"),
    "points among commas": ("T;P\n1,5;2.5\n1,6;2,6\n1,7;2,7\n", "decimal points stand among"),
    "bad cells further down": ("T;P\n" + "1;2\n" * 600 + "x;2\n", "do not fit this guess"),
    "two time formats": ("a;b\n" + "2026-03-02T10:00:00Z;2.3.2026 10:00\n" * 2, "different formats"),
}


@pytest.mark.parametrize(("content", "doubt"), DOUBTS.values(), ids=DOUBTS.keys())
def test_doubts_are_said(tmp_path: Path, content: str | bytes, doubt: str) -> None:
    found = guess(tmp_path, content)
    assert any(doubt in sentence for sentence in found.doubts), found.doubts


def test_no_format_is_chosen_where_two_fit(tmp_path: Path) -> None:
    found = guess(tmp_path, "t,T\n03/02/2026 10:00:00,1\n04/02/2026 10:00:00,2\n")
    assert (found.columns[0].kind, found.dialect.time_format, found.time_span) == ("time", None, None)
    assert found.columns[0].time_formats == ("%d/%m/%Y %H:%M:%S", "%m/%d/%Y %H:%M:%S")
    found = guess(tmp_path, "t,T\n03/02/2026 10:00:00,1\n14/02/2026 10:00:00,2\n")
    assert found.dialect.time_format == "%d/%m/%Y %H:%M:%S"
    assert found.columns[0].first == "03/02/2026 10:00:00"


def test_seconds_since_1970_need_a_heading_that_says_so(tmp_path: Path) -> None:
    found = guess(tmp_path, "timestamp,T\n1772435400.5,1\n1772435401.5,2\n")
    assert (found.dialect.time_format, found.time_span) == ("epoch", (1772435400.5, 1772435401.5))
    found = guess(tmp_path, "resistance,T\n1772435400.5,1\n1772435401.5,2\n")
    assert (found.dialect.time_format, found.columns[0].kind) == (None, "number")


REFUSED = {
    "empty": (b"", "no rows"),
    "only comments": (b"# a\n# b\n", "no rows"),
    "zero bytes": (b"a\x00b\n", "zero bytes"),
    "prose": (b"This is a letter\nto whom it may concern\nabout nothing at all\n", "no delimiter"),
    "damaged": (b"\x1f\x8bxxxxxxxxxxxxxxxxxx", "damaged"),
}


@pytest.mark.parametrize(("content", "why"), REFUSED.values(), ids=REFUSED.keys())
def test_what_is_no_table_is_refused(tmp_path: Path, content: bytes, why: str) -> None:
    with pytest.raises(BadRequest, match=why):
        guess(tmp_path, content)


HEADINGS = {
    "T (mK)": ("T", "mK"),
    "R [Ohm]": ("R", "Ohm"),
    "Period/ms": ("Period", "ms"),
    "Period / ms": ("Period", "ms"),
    "p_Pa": ("p", "Pa"),
    "nsorb [mmol/g]": ("nsorb", "mmol/g"),
    "T": ("T", None),
    "P/P0": ("P/P0", None),
    "T_bath": ("T_bath", None),
    "a/b/c": ("a/b/c", None),
    "f(x) (Hz)": ("f(x)", "Hz"),
    "T ()": ("T ()", None),
    "": ("", None),
}


@pytest.mark.parametrize(("heading", "expected"), HEADINGS.items(), ids=list(HEADINGS))
def test_units_in_headings(heading: str, expected: tuple[str, str | None]) -> None:
    assert unit_text(heading)[:2] == expected

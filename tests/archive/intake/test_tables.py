"""Text tables: what is read, what is reported, and on which line."""

from __future__ import annotations

import gzip
import hashlib
import io
import itertools
import math
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from archive.errors import BadRequest
from archive.intake.dialect import DETAILED, ColumnRequest
from archive.intake.tables import TableReader, read_header
from schemas.sweep import Dialect

BLOCK = 4 << 20


def read(
    content: bytes, *columns: ColumnRequest, block_bytes: int = BLOCK, **dialect: Any
) -> tuple[Any, Any, Any, TableReader]:
    """Return columns, sentinel masks, line numbers and the reader of a table given as bytes."""
    reader = TableReader(
        io.BytesIO(content),
        file="s017.csv",
        dialect=Dialect(**dialect),
        columns=columns,
        block_bytes=block_bytes,
    )
    blocks = list(reader.blocks())
    values = {c.name: np.concatenate([b.columns[c.name] for b in blocks] or [np.zeros(0)]) for c in columns}
    masks = {c.name: np.concatenate([b.sentinel[c.name] for b in blocks] or [np.zeros(0)]) for c in columns}
    lines = [int(line) for block in blocks for line in block.lines]
    return values, masks, lines, reader


def number(column: str | int, *sentinels: str, nan: Any = "error", name: str = "x") -> ColumnRequest:
    """Return a request for a column of numbers."""
    return ColumnRequest(name, column, "number", sentinels, nan)


GOOD = {
    "comma": (b"a,b\n1,2\n3,4\n", {}, [2.0, 4.0], [2, 3]),
    "tab": (b"a\tb\n1\t2\n3\t4\n", {"delimiter": "\t"}, [2.0, 4.0], [2, 3]),
    "bar": (b"a|b\n1|2\n", {"delimiter": "|"}, [2.0], [2]),
    "semicolon, decimal comma": (b"a;b\n1,5;2,5\n", {"delimiter": ";", "decimal": ","}, [2.5], [2]),
    "white space": (
        b"  a \t b\n   1    2.5e-3\n\n 3\t\t4  \n",
        {"delimiter": "space"},
        [2.5e-3, 4.0],
        [2, 4],
    ),
    "white space, quoted": (b'a "b"\n"x y"  2\n', {"delimiter": "space"}, [2.0], [2]),
    "byte order mark": (b"\xef\xbb\xbfa,b\n1,2\n", {}, [2.0], [2]),
    "latin-1": ("a,b\nµ,2\n".encode("latin-1"), {"encoding": "latin-1"}, [2.0], [2]),
    "carriage returns and line feeds": (b"a,b\r\n1,2\r\n\r\n3,4\r\n", {}, [2.0, 4.0], [2, 4]),
    "carriage returns alone": (b"a,b\r1,2\r\r3,4\r", {}, [2.0, 4.0], [2, 4]),
    "last line without end": (b"a,b\n1,2\n3,4", {}, [2.0, 4.0], [2, 3]),
    "comments and blank lines": (b"# x\n\na,b\n# 5,6\n1,2\n   \n  # y\n3,4\n", {}, [2.0, 4.0], [5, 8]),
    "comment mark of two": (b"// x\na,b\n1,2\n", {"comment": "//"}, [2.0], [3]),
    "no comment mark": (b"a,b\n#1,2\n", {"comment": None}, [2.0], [2]),
    "header in a comment": (b"# log\n# a, b\n1,2\n", {"header_comment": True, "skip_rows": 1}, [2.0], [3]),
    "units row": (b"a,b\ns,K\n1,2\n", {"header_rows": 2}, [2.0], [3]),
    "lines to skip": (b"Instrument 7\n\na,b\n1,2\n", {"skip_rows": 2}, [2.0], [4]),
    "channel numbers below the names": (b"a,b\n101,102\n1,2\n", {"header_rows": 2}, [2.0], [3]),
    "names in the dialect": (b"1,2\n3,4\n", {"header_rows": 0, "names": ("a", "b")}, [2.0, 4.0], [1, 2]),
    "quoted": (b'"a","b"\n"1, or so","2"\n', {}, [2.0], [2]),
    "quoted quotation mark": (b'a,b\n"say ""x""",2\n', {}, [2.0], [2]),
    "apostrophes": (b"a,b\n'1,5',2\n", {"quote": "'"}, [2.0], [2]),
    "no quotes": (b'a,b\n5",2\n', {"quote": None}, [2.0], [2]),
    "plus signs and blanks": (b"a,b\n1, +2.5E+01 \n", {}, [25.0], [2]),
    "points without digits": (b"a,b\n1,.5\n1,5.\n", {}, [0.5, 5.0], [2, 3]),
}


@pytest.mark.parametrize(("content", "dialect", "expected", "lines"), GOOD.values(), ids=GOOD.keys())
@pytest.mark.parametrize("block_bytes", [64, BLOCK], ids=["small blocks", "one block"])
@pytest.mark.parametrize("pack", [bytes, gzip.compress], ids=["plain", "gzip"])
def test_a_clean_table_is_read_with_its_line_numbers(
    *,
    content: bytes,
    dialect: dict[str, Any],
    expected: list[float],
    lines: list[int],
    block_bytes: int,
    pack: Callable[[bytes], bytes],
) -> None:
    values, masks, found, reader = read(pack(content), number("b"), block_bytes=block_bytes, **dialect)
    assert reader.bad_cells == []
    assert values["x"].tolist() == expected
    assert not masks["x"].any()
    assert found == lines
    assert reader.rows == len(lines)
    assert reader.header == ("a", "b")


BAD = {
    "hexadecimal": (b"a,b\n1,0x1F\n", {}, (2, '2 "b"', "0x1F", "hexadecimal")),
    "overflow to infinity": (b"a,b\n1,1e999\n", {}, (2, '2 "b"', "1e999", "too large")),
    "overflow, in text": (b"a,b\n1,x\n1,-1e999\n", {}, (3, '2 "b"', "-1e999", "too large")),
    "infinity": (b"a,b\n1,-inf\n", {}, (2, '2 "b"', "-inf", "infinite")),
    "nan": (b"a,b\n1,NaN\n", {}, (2, '2 "b"', "NaN", "is NaN")),
    "empty": (b"a,b\n1,\n", {}, (2, '2 "b"', "", "is empty")),
    "word": (b"a,b\n1,OVLD\n", {}, (2, '2 "b"', "OVLD", "not a number")),
    "Fortran exponent": (b"a,b\n1,1.5D-03\n", {}, (2, '2 "b"', "1.5D-03", "Fortran")),
    "thousands in quotes": (b'a,b\n1,"1,234.5"\n', {}, (2, '2 "b"', "1,234.5", "thousands")),
    "thousands by points": (
        b"a;b\n1;1.234,5\n",
        {"delimiter": ";", "decimal": ","},
        (2, '2 "b"', "1.234,5", "thousands"),
    ),
    "thousands by blanks": (
        b"a;b\n1;1 234 567\n",
        {"delimiter": ";"},
        (2, '2 "b"', "1 234 567", "thousands"),
    ),
    "comma for point": (b"a;b\n1;1,5\n", {"delimiter": ";"}, (2, '2 "b"', "1,5", "decimal comma")),
    "point for comma": (
        b"a;b\n1;1.5\n",
        {"delimiter": ";", "decimal": ","},
        (2, '2 "b"', "1.5", "decimal point"),
    ),
    "digits of another script": ("a,b\n1,１\n".encode(), {}, (2, '2 "b"', "１", "not a number")),
    "underscore": (b"a,b\n1,1_0\n", {}, (2, '2 "b"', "1_0", "not a number")),
    "short row": (b"a,b\n1\n", {}, (2, "", "1", "1 cells where the table has 2")),
    "long row": (b"a,b\n1,2,3\n", {}, (2, "", "1,2,3", "3 cells where the table has 2")),
    "delimiter at the end": (b"a,b\n1,2,\n", {}, (2, "", "1,2,", "delimiter at the end")),
    "decimal commas between commas": (b"a,b\n1,5,2,5\n", {}, (2, "", "1,5,2,5", "decimal commas")),
    "quoted line break": (b'a,b\n"1\n",2\n', {}, (2, "", '"1', "line break inside is not supported")),
    "quote inside": (b'a,b\n"1"5,2\n', {}, (2, "", '"1"5,2', "inside a cell")),
    "zero bytes": (b"a,b\n1,2\n\x00\x00\x00", {}, (3, "", "\x00\x00\x00", "zero bytes")),
    "not UTF-8": ("a,b\nµ,2\n".encode("latin-1"), {}, (2, "", "\\xb5,2", "not UTF-8")),
    "header not UTF-8": ("µ,b\n1,2\n".encode("latin-1"), {}, (1, "", "\\xb5,b", "not UTF-8")),
    "stray carriage return": (b"a,b\n1\r,2\n", {}, (2, "", "1\r,2", "carriage return")),
    "no rows": (b"a,b\n", {}, (2, "", "", "without a row")),
    "no header": (b"# a,b\n", {}, (2, "", "", "1 more header lines")),
    "empty file": (b"", {}, (1, "", "", "header lines")),
    "row taken for a header line": (
        b"a,b\n1.5,2.5\n3,4\n",
        {"header_rows": 2},
        (2, "", "1.5, 2.5", "reads as a row of data, but counts among the 2 header lines"),
    ),
    "row taken for the names": (
        b"1.5,2.5\n3,4\n",
        {"names": ("a", "b")},
        (1, "", "1.5, 2.5", "reads as a row of data"),
    ),
    "no such column": (b"a,c\n1,2\n", {}, (1, "b", "a, c", "no column has this name")),
    "name stands twice": (b"b,b\n1,2\n", {}, (1, "b", "b, b", "2 columns have this name")),
    "name without header": (
        b"1,2\n",
        {"header_rows": 0},
        (1, "b", "2 columns without a header", "by number"),
    ),
    "header comment missing": (
        b"a,b\n1,2\n",
        {"header_comment": True},
        (1, "", "a,b", "does not begin with #"),
    ),
    "spreadsheet": (b"PK\x03\x04" + b"x" * 60, {}, (1, "", "PK\x03\x04", "zip archive")),
    "UTF-16": ("a,b\n1,2\n".encode("utf-16"), {}, (1, "", "\\xff\\xfe", "UTF-16")),
    "HDF5": (b"\x89HDF\r\n\x1a\n" + b"\0" * 60, {}, (1, "", "\\x89HDF\r\n\x1a\n", "HDF5")),
}


@pytest.mark.parametrize(("content", "dialect", "expected"), BAD.values(), ids=BAD.keys())
def test_what_is_wrong_is_named_with_its_place(
    content: bytes, dialect: dict[str, Any], expected: tuple[int, str, str, str]
) -> None:
    values, _, _, reader = read(content, number("b"), **dialect)
    cell = next(cell for cell in reader.bad_cells if expected[3] in cell.why)
    assert (cell.file, cell.line, cell.column, cell.found) == ("s017.csv", *expected[:3])
    assert reader.bad_cell_count == len(reader.bad_cells)
    if expected[1].startswith("2"):
        assert np.isnan(values["x"][-1])


def test_all_faults_of_a_table_come_at_once_and_in_file_order() -> None:
    content = b"T,P\nx,2\n3\n4,y\nz,\n5,6\n"
    values, _, lines, reader = read(content, number("T", name="t"), number("P", name="p"))
    assert [(cell.line, cell.column[:1]) for cell in reader.bad_cells] == [
        (2, "1"),
        (3, ""),
        (4, "2"),
        (5, "1"),
        (5, "2"),
    ]
    assert lines == [2, 4, 5, 6]
    assert values["t"][[1, 3]].tolist() == [4.0, 5.0]


def test_a_missing_column_does_not_hide_faults_of_the_others() -> None:
    values, _, _, reader = read(b"a,b\n1,x\n", number("q", name="q"), number("b"))
    assert [cell.column for cell in reader.bad_cells] == ["q", '2 "b"']
    assert np.isnan(values["q"]).all()


SENTINELS = {
    "by value": (b"9.900000E+37", ("9.9E37",), "error", True, 0),
    "by value, negative": (b"-9999.00", ("-9999",), "error", True, 0),
    "another value": (b"-9998", ("-9999",), "error", False, 0),
    "as text": (b" OVLD ", ("OVLD",), "error", True, 0),
    "text is compared exactly": (b"ovld", ("OVLD",), "error", False, 1),
    "empty": (b"", ("",), "error", True, 0),
    "nan": (b"NaN", ("NaN",), "error", True, 0),
    "nan of a column that keeps NaN": (b"NaN", ("NaN",), "keep", True, 0),
    "nan is kept": (b"NaN", (), "keep", False, 0),
    "empty is kept": (b"", (), "keep", False, 0),
    "infinity is not kept": (b"inf", (), "keep", False, 1),
    "infinity by name": (b"inf", ("inf",), "error", True, 0),
    "nan of another kind": (b"NaN", ("OVLD",), "error", False, 1),
}


@pytest.mark.parametrize(
    ("cell", "sentinels", "nan", "masked", "bad"), SENTINELS.values(), ids=SENTINELS.keys()
)
def test_sentinels_are_marked_and_only_they(
    *, cell: bytes, sentinels: tuple[str, ...], nan: Any, masked: bool, bad: int
) -> None:
    values, masks, _, reader = read(b"a,b\n1,2\n3," + cell + b"\n", number("b", *sentinels, nan=nan))
    assert masks["x"].tolist() == [False, masked]
    assert reader.bad_cell_count == bad
    assert np.isnan(values["x"][1]) == (cell != b"-9998")


def test_one_channels_sentinel_is_a_bad_cell_of_another() -> None:
    columns = number("a", "OVLD", name="a"), number("b", "9.9E37", name="b")
    _, masks, _, reader = read(b"a,b\nOVLD,9.9E37\n9.9E37,OVLD\n1,1\n", *columns)
    assert masks["a"].tolist() == [True, False, False]
    assert masks["b"].tolist() == [True, False, False]
    assert [(cell.line, cell.column) for cell in reader.bad_cells] == [(3, '2 "b"')]


def test_times_and_text_stand_beside_numbers() -> None:
    content = b"when,what,T\n2026-03-02T09:10:00+02:00,ramp,1\n1999,\xc2\xb5,2\n---,,3\n"
    time = ColumnRequest("t", "when", "time", ("---",))
    values, masks, _, reader = read(
        content, time, ColumnRequest("w", 2, "text"), number("T"), time_format="iso8601"
    )
    # 2026-03-02 is day 20514 since 1970-01-01: 56 years of 365 days, 14 leap days, 31 + 28 + 1 days.
    assert values["t"][0] == (56 * 365 + 14 + 60) * 86400 + 7 * 3600 + 600
    assert np.isnan(values["t"][1:]).all()
    assert masks["t"].tolist() == [False, False, True]
    assert values["w"].tolist() == ["ramp", "µ", ""]
    assert [(cell.line, cell.found) for cell in reader.bad_cells] == [(3, "1999")]


def test_a_column_can_be_asked_for_twice() -> None:
    values, _, _, reader = read(b"a\n1.50\n", number("a"), ColumnRequest("w", "a", "text"))
    assert (values["x"].tolist(), values["w"].tolist(), reader.bad_cell_count) == ([1.5], ["1.50"], 0)


def test_epoch_sentinels_are_compared_by_value() -> None:
    time = ColumnRequest("t", 1, "time", ("-1",))
    values, masks, _, reader = read(b"t\n1767225600.5\n-1.0\n", time, time_format="epoch")
    assert values["t"][0] == 1767225600.5
    assert (masks["t"].tolist(), reader.bad_cell_count) == ([False, True], 0)


def test_lines_are_right_across_three_blocks() -> None:
    body, expected, bad = [b"T,P"], [], []
    for row in range(3000):
        if row % 7 == 0:
            body.append(b"")
        if row % 11 == 0:
            body.append(b"# pause, here")
        if row % 501 == 500:
            bad.append(len(body) + 1)
            body.append(b"%d,x" % row)
        else:
            body.append(b"%d,1" % row)
        expected.append(len(body))
    content = b"\r\n".join(body) + b"\r\n"
    reader = TableReader(
        io.BytesIO(content),
        file="log",
        dialect=Dialect(),
        columns=[number("T"), number("P", name="p")],
        block_bytes=len(content) // 3 + 100,
    )
    blocks = list(reader.blocks())
    assert len(blocks) == 3
    assert [int(line) for block in blocks for line in block.lines] == expected
    assert [cell.line for cell in reader.bad_cells] == bad
    assert np.concatenate([block.columns["x"] for block in blocks]).tolist() == list(range(3000))
    assert blocks[0].first_line == 1
    assert all(
        a.first_line <= a.lines[0] and a.lines[-1] < b.first_line for a, b in itertools.pairwise(blocks)
    )


def test_ten_thousand_bad_cells_are_named_and_all_are_counted() -> None:
    content = b"a,b\n" + b"".join(b"%d,bad%d\n" % (row, row) for row in range(10_005))
    _, _, _, reader = read(content, number("b"), block_bytes=4096)
    assert reader.bad_cell_count == 10_005
    assert len(reader.bad_cells) == DETAILED
    assert (reader.bad_cells[-1].line, reader.bad_cells[-1].found) == (10_001, "bad9999")


def test_a_long_bad_cell_is_shown_shortened() -> None:
    _, _, _, reader = read(b"a\n" + b"x" * 5000 + b"\n", number("a"))
    assert len(reader.bad_cells[0].found) == 80


@pytest.mark.parametrize("pack", [bytes, gzip.compress], ids=["plain", "gzip"])
def test_listeners_get_every_byte_as_it_stands_in_the_file(pack: Callable[[bytes], bytes]) -> None:
    stored = pack(b"a,b\n" + b"1,2\n" * 400_000)
    digest, size = hashlib.sha256(), [0]

    def count(chunk: bytes) -> None:
        size[0] += len(chunk)

    reader = TableReader(
        io.BytesIO(stored),
        file="f",
        dialect=Dialect(),
        columns=[number("a")],
        tee=[digest.update, count],
        block_bytes=1 << 16,
    )
    rows = sum(len(block.lines) for block in reader.blocks())
    assert rows == 400_000
    assert size == [len(stored)]
    assert digest.digest() == hashlib.sha256(stored).digest()


@pytest.mark.parametrize("block_bytes", [1 << 20, BLOCK], ids=["small blocks", "one block"])
def test_listeners_get_a_file_whole_that_is_no_table(block_bytes: int) -> None:
    stored = b"PK\x03\x04" + bytes(3 << 20)
    seen = bytearray()
    reader = TableReader(
        io.BytesIO(stored),
        file="f",
        dialect=Dialect(),
        columns=[number("a")],
        tee=[seen.extend],
        block_bytes=block_bytes,
    )
    assert list(reader.blocks()) == []
    assert (seen == stored, reader.bad_cell_count) == (True, 1)


PACKED = gzip.compress(b"a,b\n" + b"".join(b"%d,2\n" % row for row in range(5000)))
DAMAGED = {
    "cut off": (PACKED[:-2000], "cut off"),
    "flipped bit": (PACKED[:3000] + bytes([PACKED[3000] ^ 1]) + PACKED[3001:], "damaged"),
    "something behind": (PACKED + b"more", "damaged"),
}


@pytest.mark.parametrize(("stored", "why"), DAMAGED.values(), ids=DAMAGED.keys())
def test_damaged_packing_is_reported(stored: bytes, why: str) -> None:
    _, _, _, reader = read(stored, number("a"))
    assert any(why in cell.why for cell in reader.bad_cells)


def test_gzip_members_follow_each_other_and_may_be_filled_with_zeros() -> None:
    stored = gzip.compress(b"a\n1\n") + gzip.compress(b"2\n") + bytes(100)
    values, _, _, reader = read(stored, number("a"))
    assert (values["x"].tolist(), reader.bad_cells) == ([1.0, 2.0], [])


def test_a_line_without_end_does_not_fill_the_memory() -> None:
    chunks = (b"1" * (1 << 20) for _ in range(40))
    reader = TableReader(chunks, file="f", dialect=Dialect(), columns=[number(1)], block_bytes=1 << 20)
    assert list(reader.blocks()) == []
    assert "without a line end" in reader.bad_cells[0].why


REFUSED = {
    "decimal comma between commas": ({"decimal": ","}, "three readings"),
    "comment is the delimiter": ({"delimiter": ";", "comment": ";"}, "begins with the delimiter"),
    "comment like a number": ({"comment": "-"}, "like a number"),
    "time without format": ({}, "format is not stated"),
    "local time without zone": ({"time_format": "%d.%m.%Y %H:%M"}, "without their zone"),
}


@pytest.mark.parametrize(("dialect", "why"), REFUSED.values(), ids=REFUSED.keys())
def test_a_dialect_with_two_readings_is_refused_before_reading(dialect: dict[str, Any], why: str) -> None:
    with pytest.raises(BadRequest, match=why):
        read(b"a,b\n1,2\n", ColumnRequest("t", 1, "time"), **dialect)


def test_header_of_a_file(tmp_path: Path) -> None:
    path = tmp_path / "log.csv.gz"
    path.write_bytes(gzip.compress(b'# log\nT (K),"P, raw"\n1,2\n'))
    assert read_header(path, Dialect()) == ("T (K)", "P, raw")
    assert read_header(path, Dialect(names=("t", "p"))) == ("t", "p")


FINITE = st.floats(allow_nan=False, allow_infinity=False)


@st.composite
def tables(draw: st.DrawFn) -> tuple[bytes, dict[str, Any], list[list[float]]]:
    """Draw a table of numbers written with `repr` in some dialect."""
    width = draw(st.integers(1, 4))
    rows = draw(st.lists(st.lists(FINITE, min_size=width, max_size=width), min_size=1, max_size=30))
    delimiter = draw(st.sampled_from([",", ";", "\t", "space", "|"]))
    decimal = draw(st.sampled_from([".", ","])) if delimiter != "," else "."
    quoted = draw(st.booleans())
    end = draw(st.sampled_from(["\n", "\r\n", "\r"]))
    between = draw(st.sampled_from([" ", "   ", " \t "])) if delimiter == "space" else delimiter

    def cell(value: float) -> str:
        text = repr(value).replace(".", decimal)
        return f'"{text}"' if quoted else text

    lines = [between.join(f"c{index}" for index in range(width))]
    for row in rows:
        lines += draw(st.sampled_from([[], [""], ["# , ; x"]]))
        lines.append(between.join(cell(value) for value in row))
    content = (end.join(lines) + end).encode()
    return content, {"delimiter": delimiter, "decimal": decimal}, rows


@settings(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(tables(), st.integers(64, 400))
def test_numbers_come_back_bit_for_bit(
    table: tuple[bytes, dict[str, Any], list[list[float]]], block_bytes: int
) -> None:
    content, dialect, rows = table
    columns = [number(f"c{index}", name=f"c{index}") for index in range(len(rows[0]))]
    values, _, lines, reader = read(content, *columns, block_bytes=block_bytes, **dialect)
    assert reader.bad_cells == []
    for index, column in enumerate(columns):
        assert values[column.name].tobytes() == np.array([row[index] for row in rows]).tobytes()
    text = content.decode().replace("\r\n", "\n").replace("\r", "\n").split("\n")
    assert all(text[line - 1] and not text[line - 1].startswith("#") for line in lines)


CELL = st.text(alphabet=st.sampled_from(list('0123456789.,;eE+-x" \t#nafiµ')), max_size=8)


@settings(max_examples=200, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(st.lists(CELL, min_size=1, max_size=12), st.integers(64, 200))
def test_every_line_is_a_row_or_a_finding_or_nothing(cells: list[str], block_bytes: int) -> None:
    content = "".join(f"{cell},1\n" for cell in cells).encode()
    values, _, lines, reader = read(
        content, number(1), block_bytes=block_bytes, header_rows=0, names=("a", "b")
    )
    whole_lines = {cell.line for cell in reader.bad_cells if cell.column == ""}
    comments = {index for index, cell in enumerate(cells, start=1) if cell.lstrip(" \t").startswith("#")}
    assert set(lines) | whole_lines | comments >= set(range(1, len(cells) + 1))
    bad = {cell.line for cell in reader.bad_cells if cell.column}
    for line, value in zip(lines, values["x"].tolist(), strict=True):
        # Python's own reading of the same cell is the outside check.
        assert math.isnan(value) if line in bad else value == float(cells[line - 1].strip().strip('"'))


@pytest.mark.parametrize("fault", ["raises", "loses rows"])
def test_rows_that_arrow_does_not_split_as_expected_are_never_taken(
    fault: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    def read_csv(*_: Any, **__: Any) -> pa.Table:
        if fault == "raises":
            raise pa.ArrowInvalid("no")
        return pa.table({"0": pa.array(["1"])})

    monkeypatch.setattr("archive.intake.tables.csv.read_csv", read_csv)
    values, _, lines, reader = read(b"a\n1\n2\n", number("a"))
    assert (values["x"].tolist(), lines) == ([], [])
    assert [(cell.line, "cannot be read" in cell.why) for cell in reader.bad_cells] == [(2, True)]


def test_one_wrong_cell_makes_text_of_its_column_for_some_blocks_only() -> None:
    """Columns beside it, and its own some blocks later, are read as numbers at once; nothing of the result shows it."""
    rows = [f"{n},{n}.5,{-n}" for n in range(4000)]
    rows[1000] = "1000,1000.5.5,-1000"
    seen: list[set[str]] = []
    reader = TableReader(
        io.BytesIO(("a,b,c\n" + "\n".join(rows) + "\n").encode()),
        file="log.csv",
        dialect=Dialect(),
        columns=[number(name, name=name) for name in "abc"],
        block_bytes=1024,
    )
    sums = np.zeros(3)
    for block in reader.blocks():
        seen.append(set("012") - reader._numbers)
        sums += [np.nansum(block.columns[name]) for name in "abc"]
    assert [(cell.line, cell.column) for cell in reader.bad_cells] == [(1002, '2 "b"')]
    assert sums.tolist() == [4000 * 3999 / 2, 4000 * 3999 / 2 + 3999 * 0.5 - 1000, -4000 * 3999 / 2]
    assert {frozenset(each) for each in seen} == {frozenset(), frozenset({"1"})}
    assert not seen[0]
    assert not seen[-1]

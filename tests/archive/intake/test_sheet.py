"""A sheet's faults are all found in one pass, each with its line."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from archive.intake.sheet import LineMap, read_sheet, spelled

GOOD = """\
format = "stillroom-cooldown/1"
name = "2026-03"
cryostat = "K2"
begin = 2026-03-02T09:10:00+02:00
end = 2026-03-20T18:00:00+02:00
time_zone = "Europe/Helsinki"
operators = ["graduate student"]
purpose = "test"
outcome = "complete"
temperature_scale = "ITS-90"

[gas_end]
state = "recovered"

[layout.bridge]
dialect = { delimiter = "," }

[layout.bridge.channels.temperature]
column = "T (K)"
quantity = "temperature"
unit = "K"
scale = "ITS-90"

[[sweep]]
name = "s001"
kind = "temperature-sweep"
files = ["a.csv"]
layout = "bridge"

[[sweep]]
name = "s002"
kind = "temperature-sweep"
files = ["b.csv"]
layout = "bridge"

[[dose]]
name = "d01"
at = 2026-03-03T10:00:00+02:00
amount = "31.2(2) umol"
"""


def read(tmp_path: Path, text: str) -> list[tuple[int | None, str | None, str]]:
    """Line, field and sentence of every fault."""
    path = tmp_path / "cooldown.toml"
    path.write_text(text, encoding="utf-8")
    reading = read_sheet(path)
    assert (reading.sheet is None) == bool(reading.findings)
    return [(finding.line, finding.field, finding.sentence()) for finding in reading.findings]


def test_a_good_sheet_has_no_fault(tmp_path: Path) -> None:
    assert read(tmp_path, GOOD) == []


@pytest.mark.parametrize(
    ("old", "new", "line", "field", "said"),
    [
        ('name = "s002"', 'name = "s 002"', 31, "sweep[2].name", "letters, digits"),
        (
            "begin = 2026-03-02T09:10:00+02:00",
            "begin = 2026-03-02T09:10:00",
            4,
            "begin",
            "no offset from UTC",
        ),
        ('outcome = "complete"', 'outcome = "done"', 9, "outcome", "'complete', 'aborted' or 'open'"),
        (
            'scale = "ITS-90"\n\n[[sweep',
            "\n[[sweep",
            18,
            "layout.bridge.channels.temperature",
            "needs its scale",
        ),
        ('amount = "31.2(2) umol"', 'amount = "31.2 cm3 STP"', 39, "dose[1].amount", "reference state"),
        ('amount = "31.2(2) umol"', 'amount = "31,2 umol"', 39, "dose[1].amount", "decimal"),
        ('amount = "31.2(2) umol"', 'amout = "31.2 umol"', 39, "dose[1].amout", "did you mean amount?"),
        ('state = "recovered"', "", 12, "gas_end.state", "state is missing"),
        (
            'kind = "temperature-sweep"\nfiles = ["b.csv"]',
            'kind = "warm-up"\nfiles = ["b.csv"]',
            32,
            "sweep[2].kind",
            "warm-up",
        ),
        ("end = 2026-03-20", "end = 2026-03-01", 1, None, "end must be later than begin"),
    ],
)
def test_each_fault_names_its_line_and_field(
    tmp_path: Path, old: str, new: str, line: int, field: str | None, said: str
) -> None:
    assert old in GOOD
    faults = read(tmp_path, GOOD.replace(old, new))
    assert [fault for fault in faults if fault[:2] == (line, field) and said in fault[2]], faults


def test_all_faults_are_found_at_once(tmp_path: Path) -> None:
    text = (
        GOOD.replace('outcome = "complete"', 'outcome = "done"')
        .replace("umol", "umolar")
        .replace("s001", "s.001")
    )
    assert sorted(line for line, _, _ in read(tmp_path, text) if line) == [9, 25, 39]


@pytest.mark.parametrize(
    ("content", "line", "said"),
    [
        (b'name = "a\n', 1, "not valid TOML"),
        (b'name = "a"\nname = "b"\n', 2, "not valid TOML"),
        (b'name = "\xff\xfe"\n', 1, "not UTF-8"),
        (b"[" * 5000, 1, "not valid TOML"),
    ],
)
def test_unreadable_text_is_a_finding(tmp_path: Path, content: bytes, line: int, said: str) -> None:
    path = tmp_path / "cooldown.toml"
    path.write_bytes(content)
    (finding,) = read_sheet(path).findings
    assert said in finding.what
    assert finding.line == line


def test_no_sheet_says_how_to_make_one(tmp_path: Path) -> None:
    (finding,) = read_sheet(tmp_path / "cooldown.toml").findings
    assert "stillroom draft" in (finding.remedy or "")


def test_lines_survive_multi_line_values() -> None:
    text = 'a = """\n[[not]]\nx = 1\n"""\nb = [\n  { c = 1 },\n]\n[[t]]\nk = 1\n[t.u]\nv = 2\n[[t]]\nk = 3\n'
    lines = LineMap(text)
    assert [
        lines.line(path)
        for path in (("b",), ("t", 0, "k"), ("t", 0, "u", "v"), ("t", 1, "k"), ("t", 1, "no"))
    ] == [5, 9, 11, 13, 12]


def test_a_field_is_spelled_as_people_count() -> None:
    assert spelled(("dose", 2, "pressure_before")) == "dose[3].pressure_before"


@pytest.mark.parametrize(
    "nested",
    ["[" + ".".join(["a"] * 5000) + "]\nx = 1\n", "deep = " + "[" * 300 + "]" * 300, "deep = " + "[" * 5000],
    ids=["tables", "lists", "lists-beyond-the-parser"],
)
def test_deep_nesting_is_a_fault_of_the_sheet(tmp_path: Path, nested: str) -> None:
    """However deep, it ends in a finding."""
    ((_, _, sentence),) = read(tmp_path, nested + "\n" + GOOD if nested[0] == "d" else GOOD + nested)
    assert "nested" in sentence


def test_a_sheet_of_unknown_names_is_told_soon(tmp_path: Path) -> None:
    """A hint is looked for a hundred times, not for each of many thousand names."""
    faults = read(tmp_path, "".join(f"purpos{number} = 1\n" for number in range(20_000)) + GOOD)
    assert len(faults) == 20_000
    assert sum("did you mean purpose?" in sentence for _, _, sentence in faults) == 100


@pytest.mark.parametrize("name", ["a\\\\b.csv", "a\\u0000b.csv"], ids=["backslash", "zero-byte"])
@pytest.mark.parametrize("field", ["sweep[1].files[1]", "other_files[1]"])
def test_a_path_has_its_form_in_words(tmp_path: Path, name: str, field: str) -> None:
    """One fault, without a regular expression, and without the list being called too short because of it."""
    text = GOOD.replace("a.csv", name) if "sweep" in field else f'other_files = ["{name}"]\n' + GOOD
    ((_, found, sentence),) = read(tmp_path, text)
    assert found == field
    assert "forward slashes" in sentence


@pytest.mark.parametrize("written", ["2026-03-02", '"yesterday"', "9.5", "09:10:00"])
def test_a_time_that_is_none_is_asked_for_by_example(tmp_path: Path, written: str) -> None:
    """The sentence shows how a time is written."""
    ((_, field, sentence),) = read(tmp_path, GOOD.replace("2026-03-02T09:10:00+02:00", written))
    assert field == "begin"
    assert "2026-03-02T09:10:00+02:00" in sentence


def test_only_the_time_that_is_missing_is_named(tmp_path: Path) -> None:
    """Begin alone is missing here."""
    ((_, _, sentence),) = read(tmp_path, GOOD.replace("begin = ", "# "))
    assert "begin missing" in sentence


def test_a_sheet_that_is_a_pipe_is_not_waited_for(tmp_path: Path) -> None:
    """A pipe has no end, and nobody at the other one."""
    os.mkfifo(tmp_path / "cooldown.toml")
    (finding,) = read_sheet(tmp_path / "cooldown.toml").findings
    assert finding.what == "the sheet is not a file"

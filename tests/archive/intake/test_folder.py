"""Reading a folder: every file once, every fault, bounded memory, and the same rows whatever the form of the file."""

from __future__ import annotations

import gzip
import hashlib
import os
from pathlib import Path

import numpy as np
import pytest

from archive.intake import folder as folder_module
from archive.intake import gather
from archive.intake.checks.times import time_reversed
from archive.intake.folder import read_cooldown
from archive.intake.paths import folder_files
from archive.intake.thresholds import Thresholds
from archive.store import MemoryStore
from tests.small_cooldown import write_folder

REAL = Path(__file__).parents[2] / "real"


def edited(folder: Path, old: str, new: str) -> None:
    """Change the sheet."""
    text = (folder / "cooldown.toml").read_text(encoding="utf-8")
    assert old in text
    (folder / "cooldown.toml").write_text(text.replace(old, new), encoding="utf-8")


def test_a_good_folder_has_no_finding(tmp_path: Path) -> None:
    reading = read_cooldown(write_folder(tmp_path))
    assert reading.findings == []
    assert {name: table.rows for name, table in reading.tables.items()} == {"s001": 60, "s002": 60}
    table = reading.tables["s002"]
    # Units are SI here: the file's milliseconds have become seconds.
    np.testing.assert_allclose(table.columns["period"][0], (1 + 1e-6 * 0.2 + 8e-6) * 1e-3, rtol=1e-12)
    assert table.where(0) == ("film.csv", 2)
    assert (
        reading.raw_files["film.csv"].sha256
        == hashlib.sha256((tmp_path / "film.csv").read_bytes()).hexdigest()
    )
    assert sorted(reading.records) == ["bob.r1", "fridge.r1", "plastic.r1", "well-helium.r1"]


def test_long_sweeps_are_thinned_in_memory_and_whole_in_the_sealed_file(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    whole = read_cooldown(write_folder(tmp_path))
    monkeypatch.setattr(gather, "KEPT_ROWS", 16)
    store = MemoryStore()
    with store.writer("2026-03/2026-03.a1") as writer:
        thinned = read_cooldown(tmp_path, sink=writer)
        writer.document("{}")
        writer.seal()
    table, full = thinned.tables["s001"], whole.tables["s001"]
    assert (table.rows, table.stride, len(table.lines)) == (60, 4, 15)
    np.testing.assert_array_equal(table.columns["temperature"], full.columns["temperature"][::4])
    assert table.facts == full.facts
    np.testing.assert_array_equal(
        store.column("2026-03/2026-03.a1", "sweeps/s001/temperature"), full.columns["temperature"]
    )
    np.testing.assert_array_equal(store.column("2026-03/2026-03.a1", "sweeps/s001/source_line"), full.lines)


def test_the_same_rows_from_gzip_and_numpy(tmp_path: Path) -> None:
    folder = write_folder(tmp_path)
    plain = read_cooldown(folder).tables["s001"]
    (folder / "empty.csv.gz").write_bytes(gzip.compress((folder / "empty.csv").read_bytes(), mtime=0))
    edited(folder, '"empty.csv"', '"empty.csv.gz"')
    packed = read_cooldown(folder)
    assert packed.findings == []
    assert packed.tables["s001"].facts == plain.facts
    np.save(
        folder / "empty.npy", np.column_stack([plain.columns["temperature"], plain.columns["period"] * 1e3])
    )
    edited(
        folder,
        'files = ["empty.csv.gz"]\nlayout = "bridge"',
        'files = ["empty.npy"]\nchannels.temperature = { column = 1, quantity = "temperature", unit = "K", scale = "ITS-90" }\nchannels.period = { column = 2, quantity = "period", unit = "ms" }',
    )
    array = read_cooldown(folder)
    assert array.findings == []
    np.testing.assert_array_equal(array.tables["s001"].columns["temperature"], plain.columns["temperature"])


def test_every_bad_cell_of_every_file_is_found_in_one_pass(tmp_path: Path) -> None:
    folder = write_folder(tmp_path)
    for name, cells in (("empty.csv", ["0.2500", "0.3000"]), ("film.csv", ["0.7000"])):
        text = (folder / name).read_text(encoding="utf-8")
        for cell in cells:
            text = text.replace(f",{cell},", ",OVLD,")
        (folder / name).write_text(text, encoding="utf-8")
    findings = read_cooldown(folder).findings
    # Row n stands in line n + 2: 0.25 K is row 5, 0.30 K row 10, 0.70 K row 50.
    assert [(each.file, each.line, each.column) for each in findings] == [
        ("empty.csv", 7, '2 "T (K)"'),
        ("empty.csv", 12, '2 "T (K)"'),
        ("film.csv", 52, '2 "T (K)"'),
    ]
    assert all("OVLD" in (each.found or "") for each in findings)


def test_one_fault_of_every_row_is_told_once(tmp_path: Path) -> None:
    folder = write_folder(tmp_path)
    edited(folder, 'time_format = "iso8601"', 'time_format = "iso8601", delimiter = ";"')
    findings = [each for each in read_cooldown(folder).findings if each.file == "film.csv"]
    assert 1 <= len(findings) <= 4


@pytest.mark.parametrize(
    "name",
    ["../x.csv", "/etc/passwd", "C:x.csv", "sub/../../x.csv", "empty.CSV", "nothere.csv", "sub", ".", "..", "pipe",
     "./empty.csv", "sub//empty.csv", "loop"],
)  # fmt: skip
def test_a_path_stays_inside_the_folder_and_is_spelled_as_on_disk(tmp_path: Path, name: str) -> None:
    folder = write_folder(tmp_path / "run")
    (folder / "sub").mkdir()
    (folder / "loop").symlink_to("loop")
    os.mkfifo(folder / "pipe")
    (tmp_path / "x.csv").write_text("T (K),P (ms)\n1,1\n")
    edited(folder, '"empty.csv"', f'"{name}"')
    (finding,) = read_cooldown(folder).findings
    assert (finding.code, finding.field) == ("file-unreadable", "sweep[1].files")
    assert name in finding.what


@pytest.mark.parametrize(
    ("old", "new", "remedy"),
    [
        ("T (K)", "T (mK)", "correct the column"),
        ("2026", "", "name the cell"),
        (",", ",7,", "bring a whole copy"),
    ],
    ids=["column", "cell", "line"],
)
def test_each_fault_of_a_table_has_its_own_remedy(tmp_path: Path, old: str, new: str, remedy: str) -> None:
    """What to do about a missing column, a bad cell and a ragged line is not the same."""
    folder = write_folder(tmp_path)
    lines = (folder / "film.csv").read_text(encoding="utf-8").splitlines(keepends=True)
    place = 0 if old in lines[0] and old != "," else 5
    lines[place] = lines[place].replace(old, new, 1)
    (folder / "film.csv").write_text("".join(lines), encoding="utf-8")
    remedies = {each.remedy for each in read_cooldown(folder).findings if each.code == "bad-cell"}
    assert len(remedies) == 1
    assert remedies.pop().startswith(remedy)  # type: ignore[union-attr]


def test_a_cooldown_is_not_named_as_a_device(tmp_path: Path) -> None:
    """The check says what the ingest would stumble over."""
    folder = write_folder(tmp_path, name="con")
    (finding,) = read_cooldown(folder).findings
    assert (finding.field, finding.found, finding.severity) == ("name", "con", "error")


def test_times_without_a_zone_are_told_once(tmp_path: Path) -> None:
    """One fault in every row is one finding."""
    folder = write_folder(tmp_path)
    text = (folder / "film.csv").read_text(encoding="utf-8")
    (folder / "film.csv").write_text(text.replace("+02:00", ""), encoding="utf-8")
    (finding,) = (each for each in read_cooldown(folder).findings if each.file == "film.csv")
    assert "59 or more further rows" in finding.what
    assert "zone" in str(finding.remedy)


def test_a_line_without_end_is_not_told_as_a_change(tmp_path: Path) -> None:
    """The reader gives up on such a file before its end, which is no sign that somebody writes to it."""
    folder = write_folder(tmp_path)
    with (folder / "film.csv").open("a", encoding="utf-8") as stream:
        stream.write("1" * 3_000_000)
    assert {each.code for each in read_cooldown(folder).findings if each.file == "film.csv"} == {"bad-cell"}


def test_time_that_runs_backwards_from_file_to_file_names_the_second(tmp_path: Path) -> None:
    """The same line stands in both files; the fault lies in the one that was put second."""
    folder = write_folder(tmp_path)
    (folder / "earlier.csv").write_bytes((folder / "film.csv").read_bytes())
    edited(folder, '["film.csv"]', '["film.csv", "earlier.csv"]')
    reading = read_cooldown(folder)
    (found,) = time_reversed(reading, Thresholds())
    assert (found.file, found.line) == ("earlier.csv", 2)
    assert "at 1 place of s002" in found.what


def test_a_file_that_changes_while_it_is_read_is_refused(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    folder = write_folder(tmp_path)
    real = folder_module._keep_raw

    def kept_then_changed(reading, name, *arguments, **options):  # type: ignore[no-untyped-def]
        path = real(reading, name, *arguments, **options)
        if name == "film.csv":
            with (folder / name).open("a") as stream:
                stream.write("2026-03-08T12:00:00+02:00,0.9,1.1\n")
        return path

    monkeypatch.setattr(folder_module, "_keep_raw", kept_then_changed)
    assert "file-changed" in {each.code for each in read_cooldown(folder).findings}


def test_hidden_files_are_not_listed(tmp_path: Path) -> None:
    write_folder(tmp_path)
    (tmp_path / ".lock").write_text("")
    assert list(folder_files(tmp_path)) == ["cooldown.toml", "empty.csv", "film.csv"]


@pytest.mark.parametrize(
    ("name", "rows"), [("superfluid-resonator-sweeps", 22 * 500 + 100), ("he4-ar-mcm41-isotherms", 38)]
)
def test_open_data_of_others_is_read_whole(name: str, rows: int) -> None:
    reading = read_cooldown(REAL / name)
    assert reading.findings == []
    assert sum(table.rows for table in reading.tables.values()) == rows

"""A drafted sheet: valid TOML whose guesses have reasons, whose blanks are findings, and in which nothing is invented."""

from __future__ import annotations

import gzip
import tomllib
from pathlib import Path

import pytest

from archive.errors import BadRequest
from archive.intake.draft import draft_text, write_draft
from archive.intake.sheet import read_sheet

STAMPED = "time,T (K),P (us)\n2026-03-02T09:10:00+02:00,0.5,1003.1\n2026-03-02T09:11:00+02:00,0.6,1003.2\n"
COMMAS = "Datum;R [Ohm]\r\n02.03.2026 10:00:00;9,9E37\r\n02.03.2026 10:01:00;1204,5\r\n02.03.2026 10:02:00;1203,1\r\n"


def _folder(tmp_path: Path) -> Path:
    folder = tmp_path / "2026-03"
    (folder / "raw").mkdir(parents=True)
    (folder / "raw" / "a.csv").write_text(STAMPED, encoding="utf-8")
    (folder / "raw" / "b.csv.gz").write_bytes(gzip.compress(STAMPED.encode()))
    (folder / "raw" / "c.txt").write_bytes(COMMAS.encode())
    (folder / "notes.txt").write_text("The run went well.\nWe saw the step.\n", encoding="utf-8")
    (folder / "scan.h5").write_bytes(b"\x89HDF\r\n\x1a\n")
    (folder / ".hidden").write_text("x", encoding="utf-8")
    return folder


def test_the_draft_holds_what_the_files_show(tmp_path: Path) -> None:
    path, draft = write_draft(_folder(tmp_path))
    sheet = tomllib.loads(path.read_text(encoding="utf-8"))
    assert draft.tables == 3
    assert sheet["name"] == "2026-03"
    assert [sweep["files"] for sweep in sheet["sweep"]] == [["raw/a.csv"], ["raw/b.csv.gz"], ["raw/c.txt"]]
    assert sheet["sweep"][0]["layout"] == sheet["sweep"][1]["layout"] != sheet["sweep"][2]["layout"]
    assert sheet["begin"].isoformat() == "2026-03-02T07:10:00+00:00"
    first = sheet["layout"]["layout-1"]
    assert first["channels"]["time"] == {"column": "time", "quantity": "instant"}
    assert first["channels"]["p"]["unit"] == "us"
    second = sheet["layout"]["layout-2"]
    assert (second["dialect"]["delimiter"], second["dialect"]["decimal"]) == (";", ",")
    assert second["channels"]["r"]["quantity"] == "resistance"
    assert second["channels"]["r"]["sentinels"] == ["9,9E37"]


def test_every_value_is_a_guess_with_a_reason_or_a_blank(tmp_path: Path) -> None:
    lines = draft_text(_folder(tmp_path)).text.splitlines()
    values = [line for line in lines if " = " in line and not line.startswith("#")]
    unmarked = [line for line in values if "# guessed:" not in line and "# to fill in:" not in line]
    assert unmarked == ['format = "stillroom-cooldown/1"']
    assert all(line.partition("# guessed:")[2].strip() for line in values if "# guessed:" in line)
    blanks = [line for line in values if "# to fill in:" in line]
    assert all(line.partition(" = ")[2].startswith(('""', "[]")) for line in blanks)


def test_what_no_file_tells_is_reported_with_its_line(tmp_path: Path) -> None:
    path, _ = write_draft(_folder(tmp_path))
    reading = read_sheet(path)
    lines = path.read_text(encoding="utf-8").splitlines()
    found = {finding.field: finding for finding in reading.findings}
    for field in ("cryostat", "operators", "outcome", "temperature_scale", "gas_end.state"):
        line = found[field].line
        assert line is not None
        assert "# to fill in:" in lines[line - 1]
    assert {"purpose", "time_zone"} <= set(found)
    assert all(finding.code != "sheet-syntax" for finding in reading.findings)


def test_files_that_are_no_tables_are_named_with_the_reason(tmp_path: Path) -> None:
    text = draft_text(_folder(tmp_path)).text
    assert '#   "notes.txt": not taken for a table' in text
    assert '#   "scan.h5": a NumPy or HDF5 file' in text
    assert ".hidden" not in text


def test_a_sheet_that_is_there_is_never_overwritten(tmp_path: Path) -> None:
    folder = _folder(tmp_path)
    (folder / "cooldown.toml").write_text("mine", encoding="utf-8")
    with pytest.raises(BadRequest, match="not overwritten"):
        write_draft(folder)
    assert (folder / "cooldown.toml").read_text(encoding="utf-8") == "mine"


def test_text_of_files_cannot_break_out_of_its_comment(tmp_path: Path) -> None:
    (tmp_path / "a.csv").write_bytes(b'x "\x07] (K),y\x0b (s)\n1,2\n3,4\nstop\x1b[2J,5\n7,8\n')
    (tmp_path / 'b"\\\n[gas_end].csv').write_text(STAMPED, encoding="utf-8")
    sheet = tomllib.loads(draft_text(tmp_path).text)
    assert list(sheet["gas_end"]) == ["state"]


@pytest.mark.parametrize("made", [False, True], ids=["no-folder", "empty-folder"])
def test_nothing_to_draft_from_is_refused(*, made: bool, tmp_path: Path) -> None:
    folder = tmp_path / "x"
    if made:
        folder.mkdir()
    with pytest.raises(BadRequest):
        draft_text(folder)


def test_a_folder_whose_name_is_no_name_leaves_a_blank(tmp_path: Path) -> None:
    folder = tmp_path / "March run (2)"
    folder.mkdir()
    (folder / "a.csv").write_text("1,0.5\n2,0.6\n", encoding="utf-8")
    (folder / "words.csv").write_text("role,note\nstudent,fine\npostdoc,fine\n", encoding="utf-8")
    text = draft_text(folder).text
    sheet = tomllib.loads(text)
    assert (sheet["name"], sheet["begin"], sheet["end"]) == ("", "", "")
    assert list(sheet["layout"]["layout-1"]["channels"]) == ["column_1", "column_2"]
    assert [channel["column"] for channel in sheet["layout"]["layout-1"]["channels"].values()] == [1, 2]
    assert '# unit = ""  # to fill in: the file names none' in text
    assert '"words.csv": not taken for a table' in text

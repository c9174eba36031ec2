"""The door: what comes in is kept whole, once, and can be found, shown and made anew."""

from __future__ import annotations

import hashlib
import json
import shutil
from pathlib import Path

import numpy as np
import pytest

from archive import Archive
from archive.errors import ArchiveBusy, BadRequest, DamagedFile, NotAnArchive, UnknownAddress
from archive.index import SearchQuery
from archive.store.durable import archive_lock
from tests.small_cooldown import write_folder


def contents(root: Path) -> dict[str, str]:
    """Digest of every sealed and staged file."""
    return {
        path.relative_to(root).as_posix(): hashlib.sha256(path.read_bytes()).hexdigest()
        for part in ("sealed", "staging")
        for path in sorted((root / part).rglob("*"))
        if path.is_file()
    }


def edit(path: Path, old: str, new: str) -> None:
    """Replace text that must be there."""
    text = path.read_text(encoding="utf-8")
    assert old in text
    path.write_text(text.replace(old, new), encoding="utf-8")


def test_the_index_in_postgresql_is_made_anew_too(lab: Archive, folder: Path) -> None:
    lab.ingest(folder)
    lab.reduce("2026-03")
    before = lab._index.rows()
    Archive.rebuild_index(lab.root)
    assert lab._index.rows() == before


def test_an_ingest_keeps_every_raw_byte(lab: Archive, folder: Path) -> None:
    outcome = lab.ingest(folder)
    assert (outcome.state, outcome.address) == ("ingested", "2026-03.a1")
    shown = lab.show("2026-03.a1")
    digests = {entry["name"]: entry["sha256"] for entry in shown["raw_files"]}
    assert digests == {
        name: hashlib.sha256((folder / name).read_bytes()).hexdigest()
        for name in ("cooldown.toml", "empty.csv", "film.csv")
    }
    np.testing.assert_allclose(
        lab.sweep("2026-03/s001")["temperature"], 0.2 + 0.01 * np.arange(60), rtol=0, atol=1e-12
    )


def test_the_same_folder_again_changes_nothing(lab: Archive, folder: Path) -> None:
    lab.ingest(folder)
    before = contents(lab.root)
    outcome = lab.ingest(folder)
    assert (outcome.state, outcome.address) == ("already", "2026-03.a1")
    assert contents(lab.root) == before


def test_a_changed_file_becomes_a_supplement_that_says_what_differs(lab: Archive, folder: Path) -> None:
    lab.ingest(folder)
    before = contents(lab.root)
    edit(folder / "film.csv", "0.7900", "0.7901")
    outcome = lab.ingest(folder)
    assert (outcome.state, outcome.address) == ("supplement", "2026-03.a2")
    assert len(outcome.differences) == 1
    assert "film.csv changed" in outcome.differences[0]
    after = contents(lab.root)
    assert before.items() <= after.items()
    assert lab.sweep("2026-03/s002")["temperature"][59] == 0.7901
    assert [row.accession for row in lab.search(SearchQuery(cooldown="2026-03", sort="name"))] == [
        "2026-03.a1",
        "2026-03.a2",
    ]


def test_a_record_that_differs_under_its_revision_is_refused_with_both_values(
    lab: Archive, folder: Path
) -> None:
    lab.ingest(folder)
    before = contents(lab.root)
    edit(folder / "cooldown.toml", "1.60(3) m^2", "1.70(3) m^2")
    outcome = lab.ingest(folder)
    assert outcome.state == "refused"
    (finding,) = [finding for finding in outcome.report.findings if finding.code == "record-differs"]
    assert "1.70(3)" in (finding.found or "")
    assert "1.60(3)" in (finding.expected or "")
    assert contents(lab.root) == before


@pytest.mark.parametrize(
    ("file", "old", "new", "code"),
    [
        ("film.csv", "0.5000", "0,5oo0", "bad-cell"),
        ("cooldown.toml", 'unit = "ms"', 'unit = "m"', "channel-unit"),
        ("cooldown.toml", '"film.csv"', '"../film.csv"', "file-unreadable"),
        ("cooldown.toml", '"film.csv"', '"flim.csv"', "file-unreadable"),
        ("cooldown.toml", 'layout = "bridge"\nafter', 'layout = "brigde"\nafter', "unknown-name"),
    ],
)
def test_an_error_leaves_no_trace(
    lab: Archive, folder: Path, file: str, old: str, new: str, code: str
) -> None:
    edit(folder / file, old, new)
    outcome = lab.ingest(folder)
    assert outcome.state == "refused"
    assert code in {finding.code for finding in outcome.report.findings if finding.severity == "error"}
    assert contents(lab.root) == {}
    assert lab.cooldowns() == []


def test_a_link_out_of_the_folder_is_refused(lab: Archive, folder: Path, tmp_path: Path) -> None:
    (tmp_path / "secret.csv").write_bytes((folder / "film.csv").read_bytes())
    (folder / "film.csv").unlink()
    (folder / "film.csv").symlink_to(tmp_path / "secret.csv")
    outcome = lab.ingest(folder)
    assert outcome.state == "refused"
    assert any("leads out of the cooldown folder" in finding.what for finding in outcome.report.findings)


def test_the_index_is_made_anew_row_for_row(sqlite_lab: Archive, folder: Path) -> None:
    sqlite_lab.ingest(folder)
    sqlite_lab.reduce("2026-03")
    edit(folder / "film.csv", "0.7900", "0.7901")
    sqlite_lab.ingest(folder)
    before = sqlite_lab._index.rows()
    sqlite_lab.close()
    (sqlite_lab.root / "index.sqlite3").unlink()
    with pytest.raises(Exception, match="rebuild-index"):
        Archive.open(sqlite_lab.root)
    Archive.rebuild_index(sqlite_lab.root)
    with Archive.open(sqlite_lab.root) as again:
        assert again._index.rows() == before
        assert sum(map(len, before.values())) > 20


def test_rebuilding_stops_at_damage_and_keeps_the_old_index(sqlite_lab: Archive, folder: Path) -> None:
    sqlite_lab.ingest(folder)
    before = sqlite_lab._index.rows()
    sqlite_lab.close()
    sealed = sqlite_lab.root / "sealed" / "2026-03" / "2026-03.a1.h5"
    flip(sealed, sealed.stat().st_size // 2)
    with pytest.raises(DamagedFile):
        Archive.rebuild_index(sqlite_lab.root)
    with Archive.open(sqlite_lab.root) as again:
        assert again._index.rows() == before


def flip(path: Path, offset: int) -> None:
    """Flip one bit of a sealed file."""
    path.chmod(0o644)
    data = bytearray(path.read_bytes())
    data[offset] ^= 1
    path.write_bytes(data)


def test_fixity_names_damaged_missing_and_stray(sqlite_lab: Archive, folder: Path) -> None:
    sqlite_lab.ingest(folder)
    sqlite_lab.ingest(write_folder(folder.parent / "other", name="2026-04"))
    assert sqlite_lab.fixity() == []
    sealed = sqlite_lab.root / "sealed"
    flip(sealed / "2026-03" / "2026-03.a1.h5", 5000)
    (sealed / "2026-04" / "2026-04.a1.h5").unlink()
    (sealed / "2026-04" / "notes.txt").write_text("?")
    assert {(damage.key, damage.kind) for damage in sqlite_lab.fixity()} == {
        ("2026-03/2026-03.a1", "damaged"),
        ("2026-04/2026-04.a1", "missing"),
        ("sealed/2026-04/notes.txt", "stray"),
    }


def test_a_sealed_file_without_index_rows_is_completed_on_opening(sqlite_lab: Archive, folder: Path) -> None:
    sqlite_lab.close()
    shutil.copy(sqlite_lab.root / "index.sqlite3", sqlite_lab.root.parent / "empty.sqlite3")
    with Archive.open(sqlite_lab.root) as first:
        first.ingest(folder)
        rows = first._index.rows()
    shutil.copy(sqlite_lab.root.parent / "empty.sqlite3", sqlite_lab.root / "index.sqlite3")
    with Archive.open(sqlite_lab.root) as again:
        assert again._index.rows() == rows
        assert any("rows were made from the file itself" in notice for notice in again.notices)


def test_one_writer_at_a_time(lab: Archive, folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("archive.lab.opened.archive_lock", lambda root: archive_lock(root, wait_s=0.1))
    with archive_lock(lab.root), pytest.raises(ArchiveBusy) as caught:
        lab.ingest(folder)
    assert caught.value.exit_code == 4


@pytest.mark.parametrize(
    ("address", "what"),
    [
        ("2026-03", "cooldown"),
        ("2026-03.a1", "accession"),
        ("2026-03.a1:film.csv", "raw file"),
        ("2026-03/s002", "sweep"),
        ("2026-03/s002#period", "channel"),
        ("2026-03/d01", "dose"),
        ("bob.r1", "cell"),
        ("bob", "cell"),
        ("plastic.r1", "substrate"),
        ("2026-03/s001@empty-cell.1", "reduction"),
        ("2026-03/s001@empty-cell.1#empty_period", "result"),
        ("film-transition.r1", "plan"),
    ],
)
def test_everything_with_an_address_is_shown(lab: Archive, folder: Path, address: str, what: str) -> None:
    lab.ingest(folder)
    lab.reduce("2026-03", plan="empty-cell")
    shown = lab.show(address)
    assert (shown["address"], shown["what"]) == (address, what)
    json.dumps(shown, allow_nan=False)


@pytest.mark.parametrize(
    "address",
    [
        "2027-01",
        "2026-03/s009",
        "2026-03.a7",
        "bob.r9",
        "2026-03/s001@empty-cell.9",
        "../x",
        "",
        "2026-03/s002#mass",
    ],
)
def test_an_unknown_address_says_so(lab: Archive, folder: Path, address: str) -> None:
    lab.ingest(folder)
    with pytest.raises(UnknownAddress):
        lab.show(address)


def test_reducing_again_with_the_same_inputs_seals_nothing(lab: Archive, folder: Path) -> None:
    lab.ingest(folder)
    (first,) = lab.reduce("2026-03", plan="empty-cell")
    assert first.problem is None
    (second,) = lab.reduce("2026-03", plan="empty-cell")
    assert (second.address, second.already) == (first.address, True)


def test_a_reduction_replays_to_the_bit(lab: Archive, folder: Path) -> None:
    lab.ingest(folder)
    (made,) = lab.reduce("2026-03", plan="empty-cell")
    report = lab.replay(made.address or "")
    assert report.identical
    assert report.outputs >= 4
    assert report.largest_difference == {}


def test_a_trace_ends_in_raw_files_and_lines(lab: Archive, folder: Path) -> None:
    lab.ingest(folder)
    lab.reduce("2026-03", plan="empty-cell")
    text = json.dumps(lab.trace("2026-03/s001@empty-cell.1#empty_period").to_dict())
    assert "empty.csv" in text
    assert hashlib.sha256((folder / "empty.csv").read_bytes()).hexdigest() in text


def test_a_missing_need_names_the_command(lab: Archive, folder: Path) -> None:
    lab.ingest(folder)
    (outcome,) = lab.reduce("2026-03", plan="film-transition")
    assert outcome.problem is not None
    assert "empty-cell" in str(outcome.problem)
    assert "stillroom" in str(outcome.problem)


def test_an_archive_is_found_from_below_and_by_name(
    sqlite_lab: Archive, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.delenv("STILLROOM_ARCHIVE", raising=False)
    monkeypatch.chdir(sqlite_lab.root / "sealed")
    with Archive.open() as found:
        assert found.root == sqlite_lab.root
    monkeypatch.chdir(tmp_path)
    with pytest.raises(NotAnArchive):
        Archive.open()
    monkeypatch.setenv("STILLROOM_ARCHIVE", str(sqlite_lab.root))
    with Archive.open() as found:
        assert found.name == "Test laboratory"


def test_an_archive_is_not_made_over_something(sqlite_lab: Archive, tmp_path: Path) -> None:
    with pytest.raises(BadRequest):
        Archive.create(sqlite_lab.root)
    (tmp_path / "full").mkdir()
    (tmp_path / "full" / "x").write_text("x")
    with pytest.raises(BadRequest):
        Archive.create(tmp_path / "full")
    assert sorted(path.name for path in (tmp_path / "full").iterdir()) == ["x"]


def test_a_report_is_written_whole_or_not_at_all(
    sqlite_lab: Archive, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    target = tmp_path / "reports"
    sqlite_lab.write_reports({"a.html": b"first"}, target)

    def full(descriptor: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("archive.store.durable._sync", full)
    with pytest.raises(BadRequest, match="No space left"):
        sqlite_lab.write_reports({"a.html": b"second"}, target)
    assert {path.name: path.read_bytes() for path in target.iterdir()} == {"a.html": b"first"}


def test_checks_know_what_earlier_cooldowns_brought(lab: Archive, folder: Path) -> None:
    lab.ingest(folder)
    again = write_folder(folder.parent / "2026-04", name="2026-04")
    codes = {finding.code for finding in lab.check(again).findings}
    assert "file-archived" in codes
    assert "period-scatter-history" not in codes
    rng = np.random.default_rng(1)
    lines = (again / "film.csv").read_text(encoding="utf-8").splitlines()
    noisy = [lines[0]]
    for line in lines[1:]:
        time, temperature, period = line.split(",")
        noisy.append(f"{time},{temperature},{float(period) + rng.normal(0, 1e-7):.9f}")
    (again / "film.csv").write_text("\n".join(noisy) + "\n", encoding="utf-8")
    assert "period-scatter-history" in {finding.code for finding in lab.check(again).findings}

"""What an archive does about half-made folders, lost indexes, foreign files and full disks."""

from __future__ import annotations

import errno
import os
import sqlite3
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from archive.errors import ArchiveError, BadRequest, DamagedFile, InvalidSheet, MissingFile, UnknownAddress
from archive.index import SearchQuery
from archive.lab import Archive
from archive.store.local import open_store
from tests.small_cooldown import write_folder

NO_SPACE = OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))


def raiser(error: Exception) -> Callable[..., Any]:
    """Return a function that always fails so."""

    def fail(*arguments: object, **options: object) -> None:
        raise error

    return fail


@pytest.mark.parametrize("collaborator", ["Index.create", "write_whole"])
def test_an_archive_that_cannot_be_made_leaves_its_folder_for_a_second_try(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, collaborator: str
) -> None:
    """A disk that is full while an archive is made does not spoil the folder."""
    with monkeypatch.context() as patch:
        patch.setattr(f"archive.lab.place.{collaborator}", raiser(ArchiveError("full")))
        with pytest.raises(ArchiveError, match="full"):
            Archive.create(tmp_path / "lab")
    assert {path.name for path in (tmp_path / "lab").iterdir()} == {"archive.lock"}
    with Archive.create(tmp_path / "lab") as lab:
        assert lab.name == "lab"


@pytest.mark.parametrize("name", ['a "b" \\c', "two\nlines", "del\x7f", "ünï"])
def test_any_text_can_be_the_name_of_an_archive(tmp_path: Path, name: str) -> None:
    """The settings are written so that they are read again."""
    with Archive.create(tmp_path / "lab", name=name) as lab:
        assert lab.name == name


@pytest.mark.parametrize("name", ["x" * 20_001, "\udcff"], ids=["long", "no-text"])
def test_a_name_that_is_none_is_refused_before_anything_is_made(tmp_path: Path, name: str) -> None:
    """No folder is left."""
    with pytest.raises(BadRequest, match="name"):
        Archive.create(tmp_path / "lab", name=name)
    assert not (tmp_path / "lab").exists()


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("name = " + "[" * 5000, "nested"),
        ('name = "x"\nindex = "sqlite:///a\\u0000b"\n', "control characters"),
        ('name = "x"\nlimits = 3\n', "limits is not a name that is known here"),
    ],
    ids=["deep", "zero-byte", "unknown"],
)
def test_settings_that_cannot_be_read_name_their_file(sqlite_lab: Archive, text: str, said: str) -> None:
    """Whatever stands there, it ends in a sentence with the place."""
    (sqlite_lab.root / "stillroom.toml").write_text(text, encoding="utf-8")
    with pytest.raises(InvalidSheet, match=said) as caught:
        Archive.open(sqlite_lab.root)
    assert str(sqlite_lab.root / "stillroom.toml") in str(caught.value)


def _table_lost(index: Path) -> None:
    with sqlite3.connect(index) as connection:
        connection.execute("PRAGMA foreign_keys = OFF")
        connection.execute("DROP TABLE sweep")
    connection.close()


def _pages_lost(index: Path) -> None:
    content = bytearray(index.read_bytes())
    content[8192:] = bytes(value ^ 0xFF for value in content[8192:])
    index.write_bytes(content)


def _not_a_file(index: Path) -> None:
    index.unlink()
    index.mkdir()


@pytest.mark.parametrize("spoil", [_table_lost, _pages_lost, _not_a_file])
def test_an_index_that_opens_badly_or_not_at_all_is_made_anew(
    sqlite_lab: Archive, folder: Path, spoil: Callable[[Path], None]
) -> None:
    """What is told to be the remedy must be one."""
    sqlite_lab.ingest(folder)
    rows = sqlite_lab._index.rows()
    sqlite_lab.close()
    index = sqlite_lab.root / "index.sqlite3"
    spoil(index)
    Archive.rebuild_index(sqlite_lab.root)
    assert index.with_name("index.sqlite3.set-aside-1").exists()
    with Archive.open(sqlite_lab.root) as again:
        assert again._index.rows() == rows


def test_a_foreign_sealed_file_keeps_nobody_out(sqlite_lab: Archive, folder: Path) -> None:
    """A whole file of another version lies there; the archive opens, says so, and fixity names it."""
    sqlite_lab.ingest(folder)
    sqlite_lab.close()
    with open_store(sqlite_lab.root).writer("2026-09/2026-09.a1") as writer:
        writer.document('{"format": "of another version"}')
        writer.seal()
    with Archive.open(sqlite_lab.root) as again:
        assert any("2026-09/2026-09.a1 is sealed, but cannot be recorded" in each for each in again.notices)
        assert [cooldown.name for cooldown in again.cooldowns()] == ["2026-03"]
        assert [(damage.key, damage.kind) for damage in again.fixity()] == [("2026-09/2026-09.a1", "stray")]


def test_a_full_disk_keeps_no_reader_out(sqlite_lab: Archive, monkeypatch: pytest.MonkeyPatch) -> None:
    """What an interruption left waits until there is room."""
    sqlite_lab.close()
    (sqlite_lab.root / "staging" / "left").write_text("")
    monkeypatch.setattr("archive.lab.opened.sweep_staging", raiser(NO_SPACE))
    with Archive.open(sqlite_lab.root) as again:
        assert again.cooldowns() == []
        assert "No space left on device" in again.notices[0]


def test_a_reduction_that_cannot_be_sealed_stops_no_other(
    sqlite_lab: Archive, folder: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Each outcome carries its own problem."""
    sqlite_lab.ingest(folder)
    count = len(sqlite_lab.reduce("2026-03"))
    monkeypatch.setattr("archive.lab.carrying._same", lambda *_: False)
    monkeypatch.setattr(sqlite_lab, "_seal_reduction", raiser(ArchiveError("the disk is full")))
    outcomes = sqlite_lab.reduce("2026-03")
    assert len(outcomes) == count
    assert all(outcome.problem is not None for outcome in outcomes)


def test_damage_of_a_sealed_file_is_told_before_the_index_is_touched(
    sqlite_lab: Archive, folder: Path
) -> None:
    """With both damaged, the index stays where it is."""
    sqlite_lab.ingest(folder)
    sqlite_lab.close()
    _table_lost(sqlite_lab.root / "index.sqlite3")
    sealed = sqlite_lab.root / "sealed" / "2026-03" / "2026-03.a1.h5"
    sealed.chmod(0o644)
    sealed.write_bytes(sealed.read_bytes()[:-100])
    with pytest.raises(DamagedFile, match="sealed file"):
        Archive.rebuild_index(sqlite_lab.root)
    assert not list(sqlite_lab.root.glob("*set-aside*"))


@pytest.mark.parametrize("address", ["2026-03", "2026-03.a1", "2026-03/s001", "TO-4.r1"])
def test_only_a_reduction_is_computed_again(sqlite_lab: Archive, folder: Path, address: str) -> None:
    """Another address is refused by what it is, not by what no file can be called."""
    sqlite_lab.ingest(folder)
    with pytest.raises(UnknownAddress, match="is no reduction; expected an address such as"):
        sqlite_lab.replay(address)


def test_a_result_stands_for_its_reduction(sqlite_lab: Archive, folder: Path) -> None:
    """An address copied from a list of results can be computed again as it is."""
    sqlite_lab.ingest(folder)
    done = next(each for each in sqlite_lab.reduce("2026-03") if each.document is not None)
    name = done.document.outputs[-1].name  # type: ignore[union-attr]
    assert sqlite_lab.replay(f"{done.address}#{name}").address == done.address


def test_a_revision_that_is_not_there_names_those_that_are(sqlite_lab: Archive, folder: Path) -> None:
    """The record is known, its revision is not."""
    sqlite_lab.ingest(folder)
    record = sqlite_lab.records()[0]
    with pytest.raises(UnknownAddress, match=f"expected one of: {record.address}"):
        sqlite_lab.show(f"{record.name}.r77")


@pytest.mark.parametrize(
    "query", [SearchQuery(limit=2**63), SearchQuery(offset=2**70), SearchQuery(limit=-1), SearchQuery(cell="\udcff")],
    ids=["limit", "offset", "negative", "no-text"],
)  # fmt: skip
def test_a_search_that_no_database_can_carry_out_is_refused(sqlite_lab: Archive, query: SearchQuery) -> None:
    """Numbers beyond the database's and bytes that are no text."""
    with pytest.raises(BadRequest):
        sqlite_lab.search(query)


@pytest.mark.parametrize("spoil", [None, _table_lost], ids=["index-whole", "index-spoilt"])
def test_a_lost_sealed_file_is_never_forgotten(
    sqlite_lab: Archive, folder: Path, spoil: Callable[[Path], None] | None
) -> None:
    """An index made anew from what is left would call an archive whole that has lost a file."""
    sqlite_lab.ingest(folder)
    sqlite_lab.close()
    (sqlite_lab.root / "sealed" / "2026-03" / "2026-03.a1.h5").unlink()
    index = sqlite_lab.root / "index.sqlite3"
    if spoil is not None:
        spoil(index)
    with pytest.raises(MissingFile, match=r"2026-03/2026-03\.a1.*is missing"):
        Archive.rebuild_index(sqlite_lab.root)
    assert not list(sqlite_lab.root.glob("*set-aside*"))
    index.rename(index.with_name("kept"))
    Archive.rebuild_index(sqlite_lab.root)
    with Archive.open(sqlite_lab.root) as again:
        # The new index knows nothing of it; the journal still does.
        assert [(each.key, each.kind) for each in again.fixity()] == [("2026-03/2026-03.a1", "missing")]


def test_an_archive_in_a_folder_that_may_only_be_read_answers(
    sqlite_lab: Archive, folder: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A copy on a read-only medium is searched and proved like any other; what writes is refused by the database too."""
    sqlite_lab.ingest(folder)
    sqlite_lab.close()
    monkeypatch.setattr("os.access", lambda path, mode: mode != os.W_OK)
    with Archive.open(sqlite_lab.root) as again:
        assert [cooldown.name for cooldown in again.cooldowns()] == ["2026-03"]
        assert again.fixity() == []
        assert not (sqlite_lab.root / "index.sqlite3-shm").exists()
        with pytest.raises(BadRequest, match="reading only"):
            again.ingest(write_folder(folder.parent / "2026-04", name="2026-04"))

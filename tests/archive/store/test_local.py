"""What cannot be read is said to be so, and never taken for absent."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from archive.errors import ArchiveError, DamagedFile
from archive.store import LocalStore, local, open_store

KEY = "2026-03/2026-03.a1"


@pytest.fixture
def store(tmp_path: Path) -> LocalStore:
    """Return a store with one file in it."""
    store = open_store(tmp_path)
    with store.writer(KEY) as writer:
        writer.document("{}")
        writer.seal()
    return store


def test_a_folder_that_cannot_be_listed_is_not_empty(
    store: LocalStore, monkeypatch: pytest.MonkeyPatch
) -> None:
    def refuse(path: object) -> None:
        raise PermissionError(13, "Permission denied", str(path))

    monkeypatch.setattr(os, "scandir", refuse)
    with pytest.raises(ArchiveError, match=r"sealed: a folder of the archive cannot be read"):
        store.keys()


def test_a_folder_that_leads_in_a_circle_is_not_empty(store: LocalStore) -> None:
    (store.root / "sealed" / "2026-04").symlink_to(store.root / "sealed" / "2026-04")
    with pytest.raises(ArchiveError, match="cannot be read"):
        store.contains("2026-04/x")


def test_a_folder_in_the_place_of_a_file_is_damage(store: LocalStore) -> None:
    path = store.path(KEY)
    path.unlink()
    path.mkdir()
    for read in (store.describe, store.document, store.tables, store.raw_names):
        with pytest.raises(DamagedFile, match=r"2026-03\.a1\.h5"):
            read(KEY)


def test_a_writer_that_cannot_begin_leaves_no_trace(
    store: LocalStore, monkeypatch: pytest.MonkeyPatch
) -> None:
    def fail(self: object, path: Path, key: str) -> None:
        path.touch()
        raise OSError("no room")

    monkeypatch.setattr(local.SealedWriter, "__init__", fail)
    with pytest.raises(OSError, match="no room"), store.writer("2026-03/next"):
        pytest.fail("a writer was given out")
    assert store.strays() == []


def test_a_file_that_was_exchanged_is_looked_at_again(store: LocalStore) -> None:
    assert store.document(KEY) == "{}"
    path = store.path(KEY)
    path.unlink()
    path.write_bytes(b"not HDF5 at all")
    with pytest.raises(DamagedFile, match="does not begin"):
        store.document(KEY)

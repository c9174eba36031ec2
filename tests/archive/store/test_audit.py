"""Files that reach outside themselves, or need what not everybody has, are refused before they are read."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import h5py
import numpy as np
import pytest

from archive.errors import DamagedFile
from archive.store import open_store

KEY = "2026-03/2026-03.a1"
CHECKED = {"chunks": (1,), "fletcher32": True}


def soft(file: h5py.File, folder: Path) -> None:
    file["odd"] = h5py.SoftLink("/document")


def external_link(file: h5py.File, folder: Path) -> None:
    file["odd"] = h5py.ExternalLink(str(folder / "other.h5"), "/x")


def external_storage(file: h5py.File, folder: Path) -> None:
    (folder / "secret").write_bytes(b"12345678")
    file.create_dataset("odd", shape=(1,), dtype="f8", external=[(str(folder / "secret"), 0, 8)])


def virtual(file: h5py.File, folder: Path) -> None:
    layout = h5py.VirtualLayout(shape=(1,), dtype="f8")
    layout[:] = h5py.VirtualSource(str(folder / "other.h5"), "x", shape=(1,))
    file.create_virtual_dataset("odd", layout)


def lzf(file: h5py.File, folder: Path) -> None:
    file.create_dataset("odd", data=[1.0], compression="lzf", **CHECKED)


def contiguous(file: h5py.File, folder: Path) -> None:
    file.create_dataset("odd", data=[1.0])


def variable_text(file: h5py.File, folder: Path) -> None:
    file.create_dataset("odd", data=["a"], chunks=(1,))


def huge(file: h5py.File, folder: Path) -> None:
    file.create_dataset("odd", shape=(10**12,), dtype="f8", chunks=(10**6,), fletcher32=True)


def reached_twice(file: h5py.File, folder: Path) -> None:
    file["odd"] = file["document"]


def circle(file: h5py.File, folder: Path) -> None:
    file["odd"] = file["/"]


@pytest.mark.parametrize(
    "spoil",
    [
        soft,
        external_link,
        external_storage,
        virtual,
        lzf,
        contiguous,
        variable_text,
        huge,
        reached_twice,
        circle,
    ],
    ids=lambda spoil: spoil.__name__,
)
def test_refused_and_named(spoil: Callable[[h5py.File, Path], None], tmp_path: Path) -> None:
    store = open_store(tmp_path)
    with store.writer(KEY) as writer:
        writer.array("x", np.array([1.0]), {})
        writer.document("{}")
        writer.seal()
    assert store.document(KEY) == "{}"
    path = store.path(KEY)
    path.chmod(0o644)
    with h5py.File(path, "r+", libver=("v110", "v110")) as file:
        spoil(file, tmp_path)
    with pytest.raises(DamagedFile, match="odd"):
        store.document(KEY)
    assert "odd" in {damage.dataset for damage in store.verify(KEY)}


@pytest.mark.parametrize(
    ("spoil", "says"),
    [
        (lambda data: b"", "does not begin"),
        (lambda data: b"T/K\n0.5\n", "does not begin"),
        (lambda data: data[:8] + b"\x02" + data[9:], "version 2"),
        (lambda data: data[:11] + b"\x01" + data[12:], "not closed"),
        (lambda data: data[:-1], "cannot"),
        (lambda data: data[: len(data) // 2], "cannot"),
    ],
    ids=["empty", "text", "superblock", "unclosed", "a byte short", "half"],
)
def test_a_file_that_is_not_whole_is_damaged_and_never_absent(
    spoil: Callable[[bytes], bytes], says: str, tmp_path: Path
) -> None:
    store = open_store(tmp_path)
    with store.writer(KEY) as writer:
        writer.document("{}")
        sealed = writer.seal()
    path = store.path(KEY)
    path.chmod(0o644)
    path.write_bytes(spoil(path.read_bytes()))
    assert store.contains(KEY)
    assert store.keys() == [KEY]
    with pytest.raises(DamagedFile, match=says):
        store.document(KEY)
    damage = store.verify(KEY, sealed.sha256)
    assert {d.kind for d in damage} == {"damaged"}
    assert damage[0].expected == sealed.sha256
    assert any(says in d.what for d in damage)


def test_a_file_in_anothers_place_is_found(tmp_path: Path) -> None:
    store = open_store(tmp_path)
    with store.writer(KEY) as writer:
        writer.document("{}")
        sealed = writer.seal()
    other = store.path("2026-04/2026-04.a1")
    other.parent.mkdir()
    other.write_bytes(store.path(KEY).read_bytes())
    (damage,) = store.verify("2026-04/2026-04.a1", sealed.sha256)
    assert (damage.expected, damage.found) == ("2026-04/2026-04.a1", KEY)

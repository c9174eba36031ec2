"""A single changed bit anywhere is found, and the dataset it lies in is named."""

from __future__ import annotations

import subprocess
from pathlib import Path

import h5py
import numpy as np
import pytest

from archive.store import Column, Damage, LocalStore, SealedFile, examine, fixity, open_store

KEY = "2026-03/2026-03.a1"


@pytest.fixture
def store(tmp_path: Path) -> LocalStore:
    """Return a store with one file in it."""
    store = open_store(tmp_path)
    with store.writer(KEY) as writer:
        writer.raw("T.bin", [np.random.default_rng(5).bytes(3000)])
        columns = [
            Column("time", "float64", "s", "s", "time", "Time"),
            Column("T", "float64", "K", "K", "temperature", "Temperature"),
            Column("note", "str", "", "", "text", "Note"),
        ]
        table = writer.table("sweep", columns, index="time")
        count = np.arange(300)
        table.append({"time": count * 1.0, "T": np.sin(count), "note": np.array([f"n{i}" for i in count])})
        writer.array("fits/shift", np.array(2.5), {"units": "K"})
        writer.document('{"name": "2026-03"}')
        writer.seal()
    return store


def chunk_places(path: Path) -> dict[int, str]:
    """Return which dataset each byte of stored values belongs to, as HDF5 says."""
    places: dict[int, str] = {}

    def look(name: str, node: h5py.Dataset | h5py.Group) -> None:
        if isinstance(node, h5py.Dataset) and node.chunks:
            for number in range(node.id.get_num_chunks()):
                info = node.id.get_chunk_info(number)
                places.update(dict.fromkeys(range(info.byte_offset, info.byte_offset + info.size), name))

    with h5py.File(path) as file:
        file.visititems(look)
    return places


def flip(path: Path, whole: bytes, place: int) -> None:
    """Write `whole` back with one bit changed."""
    data = bytearray(whole)
    data[place] ^= 1 << place % 8
    path.write_bytes(data)


def test_a_flipped_bit_in_stored_values_names_its_dataset(store: LocalStore) -> None:
    path = store.path(KEY)
    path.chmod(0o644)
    places, whole = chunk_places(path), path.read_bytes()
    tried = sorted(places)[::23]
    assert {places[place] for place in tried} >= {"raw/T.bin", "sweep/T", "sweep/time", "sweep/note"}
    for place in tried:
        flip(path, whole, place)
        assert [damage.dataset for damage in examine._inside(path, KEY)] == [places[place]], place


def test_a_flipped_bit_anywhere_is_found_and_harms_nobody(store: LocalStore) -> None:
    """The whole way, through the child process, at places spread over the file."""
    path = store.path(KEY)
    path.chmod(0o644)
    whole, sealed = path.read_bytes(), store.describe(KEY)
    places = chunk_places(path)
    for place in (0, 8, 11, 40, *range(100, len(whole), len(whole) // 8)):
        flip(path, whole, place)
        damage = fixity(store, {KEY: sealed})
        assert damage[0].kind == "damaged"
        assert (damage[0].expected, damage[0].dataset) == (sealed.sha256, None)
        if place in places:
            assert places[place] in damage[0].what
            assert places[place] in {d.dataset for d in damage}
    path.write_bytes(whole)
    assert fixity(store, {KEY: sealed}) == []


def test_a_change_outside_every_dataset_is_told_as_such(store: LocalStore) -> None:
    path, sealed = store.path(KEY), store.describe(KEY)
    path.chmod(0o644)
    path.write_bytes(path.read_bytes().replace(b"Temperature", b"Temperatura"))
    (damage,) = store.verify(KEY, sealed.sha256)
    assert "every dataset is whole" in damage.what


def test_a_false_record_made_of_a_damaged_file_does_not_vouch_for_it(store: LocalStore) -> None:
    path = store.path(KEY)
    path.chmod(0o644)
    place = next(place for place, name in chunk_places(path).items() if name == "sweep/T")
    flip(path, path.read_bytes(), place)
    (damage,) = store.verify(KEY, store.describe(KEY).sha256)
    assert damage.dataset == "sweep/T"


def test_values_exchanged_with_right_checksums_are_found(store: LocalStore) -> None:
    path = store.path(KEY)
    path.chmod(0o644)
    with h5py.File(path, "r+") as file:
        file["sweep/T"][5] = 4.2
        file["fits/shift"][()] = 2.6
        file["raw/T.bin"].attrs["size"] = 2999
    found = {damage.dataset: damage for damage in store.verify(KEY)}
    assert set(found) == {"sweep/T", "fits/shift", "raw/T.bin"}
    assert (found["raw/T.bin"].expected, found["raw/T.bin"].found) == ("2999", "3000")


def test_a_file_without_document_is_found(store: LocalStore) -> None:
    path = store.path(KEY)
    path.chmod(0o644)
    with h5py.File(path, "r+") as file:
        del file["document"]
    assert [damage.dataset for damage in store.verify(KEY)] == ["document"]


@pytest.mark.parametrize("end", ["crash", "no end"])
def test_a_file_that_hdf5_cannot_cope_with_is_damaged(
    store: LocalStore, monkeypatch: pytest.MonkeyPatch, end: str
) -> None:
    def run(command: list[str], **_: object) -> subprocess.CompletedProcess[bytes]:
        if end == "no end":
            raise subprocess.TimeoutExpired(command, 60)
        return subprocess.CompletedProcess(command, -11, b"", b"Segmentation fault\n")

    monkeypatch.setattr(subprocess, "run", run)
    (first, second) = store.verify(KEY, "0" * 64)
    assert isinstance(first, Damage)
    assert ("did not come to an end" if end == "no end" else "cannot cope") in second.what


def test_a_file_that_cannot_be_read_is_damaged(store: LocalStore) -> None:
    path = store.path(KEY)
    path.unlink()
    path.mkdir()
    (damage,) = store.verify(KEY)
    assert (damage.kind, damage.what) == ("damaged", "the file cannot be read")
    assert store.contains(KEY)


def test_a_lost_file_is_missing(store: LocalStore) -> None:
    sealed = SealedFile(KEY, "0" * 64, 1)
    store.path(KEY).unlink()
    (damage,) = fixity(store, {KEY: sealed})
    assert (damage.kind, damage.expected) == ("missing", "0" * 64)

"""Sealed files that are not what they were are found in a child process, whatever the digests that came with them say."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import h5py

from archive import Archive
from tests.archive.exchange.forging import refused, swap

DROP = "2026-04/s002@drop.1"
Make = Callable[..., Archive]


def test_a_whole_package_is_taken_in(package: Path, other: Make) -> None:
    there = other()
    assert there.import_package(package).state == "imported"
    assert there.fixity() == []


def test_a_damaged_file_is_refused_even_when_every_digest_was_made_anew(copy: Path, other: Make) -> None:
    content = bytearray((copy / "data" / "sealed" / f"{DROP}.h5").read_bytes())
    with h5py.File(copy / "data" / "sealed" / f"{DROP}.h5") as file:
        place = file["arrays/period_drop"].id.get_chunk_info(0).byte_offset
    content[place + 20] ^= 1
    swap(copy, DROP, bytes(content))
    there = other()
    assert refused(there, copy) == {"bag-file-damaged"}
    assert there.import_package(copy).damaged


def test_bytes_that_are_no_hdf5_are_refused(copy: Path, other: Make) -> None:
    swap(copy, DROP, b"\x89HDF\r\n\x1a\n" + bytes(200))
    assert refused(other(), copy) == {"bag-file-damaged"}


def test_a_file_that_reads_another_is_refused(copy: Path, other: Make) -> None:
    path = copy / "data" / "sealed" / f"{DROP}.h5"
    with h5py.File(path, "r+", libver=("v110", "v110")) as file:
        file["way"] = h5py.ExternalLink("/etc/hostname", "/")
    swap(copy, DROP, path.read_bytes())
    assert refused(other(), copy) == {"bag-file-damaged"}


def test_a_file_under_the_name_of_another_is_refused(copy: Path, other: Make) -> None:
    swap(copy, DROP, (copy / "data" / "sealed" / "2026-03" / "s001@empty-cell.1.h5").read_bytes())
    assert refused(other(), copy) == {"bag-file-damaged"}

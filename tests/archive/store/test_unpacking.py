"""Rows come out of their chunks as HDF5 itself reads them, and damage is told; how many threads packed does not show."""

from __future__ import annotations

import zlib
from pathlib import Path

import h5py
import numpy as np
import pytest

from archive.store.chunks import CHUNK_BYTES, fletcher32
from archive.store.interface import Column
from archive.store.sealed import SealedWriter
from archive.store.unpacking import parts_of, rows_of

ROWS = 5 * CHUNK_BYTES // 8 + 77
COLUMNS = [Column(name, kind, "1", "1", "number", name) for name, kind in (("x", "float64"), ("n", "int64"))]


def write(path, jobs):
    """Write decimals, which pack better as they are, and counts, which pack better shuffled."""
    random = np.random.default_rng(5)
    values = {"x": np.round(random.standard_normal(ROWS), 3), "n": np.arange(ROWS)}
    writer = SealedWriter(path, "2026-03/2026-03.a1", jobs=jobs)
    table = writer.table("t", COLUMNS)
    for start in range(0, ROWS, 50_000):
        table.append({name: column[start : start + 50_000] for name, column in values.items()})
    writer.raw("noise.bin", [random.bytes(CHUNK_BYTES + 5)])
    writer.document("{}")
    writer.finish()
    return path


@pytest.fixture(scope="module")
def file(tmp_path_factory):
    """Return a written file, open."""
    with h5py.File(write(tmp_path_factory.mktemp("unpacking") / "two.h5", 2)) as opened:
        yield opened


def test_the_bytes_do_not_depend_on_the_number_of_threads(file, tmp_path):
    two = Path(file.filename).read_bytes()
    assert write(tmp_path / "one.h5", 1).read_bytes() == two


def test_each_column_has_the_filters_that_suit_it(file):
    assert not file["t/x"].shuffle
    assert file["t/n"].shuffle
    assert file["t/x"].id.get_storage_size() < 0.5 * file["t/x"].nbytes


@pytest.mark.parametrize("path", ["t/x", "t/n", "raw/noise.bin", "document"])
@pytest.mark.parametrize(
    "cut", [(None, None), (0, 1), (32_767, 32_769), (100, -3), (-10, None), (7, 3), (None, 10**9)], ids=str
)
def test_rows_are_those_that_hdf5_reads(file, path, cut):
    values = rows_of(file[path], *cut)
    expected = file[path][slice(*cut)]
    assert values.dtype == expected.dtype
    assert values.tobytes() == expected.tobytes()


@pytest.mark.parametrize("path", ["t/x", "t/n", "raw/noise.bin"])
def test_parts_make_up_the_whole(file, path):
    assert b"".join(part.tobytes() for part in parts_of(file[path], None)) == file[path][()].tobytes()


def test_what_is_packed_otherwise_is_left_to_hdf5(tmp_path):
    table = np.arange(12.0).reshape(3, 4)
    with h5py.File(tmp_path / "other.h5", "w") as file:
        for name, options in (("plain", {}), ("zlib", {"compression": "gzip", "chunks": (2, 4)})):
            dataset = file.create_dataset(name, data=table, **options)
            assert np.array_equal(rows_of(dataset, 1, 3), table[1:3])
            assert np.array_equal(np.concatenate(list(parts_of(dataset, None))), table)
        assert rows_of(file.create_dataset("one", data=2.5)) == 2.5


@pytest.mark.parametrize("fault", ["checksum", "stream", "short", "long"])
def test_a_chunk_that_is_not_whole_is_told(tmp_path, fault):
    size = 8 * 10
    content = zlib.compress(bytes({"short": size - 8, "long": 100 * size}.get(fault, size)))
    if fault == "stream":
        content = b"\x00" + content[1:]
    total = fletcher32(content) ^ (fault == "checksum")
    with h5py.File(tmp_path / "damaged.h5", "w") as file:
        dataset = file.create_dataset(
            "x", shape=(10,), dtype="<f8", chunks=(10,), compression="gzip", fletcher32=True
        )
        dataset.id.write_direct_chunk((0,), content + total.to_bytes(4, "little"), 0)
        with pytest.raises(OSError, match="a chunk is damaged"):
            rows_of(dataset)

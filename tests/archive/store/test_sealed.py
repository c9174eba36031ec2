"""The file itself: standard HDF5 that any tool reads, and the same bytes for the same input."""

from __future__ import annotations

import subprocess
import zlib
from collections.abc import Iterator
from pathlib import Path

import h5py
import numpy as np
import pytest

from archive.errors import ArchiveError
from archive.store import Column, LocalStore, open_store
from archive.store.chunks import fletcher32
from archive.store.sealed import writing
from tests.outside import program

KEY = "2026-03/2026-03.a1"
COLUMNS = (
    Column("time", "float64", "s", "s", "time", "Time since the sweep began"),
    Column("period", "float64", "µs", "us", "period", "Period of the oscillator"),
    Column("note", "str", "", "", "text", "What the operator wrote"),
)


def fill(store: LocalStore, *, block: int = 10_000, rows: int = 40_000) -> Path:
    """Seal a file with raw bytes, a table longer than a chunk and a document, and return its path."""
    count = np.arange(rows)
    columns = {
        "time": count * 0.5,
        "period": 1000 + np.sin(count).round(4),
        "note": np.array([f"Füllung {i % 7}" for i in count]),
    }
    with store.writer(KEY) as writer:
        raw = np.random.default_rng(3).bytes(300_000)
        writer.raw("noise.bin", (raw[i : i + block] for i in range(0, len(raw), block)))
        writer.raw("T.csv", [b"T/K\n" * 5000])
        table = writer.table("sweeps/s017", COLUMNS, index="time")
        for i in range(0, rows, block):
            table.append({name: values[i : i + block] for name, values in columns.items()})
        writer.array("fits/covariance", np.eye(2), {"units": "1"})
        writer.array("fits/shift", np.array(2.5), {"units": "1"})
        writer.document('{"name": "2026-03", "note": "Zürich ' + "x" * 70_000 + '"}')
        writer.seal()
    return store.path(KEY)


@pytest.fixture(scope="module")
def path(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a sealed file that the tests of this module only read."""
    return fill(open_store(tmp_path_factory.mktemp("lab")))


@pytest.fixture
def file(path: Path) -> Iterator[h5py.File]:
    """Return it opened by plain h5py."""
    with h5py.File(path, "r") as opened:
        yield opened


def test_the_bytes_do_not_depend_on_time_place_or_blocks(path: Path, tmp_path: Path) -> None:
    other = fill(open_store(tmp_path), block=777)
    assert other.read_bytes() == path.read_bytes()


def test_superblock_is_version_3_and_closed(path: Path) -> None:
    head = path.read_bytes()[:12]
    assert (head[:8], head[8], head[11]) == (b"\x89HDF\r\n\x1a\n", 3, 0)


def test_nobody_may_write_to_it(path: Path) -> None:
    mode = path.stat().st_mode & 0o777
    assert mode & 0o222 == 0
    assert mode & 0o400


def test_every_dataset_has_checksums_and_only_common_filters(file: h5py.File) -> None:
    found = {}

    def look(name: str, node: h5py.Dataset | h5py.Group) -> None:
        if isinstance(node, h5py.Dataset) and node.shape != ():
            plan = node.id.get_create_plist()
            found[name] = {plan.get_filter(i)[0] for i in range(plan.get_nfilters())}
            assert node.chunks is not None
            assert np.prod(node.chunks) * node.dtype.itemsize <= max(262_144, node.dtype.itemsize)
            assert node.dtype.kind in "fiuS"

    file.visititems(look)
    assert len(found) == 7
    assert all(3 in filters and filters <= {1, 2, 3} for filters in found.values())


def test_plain_h5py_reads_it(file: h5py.File) -> None:
    assert file["document"].asstr()[0].startswith('{"name": "2026-03", "note": "Zürich')
    period = file["sweeps/s017/period"]
    assert period.attrs["units"] == "µs"
    assert period.attrs["long_name"] == "Period of the oscillator"
    assert period[2] == 1000 + round(float(np.sin(2)), 4)
    assert file["sweeps/s017/note"].asstr()[8] == "Füllung 1"
    assert file["raw/T.csv"][:].tobytes() == b"T/K\n" * 5000
    assert file["fits/shift"][()] == 2.5


def test_the_index_is_the_scale_of_the_other_columns(file: h5py.File) -> None:
    for name in ("period", "note"):
        dimension = file[f"sweeps/s017/{name}"].dims[0]
        assert (dimension.label, dimension.keys()) == ("time", ["time"])
        assert dimension[0] == file["sweeps/s017/time"]


def test_bytes_that_are_packed_already_are_stored_as_they_are(file: h5py.File) -> None:
    noise = file["raw/noise.bin"]
    assert noise.id.get_chunk_info(0).filter_mask == 0b01  # the first filter, deflate, was skipped
    assert noise.id.get_chunk_info(0).size == 262_144 + 4
    assert file["raw/T.csv"].id.get_storage_size() < 1000


def test_packing_is_an_ordinary_zlib_stream(file: h5py.File) -> None:
    mask, chunk = file["raw/T.csv"].id.read_direct_chunk((0,))
    assert mask == 0
    assert zlib.decompress(chunk[:-4]) == b"T/K\n" * 5000


@pytest.mark.parametrize(
    "data",
    [b"", b"\0" * 9, b"\xff" * 4, b"\x00\x01\xff\xfe", b"a", bytes(range(256)) * 999, b"\xff\xff" * 70_000],
    ids=["nothing", "zeros", "ones", "sum 65535", "odd", "long", "long ones"],
)
def test_checksum_is_that_of_hdf5(data: bytes, tmp_path: Path) -> None:
    """HDF5 itself computes the checksum of an unpacked chunk, and appends it."""
    with h5py.File(tmp_path / "x.h5", "w") as file:
        dataset = file.create_dataset(
            "x",
            data=np.frombuffer(data + b"\0" * (not data), dtype="u1"),
            chunks=(max(1, len(data)),),
            fletcher32=True,
        )
        file.flush()
        _, chunk = dataset.id.read_direct_chunk((0,))
    assert fletcher32(data) == int.from_bytes(chunk[-4:], "little")


def test_an_older_reader_reads_all_of_it(path: Path) -> None:
    """Debian's h5dump 1.10 reads every value; exit 1 would mean a checksum or a feature it does not know."""
    run = subprocess.run([program("h5dump"), path], capture_output=True, text=True, check=False)
    assert (run.returncode, run.stderr) == (0, "")
    for part in ('DATASET "period"', "DIMENSION_LIST", "llung 6", 'ATTRIBUTE "units"'):
        assert part in run.stdout


def test_a_full_disk_is_told_in_the_words_of_the_system(tmp_path: Path) -> None:
    """Of what HDF5 says of a failed write, only the message of the system is for people."""
    said = "Can't write chunk (file write failed: errno = 28, error message = 'No space left on device', buf = 0x55)"
    with pytest.raises(ArchiveError, match="found No space left on device; make room"), writing(tmp_path):
        raise OSError(said)


def test_of_a_failed_write_the_words_of_the_system_are_told(tmp_path: Path) -> None:
    """As HDF5 told it on a full tmpfs."""
    told = "Can't write data (file write failed: errno = 28, error message = 'No space left on device', buf = 0x5624491783d8)"
    with (
        pytest.raises(ArchiveError, match=r"found No space left on device; make room"),
        writing(tmp_path / "x.h5"),
    ):
        raise OSError(28, told)

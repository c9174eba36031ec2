"""Writing, reading and proving of sealed files against plain h5py and plain digests of the same columns and files."""

from __future__ import annotations

import hashlib
import shutil
import tempfile
from functools import partial
from pathlib import Path

import h5py
import numpy as np

from archive import Archive
from archive.store.interface import Column
from archive.store.local import LocalStore
from archive.store.sealed import SealedWriter
from tests.benchmarks.harness import Benchmark, Size, Work
from tests.benchmarks.measured_log import CHANNELS, script, write_folder

__all__ = ["FIXITY", "READ", "WRITE", "WRITE_SIZE"]

_KEY = "2026-03/2026-03.a1"
_COLUMNS = [Column(name, "float64", "1", "1", "number", name) for name in CHANNELS]
_BLOCK = 32_768


def _columns(place: Path, rows: int) -> dict[str, np.ndarray]:
    """Return ten columns as a log gives them."""
    folder = write_folder(place / "logs", rows)
    script(folder / "log000.csv", place / "columns.h5", raw=False)
    with h5py.File(place / "columns.h5") as file:
        return {name: file[name][()] for name in CHANNELS}


def _rows(size: Size) -> int:
    return {"small": 40_000, "default": 500_000, "full": 1_515_000}[size]


def _append(writer: SealedWriter, columns: dict[str, np.ndarray], rows: int) -> None:
    table = writer.table("sweeps/s000", _COLUMNS)
    for start in range(0, rows, _BLOCK):
        table.append({name: values[start : start + _BLOCK] for name, values in columns.items()})
    writer.document("{}")


def _told(path: Path, group: str) -> np.ndarray:
    with h5py.File(path) as file:
        return np.array([file[group][name][-1] for name in CHANNELS])


def _writing(size: Size, *, sizes: bool) -> Work:
    place = Path(tempfile.mkdtemp(prefix="stillroom-write-"))
    rows = _rows(size)
    columns = _columns(place, rows)
    ours, theirs = place / "ours.h5", place / "theirs.h5"

    def subject() -> np.ndarray | int:
        ours.unlink(missing_ok=True)
        writer = SealedWriter(ours, _KEY)
        _append(writer, columns, rows)
        writer.finish()
        return ours.stat().st_size if sizes else _told(ours, "sweeps/s000")

    def baseline() -> np.ndarray | int:
        with h5py.File(theirs, "w") as file:
            for name, values in columns.items():
                file.create_dataset(name, data=values, compression="gzip", compression_opts=4, shuffle=True)
        return theirs.stat().st_size if sizes else _told(theirs, "/")

    return Work(subject, baseline, rows, lambda: shutil.rmtree(place))


def _reading(size: Size) -> Work:
    place = Path(tempfile.mkdtemp(prefix="stillroom-read-"))
    rows = _rows(size)
    store = LocalStore(place)
    with store.writer(_KEY) as writer:
        _append(writer, _columns(place, rows), rows)  # type: ignore[arg-type]
        writer.seal()

    def subject() -> np.ndarray:
        return store.column(_KEY, "sweeps/s000/period")

    def baseline() -> np.ndarray:
        with h5py.File(store.path(_KEY)) as file:
            return file["sweeps/s000/period"][()]

    return Work(subject, baseline, rows, lambda: shutil.rmtree(place))


def _proving(size: Size) -> Work:
    place = Path(tempfile.mkdtemp(prefix="stillroom-fixity-"))
    files, rows = (3, 2_000) if size == "small" else (8, 100_000 if size == "default" else 400_000)
    lab = Archive.create(place / "lab")
    for number in range(files):
        folder = write_folder(place / f"2026-03-{number}", rows)
        sheet = folder / "cooldown.toml"
        sheet.write_text(sheet.read_text().replace('"2026-03"', f'"2026-03-{number}"'))
        assert lab.ingest(folder).state == "ingested"
        shutil.rmtree(folder)
    sealed = sorted((place / "lab" / "sealed").rglob("*.h5"))
    digests = [hashlib.sha256(path.read_bytes()).hexdigest() for path in sealed]

    def subject() -> int:
        assert lab.fixity() == []
        return files

    def baseline() -> int:
        found = []
        for path in sealed:
            with path.open("rb") as stream:
                found.append(hashlib.file_digest(stream, "sha256").hexdigest())
        return sum(a == b for a, b in zip(found, digests, strict=True))

    def close() -> None:
        lab.close()
        shutil.rmtree(place)

    return Work(subject, baseline, sum(path.stat().st_size for path in sealed) // 1_000_000, close)


WRITE = Benchmark(
    name="compressed-write",
    description="ten columns of measured numbers into an HDF5 file, shuffled and deflated",
    subject="writer of sealed files, with digests and checksums",
    baseline="h5py, gzip 4, shuffle",
    unit="rows",
    prepare=partial(_writing, sizes=False),
)

WRITE_SIZE = Benchmark(
    name="compressed-size",
    description="size of that file",
    subject="writer of sealed files",
    baseline="h5py, gzip 4, shuffle",
    unit="rows",
    prepare=partial(_writing, sizes=True),
    cost="bytes",
)

READ = Benchmark(
    name="column-read",
    description="one column of a sealed file into memory",
    subject="store, which looks through the structure and compares the checksums",
    baseline="h5py, the same file",
    unit="rows",
    prepare=_reading,
)

FIXITY = Benchmark(
    name="fixity",
    description="a pass over all sealed files, read whole and compared with the records, and with index and journal",
    subject="fixity, every dataset unpacked and compared too",
    baseline="hashlib.file_digest of the same files, which unpacks nothing",
    unit="MB",
    prepare=_proving,
)

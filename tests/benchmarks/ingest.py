"""Ingest of a long log and of short ones against the script that a person would write for them.

Ingest does more than the script: it checks, seals, syncs, reads back, and enters an index and a journal. Of a log of one
sweep the default is 66 MB and the full size 200 MB.
"""

from __future__ import annotations

import shutil
import tempfile
from collections.abc import Callable
from functools import partial
from pathlib import Path

import h5py
import numpy as np

from archive import Archive
from tests.benchmarks.harness import Benchmark, Size, Work
from tests.benchmarks.measured_log import Stored, script, write_folder

__all__ = ["LOG", "LOG_BARE", "MANY", "SMALL", "SMALL_SIZE"]

_SMALL_ROWS = 3_000


class _Bench:
    """A folder of logs, an open archive, and the results of the two sides."""

    def __init__(self, rows: int, files: int) -> None:
        self.place = Path(tempfile.mkdtemp(prefix="stillroom-ingest-"))
        self.folder = write_folder(self.place / "2026-03", rows, files)
        self.logs = sorted(self.folder.glob("*.csv"))
        self.lab = Archive.create(self.place / "lab")
        self.number = 0

    def ingested(self) -> Path:
        """Take the folder in as one more cooldown, under a name that is not there yet; return the sealed file."""
        self.number += 1
        name = f"2026-03-{self.number}"
        folder = self.place / name
        folder.mkdir()
        for log in self.logs:
            (folder / log.name).hardlink_to(log)
        sheet = (self.folder / "cooldown.toml").read_text(encoding="utf-8")
        (folder / "cooldown.toml").write_text(sheet.replace('"2026-03"', f'"{name}"'), encoding="utf-8")
        outcome = self.lab.ingest(folder)
        assert outcome.address == f"{name}.a1", outcome
        return self.place / "lab" / "sealed" / name / f"{outcome.address}.h5"

    def scripted(self, *, raw: bool = True) -> list[Path]:
        """Let the script do its work for each log; return its files."""
        targets = [self.place / f"{log.stem}.h5" for log in self.logs]
        for log, target in zip(self.logs, targets, strict=True):
            script(log, target, raw=raw)
        return targets

    def close(self) -> None:
        self.lab.close()
        shutil.rmtree(self.place)


def _long(size: Size, *, raw: bool) -> Work:
    bench = _Bench({"small": 2_000, "default": 500_000, "full": 1_515_000}[size], 1)
    return Work(
        lambda: Stored(bench.ingested(), "sweeps/s000"),
        lambda: Stored(bench.scripted(raw=raw)[0]),
        sum(log.stat().st_size for log in bench.logs) // 1_000_000,
        bench.close,
    )


def _short(size: Size, *, sizes: bool) -> Work:
    bench = _Bench(_SMALL_ROWS, 1)
    subject: Callable[[], Stored | int] = lambda: Stored(bench.ingested(), "sweeps/s000")  # noqa: E731
    baseline: Callable[[], Stored | int] = lambda: Stored(bench.scripted()[0])  # noqa: E731
    if sizes:
        subject = lambda: bench.ingested().stat().st_size  # noqa: E731
        baseline = lambda: bench.scripted()[0].stat().st_size  # noqa: E731
    return Work(subject, baseline, _SMALL_ROWS, bench.close)


def _many(size: Size) -> Work:
    rows, files = (200, 5) if size == "small" else (_SMALL_ROWS, 60 if size == "default" else 300)
    bench = _Bench(rows, files)

    def rows_of(paths: list[Path]) -> np.ndarray:
        found = []
        for path in paths:
            with h5py.File(path) as file:
                groups = file["sweeps"].values() if "sweeps" in file else [file]
                found += [group["period"].shape[0] for group in groups]
        return np.array(found)

    return Work(lambda: rows_of([bench.ingested()]), lambda: rows_of(bench.scripted()), files, bench.close)


_SUBJECT = "ingest: columns, raw bytes, digests, checks, synced, read back, index and journal"
_SCRIPT = "pandas reads, h5py writes columns and raw bytes with gzip 4, hashlib"

LOG = Benchmark(
    name="ingest",
    description="a log of a time stamp and ten numbers a row into an archive",
    subject=_SUBJECT,
    baseline=_SCRIPT,
    unit="MB",
    prepare=partial(_long, raw=True),
    tolerance=1e-12,  # pandas reads decimals to within some units of the last place
)

LOG_BARE = Benchmark(
    name="ingest-bare",
    description="the same against a script that keeps neither raw bytes nor digest",
    subject=_SUBJECT,
    baseline="pandas reads, h5py writes columns with gzip 4",
    unit="MB",
    prepare=partial(_long, raw=False),
    tolerance=1e-12,
)

SMALL = Benchmark(
    name="ingest-small",
    description="a cooldown of one small sweep",
    subject=_SUBJECT,
    baseline=_SCRIPT,
    unit="rows",
    prepare=partial(_short, sizes=False),
    tolerance=1e-12,
)

SMALL_SIZE = Benchmark(
    name="ingest-small-size",
    description="size of its file",
    subject="sealed file",
    baseline="file of the script",
    unit="rows",
    prepare=partial(_short, sizes=True),
    cost="bytes",
)

MANY = Benchmark(
    name="ingest-many",
    description="a cooldown of many small sweeps of 3,000 rows",
    subject=_SUBJECT,
    baseline=f"{_SCRIPT}, once a file",
    unit="sweeps",
    prepare=_many,
)

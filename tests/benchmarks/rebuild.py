"""An index made anew from the sealed files of many cooldowns, against reading the document of each file with h5py and parsing its JSON.

Each cooldown here has an accession of six sweeps and a reduction; the files hold their documents and a small raw file. The subject
proves each file by its digest and structure, too, validates its document and writes all rows.
"""

from __future__ import annotations

import json
import tempfile
from collections.abc import Iterator
from pathlib import Path

import h5py
import numpy as np

from archive import Archive
from archive.store import open_store
from schemas.lineage import AccessionDocument, ReductionDocument
from tests.archive.index import documents as make
from tests.benchmarks.harness import Benchmark, Size, Work

__all__ = ["BENCHMARK"]

_COOLDOWNS = {"small": 3, "default": 200, "full": 2_000}
_SWEEPS = 6


def _documents(number: int) -> Iterator[AccessionDocument | ReductionDocument]:
    name = f"2{number // 1000:03}-{number % 1000:04}"
    yield make.accession(name, sweeps=tuple(make.sweep(f"s{each:03}") for each in range(_SWEEPS)))
    yield make.reduction(f"{name}/s000")


def _prepare(size: Size) -> Work:
    folder = tempfile.TemporaryDirectory(prefix="stillroom-rebuild-")
    root = Path(folder.name, "lab")
    Archive.create(root).close()
    store = open_store(root)
    for number in range(_COOLDOWNS[size]):
        for document in _documents(number):
            key = make.entry(document)[0]
            with store.writer(key) as writer:
                writer.raw("log.csv", [b"1,2\n" * 500])
                writer.document(document.model_dump_json())
                writer.seal()
    # Rebuilt once before, it knows the digest of every file, as an index that is made anew usually does.
    Archive.rebuild_index(root)
    paths = sorted((root / "sealed").rglob("*.h5"))

    def subject() -> np.ndarray:
        counts = Archive.rebuild_index(root)
        return np.array([counts["accessions"], counts["reductions"], counts["sweeps"]])

    def baseline() -> np.ndarray:
        counted = np.zeros(3, dtype=int)
        for path in paths:
            with h5py.File(path) as file:
                said = json.loads(file["document"][0])
            accession = "accessioned" in said
            counted += (accession, not accession, len(said["sweeps"]) if accession else 0)
        return counted

    return Work(subject, baseline, _COOLDOWNS[size], folder.cleanup)


BENCHMARK = Benchmark(
    name="rebuild",
    description="the index of an archive made anew from its sealed files, an accession of six sweeps and a reduction each",
    subject="Archive.rebuild_index",
    baseline="h5py and json over the same files",
    unit="cooldowns",
    prepare=_prepare,
)

"""Reading of blocks with wrong cells against reading the same text without; one cell, and ten thousand.

A block is as much text as is parsed at once, so one wrong cell in it costs the most that one cell can. Of ten thousand
cells, which lie in all blocks of a log, each is found with its line and column.
"""

from __future__ import annotations

import shutil
import tempfile
from functools import partial
from pathlib import Path

import numpy as np

from archive.intake.dialect import ColumnRequest
from archive.intake.tables import TableReader
from schemas.sweep import Dialect
from tests.benchmarks.harness import Benchmark, Size, Work
from tests.benchmarks.measured_log import CHANNELS, write_folder

__all__ = ["MANY", "ONE"]

_REQUESTS = [
    ColumnRequest("time", "time", "time"),
    *(ColumnRequest(name, name, "number") for name in CHANNELS),
]


def _read(text: bytes) -> tuple[TableReader, np.ndarray]:
    reader = TableReader(
        [text], file="log.csv", dialect=Dialect.model_validate({"time_format": "iso8601"}), columns=_REQUESTS
    )
    total = np.zeros(len(_REQUESTS))
    for block in reader.blocks():
        total += [np.nansum(block.columns[request.name]) for request in _REQUESTS]
    return reader, total


def _prepare(size: Size, *, wrong: int | None) -> Work:
    place = Path(tempfile.mkdtemp(prefix="stillroom-cells-"))
    rows = 1_000 if size == "small" else 7_500 if wrong else {"default": 300_000, "full": 1_515_000}[size]
    text = (write_folder(place / "logs", rows) / "log000.csv").read_bytes()
    shutil.rmtree(place)
    lines = text.splitlines(keepends=True)
    count = wrong or (50 if size == "small" else 10_000)
    places = np.linspace(2, rows + 1, count + 2)[1:-1].astype(int)  # lines from 1, the header first
    for line in places.tolist():
        cells = lines[line - 1].split(b",")
        cells[3] = b"1.2.3"
        lines[line - 1] = b",".join(cells)
    spoiled = b"".join(lines)

    def subject() -> np.ndarray:
        reader, _ = _read(spoiled)
        assert reader.bad_cell_count == count
        told = [cell.line for cell in reader.bad_cells if cell.column == '4 "amplitude"']
        return np.array(told)

    def baseline() -> np.ndarray:
        _read(text)
        return places[: len(places)]

    return Work(subject, baseline, rows)


ONE = Benchmark(
    name="bad-cell",
    description="a block of text with one wrong cell",
    subject="read with one wrong cell, which is named",
    baseline="read without",
    unit="rows",
    prepare=partial(_prepare, wrong=1),
)

MANY = Benchmark(
    name="bad-cells",
    description="a log with ten thousand wrong cells",
    subject="read with wrong cells, each named",
    baseline="read without",
    unit="rows",
    prepare=partial(_prepare, wrong=None),
)

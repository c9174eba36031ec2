"""All benchmarks there are, in the order in which they run.

To add one: a module beside this one with a `BENCHMARK`, and its line in the list.
"""

from __future__ import annotations

from tests.benchmarks import (
    bad_cells,
    dynamic_curve,
    ingest,
    ingest_memory,
    pages,
    picture,
    plane,
    rebuild,
    reductions,
    run_sheet,
    sealed_files,
    search,
    starting,
    words_and_counts,
)
from tests.benchmarks.harness import Benchmark

__all__ = ["BENCHMARKS"]

BENCHMARKS: tuple[Benchmark, ...] = (
    ingest.LOG,
    ingest.LOG_BARE,
    ingest_memory.BENCHMARK,
    ingest.SMALL,
    ingest.SMALL_SIZE,
    ingest.MANY,
    bad_cells.ONE,
    bad_cells.MANY,
    sealed_files.WRITE,
    sealed_files.WRITE_SIZE,
    sealed_files.READ,
    sealed_files.FIXITY,
    dynamic_curve.BENCHMARK,
    pages.BENCHMARK,
    plane.BENCHMARK,
    search.MIDDLE,
    search.SLOWEST,
    words_and_counts.WORDS,
    words_and_counts.COUNTS,
    rebuild.BENCHMARK,
    starting.HELP,
    starting.VERSION,
    starting.SEARCH,
    reductions.FILM,
    reductions.RENEWAL,
    run_sheet.BENCHMARK,
    picture.FIRST,
    picture.ZOOM,
)

"""All benchmarks there are, in the order in which they run.

To add one: a module beside this one with a `BENCHMARK`, and its line in the list.
"""

from __future__ import annotations

from tests.benchmarks import dynamic_curve, pages, picture, plane
from tests.benchmarks.harness import Benchmark

__all__ = ["BENCHMARKS"]

BENCHMARKS: tuple[Benchmark, ...] = (
    dynamic_curve.BENCHMARK,
    pages.BENCHMARK,
    plane.BENCHMARK,
    picture.FIRST,
    picture.ZOOM,
)

"""How a benchmark is declared, measured and written down.

Rules: a benchmark has a subject and a named baseline that do the same work, on the same input, in the same run; the two take
turns, so whatever else the machine does strikes both; their results are compared first, for a fast wrong answer is worth
nothing; nobody fails for being slow.
"""

from __future__ import annotations

import json
import platform
import statistics
import sys
import time
from collections.abc import Callable
from dataclasses import dataclass
from importlib.metadata import version
from pathlib import Path
from typing import Any, Literal

import numpy as np
import numpy.typing as npt

__all__ = [
    "ROUNDS",
    "Benchmark",
    "Disagreement",
    "Measured",
    "Size",
    "Timed",
    "Work",
    "document",
    "measured",
    "write",
]

Size = Literal["small", "default", "full"]

ROUNDS = 5
"""Rounds at the least; the middle of five is not moved by two that something disturbed."""


@dataclass(frozen=True)
class Timed:
    """What a side returns that times itself, because not its whole run counts.

    Attributes
    ----------
    result : array-like
        Numbers, as of any side.
    seconds : float
        What counts, such as the median of many answers.
    """

    result: npt.ArrayLike
    seconds: float


@dataclass(frozen=True)
class Work:
    """One input, made for both sides.

    Attributes
    ----------
    subject, baseline : callable
        Do the work on that input and return its result: numbers, in an order that both share, or something that
        gives them when `numpy.asarray` asks, which is not timed. Where not seconds but bytes are the cost, they return it.
    amount : int
        How much was done, in the benchmark's `unit`.
    close : callable, optional
        Takes away what the work left (files, processes).
    """

    subject: Callable[[], npt.ArrayLike | Timed]
    baseline: Callable[[], npt.ArrayLike | Timed]
    amount: int
    close: Callable[[], None] = lambda: None


@dataclass(frozen=True)
class Benchmark:
    """What is measured, against what.

    Attributes
    ----------
    name : str
        As given on the command line.
    description : str
        One sentence: which work, at which accuracy.
    subject, baseline : str
        What each side is, in words.
    unit : str
        What `Work.amount` counts.
    prepare : callable
        Takes the size, returns the work.
    tolerance : float
        By how much the two results may differ, as a fraction of the largest value of the baseline's.
    cost : {"s", "bytes"}
        What the two sides are held against each other by: seconds, or bytes of memory or of a file, which each side
        returns; those are no results, so they are not compared.
    """

    name: str
    description: str
    subject: str
    baseline: str
    unit: str
    prepare: Callable[[Size], Work]
    tolerance: float = 0.0
    cost: Literal["s", "bytes"] = "s"


@dataclass(frozen=True)
class Measured:
    """Costs of both sides, round by round, and how far the results were apart.

    Attributes
    ----------
    benchmark : Benchmark
    size : str
    amount : int
    subject_cost, baseline_cost : tuple of float
        In seconds, or in the benchmark's own `cost`.
    difference : float
        Largest difference of the two results, as a fraction of the largest value.
    """

    benchmark: Benchmark
    size: Size
    amount: int
    subject_cost: tuple[float, ...]
    baseline_cost: tuple[float, ...]
    difference: float

    @property
    def ratio(self) -> float:
        """How many times as much the baseline costs, by the medians."""
        return statistics.median(self.baseline_cost) / statistics.median(self.subject_cost)


class Disagreement(Exception):
    """Subject and baseline do not give the same result."""


def measured(benchmark: Benchmark, *, size: Size = "default", rounds: int = ROUNDS) -> Measured:
    """Return the costs of both sides, taken in turns.

    Parameters
    ----------
    benchmark : Benchmark
    size : {"small", "default", "full"}
    rounds : int
        At least one; below `ROUNDS` only to try whether a benchmark runs.

    Raises
    ------
    Disagreement
        The two results differ by more than the benchmark allows.
    """
    work = benchmark.prepare(size)
    try:
        # This first round also loads what either side imports; its times do not count.
        difference = _difference(benchmark, work) if benchmark.cost == "s" else 0.0
        costs: tuple[list[float], list[float]] = ([], [])
        for number in range(rounds):
            # Who goes first changes: what one leaves in the processor's cache is no one's gain.
            for side in (0, 1) if number % 2 == 0 else (1, 0):
                function = (work.subject, work.baseline)[side]
                costs[side].append(
                    _seconds(function) if benchmark.cost == "s" else float(_result(function()))
                )
    finally:
        work.close()
    return Measured(benchmark, size, work.amount, tuple(costs[0]), tuple(costs[1]), difference)


def _seconds(function: Callable[[], Any]) -> float:
    begin = time.perf_counter()
    told = function()
    return told.seconds if isinstance(told, Timed) else time.perf_counter() - begin


def _result(told: npt.ArrayLike | Timed) -> npt.NDArray[Any]:
    return np.asarray(told.result if isinstance(told, Timed) else told)


def _difference(benchmark: Benchmark, work: Work) -> float:
    ours, theirs = _result(work.subject()), _result(work.baseline())
    if ours.shape != theirs.shape:
        raise Disagreement(
            f"{benchmark.name}: {benchmark.subject} gave shape {ours.shape}, {benchmark.baseline} {theirs.shape}"
        )
    unit = float(np.max(np.abs(theirs), initial=0.0)) or 1.0
    difference = float(np.max(np.abs(ours - theirs), initial=0.0)) / unit
    if not difference <= benchmark.tolerance:
        raise Disagreement(
            f"{benchmark.name}: {benchmark.subject} and {benchmark.baseline} differ by {difference:.3g}, "
            f"expected at most {benchmark.tolerance:.3g}"
        )
    return difference


def document(results: list[Measured]) -> dict[str, Any]:
    """Return what was measured, and where, ready for JSON; costs in seconds or bytes, as their names end."""
    return {
        "schema": 1,
        "python": platform.python_version(),
        "machine": platform.machine(),
        "system": platform.system(),
        "packages": {name: version(name) for name in ("stillroom", "numpy", "scipy", "h5py", "sqlalchemy")},
        "command": [Path(sys.argv[0]).name, *sys.argv[1:]],
        "benchmarks": [
            {
                "name": each.benchmark.name,
                "description": each.benchmark.description,
                "subject": each.benchmark.subject,
                "baseline": each.benchmark.baseline,
                "size": each.size,
                "amount": each.amount,
                "unit": each.benchmark.unit,
                f"subject_{each.benchmark.cost}": list(each.subject_cost),
                f"baseline_{each.benchmark.cost}": list(each.baseline_cost),
                f"subject_median_{each.benchmark.cost}": statistics.median(each.subject_cost),
                f"baseline_median_{each.benchmark.cost}": statistics.median(each.baseline_cost),
                "ratio": each.ratio,
                "largest_relative_difference": each.difference,
                "tolerance": each.benchmark.tolerance,
            }
            for each in results
        ],
    }


def write(path: Path, results: list[Measured]) -> None:
    """Write `document` of the results to a file."""
    path.write_text(json.dumps(document(results), indent=1) + "\n", encoding="utf-8")

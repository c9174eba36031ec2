"""Run benchmarks: ``python -m tests.benchmarks [NAME ...] [--size small|default|full] [--rounds N] [--json FILE]``."""

from __future__ import annotations

import argparse
import statistics
import sys
from pathlib import Path

from tests.benchmarks.harness import ROUNDS, Disagreement, Measured, measured, write
from tests.benchmarks.listing import BENCHMARKS

__all__ = ["main"]


def main(arguments: list[str] | None = None) -> int:
    """Run what is named, print a line for each, and return the exit code: 0, or 1 where two sides disagree."""
    names = [each.name for each in BENCHMARKS]
    parser = argparse.ArgumentParser(
        prog="python -m tests.benchmarks",
        description="Measure the program against named baselines that do the same work in the same run.",
        epilog="benchmarks: " + "; ".join(f"{each.name}: {each.description}" for each in BENCHMARKS),
    )
    parser.add_argument("names", nargs="*", metavar="NAME", help=f"of {', '.join(names)}; all without")
    parser.add_argument("--size", choices=("small", "default", "full"), default="default")
    parser.add_argument(
        "--rounds", type=int, default=ROUNDS, help=f"turns of each side, at least {ROUNDS} (the default)"
    )
    parser.add_argument("--json", type=Path, metavar="FILE", help="write all times to this file, too")
    chosen = parser.parse_args(arguments)
    unknown = [name for name in chosen.names if name not in names]
    if unknown:
        parser.error(f"found no benchmark {unknown[0]!r}, expected one of {', '.join(names)}")
    if chosen.rounds < ROUNDS:
        parser.error(f"found {chosen.rounds} rounds, expected at least {ROUNDS}")
    if chosen.json is not None and not chosen.json.parent.is_dir():
        parser.error(f"found no folder {chosen.json.parent}, expected one for the file")
    results, failed = [], False
    for benchmark in BENCHMARKS:
        if chosen.names and benchmark.name not in chosen.names:
            continue
        try:
            result = measured(benchmark, size=chosen.size, rounds=chosen.rounds)
        except Disagreement as error:
            sys.stdout.write(f"{error}\n")
            failed = True
            continue
        results.append(result)
        sys.stdout.write(_lines(result))
        sys.stdout.flush()
    if chosen.json is not None:
        write(chosen.json, results)
    return int(failed)


def _lines(result: Measured) -> str:
    benchmark = result.benchmark
    timed = benchmark.cost == "s"
    unit, scale = ("s", 1.0) if timed else ("MB", 1e-6)
    rows = "".join(
        f"  {scale * statistics.median(costs):12.6f} {unit}  ({scale * min(costs):.6f} to {scale * max(costs):.6f})  {words}\n"
        for costs, words in (
            (result.subject_cost, benchmark.subject),
            (result.baseline_cost, benchmark.baseline),
        )
    )
    last = (
        f"times as fast; the results differ by {result.difference:.1e} of the largest value"
        if timed
        else "times as much costs the baseline"
    )
    return (
        f"{benchmark.name}: {benchmark.description} ({result.amount} {benchmark.unit}, {len(result.subject_cost)} rounds, medians)\n"
        f"{rows}  {result.ratio:12.2f} {last}\n"
    )


if __name__ == "__main__":
    sys.exit(main())

"""Every benchmark runs and its two sides agree; how long they take is nobody's verdict here."""

from __future__ import annotations

import json
import os

import numpy as np
import pytest

from tests.benchmarks.__main__ import main
from tests.benchmarks.harness import ROUNDS, Benchmark, Disagreement, Work, document, measured
from tests.benchmarks.listing import BENCHMARKS


def toy(subject, baseline, tolerance=0.0, close=lambda: None):
    """Return a benchmark of two functions."""
    return Benchmark(
        "toy",
        "counts",
        "ours",
        "theirs",
        "calls",
        lambda size: Work(subject, baseline, len(size), close),
        tolerance,
    )


def test_names_are_unique_and_lines_are_filled():
    assert len({each.name for each in BENCHMARKS}) == len(BENCHMARKS)
    for each in BENCHMARKS:
        assert all((each.name, each.description, each.subject, each.baseline, each.unit)), each.name


@pytest.mark.parametrize("benchmark", BENCHMARKS, ids=lambda each: each.name)
def test_each_runs_at_the_small_size_and_both_sides_agree(benchmark, monkeypatch):
    # Lines of the children that some of them start are counted elsewhere.
    for name in [name for name in os.environ if name.startswith("COVERAGE_")]:
        monkeypatch.delenv(name)
    result = measured(benchmark, size="small", rounds=1)
    assert result.difference <= benchmark.tolerance
    assert all(cost > 0 for cost in result.subject_cost + result.baseline_cost)


@pytest.mark.parametrize(
    ("name", "unit", "words"),
    [("dynamic-curve", "s", "times as fast"), ("compressed-size", "bytes", "times as much")],
)
def test_costs_are_printed_and_written(name, unit, words, tmp_path, capsys):
    assert main([name, "--size", "small", "--json", str(tmp_path / "costs.json")]) == 0
    (entry,) = json.loads((tmp_path / "costs.json").read_text())["benchmarks"]
    assert entry["name"] == name
    assert entry["size"] == "small"
    ours, theirs = entry[f"subject_{unit}"], entry[f"baseline_{unit}"]
    assert len(ours) == len(theirs) == ROUNDS
    assert all(cost > 0 for cost in ours + theirs)
    assert entry["ratio"] == pytest.approx(entry[f"baseline_median_{unit}"] / entry[f"subject_median_{unit}"])
    assert words in capsys.readouterr().out


def test_the_dynamic_curve_is_held_to_1e_8():
    """The accuracy that its description speaks of."""
    (curve,) = (each for each in BENCHMARKS if each.name == "dynamic-curve")
    assert curve.tolerance <= 1e-8


def test_the_sides_take_turns_and_the_first_round_does_not_count():
    calls = []
    benchmark = toy(lambda: calls.append("s") or 1.0, lambda: calls.append("b") or 1.0)
    result = measured(benchmark, rounds=3)
    assert "".join(calls) == "sb" + "sbbssb"
    assert len(result.subject_cost) == 3


@pytest.mark.parametrize(
    ("subject", "baseline", "words"),
    [
        (lambda: [1.0, 2.0], lambda: [1.0, 2.1], "differ by 0.0476"),
        (lambda: [1.0], lambda: [1.0, 2.0], "shape"),
        (lambda: np.nan, lambda: 1.0, "differ by nan"),
    ],
    ids=["value", "shape", "not a number"],
)
def test_sides_that_disagree_are_refused_and_cleared_away(subject, baseline, words):
    closed = []
    with pytest.raises(Disagreement, match=words):
        measured(toy(subject, baseline, 0.01, lambda: closed.append(True)))
    assert closed == [True]


def test_a_document_names_its_surroundings():
    written = document([measured(toy(lambda: 1.0, lambda: 1.0))])
    assert json.loads(json.dumps(written)) == written
    assert set(written["packages"]) >= {"stillroom", "numpy", "scipy"}
    assert written["benchmarks"][0]["amount"] == len("default")


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["no-such"], "expected one of"),
        (["--rounds", "2"], "expected at least 5"),
        (["--json", "/no/such/folder/times.json"], "found no folder"),
    ],
    ids=["name", "rounds", "folder"],
)
def test_bad_arguments_are_refused_in_words(arguments, words, capsys):
    with pytest.raises(SystemExit) as refused:
        main(arguments)
    assert refused.value.code == 2
    assert words in capsys.readouterr().err

"""Peaks and step forms against the tables; shift of the crossing."""

from __future__ import annotations

import csv
import math
from pathlib import Path

import numpy as np
import pytest

from archive.physics.film_dynamic import (
    complex_stiffness,
    fixed_start,
    free_vortex_length,
    reduced_response,
    villain_start,
)
from archive.physics.film_features import dissipation_peak, shift_of_crossing
from archive.physics.film_step import step_stiffness, step_stiffness_linear_flow

TABLES = Path(__file__).parents[2] / "published" / "film-tables"
STARTS = {"V": villain_start, "B": lambda ratio: fixed_start(ratio, b=5.5)}


def rows(name):
    with (TABLES / name).open() as file:
        return list(csv.DictReader(file))


@pytest.mark.parametrize(
    "row", rows("peaks.csv"), ids=lambda row: f"{row['trajectory']} {row['L']} {row['F']}"
)
def test_dissipation_peak(row):
    start_of, L = STARTS[row["trajectory"]], float(row["L"])
    peak = dissipation_peak(start_of, L=L, F=float(row["F"]))
    # The maximum is flat: its place is sharp to about the square root of the precision.
    assert peak.ratio == pytest.approx(float(row["ratio"]), abs=1e-6)
    assert peak.q == pytest.approx(float(row["q"]), abs=6e-7)
    assert pytest.approx(float(row["S"]), abs=2e-5) == peak.S
    l_plus = free_vortex_length(start_of(np.array([peak.ratio])))[0]
    assert l_plus - (L + math.log(14)) / 2 == pytest.approx(float(row["l_plus_minus_l_D"]), abs=1e-4)


@pytest.mark.parametrize("row", rows("step-form.csv"), ids=lambda row: row["ratio"])
def test_step_form_on_the_full_flow(row):
    at = np.array([float(row["ratio"])])
    S, q = reduced_response(at, step_stiffness(villain_start(at), L=12.0))
    assert float(f"{S[0]:.6g}") == float(row["S_step"])
    assert f"{q[0]:.6e}" == row["q_step"]
    _, full = reduced_response(at, complex_stiffness(villain_start(at), L=12.0))
    assert q[0] / full[0] == pytest.approx(float(row["q_step_over_full"]), abs=6e-5)


@pytest.mark.parametrize(
    ("t", "S", "q"),
    [(-0.01, 1.154509, 2.959613e-3), (0.0, 1.073252, 8.443535e-3), (0.01, 0.947100, 3.349828e-2)],
)
def test_step_form_on_the_linear_flow(t, S, q):
    found = reduced_response(np.array([1 + t]), step_stiffness_linear_flow(np.array([t]), b=5.5, L=12.0))
    assert found[0][0] == pytest.approx(S, abs=6e-7)
    assert found[1][0] == pytest.approx(q, abs=6e-9)


def test_step_form_on_the_linear_flow_ends_where_the_flow_ends():
    assert np.isnan(step_stiffness_linear_flow(np.array([0.05]), b=5.5, L=12.0)[0])


def test_shift_of_crossing():
    shift = shift_of_crossing(b=5.5, L=12.0)
    at = np.array([1 + shift])
    S, _ = reduced_response(at, complex_stiffness(fixed_start(at, b=5.5), L=12.0))
    assert S[0] == pytest.approx(1 + shift, rel=1e-10)
    # Table of start B, L = 12: S = 1.047288 at 1.001 and 0.992588 at 1.005.
    assert 0.001 < shift < 0.005


def test_shift_shrinks_with_frequency_ratio():
    shifts = [shift_of_crossing(b=5.5, L=L) for L in (8.0, 12.0, 16.0)]
    assert shifts[0] > shifts[1] > shifts[2] > 0


def test_no_crossing_is_refused():
    with pytest.raises(ValueError, match="no crossing"):
        shift_of_crossing(b=1.0, L=-30.0)

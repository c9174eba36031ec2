"""Static film theory: constants of the reference tables, limits, and inverse functions."""

from __future__ import annotations

import csv
import math
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.optimize import brentq

from archive.physics.film_dynamic import VILLAIN_CRITICAL_STIFFNESS, fixed_start, villain_start
from archive.physics.film_static import (
    UNIVERSAL_JUMP,
    correlation_length_above,
    correlation_length_below,
    flow_invariant,
    onset_coverage,
    renormalised_stiffness,
    static_areal_density,
    superfluid_areal_density,
    x_minus_log1p,
    x_of_s,
)

TABLE = Path(__file__).parents[2] / "published" / "film-tables" / "dynamic-b.csv"


def test_universal_jump():
    """Nelson and Kosterlitz 1977 with CODATA 2022: 3.491357877e-8 kg m^-2 K^-1."""
    assert pytest.approx(3.491357877e-8, rel=2e-9) == UNIVERSAL_JUMP


def test_onset_coverage():
    """8.72272 umol m^-2 K^-1."""
    assert float(onset_coverage(1.0, inert_coverage=0.0)) == pytest.approx(8.72272e-6, abs=5e-12)
    assert float(onset_coverage(0.5, inert_coverage=25e-6)) == pytest.approx(29.36136e-6, abs=5e-11)


def test_villain_critical_stiffness():
    def excess(K):
        x = 2 / (math.pi * K) - 1
        return (2 * math.pi * math.exp(-(math.pi**2) * K / 2)) ** 2 - 2 * (x - math.log1p(x))

    assert pytest.approx(brentq(excess, 0.7, 0.8, xtol=1e-15), abs=1e-12) == VILLAIN_CRITICAL_STIFFNESS
    assert pytest.approx(0.747852422, abs=5e-10) == VILLAIN_CRITICAL_STIFFNESS


def test_villain_b():
    """The constant b = 4 sqrt(dc/dt) at the transition = 2.768394691."""
    step = 1e-4
    up, down = villain_start(np.array([1 + step])), villain_start(np.array([1 - step]))
    slope = (up.invariant[0] - down.invariant[0]) / (2 * step)
    assert 4 * math.sqrt(slope) == pytest.approx(2.768394691, rel=1e-6)


@pytest.mark.parametrize(
    ("start", "expected"),
    [(villain_start(np.array([0.95])), 0.749809), (fixed_start(np.array([0.99]), b=5.5), 0.732818)],
    ids=["V", "B"],
)
def test_renormalised_stiffness(start, expected):
    assert renormalised_stiffness(start.invariant)[0] == pytest.approx(expected, abs=5e-7)


def test_cusp_near_the_transition():
    """K_R = (2/pi)(1 + (b/4) sqrt|t| + O(t))."""
    b, t = 5.0, 1e-8
    ratio = static_areal_density(1 - t, transition_temperature=1.0, b=b) / (UNIVERSAL_JUMP * (1 - t))
    assert float(ratio) - 1 == pytest.approx(b / 4 * math.sqrt(t), rel=1e-3)
    assert float(static_areal_density(1.0001, transition_temperature=1.0, b=b)) == 0


def test_static_areal_density_is_that_of_the_table():
    """Every row of the start with c = (b/4)^2 t exactly, to half a unit of its last digit."""
    rows = list(csv.DictReader(TABLE.read_text(encoding="utf-8").splitlines()))
    assert len(rows) == 15
    for row in rows:
        found = static_areal_density(float(row["ratio"]), transition_temperature=1.0, b=5.5) / UNIVERSAL_JUMP
        assert float(found) == pytest.approx(float(row["S_static"]), abs=5.1e-7), row["ratio"]


@given(st.floats(-2.4, 1.5))
def test_x_of_s_inverts_s_of_x(s):
    x = float(x_of_s(s))
    back = math.copysign(math.sqrt(2 * float(x_minus_log1p(x))), x)
    assert back == pytest.approx(s, rel=1e-12, abs=1e-13)


@pytest.mark.parametrize("x", [-0.9, -0.4, -1.1e-2, -1e-2, -9e-3, 1e-5, 9e-3, 1.1e-2, 0.7])
def test_x_minus_log1p(x):
    # Direct difference in exact rational arithmetic is not available; the series of 400 terms is, for |x| < 1.
    expected = math.fsum((-1) ** k * x**k / k for k in range(2, 400))
    assert float(x_minus_log1p(x)) == pytest.approx(expected, rel=1e-14)


def test_invariant_is_zero_at_the_fixed_point():
    assert float(flow_invariant(x=0.0, fugacity=0.0)) == 0
    assert float(flow_invariant(x=-0.5, fugacity=math.sqrt(0.386294))) == pytest.approx(0.0, abs=1e-6)


def test_correlation_lengths():
    t = 0.01
    assert float(correlation_length_above(t, core=1.0, b=5.5)) == pytest.approx(math.exp(2 * math.pi / 0.55))
    assert float(correlation_length_below(-t, core=1.0, b=5.5)) == pytest.approx(math.exp(1 / 0.55))
    assert math.isnan(float(correlation_length_above(-t, core=1.0, b=5.5)))
    assert math.isnan(float(correlation_length_below(t, core=1.0, b=5.5)))


def test_areal_density_from_period_drop():
    """The example oscillator: with chi = 0.10 the jump at 1 K is a drop of 1.319733 ns."""
    sigma = superfluid_areal_density(1.319733e-9, period_per_areal_density=0.042, drag_factor=0.10)
    assert float(sigma) == pytest.approx(UNIVERSAL_JUMP, rel=1e-6)


def test_doubling_the_area_halves_the_areal_density():
    one = superfluid_areal_density(1e-9, period_per_areal_density=0.042, drag_factor=0.0)
    two = superfluid_areal_density(1e-9, period_per_areal_density=0.084, drag_factor=0.0)
    assert float(one) == 2 * float(two)


@pytest.mark.parametrize(
    "call",
    [
        lambda: superfluid_areal_density(1.0, period_per_areal_density=0.0, drag_factor=0.0),
        lambda: superfluid_areal_density(1.0, period_per_areal_density=1.0, drag_factor=1.0),
        lambda: static_areal_density(1.0, transition_temperature=0.0, b=5.0),
    ],
    ids=["sensitivity", "chi", "transition"],
)
def test_refused(call):
    with pytest.raises(ValueError, match="found"):
        call()

"""Crossing of the universal line."""

from __future__ import annotations

import math

import numpy as np
import pytest

from archive.physics.film_dynamic import complex_stiffness, dynamic_areal_density, fixed_start
from archive.physics.film_features import shift_of_crossing
from archive.physics.film_static import UNIVERSAL_JUMP
from archive.physics.universal_line import crossing_of_universal_line

T = np.linspace(0.7, 1.1, 81)


def test_straight_fall():
    """With sigma = line + k (T_c - T): the crossing is T_c."""
    found = crossing_of_universal_line(T, UNIVERSAL_JUMP * T + 3e-8 * (0.913 - T))
    assert found.temperature == pytest.approx(0.913, abs=1e-10)
    assert found.areal_density == pytest.approx(0.913 * 3.491358e-8, rel=1e-6)
    assert found.slope == pytest.approx(-3e-8, rel=1e-9)


def test_uncertainty_is_honest_and_wild_points_do_not_move_it():
    """Pulls of 800 records: mean 0 and width 1 within four standard errors."""
    rng = np.random.default_rng(7)
    pulls = []
    for _ in range(800):
        noisy = UNIVERSAL_JUMP * T + 3e-8 * (0.913 - T) + rng.normal(0, 3e-10, T.size)
        noisy[10] = 0.0
        noisy[70] = 1e-7
        found = crossing_of_universal_line(T, noisy, standard_uncertainty=3e-10)
        pulls.append((found.temperature - 0.913) / found.standard_uncertainty)
    assert abs(np.mean(pulls)) < 4 / math.sqrt(800)
    assert abs(np.std(pulls) - 1) < 4 / math.sqrt(1600)


def test_dynamic_film_crosses_above_its_static_transition():
    fine = np.linspace(0.89, 0.92, 121)
    K = complex_stiffness(fixed_start(fine / 0.9, b=5.5), L=12.0)
    found = crossing_of_universal_line(fine, dynamic_areal_density(fine, K).real)
    expected = 0.9 * (1 + shift_of_crossing(b=5.5, L=12.0))
    assert found.temperature == pytest.approx(expected, rel=1e-5)


@pytest.mark.parametrize(
    ("sigma", "reason"),
    [(np.zeros_like(T), "below"), (2 * UNIVERSAL_JUMP * T, "above")],
    ids=["below", "above"],
)
def test_no_crossing(sigma, reason):
    found = crossing_of_universal_line(T, sigma)
    assert not found.found
    assert reason in found.reason
    assert math.isnan(found.temperature)


def test_few_points():
    assert "expected at least 8" in crossing_of_universal_line(T[:5], T[:5]).reason


def test_one_temperature():
    assert not crossing_of_universal_line(np.ones(8), [1.0] * 4 + [0.0] * 4).found


@pytest.mark.parametrize(
    ("arguments", "message"), [({"order": 3}, "order"), ({"points": 3}, "points")], ids=["order", "points"]
)
def test_refused(arguments, message):
    with pytest.raises(ValueError, match=message):
        crossing_of_universal_line(T, T, **arguments)

"""The films of the demonstration obey what the theory demands of them."""

from __future__ import annotations

import numpy as np
import pytest

from archive.demo.film import MOLAR_JUMP, coverage_of_transition, planar_transition, response_of, start_of
from archive.demo.truth import PG2, TO4
from archive.physics.film_features import shift_of_crossing

FILM = TO4.film
GLASS = PG2.film


def test_universal_jump_as_amount_is_the_published_one():
    # 8.72272 umol m^-2 K^-1: Nelson and Kosterlitz (1977) with CODATA constants.
    assert abs(MOLAR_JUMP / 8.72272e-6 - 1) < 1e-6


@pytest.mark.parametrize("coverage", [26e-6, 29.5e-6, 37e-6])
def test_all_mass_above_the_inert_layer_flows_at_zero_temperature(coverage):
    real, imaginary = response_of(FILM, 1e-3, coverage)
    assert float(real) == pytest.approx(coverage - FILM.inert, rel=1e-9)
    assert float(imaginary) == 0.0


@pytest.mark.parametrize("coverage", [24.0e-6, 12e-6, 0.0])
def test_nothing_flows_at_or_below_the_inert_coverage(coverage):
    real, imaginary = response_of(FILM, np.array([0.02, 0.5]), coverage)
    assert not real.any()
    assert not imaginary.any()


def test_transition_and_coverage_are_inverse():
    for temperature in (0.1, 0.5, 0.9):
        assert planar_transition(FILM, coverage_of_transition(FILM, temperature)) == pytest.approx(
            temperature
        )


def test_the_invariant_vanishes_at_the_transition_with_slope_b_over_four_squared():
    step = 1e-5
    low, at, high = start_of(FILM, np.array([1 - step, 1.0, 1 + step])).invariant
    assert abs(at) < 1e-14
    assert (high - low) / (2 * step) == pytest.approx((5.5 / 4) ** 2, rel=1e-6)


def test_the_observed_density_meets_the_universal_line_where_the_fixed_start_says():
    # The two trajectories share b and x_0 and differ in second order of T/T_KT - 1 only.
    coverage = 34.5e-6
    transition = planar_transition(FILM, coverage)
    shift = shift_of_crossing(b=FILM.b, L=FILM.log_diffusion, x0=FILM.x0)
    temperature = transition * (1 + shift + np.array([-3e-5, 3e-5]))
    excess = response_of(FILM, temperature, coverage)[0] - MOLAR_JUMP * temperature
    assert excess[0] > 0 > excess[1]


def test_the_dissipation_peak_is_as_high_as_the_theory_allows():
    # 0.26 to 0.33 of the jump for F = 0.5 to 2: Ambegaokar, Halperin, Nelson, Siggia (1980), integrated.
    coverage = 37e-6
    transition = planar_transition(FILM, coverage)
    _, imaginary = response_of(FILM, transition * np.linspace(1.0, 1.1, 2001), coverage)
    peak = imaginary.max() / (MOLAR_JUMP * transition)
    assert 0.26 < peak < 0.33


def test_low_and_high_branches_join():
    coverage = 37e-6
    transition = planar_transition(FILM, coverage)
    real, imaginary = response_of(FILM, transition * np.array([0.2399999, 0.2400001]), coverage)
    assert real[0] == pytest.approx(real[1], rel=1e-7)
    assert imaginary[1] < 1e-9 * real[1]


def test_the_glass_follows_its_power_law_exactly_inside_the_window():
    coverage = 31e-6
    transition = GLASS.transition_temperature(coverage)
    t = np.geomspace(1e-3, 0.11, 9)
    real, _ = response_of(GLASS, transition * (1 - t), coverage)
    slope = np.polyfit(np.log(t), np.log(real), 1)[0]
    assert slope == pytest.approx(GLASS.exponent, abs=1e-12)


def test_the_glass_has_no_step_and_never_more_than_its_mass():
    coverage = 31e-6
    transition = GLASS.transition_temperature(coverage)
    real, _ = response_of(GLASS, transition * np.linspace(1e-3, 1.2, 4001), coverage)
    assert np.all(np.diff(real) <= 1e-18)
    assert real[0] == pytest.approx(coverage - GLASS.inert, rel=1e-6)
    assert real[-1] == 0.0

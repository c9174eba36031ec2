"""Dissipation that depends on amplitude: the decay against its equation solved by others, and the numbers back."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from archive.physics.ringdown_amplitude import amplitude_dependence, amplitude_dependent_decay

T = np.linspace(0.0, 600.0, 300)
RATE = 1 / 150.0


def test_the_decay_solves_its_equation() -> None:
    """Against scipy.integrate.solve_ivp of dA/dt = -r A (1 + b A/A0), relative tolerance 1e-10."""
    solved = solve_ivp(
        lambda _, A: -RATE * A * (1 + 0.7 * A / 2.0), (0, 600), [2.0], t_eval=T, rtol=1e-10, atol=1e-14
    )
    found = amplitude_dependent_decay(T, height=2.0, decay_rate=RATE, relative_change=0.7)
    assert found == pytest.approx(solved.y[0], rel=1e-8)


@pytest.mark.parametrize("background", ["none", "constant", "noise floor"])
def test_a_dependence_is_found_and_measured(background) -> None:
    decay = amplitude_dependent_decay(T, height=1.0, decay_rate=RATE, relative_change=0.5)
    rng = np.random.default_rng(2)
    signal = (
        np.hypot(decay, 2e-3)
        if background == "noise floor"
        else decay + (2e-3 if background == "constant" else 0)
    )
    found = amplitude_dependence(
        T, signal + rng.normal(0, 1e-3, T.size), frequency=1000.0, background=background
    )
    assert found.found
    assert found.probability < 1e-10
    assert abs(found.quality_at_rest - math.pi * 1000 / RATE) < 4 * found.quality_uncertainty
    assert abs(found.relative_change - 0.5) < 4 * found.relative_change_uncertainty
    assert found.simple.curved


@pytest.mark.no_cover
def test_a_constant_quality_factor_is_left_alone() -> None:
    """At the level of one in ten thousand none of two hundred decays is refused, and the dependence scatters about zero."""
    pulls = []
    for seed in range(200):
        rng = np.random.default_rng(seed)
        found = amplitude_dependence(T, np.exp(-RATE * T) + rng.normal(0, 3e-3, T.size), frequency=1000.0)
        assert not found.found
        pulls.append(found.relative_change / found.relative_change_uncertainty)
    assert abs(np.mean(pulls)) < 4 / math.sqrt(200)
    assert abs(np.std(pulls) - 1) < 4 / math.sqrt(400)


def test_an_exact_decay_and_too_few_points() -> None:
    assert not amplitude_dependence(T, np.exp(-RATE * T), frequency=1000.0).found
    with pytest.raises(ValueError, match="expected at least 8"):
        amplitude_dependence(T[:6], np.exp(-RATE * T[:6]), frequency=1000.0)

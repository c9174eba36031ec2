"""Persistent currents: closed forms, and pulls of the fits over simulated records."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from archive.physics.persistent_current import angular_momentum, branch_ratio, decaying, fit_decay

LABORATORIES = 200


def test_circulation_times_mass():
    """kappa_0 = 9.969294e-8 m^2/s (CODATA): N kappa_0/(2 pi) times the superfluid mass that is not dragged along."""
    found = angular_momentum(quanta=1500, density=145.2, extent=8e-6, drag_factor=0.3)
    assert float(found) == pytest.approx(1500 * 9.969294e-8 / (2 * math.pi) * 145.2 * 8e-6 * 0.7, rel=1e-6)


@pytest.mark.parametrize(
    ("changes", "words"), [({"extent": 0.0}, "extent"), ({"drag_factor": 1.0}, "drag_factor")], ids=["extent", "drag"]
)  # fmt: skip
def test_angular_momentum_refuses(changes, words):
    with pytest.raises(ValueError, match=words):
        angular_momentum(**{"quanta": 1.0, "density": 1.0, "extent": 1.0} | changes)


@pytest.mark.parametrize("m", [0.5, 2.0, 5.0])
def test_the_power_law_solves_its_equation(m):
    """dv/dt = -r v (v/v_0)^m, integrated by a solver that knows nothing of the closed form."""
    r, t = 3e-3, np.linspace(0, 5000, 11)
    solved = solve_ivp(lambda _, v: -r * v * v**m, (0, 5000), [1.0], t_eval=t, rtol=1e-10, atol=1e-14)
    assert decaying(t, initial=1.0, rate=r, exponent=m) == pytest.approx(solved.y[0], rel=1e-8)


def test_the_exponential_is_the_limit():
    t = np.linspace(0, 10, 5)
    assert decaying(t, initial=2.0, rate=0.3, exponent=0.0) == pytest.approx(2 * np.exp(-0.3 * t), rel=1e-12)
    assert decaying(t, initial=2.0, rate=0.3, exponent=1e-7) == pytest.approx(2 * np.exp(-0.3 * t), rel=1e-5)


def decay_of(seed, *, rows=120, noise=2e-12):
    """Return a decay with noise: 6e-10 kg m^2/s, m = 3.6, first decay time 2000 s."""
    rng = np.random.default_rng(seed)
    t = np.linspace(0, 72000, rows)
    return t, decaying(t, initial=6e-10, rate=1 / 2000, exponent=3.6) + noise * rng.normal(size=rows)


@pytest.mark.slow
@pytest.mark.no_cover
def test_two_hundred_decays_pull_with_unit_width():
    pulls = {"initial": [], "rate": [], "exponent": []}
    truth = {"initial": 6e-10, "rate": 1 / 2000, "exponent": 3.6}
    for seed in range(LABORATORIES):
        t, y = decay_of(seed)
        found = fit_decay(t, y, standard_uncertainty=2e-12)
        assert found.found, found.reason
        for name, values in pulls.items():
            values.append((found.fit.value(name) - truth[name]) / found.fit.standard_uncertainty(name))
    for name, values in pulls.items():
        each = np.array(values)
        assert abs(each.mean()) < 4 * each.std() / math.sqrt(LABORATORIES), name
        assert abs(each.std() - 1) < 4 / math.sqrt(2 * LABORATORIES), name


def test_a_power_law_is_told_from_an_exponential_and_without_uncertainties_too():
    t, y = decay_of(1)
    weighted, plain = fit_decay(t, y, standard_uncertainty=2e-12), fit_decay(t, y)
    assert weighted.exponential_chi2 > 100 * weighted.fit.chi2
    assert plain.fit.value("exponent") == pytest.approx(weighted.fit.value("exponent"), rel=1e-4)
    assert plain.fit.standard_uncertainty("exponent") == pytest.approx(
        weighted.fit.standard_uncertainty("exponent"), rel=0.3
    )


def test_a_current_that_keeps_has_no_decay():
    """At most a few of a thousand constant records may look like a decay: of these twelve, none."""
    rng = np.random.default_rng(5)
    t = np.linspace(0, 7200, 60)
    for _ in range(12):
        found = fit_decay(t, 6e-10 + 2e-12 * rng.normal(size=60), standard_uncertainty=2e-12)
        assert not found.found
        assert found.reason == "no decay is seen above the scatter"


def test_a_growing_current_has_no_decay():
    t = np.linspace(0, 7200, 60)
    assert not fit_decay(t, 6e-10 * (1 + t / 7200), standard_uncertainty=2e-12).found


def test_both_signs_are_refused_and_one_sign_is_not():
    t, y = decay_of(2)
    with pytest.raises(ValueError, match="both signs"):
        fit_decay(t, y - y.mean())
    assert fit_decay(t, -y).fit.value("exponent") == pytest.approx(
        fit_decay(t, y).fit.value("exponent"), rel=1e-5
    )


def cycle_of(seed, left, *, rows=300, noise=1e-3):
    """Return a cycle in temperature whose second half is `left` times what it would be."""
    rng = np.random.default_rng(seed)
    up = np.linspace(1.3, 2.1, rows // 2)
    T = np.concatenate([up, up[::-1] - 1e-3])
    y = (1 - (T / 2.3) ** 5) * np.where(np.arange(rows) < rows // 2, 1.0, left)
    return T, y + noise * rng.normal(size=rows)


def test_two_hundred_cycles_pull_with_unit_width():
    pulls = []
    for seed in range(LABORATORIES):
        T, y = cycle_of(seed, 0.95)
        found = branch_ratio(T, y, turn=150, standard_uncertainty=1e-3)
        pulls.append((found.ratio - 0.95) / found.standard_uncertainty)
    each = np.array(pulls)
    assert abs(each.mean()) < 4 * each.std() / math.sqrt(LABORATORIES)
    assert abs(each.std() - 1) < 4 / math.sqrt(2 * LABORATORIES)


def test_without_uncertainties_the_scatter_decides():
    T, y = cycle_of(3, 0.9)
    weighted, plain = branch_ratio(T, y, turn=150, standard_uncertainty=1e-3), branch_ratio(T, y, turn=150)
    assert plain.ratio == pytest.approx(weighted.ratio, abs=2e-4)
    assert plain.standard_uncertainty == pytest.approx(weighted.standard_uncertainty, rel=0.3)


@pytest.mark.parametrize("turn", [0, 300, 296], ids=["only back", "only there", "a few back"])
def test_a_record_of_one_way_has_no_ratio(turn):
    T, y = cycle_of(1, 1.0)
    if turn == 296:
        T = np.linspace(1.3, 2.1, 300)
        T[296:] = 5.0
    assert branch_ratio(T, y, turn=turn) is None


def test_a_decay_faster_than_an_exponential_is_no_power_law():
    t = np.linspace(0, 4, 60)
    found = fit_decay(t, 6e-10 * np.exp(-(t**2) / 4), standard_uncertainty=2e-12)
    assert not found.found
    assert "exponential" in found.reason


def test_readings_without_scatter():
    t = np.linspace(0, 7200, 60)
    assert not fit_decay(t, np.full(60, 6e-10)).found
    T = np.concatenate([np.linspace(1.3, 2.1, 100), np.linspace(2.1, 1.3, 100)])
    found = branch_ratio(T, (3 - T) * np.where(np.arange(200) < 100, 1.0, 0.75), turn=100)
    assert found.ratio == pytest.approx(0.75, rel=1e-9)
    assert found.standard_uncertainty < 1e-9


def test_groups_with_one_way_only_are_left_out():
    """The way back is read densely below 1.5 K only: the rest says nothing."""
    T = np.concatenate([np.linspace(1.3, 2.1, 200), [2.1], np.linspace(1.5, 1.3, 60)])
    y = (3 - T) * np.where(np.arange(T.size) < 200, 1.0, 0.9)
    found = branch_ratio(T, y, turn=200)
    assert found.groups < 8
    assert found.ratio == pytest.approx(0.9, rel=1e-9)

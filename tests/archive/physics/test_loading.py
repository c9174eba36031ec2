"""Two-slope loading curve: values and covariance back, refusals with reasons."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from archive.physics.loading import fit_loading


def curve(n, P0=1e-3, slope=1.7e-4, chi=0.3, onset=27.3e-6):
    return P0 + slope * np.minimum(n, onset) + chi * slope * np.maximum(n - onset, 0)


N = np.linspace(2e-6, 60e-6, 24)


@settings(max_examples=30, deadline=None)
@given(st.floats(0.0, 0.9), st.floats(15e-6, 45e-6))
def test_exact_curve_returns_its_input(chi, onset):
    found = fit_loading(N, curve(N, chi=chi, onset=onset))
    assert found.found, found.reason
    assert found.value("slope") == pytest.approx(1.7e-4, rel=1e-6)
    assert found.value("drag_factor") == pytest.approx(chi, abs=1e-6)
    assert found.value("onset_coverage") == pytest.approx(onset, rel=1e-5)
    assert found.value("period_at_zero") == pytest.approx(1e-3, rel=1e-12)


@pytest.mark.no_cover
def test_covariance_is_honest():
    """Scatter of the four values over many noisy runs agrees with the covariance, correlation included."""
    rng = np.random.default_rng(11)
    runs = [fit_loading(N, curve(N) + rng.normal(0, 2e-11, N.size)) for _ in range(300)]
    assert all(run.found for run in runs)
    values = np.array([run.values for run in runs])
    mean_covariance = np.mean([run.covariance for run in runs], axis=0)
    seen = np.cov(values.T)
    ratio = np.sqrt(np.diag(seen) / np.diag(mean_covariance))
    np.testing.assert_allclose(ratio, 1.0, atol=0.2)
    size = np.sqrt(np.diag(mean_covariance))
    np.testing.assert_allclose(
        seen[0, 1] / (size[0] * size[1]), mean_covariance[0, 1] / (size[0] * size[1]), atol=0.2
    )


def test_flat_substrate_is_not_refused():
    """With chi = 0 half the noisy runs give a ratio of slopes below zero."""
    rng = np.random.default_rng(12)
    runs = [fit_loading(N, curve(N, chi=0.0) + rng.normal(0, 2e-11, N.size)) for _ in range(50)]
    assert sum(run.found for run in runs) >= 49
    assert any(run.value("drag_factor") < 0 for run in runs)


def test_order_does_not_matter():
    shuffled = np.random.default_rng(1).permutation(N.size)
    a, b = fit_loading(N, curve(N)), fit_loading(N[shuffled], curve(N)[shuffled])
    np.testing.assert_array_equal(a.values, b.values)


def test_absolute_uncertainty():
    found = fit_loading(N, curve(N), standard_uncertainty=1e-11, absolute=True)
    twice = fit_loading(N, curve(N), standard_uncertainty=2e-11, absolute=True)
    assert twice.standard_uncertainty("drag_factor") == pytest.approx(
        2 * found.standard_uncertainty("drag_factor")
    )
    assert found.points_below + found.points_past == N.size


@pytest.mark.parametrize(
    ("n", "P", "reason"),
    [
        (N[:7], curve(N[:7]), "expected at least 4"),
        (N, 1e-3 + 1e-4 * N, "no onset is seen"),
        (N, 1e-3 - curve(N), "expected > 0"),
        (N, curve(N, chi=1.5), "expected 0 <= chi < 1"),
        (N, curve(N, chi=-0.5), "expected 0 <= chi < 1"),
        (N, curve(N) + np.where(N > 30e-6, 1e-8, 0.0), "the two lines meet"),
    ],
    ids=["few", "straight", "falling", "rising slope", "negative chi", "step"],
)
def test_refusals(n, P, reason):
    found = fit_loading(n, P)
    assert not found.found
    assert reason in found.reason
    assert math.isnan(found.value("drag_factor"))

"""Background: the right order, covariance, and never a value outside the range."""

from __future__ import annotations

import numpy as np
import pytest

from archive.physics.polynomial_background import fit_background

T = np.linspace(0.05, 1.5, 80)


@pytest.mark.parametrize("order", [0, 1, 2, 4])
def test_lowest_order_is_found(order):
    """The noise is fixed; a test at 1 and 5 per cent may err for another seed, so seeds are not tuned but counted."""
    shape = np.polynomial.chebyshev.chebval((2 * T - 1.55) / 1.45, [1.0] + [1e-4] * order)
    chosen = []
    for seed in range(20):
        noisy = shape + np.random.default_rng(seed).normal(0, 2e-6, T.size)
        chosen.append(fit_background(T, noisy).order)
    assert min(chosen) >= order
    assert np.count_nonzero(np.array(chosen) == order) >= 15


def test_exact_polynomial():
    found = fit_background(T, 1e-3 + 2e-9 * T**2)
    assert found.order == 2
    assert found.accepted
    value, u, outside = found.evaluate([0.05, 0.7, 1.5])
    np.testing.assert_allclose(value, 1e-3 + 2e-9 * np.array([0.05, 0.7, 1.5]) ** 2, rtol=1e-13)
    assert not outside.any()
    assert (u < 1e-12).all()


def test_never_extrapolated():
    value, u, outside = fit_background(T, T).evaluate([0.0499, 0.05, 1.5, 1.5001, np.nan])
    np.testing.assert_array_equal(outside, [True, False, False, True, True])
    np.testing.assert_array_equal(np.isnan(value), outside)
    np.testing.assert_array_equal(np.isnan(u), outside)


def test_uncertainty_is_honest():
    pulls = []
    for seed in range(200):
        noisy = 1 + 0.1 * T + np.random.default_rng(seed).normal(0, 0.01, T.size)
        found = fit_background(T, noisy, order=1, standard_uncertainty=0.01, absolute=True)
        value, u, _ = found.evaluate(0.3)
        pulls.append((value[0] - 1.03) / u[0])
    assert np.std(pulls) == pytest.approx(1.0, abs=0.12)


def test_shape_that_no_low_order_takes_is_said():
    found = fit_background(T, np.sin(40 * T), highest_order=4)
    assert not found.accepted
    assert found.order == 4
    assert "no order up to 4" in found.message


def test_understated_uncertainty_does_not_pass():
    noisy = 1 + np.random.default_rng(0).normal(0, 0.01, T.size)
    assert not fit_background(T, noisy, standard_uncertainty=0.001, absolute=True, highest_order=3).accepted


def test_residuals_keep_the_order_of_the_data():
    y = 1 + 0.1 * T + np.random.default_rng(0).normal(0, 0.01, T.size)
    forward, backward = fit_background(T, y, order=1), fit_background(T[::-1], y[::-1], order=1)
    np.testing.assert_allclose(forward.fit.residuals, backward.fit.residuals[::-1], atol=1e-12)


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ({"temperature": T, "values": T[:-1]}, "values: found"),
        ({"temperature": T, "values": T, "order": 79}, "order: found"),
        ({"temperature": np.ones(6), "values": np.ones(6)}, "one value"),
    ],
    ids=["length", "order", "one temperature"],
)
def test_refused(arguments, message):
    with pytest.raises(ValueError, match=message):
        fit_background(**arguments)

"""Allan deviation: cases with a known answer."""

from __future__ import annotations

import numpy as np
import pytest

from archive.physics.allan_deviation import allan_deviation, thermal_allan_deviation


def test_by_hand():
    """Five readings, factor 1: half the mean square of the differences 1, -2, 3, -1 (in units of 1e-6)."""
    values = 1.0 + 1e-6 * np.array([0.0, 1.0, -1.0, 2.0, 1.0])
    found = allan_deviation(values, interval=10.0, factors=[1, 2])
    assert found.sigma[0] == pytest.approx(1e-6 * np.sqrt(0.5 * (1 + 4 + 9 + 1) / 4), rel=1e-5)
    # Factor 2: means 0.5, 0, 0.5, 1.5; overlapping differences two apart: 0, 1.5.
    assert found.sigma[1] == pytest.approx(1e-6 * np.sqrt(0.5 * (0 + 2.25) / 2), rel=1e-5)
    np.testing.assert_array_equal(found.tau, [10.0, 20.0])
    np.testing.assert_array_equal(found.averages, [4, 2])


def test_drift_rises_with_tau():
    """A linear drift d per reading gives d m/sqrt(2)."""
    found = allan_deviation(1.0 + 1e-7 * np.arange(200), interval=1.0, factors=[1, 4, 16])
    np.testing.assert_allclose(found.sigma, 1e-7 * np.array([1, 4, 16]) / np.sqrt(2), rtol=1e-4)


def test_white_noise_falls_with_the_root():
    rng = np.random.default_rng(1)
    found = allan_deviation(1.0 + 1e-8 * rng.normal(size=20000), interval=1.0, factors=[1, 16])
    assert found.sigma[0] == pytest.approx(1e-8, rel=0.05)
    assert found.sigma[1] == pytest.approx(0.25e-8, rel=0.1)


def test_period_and_frequency_agree():
    rng = np.random.default_rng(2)
    period = 1e-3 * (1 + 1e-7 * rng.normal(size=500))
    a, b = allan_deviation(period, interval=1.0), allan_deviation(1 / period, interval=1.0)
    np.testing.assert_allclose(a.sigma, b.sigma, rtol=1e-5)
    assert a.averages[-1] >= 1


def test_thermal_limit_of_the_example():
    """Example oscillator at v_rim = 1 mm/s (2.122e-5 rad), Q = 5e5, 1 K, 100 s: 7.0e-14."""
    found = thermal_allan_deviation(
        temperature=1.0, inertia=5e-7, frequency=1000.0, amplitude=2.122e-5, quality_factor=5e5, tau=100.0
    )
    assert float(found) == pytest.approx(7.0e-14, abs=0.05e-14)


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ({"interval": 0.0}, "interval"),
        ({"interval": 1.0, "factors": [3]}, r"factors\[0\]"),
        ({"interval": 1.0, "factors": [0]}, "factors"),
    ],
    ids=["interval", "long", "zero"],
)
def test_refused(arguments, message):
    with pytest.raises(ValueError, match=message):
        allan_deviation([1.0, 1.0, 1.0, 1.0], **arguments)

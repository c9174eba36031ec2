"""Gravity at the lambda point."""

from __future__ import annotations

import math

import pytest

from archive.physics import helium_liquid
from archive.physics.lambda_gravity import lambda_spread, reduced_temperature_limit
from archive.physics.lambda_line import LAMBDA_SLOPE


def test_one_centimetre():
    """1.273 uK per cm: G. Ahlers, Phys. Rev. 171, 275 (1968), number from memory; 2 per cent is the uncertainty of the slope."""
    found = float(lambda_spread(0.01, density=146.15))
    assert found == pytest.approx(1.273e-6, rel=0.02)
    # The parabola through the whole line would give 1.57 uK.
    assert found < 1.31e-6


def test_one_slope_in_the_house():
    T = [float(helium_liquid.lambda_temperature_estimate(p)) for p in (1e4, 2e4)]
    assert (T[1] - T[0]) / 1e4 == pytest.approx(LAMBDA_SLOPE, rel=1e-6)


def test_limit():
    """5.8e-7 for each centimetre of height."""
    limit = float(reduced_temperature_limit(0.03, density=146.15, lambda_temperature=2.1768))
    assert limit == pytest.approx(3 * 5.85e-7, rel=2e-3)


@pytest.mark.parametrize("n", [3.0, 5.0])
def test_mean_of_a_logarithm_over_the_height(n):
    """Exact mean of -ln t over an interval of unit width about n, against the second-order term 1/(24 n^2) that the notes state."""

    def integral(t):
        return -(t * math.log(t) - t)

    mean = integral(n + 0.5) - integral(n - 0.5)
    assert mean + math.log(n) == pytest.approx(1 / (24 * n**2), rel=0.02)


def test_refused():
    with pytest.raises(ValueError, match="height: found"):
        lambda_spread(-0.01, density=146.0)
    with pytest.raises(ValueError, match="lambda_temperature: found 0"):
        reduced_temperature_limit(0.01, density=146.0, lambda_temperature=0.0)

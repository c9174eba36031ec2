"""Ringdown: Q back from known decays, conventions, and refusals."""

from __future__ import annotations

import math

import numpy as np
import pytest

from archive.physics.ringdown import local_dissipation, quality_factor, ringdown

T = np.linspace(0.0, 600.0, 400)
TAU = 159.0


def test_amplitude_and_energy_agree():
    """The energy of a decay falls twice as fast: both conventions give Q = pi f tau."""
    amplitude = np.exp(-T / TAU)
    one = ringdown(T, amplitude, frequency=1000.0, convention="amplitude")
    two = ringdown(T, amplitude**2, frequency=1000.0, convention="energy")
    expected = math.pi * 1000 * TAU
    assert one.quality_factor == pytest.approx(expected, rel=1e-8)
    assert two.quality_factor == pytest.approx(expected, rel=1e-8)
    assert one.converged
    assert not one.curved
    assert float(quality_factor(frequency=1000.0, decay_time=TAU / 2, convention="energy")) == pytest.approx(
        expected
    )


@pytest.mark.parametrize(
    ("background", "signal", "level"),
    [
        ("none", lambda d: d, None),
        ("constant", lambda d: d + 0.05, "baseline"),
        ("noise floor", lambda d: np.hypot(d, 0.05), "floor"),
    ],
    ids=["none", "constant", "floor"],
)
@pytest.mark.parametrize("height", [1.0, 3e-7])
def test_backgrounds(background, signal, level, height):
    found = ringdown(
        T, height * signal(np.exp(-T / TAU)), frequency=500.0, convention="amplitude", background=background
    )
    assert found.converged, found.message
    assert found.fit.value("decay_time") == pytest.approx(TAU, rel=1e-6)
    if level:
        assert found.fit.value(level) == pytest.approx(0.05 * height, rel=1e-5)


def test_two_rates_are_called_curved():
    assert ringdown(
        T, np.exp(-T / TAU) + np.exp(-T / 30), frequency=1e3, convention="amplitude", background="none"
    ).curved


def test_a_record_that_grows_is_not_converged():
    found = ringdown(T, np.exp(T / TAU), frequency=1000.0, convention="amplitude", background="none")
    assert not found.converged
    assert math.isinf(found.quality_factor)


def test_local_dissipation():
    """Q^-1 = c theta gives theta = 1/(1/theta0 + pi f c t): read c back piece by piece."""
    f, c = 1000.0, 1e-6
    theta = 1 / (1 + math.pi * f * c * T)
    mean, dissipation, u = local_dissipation(T, theta, frequency=f, points=20)
    np.testing.assert_allclose(dissipation, c * mean, rtol=2e-3)
    assert (u > 0).all()


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"convention": "power"}, "convention"),
        ({"frequency": 0.0}, "frequency"),
        ({"background": "drift"}, "background"),
        ({"time": T[::-1]}, "time"),
    ],
    ids=["convention", "frequency", "background", "time"],
)
def test_refused(change, message):
    arguments = {"time": T, "signal": np.exp(-T), "frequency": 1.0, "convention": "amplitude"} | change
    with pytest.raises(ValueError, match=message):
        ringdown(**arguments)


def test_local_dissipation_needs_three_points():
    with pytest.raises(ValueError, match="points: found 2"):
        local_dissipation(T, np.exp(-T), frequency=1.0, points=2)

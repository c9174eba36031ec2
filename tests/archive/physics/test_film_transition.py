"""Fit of the dynamic theory: a synthetic record returns its input within the stated uncertainty."""

from __future__ import annotations

import math

import numpy as np
import pytest

from archive.physics.film_dynamic import complex_stiffness, dynamic_areal_density, fixed_start
from archive.physics.film_transition import FREE_BY_DEFAULT, fit_film_transition

W = 2 * math.pi * 1000.0
SCALE = 2 * 0.042 * 0.9 / 1e-3
"""A (1 - chi)/M = 2 (dP/dsigma)(1 - chi)/P of the example oscillator with chi = 0.1, m^2/kg."""

INPUT = {
    "transition_temperature": 0.9,
    "b": 6.2,
    "log_diffusivity": 11.4 + math.log(W),
    "F": 1.0,
    "scale": SCALE,
}


def record(seed, relative_noise=1e-3, points=45, **change):
    given = INPUT | change
    T = np.linspace(0.75, 1.05, points)
    start = fixed_start(T / given["transition_temperature"], b=given["b"])
    K = complex_stiffness(start, L=given["log_diffusivity"] - math.log(W), F=given["F"])
    ratio = given["scale"] * dynamic_areal_density(T, K)
    u = relative_noise * ratio.real.max()
    rng = np.random.default_rng(seed)
    return T, ratio.real + rng.normal(0, u, T.size) + 3 * u, -ratio.imag + rng.normal(0, u, T.size), u


def fitted(seed, *, free=FREE_BY_DEFAULT, arguments=(), **change):
    T, drop, loss, u = record(seed, **change)
    options = {"scale": SCALE} | dict(arguments)
    return fit_film_transition(
        T,
        drop,
        loss,
        standard_uncertainty_drop=u,
        standard_uncertainty_dissipation=u,
        angular_frequency=W,
        free=free,
        **options,
    ), u


@pytest.mark.parametrize(
    "change",
    [{}, {"b": 2.8, "transition_temperature": 0.88}, {"log_diffusivity": 15.0 + math.log(W)}],
    ids=["usual", "small b", "slow"],
)
def test_input_comes_back(change):
    found, u = fitted(1, **change)
    assert found.fit.converged, found.fit.message
    for name in ("transition_temperature", "b", "log_diffusivity"):
        pull = (found.values[name] - (INPUT | change)[name]) / found.standard_uncertainty(name)
        assert abs(pull) < 4, name
    assert found.values["drop_offset"] == pytest.approx(3 * u, abs=u)
    assert 0.6 < found.fit.reduced_chi2 < 1.4
    assert found.chi2_drop + found.chi2_dissipation == pytest.approx(found.fit.chi2)
    assert found.standard_uncertainty("F") == 0
    assert found.transition_temperature == found.values["transition_temperature"]
    assert found.standard_uncertainty("transition_temperature") < 2e-4


def test_free_scale_tests_the_universal_jump():
    found, _ = fitted(2, free=(*FREE_BY_DEFAULT, "scale"))
    assert found.fit.converged
    assert found.values["scale"] / SCALE == pytest.approx(1.0, abs=0.005)


def test_the_scale_alone_may_be_fitted():
    found, _ = fitted(2, free=("scale",), arguments={"scale": 1.05 * SCALE})
    assert found.fit.names == ("scale",)


def test_free_vortex_prefactor():
    found, _ = fitted(3, free=(*FREE_BY_DEFAULT, "F"), F=1.5)
    assert found.fit.converged
    assert abs(found.values["F"] - 1.5) < 4 * found.standard_uncertainty("F")


def test_scale_stays_within_its_bounds():
    found, _ = fitted(
        4,
        free=(*FREE_BY_DEFAULT, "scale"),
        arguments={"scale": 1.1 * SCALE, "scale_uncertainty": 0.01 * SCALE},
    )
    assert found.values["scale"] >= 1.08 * SCALE * (1 - 1e-9)
    assert "scale" in found.fit.at_bound


def test_given_start_values_are_used():
    found, _ = fitted(1, arguments={"start": {"b": 6.0, "log_diffusivity": 11.0 + math.log(W)}})
    assert found.fit.converged
    assert found.values["b"] == pytest.approx(6.2, abs=0.1)


@pytest.mark.parametrize(
    ("arguments", "free", "message"),
    [
        ({"scale": 0.0}, FREE_BY_DEFAULT, "scale"),
        ({}, ("core",), "found 'core'"),
        ({"start": {"b": 50.0}}, FREE_BY_DEFAULT, "expected 1.0 to 20.0"),
    ],
    ids=["scale", "name", "start"],
)
def test_refused(arguments, free, message):
    with pytest.raises(ValueError, match=message):
        fitted(1, free=free, arguments=arguments)

"""Singularity of the heat capacity: universality closed against its inverse, shape against quadrature, truth and bound recovered."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.stats import truncnorm

from archive.physics.porous_singularity import (
    ALPHA,
    AMPLITUDE_RATIO,
    expected_amplitude,
    mean_shape,
    singular_part,
    upper_bound,
)
from archive.physics.two_scale_factor import two_scale_factor

TC = 0.08


def test_the_expected_amplitude_inverts_the_two_scale_factor():
    xi = np.array([3.4e-10, 1e-8, 5e-8])
    A = expected_amplitude(xi, combination=0.815)
    assert two_scale_factor(xi, heat_capacity_amplitude=A * 27.38e-6, molar_volume=27.38e-6) == pytest.approx(
        np.full(3, 0.815), rel=1e-12
    )


def test_bulk_liquid_and_a_film():
    """Bulk: A^- = 5.6537 J/(mol K) in 27.38 cm^3/mol goes with R = 0.8500 at 3.45 angstrom."""
    bulk = 5.6537 / 27.38e-6
    assert float(expected_amplitude(3.45e-10, combination=0.85)) == pytest.approx(bulk, rel=2e-4)
    # "1e4 to 1e5 below bulk" (common practice, no source) is a length of 7 to 16 nm.
    for xi, factor in ((7.4e-9, 1e4), (16e-9, 1e5)):
        assert float(bulk / expected_amplitude(xi, combination=0.85)) == pytest.approx(factor, rel=0.02)


@pytest.mark.parametrize("t", [-0.05, -1e-3, 0.0, 4e-4, 0.03])
def test_the_mean_shape_is_the_integral(t):
    width = 2e-3

    def law(at):
        return ((1 if at < 0 else AMPLITUDE_RATIO) * abs(at) ** -ALPHA - 1) / ALPHA

    pieces = sorted({t - width / 2, t + width / 2, *([0.0] if abs(t) < width / 2 else [])})
    total = sum(quad(law, a, b, epsrel=1e-11)[0] for a, b in pairwise(pieces))
    assert float(mean_shape(t, width=width)) == pytest.approx(total / width, rel=1e-9)


def test_the_shape_is_nearly_a_logarithm_below():
    """(|t|^-alpha - 1)/alpha for t = -1e-4: -ln(1e-4) = 9.21, less by half alpha times its square, 0.52."""
    assert float(mean_shape(-1e-4, width=1e-9)) == pytest.approx(9.21 - 0.0127 * 9.21**2 / 2, abs=0.03)


def record(rng, amplitude, noise, rows=160):
    T = TC * (1 + np.linspace(-0.09, 0.09, rows))
    step = 0.18 * TC / rows
    t = T / TC - 1
    # A film's own heat capacity: smooth, quadratic and a little more.
    smooth = 2.0 + 3.0 * t - 4.0 * t**2 + 2.0 * t**3
    C = smooth + amplitude * mean_shape(t, width=step / TC) + noise * rng.normal(size=rows)
    return T, C, step


def test_truth_is_recovered_with_the_uncertainty_that_is_told():
    rng = np.random.default_rng(5)
    pulls, tight = [], 0
    for _ in range(200):
        T, C, step = record(rng, 0.02, 0.004)
        found = singular_part(T, C, transition_temperature=TC, width=step, standard_uncertainty=0.004)
        pulls.append((found.amplitude - 0.02) / found.standard_uncertainty)
        bound = upper_bound(found.amplitude, standard_uncertainty=found.standard_uncertainty)
        tight += bound >= 0.02
    assert np.mean(pulls) == pytest.approx(0, abs=4 / math.sqrt(200))
    assert np.std(pulls) == pytest.approx(1, abs=4 / math.sqrt(400))
    # 95 per cent of the bounds hold, within four binomial standard deviations.
    assert tight / 200 == pytest.approx(0.95, abs=4 * math.sqrt(0.05 * 0.95 / 200))


def test_nothing_there_gives_a_bound_of_the_size_of_the_scatter():
    rng = np.random.default_rng(6)
    T, C, step = record(rng, 0.0, 0.004)
    found = singular_part(T, C, transition_temperature=TC, width=step)
    assert abs(found.amplitude) < 4 * found.standard_uncertainty
    assert found.scatter == pytest.approx(0.004, rel=0.2)
    bound = upper_bound(found.amplitude, standard_uncertainty=found.standard_uncertainty)
    assert 0 < bound < 5 * found.standard_uncertainty
    assert math.isnan(found.reduced_chi2)


@pytest.mark.parametrize("value", [-8.0, -1.0, 0.0, 0.7, 6.0])
def test_the_bound_is_the_quantile_of_the_cut_normal(value):
    expected = truncnorm.ppf(0.95, -value / 2.0, math.inf, loc=value, scale=2.0)
    assert upper_bound(value, standard_uncertainty=2.0) == pytest.approx(expected, rel=1e-6)
    assert upper_bound(value, standard_uncertainty=2.0) > 0


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"window": 0.0}, "window"),
        ({"transition_temperature": 0.2}, "0 points above|0 points below|points"),
        ({"width": 0.0}, "width"),
        ({"order": 0}, "order"),
    ],
)
def test_refused_arguments(change, words):
    T, C, step = record(np.random.default_rng(1), 0.0, 0.01, rows=40)
    with pytest.raises(ValueError, match=words):
        singular_part(T, C, **({"transition_temperature": TC, "width": step} | change))


def test_bounds_and_amplitudes_need_what_is_positive():
    with pytest.raises(ValueError, match="length_amplitude"):
        expected_amplitude([1e-9, 0.0])
    with pytest.raises(ValueError, match="standard_uncertainty"):
        upper_bound(1.0, standard_uncertainty=0.0)

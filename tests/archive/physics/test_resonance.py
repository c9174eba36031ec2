"""Resonance search: exact return of what was put in, refusals, and measured sweeps."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from archive.physics.resonance import fit_resonance, frequency_of_largest_response, resonance_curve

FOLDER = Path(__file__).parents[2] / "real" / "superfluid-resonator-sweeps"

LARGEST_RESPONSE = {4: 1035.8, 5: 1050.3, 6: 1108.0, 7: 1134.4}
"""Hz, from SOURCE.md of the sweeps (a cross-check with a constant background removed; the medians give it exactly)."""


def sweep(name):
    return np.loadtxt(FOLDER / f"{name}.txt").T


@pytest.mark.parametrize("number", range(4))
def test_largest_response_at_the_edge_is_no_maximum(number):
    f, x, y = sweep(f"data_{number}")
    assert math.isnan(frequency_of_largest_response(f, x, y))


@pytest.mark.parametrize("number", range(4, 22))
def test_largest_response(number):
    f, x, y = sweep(f"data_{number}")
    expected = LARGEST_RESPONSE.get(number, 1141.6 if number % 2 == 0 else 1139.2)
    found = frequency_of_largest_response(f, x, y)
    assert found == pytest.approx(expected, abs=0.05)


@pytest.mark.parametrize("number", range(6))
def test_constant_background_is_refused_where_it_does_not_describe_the_record(number):
    found = fit_resonance(*sweep(f"data_{number}"))
    assert not found.found
    assert found.reason.startswith("no resonance in range: ")
    assert math.isnan(found.frequency)
    assert found.structured


def test_sloped_background_shows_one_resonance_that_grows():
    """The fitted row is smooth: rising frequency and Q to data_8, then constant within the lock-in's delay."""
    found = [fit_resonance(*sweep(f"data_{number}"), background="sloped") for number in range(22)]
    assert all(result.found for result in found)
    frequency = np.array([result.frequency for result in found])
    quality = np.array([result.quality_factor for result in found])
    assert (np.diff(frequency[:9]) > 0).all()
    assert (np.diff(quality[:9]) > 0).all()
    assert np.ptp(frequency[8:]) < 2.4
    # Up-sweeps lie above down-sweeps: the delay of the lock-in.
    assert (frequency[8::2] > frequency[9::2]).all()


def test_narrow_sweep():
    found = fit_resonance(*sweep("data"))
    assert found.found
    assert 332 < found.frequency < 334
    assert found.fit.standard_uncertainty("frequency") < 0.05


def test_no_resonance_in_noise():
    rng = np.random.default_rng(20)
    f = np.linspace(900.0, 1100.0, 300)
    found = fit_resonance(f, 1 + rng.normal(0, 0.1, f.size), rng.normal(0, 0.1, f.size))
    assert not found.found
    assert "the background alone describes the record" in found.reason
    assert found.probability > 1e-6


@pytest.mark.parametrize(
    ("f0", "Q"),
    [(1105.0, 500.0), (1250.0, 200.0), (1099.0, 200.0), (1000.0, 1.0)],
    ids=["over", "far", "edge", "wide"],
)
def test_no_resonance_inside(f0, Q):
    rng = np.random.default_rng(3)
    f = np.linspace(900.0, 1100.0, 400)
    z = resonance_curve(f, resonance_frequency=f0, quality_factor=Q, height=1.0, phase=0.3)
    z = z + 0.002 * (rng.normal(size=f.size) + 1j * rng.normal(size=f.size))
    found = fit_resonance(f, z.real, z.imag)
    assert not found.found
    assert math.isnan(found.quality_factor)


def test_a_record_that_does_not_change():
    f = np.linspace(1.0, 2.0, 20)
    assert "does not change" in fit_resonance(f, np.ones(20), np.zeros(20)).reason


def test_one_wild_point_is_no_resonance():
    rng = np.random.default_rng(5)
    f = np.linspace(900.0, 1100.0, 200)
    x, y = rng.normal(0, 1e-3, f.size), rng.normal(0, 1e-3, f.size)
    x[77] += 1.0
    assert not fit_resonance(f, x, y).found


@settings(max_examples=25, deadline=None)
@given(
    st.floats(0.3, 0.7),
    st.floats(8.0, 40.0),
    st.floats(-math.pi, math.pi),
    st.sampled_from([("+", "constant"), ("-", "constant"), ("+", "sloped"), ("-", "sloped")]),
    st.floats(-6.0, 3.0),
)
def test_exact_sweep_returns_its_input(place, widths, phase, words, decade):
    convention, background = words
    f = np.linspace(990.0, 1010.0, 241)
    f0 = 990 + 20 * place
    Q = f0 / (20 / widths)
    height = 10**decade
    z = resonance_curve(
        f, resonance_frequency=f0, quality_factor=Q, height=height, phase=phase, convention=convention
    )
    z = z + height * (0.5 - 0.2j)
    if background == "sloped":
        z = z + height * (0.003 + 0.002j) * (f - f0)
    found = fit_resonance(f, z.real, z.imag, convention=convention, background=background)
    assert found.found, found.reason
    assert found.frequency == pytest.approx(f0, abs=1e-6)
    assert found.quality_factor == pytest.approx(Q, rel=1e-5)
    assert found.fit.value("height") == pytest.approx(height, rel=1e-5)
    assert math.cos(found.fit.value("phase") - phase) == pytest.approx(1.0, abs=1e-8)


def test_width_of_the_curve():
    """Half maximum of the power at half a width f0/Q beside resonance, for large Q."""
    near = resonance_curve(
        1000.0 + 1000 / 1e6 / 2, resonance_frequency=1000.0, quality_factor=1e6, height=1.0, phase=0.0
    )
    assert abs(complex(near)) ** 2 == pytest.approx(0.5, rel=1e-5)


@pytest.mark.parametrize(
    ("arguments", "message"),
    [({"background": "curved"}, "background: found"), ({"convention": "x"}, "convention: found")],
    ids=["background", "convention"],
)
def test_refused_words(arguments, message):
    f = np.linspace(1.0, 2.0, 20)
    with pytest.raises(ValueError, match=message):
        fit_resonance(f, f, f, **arguments)


def test_a_start_that_is_known_gives_the_same_resonance() -> None:
    """And one without sense is refused; one that does not converge falls back on the search."""
    f = np.linspace(990.0, 1010.0, 201)
    z = resonance_curve(f, resonance_frequency=1000.3, quality_factor=400.0, height=1.0, phase=0.4)
    noise = np.random.default_rng(8).normal(0, 0.02, (2, f.size))
    x, y = z.real + noise[0], z.imag + noise[1]
    searched = fit_resonance(f, x, y)
    near = fit_resonance(f, x, y, near=(1000.0, 3.0))
    assert near.frequency == pytest.approx(searched.frequency, abs=1e-4)
    assert near.quality_factor == pytest.approx(searched.quality_factor, rel=1e-4)
    with pytest.raises(ValueError, match="near: found"):
        fit_resonance(f, x, y, near=(1000.0, 0.0))

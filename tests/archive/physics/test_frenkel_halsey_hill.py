"""Film thickness and pressure against the numbers of the reference tables, and against each other."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from archive.physics.frenkel_halsey_hill import (
    film_thickness,
    relative_pressure,
    saturated_film_thickness,
    van_der_waals_strength,
)

GAMMA = 27 * 3.6e-10**3
"""27 K layer^3 at 3.6 angstrom a layer, K m^3."""


THICKNESS = [
    (0.1, 1.9847, 1.9546),
    (0.5, 2.9613, 2.8958),
    (0.9, 5.5488, 5.3307),
    (0.99, 12.1441, 11.2170),
    (0.999, 26.2030, 22.6724),
]
"""p/p_0, layers, and layers with retardation at 41.7 layers; 27 K layer^3, 1.5 K."""


@pytest.mark.parametrize(("ratio", "plain", "retarded"), THICKNESS)
def test_film_thickness(ratio, plain, retarded):
    assert float(film_thickness(ratio, temperature=1.5, gamma=27.0)) == pytest.approx(plain, abs=5.1e-5)
    found = film_thickness(ratio, temperature=1.5, gamma=27.0, half_thickness=41.7)
    assert float(found) == pytest.approx(retarded, abs=1e-4)


def test_saturated_film():
    """1 cm above the bath, without retardation: 29.9 nm; alpha = 2.6168e-24 m^5/s^2 for 1259.7 K angstrom^3."""
    assert pytest.approx(1259.7, abs=0.05) == GAMMA * 1e30
    assert float(van_der_waals_strength(GAMMA)) == pytest.approx(2.6168e-24, rel=2e-5)
    assert float(saturated_film_thickness(0.01, gamma=GAMMA)) == pytest.approx(29.9e-9, abs=0.05e-9)
    assert float(saturated_film_thickness(0.01, gamma=GAMMA, half_thickness=15e-9)) < 25e-9


@given(st.floats(1.0, 60.0), st.floats(0.3, 4.0), st.sampled_from([None, 41.7, 5.0]))
def test_thickness_and_pressure_are_inverse(d, T, half):
    ratio = relative_pressure(d, temperature=T, gamma=27.0, half_thickness=half)
    back = film_thickness(ratio, temperature=T, gamma=27.0, half_thickness=half)
    # ln(p/p_0) loses digits as p/p_0 nears one.
    assert float(back) == pytest.approx(d, rel=1e-14 / (1 - float(ratio)) + 1e-12)


def test_thickness_outside_is_not_a_number():
    assert np.isnan(film_thickness([0.0, 1.0, -0.1, math.nan], temperature=1.5, gamma=27.0)).all()
    with pytest.raises(ValueError, match="gamma"):
        film_thickness(0.5, temperature=1.5, gamma=0.0)
    with pytest.raises(ValueError, match="thickness"):
        relative_pressure(0.0, temperature=1.5, gamma=27.0)

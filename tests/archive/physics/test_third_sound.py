"""Third sound against the numbers of the reference tables."""

from __future__ import annotations

import math

import pytest

from archive.physics.frenkel_halsey_hill import van_der_waals_strength
from archive.physics.third_sound import (
    areal_density_from_third_sound,
    mean_superfluid_fraction,
    third_sound_speed,
)

GAMMA = 27 * 3.6e-10**3
"""27 K layer^3 at 3.6 angstrom a layer, K m^3."""


SPEEDS = [
    (3, 78.942, 56.376, 55.057),
    (5, 36.689, 30.827, 29.646),
    (8, 18.128, 16.378, 15.399),
    (10, 12.971, 11.980, 11.101),
    (20, 4.586, 4.414, 3.820),
]
"""Layers of 3.6 angstrom; m/s: whole film superfluid, less 1.47 inert layers, retarded (41.7 layers) too."""


@pytest.mark.parametrize(("d", "whole", "inert", "retarded"), SPEEDS)
def test_third_sound(d, whole, inert, retarded):
    alpha = float(van_der_waals_strength(GAMMA))
    thickness = d * 3.6e-10
    fraction = (d - 1.47) / d
    assert float(third_sound_speed(thickness, strength=alpha)) == pytest.approx(whole, abs=6e-4)
    found = third_sound_speed(thickness, strength=alpha, superfluid_fraction=fraction)
    assert float(found) == pytest.approx(inert, abs=6e-4)
    found = third_sound_speed(
        thickness, strength=alpha, superfluid_fraction=fraction, half_thickness=41.7 * 3.6e-10
    )
    assert float(found) == pytest.approx(retarded, abs=6e-4)


def test_thermal_factor():
    plain = third_sound_speed(1e-9, strength=2.6e-24)
    assert float(third_sound_speed(1e-9, strength=2.6e-24, entropy_over_latent_heat=0.1)) == pytest.approx(
        1.1 * float(plain)
    )


def test_areal_density_back_from_the_speed():
    alpha, d = float(van_der_waals_strength(GAMMA)), 3.6e-9
    c = third_sound_speed(d, strength=alpha, superfluid_fraction=0.7)
    found = areal_density_from_third_sound(c, thickness=d, areal_mass=5e-7, strength=alpha)
    assert float(found) == pytest.approx(0.7 * 5e-7, rel=1e-12)


def test_mean_superfluid_fraction():
    """At T -> 0 half a layer is inert: (1 - 0.5/d)."""
    assert float(mean_superfluid_fraction(5.0, temperature=0.0, bulk_fraction=1.0)) == pytest.approx(0.9)
    assert math.isnan(float(mean_superfluid_fraction(1.0, temperature=1.0, bulk_fraction=0.99)))


def test_mean_superfluid_fraction_of_a_warm_film():
    """By hand, coefficients of Scholtz, McLean and Rudnick (1974) from memory: D = 0.5 + 1.13 x 1.5/0.889 = 2.40664 layers of five."""
    found = mean_superfluid_fraction(5.0, temperature=1.5, bulk_fraction=0.889)
    assert float(found) == pytest.approx(0.889 * (1 - 2.40664 / 5), abs=1e-6)

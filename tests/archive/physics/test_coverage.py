"""Coverage in its several languages against the numbers of the reference tables."""

from __future__ import annotations

import math

import pytest

from archive.physics.coverage import (
    areal_mass,
    areal_number_density,
    film_thickness_from_coverage,
    layer_coverage,
    layers,
)
from archive.physics.film_static import UNIVERSAL_JUMP


def test_layer_conventions():
    """12.9732 and 13.0541 umol/m^2; 7.81263 and 7.86137 atoms per nm^2."""
    assert layer_coverage("bulk-density") == pytest.approx(12.9732e-6, abs=5e-11)
    assert layer_coverage("3.6-angstrom") == pytest.approx(13.0541e-6, abs=5e-11)
    assert float(areal_number_density(layer_coverage("bulk-density"))) == pytest.approx(7.81263e18, rel=1e-6)
    assert float(areal_number_density(layer_coverage("3.6-angstrom"))) == pytest.approx(7.86137e18, rel=1e-6)
    assert float(layers(26.1082e-6, convention="3.6-angstrom")) == pytest.approx(2.0, rel=1e-5)
    with pytest.raises(ValueError, match="convention"):
        layer_coverage("monolayer")


def test_coverage_conversions():
    """1 umol/m^2 = 0.6022141 nm^-2 = 4.002603e-9 kg/m^2."""
    assert float(areal_number_density(1e-6)) == pytest.approx(0.6022141e18, rel=1e-7)
    assert float(areal_mass(1e-6)) == pytest.approx(4.002603e-9, rel=1e-7)


def test_thickness_of_one_layer():
    """Thickness 3.57768 angstrom by the two-thirds power; the jump is 2.40551 angstrom of liquid per kelvin."""
    assert float(film_thickness_from_coverage(layer_coverage("bulk-density"))) == pytest.approx(
        3.57768e-10, rel=2e-6
    )
    assert pytest.approx(2.40551e-10, rel=2e-6) == UNIVERSAL_JUMP / 145.14


def test_inner_layers():
    found = film_thickness_from_coverage([10e-6, 33.0541e-6], inner_coverage=20e-6, inner_thickness=5e-10)
    assert math.isnan(found[0])
    assert found[1] == pytest.approx(8.6e-10, rel=1e-5)

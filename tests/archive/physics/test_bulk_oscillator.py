"""Plates in bulk liquid: inertia, dragged layer, normal density."""

from __future__ import annotations

import math

import heprops.helium as heprops_helium
import numpy as np
import pytest

from archive.physics import helium_liquid, helium_viscosity
from archive.physics.bulk_oscillator import (
    added_inertia,
    dragged_fraction,
    normal_density_from_inertia,
    penetration_depth,
)

# T (K), eta (uP), rho_n (kg/m^3), depth at 300 Hz, 1 kHz, 3 kHz (um): viscosity and densities of Donnelly and Barenghi (1998).
DEPTHS = [
    (1.2, 17.36, 3.750, 22.165, 12.140, 7.009),
    (1.5, 13.46, 16.166, 9.400, 5.148, 2.972),
    (1.8, 12.98, 45.538, 5.499, 3.012, 1.739),
    (2.0, 14.68, 80.549, 4.397, 2.408, 1.390),
    (2.1, 18.03, 108.04, 4.208, 2.305, 1.331),
    (2.17, 23.85, 138.78, 4.270, 2.339, 1.350),
    (2.2, 26.35, 146.10, 4.375, 2.396, 1.383),
    (2.5, 32.59, 144.84, 4.886, 2.676, 1.545),
    (3.0, 35.17, 141.23, 5.140, 2.815, 1.625),
    (3.5, 35.09, 136.07, 5.231, 2.865, 1.654),
    (4.2, 32.44, 125.41, 5.239, 2.870, 1.657),
]


@pytest.mark.parametrize("row", DEPTHS, ids=lambda row: f"{row[0]} K")
def test_depth(row):
    """Four figures of viscosity leave 2e-4 of the depth, its own three decimals 5e-4 um."""
    _, eta, rho_n, *depths = row
    found = penetration_depth(
        rho_n, viscosity=eta * 1e-7, angular_frequency=2 * np.pi * np.array([300, 1e3, 3e3])
    )
    np.testing.assert_allclose(found * 1e6, depths, rtol=2e-4, atol=6e-4)


def test_inertia_is_that_of_the_square():
    """A quarter more inertia makes the period sqrt(1.25) times as long."""
    assert float(added_inertia(math.sqrt(1.25), empty_period=1.0)) == pytest.approx(0.25, rel=1e-14)


def layer_by_differences(half_gap, depth, points=4001):
    """Mean velocity of a layer between two plates over that of the plates, from the equation of motion on a grid.

    -i w u = nu u'' with u = 1 at both plates, in units of the depth: u'' = -2i u.
    """
    x = np.linspace(-half_gap / depth, half_gap / depth, points)
    h = x[1] - x[0]
    diagonal = np.full(points - 2, -2 / h**2 + 2j)
    system = (
        np.diag(diagonal)
        + np.diag(np.full(points - 3, 1 / h**2), 1)
        + np.diag(np.full(points - 3, 1 / h**2), -1)
    )
    right = np.zeros(points - 2, dtype=complex)
    right[0] = right[-1] = -1 / h**2
    u = np.concatenate([[1], np.linalg.solve(system, right), [1]])
    return np.trapezoid(u, x) / (x[-1] - x[0])


@pytest.mark.parametrize("ratio", [0.1, 0.5, 1.0, 2.5])
def test_dragged_layer_solves_the_equation_of_motion(ratio):
    by_grid = layer_by_differences(ratio, 1.0, points=1201)
    assert complex(dragged_fraction(ratio, depth=1.0)) == pytest.approx(by_grid, rel=2e-5)


@pytest.mark.parametrize("ratio", [1e-4, 1e-3, 0.1])
def test_series_of_the_layer(ratio):
    """(8/15)(h/depth)^4 of inertia is missing, (2/3)(h/depth)^2 is lost; 6.7e-3 and 5.3e-5 at a tenth."""
    found = complex(dragged_fraction(ratio, depth=1.0))
    # Where tanh serves, the imaginary part is what is left of a number near one: 2e-16 of that.
    assert found.imag == pytest.approx(2 / 3 * ratio**2, rel=2 * ratio**4 + 1e-12, abs=3e-16)
    assert 1 - found.real == pytest.approx(8 / 15 * ratio**4, rel=2 * ratio**4, abs=1e-15)


def test_wide_gap_drags_half_a_depth_at_each_plate():
    assert complex(dragged_fraction(20.0, depth=1.0)).real == pytest.approx(1 / 40, rel=1e-12)


def test_continuous_where_the_series_takes_over():
    below, above = dragged_fraction(np.array([0.9999999e-3, 1.0000001e-3]), depth=1.0)
    assert below == pytest.approx(above, rel=1e-12)


TABULATED = [1.55, 1.65, 1.75, 1.85, 1.95, 2.05, 2.1, 2.15]


@pytest.mark.parametrize("T", TABULATED)
def test_normal_fraction_of_an_outside_table_comes_back(T):
    """Superfluid fraction and density of heprops (Donnelly and Barenghi, on a 0.05 K grid) through an inertia and back."""
    rho = float(heprops_helium.density_SVP(T))
    rho_n = rho * (1 - float(heprops_helium.superfluid_fraction_SVP(T)))
    eta, w, half = float(helium_viscosity.viscosity(T)), 2 * math.pi * 500, 3e-6
    read = rho_n * dragged_fraction(half, depth=math.sqrt(2 * eta / (rho_n * w))).real
    found = float(
        normal_density_from_inertia(read, density=rho, viscosity=eta, angular_frequency=w, half_gap=half)
    )
    assert found == pytest.approx(rho_n, rel=1e-12)
    # And our own interpolation of the same tables agrees within their rounding.
    assert found == pytest.approx(float(helium_liquid.normal_density(T)), abs=0.15)


def test_superfluid_that_is_dragged():
    """A part chi of the superfluid moves with the body: 146 = 46 + 100, a tenth of 100 with it."""
    found = normal_density_from_inertia(
        56.0, density=146.0, viscosity=1.5e-6, angular_frequency=1.0, half_gap=1e-9, drag_factor=0.1
    )
    assert float(found) == pytest.approx(46.0, rel=1e-12)


def test_noise_below_zero_and_missing_rows():
    found = normal_density_from_inertia(
        np.array([-0.01, np.nan]), density=145.1, viscosity=2e-6, angular_frequency=3e3, half_gap=5e-6
    )
    assert found[0] == pytest.approx(-0.01)
    assert np.isnan(found[1])


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"half_gap": -1.0}, "half_gap"),
        ({"drag_factor": 0.95}, "drag_factor"),
        ({"half_gap": 1e-3}, "penetration depths"),
    ],
    ids=["gap", "chi", "plates too far apart"],
)
def test_refused(change, message):
    arguments = {"density": 146.0, "viscosity": 2e-6, "angular_frequency": 3e3, "half_gap": 1e-6} | change
    with pytest.raises(ValueError, match=message):
        normal_density_from_inertia(80.0, **arguments)

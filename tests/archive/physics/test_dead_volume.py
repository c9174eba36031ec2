"""Volumes by expansion: closed form, an equation of state from elsewhere, and pulls."""

from __future__ import annotations

import math

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI
from scipy.integrate import quad
from scipy.stats import chi2

from archive.physics.constants import GAS_CONSTANT
from archive.physics.dead_volume import free_volume, virial_density
from archive.physics.helium_gas import molar_density, second_virial


def density_elsewhere(pressure: float, temperature: float) -> float:
    """Molar density of helium by the equation of state that CoolProp carries."""
    return float(PropsSI("Dmolar", "P", pressure, "T", temperature, "Helium"))


@pytest.mark.parametrize(
    ("T", "p", "share"),
    [(295.0, 1e5, 1e-5), (77.36, 1e5, 2e-5), (77.36, 5e5, 3e-4), (4.222, 2e4, 1e-3)],
    ids=["room", "77 K", "77 K dense", "4.2 K"],
)
def test_the_density_is_that_of_an_equation_of_state(T, p, share):
    found = float(virial_density(p, T, second_virial=second_virial(T)))
    assert found == pytest.approx(density_elsewhere(p, T), rel=share)
    assert found == pytest.approx(float(molar_density(p, T)), rel=1e-14)


def test_the_density_solves_its_equation_and_says_where_it_may_not():
    B = -80e-6
    rho = virial_density([1e3, 2e4, -1.0, 1e5], 4.2, second_virial=B)
    assert rho[:2] + B * rho[:2] ** 2 == pytest.approx(np.array([1e3, 2e4]) / (GAS_CONSTANT * 4.2), rel=1e-14)
    # |B p/(R T)| = 0.23 in the last one.
    assert np.isnan(rho[2:]).all()
    step = 1e-9
    up, down = (virial_density(2e4, 4.2, second_virial=B + sign * step) for sign in (1, -1))
    assert (up - down) / (2 * step) == pytest.approx(-(rho[1] ** 2) / (1 + 2 * B * rho[1]), rel=1e-6)


def test_one_expansion_is_boyles_law():
    """100 kPa in 50 cm^3 fall to 40 kPa: ideal gas at one temperature fills 75 cm^3 beside."""
    rho = np.array([1e5, 4e4]) / (GAS_CONSTANT * 295.0)
    found = free_volume([50e-6 * (rho[0] - rho[1])], [rho[1]])
    assert found.volume == pytest.approx(75e-6, rel=1e-12)
    assert found.u_volume == 0
    assert math.isnan(found.offset)


def test_an_offset_is_told_and_not_fitted_into_the_volume():
    rho = np.array([2.0, 4.0, 6.0, 8.0])
    found = free_volume(1e-5 * rho + 3e-6, rho, standard_uncertainty=1e-7)
    assert found.offset == pytest.approx(3e-6, rel=1e-9)
    # Through the origin: V = sum(rho n)/sum(rho^2) = 1e-5 + 3e-6 * 20/120.
    assert found.volume == pytest.approx(1e-5 + 5e-7, rel=1e-12)
    same = free_volume([1e-5, 1.1e-5, 0.9e-5], [2.0, 2.0, 2.0])
    assert math.isnan(same.offset)


def width_of_pulls(dof):
    """Return the width of pulls whose uncertainty is the stated one, or the scatter of `dof` degrees of freedom where that is larger."""
    mean, _ = quad(lambda x: chi2.pdf(x, dof) / max(1.0, x / dof), 0, 20 * dof, points=[dof])
    return math.sqrt(mean)


def test_pulls_of_volume_and_offset():
    rng = np.random.default_rng(11)
    rho = np.linspace(5.0, 60.0, 8)
    u = 2e-8 * (1 + rho / 30)
    runs = 2000
    found = [
        free_volume(8e-6 * rho + u * rng.normal(size=8), rho, standard_uncertainty=u) for _ in range(runs)
    ]
    pulls = np.array([[(each.volume - 8e-6) / each.u_volume, each.offset / each.u_offset] for each in found])
    assert np.mean(pulls, axis=0) == pytest.approx([0, 0], abs=4 / math.sqrt(runs))
    # Chi squared and the estimates of a linear fit are independent, so the width is known: 7 and 6 degrees of freedom are left.
    assert np.std(pulls, axis=0) == pytest.approx(
        [width_of_pulls(7), width_of_pulls(6)], abs=4 / math.sqrt(2 * runs)
    )
    # The correlation of the two is that of the estimates over the runs, (1 - r^2)/sqrt(N) uncertain.
    r = np.corrcoef([each.volume for each in found], [each.offset for each in found])[0, 1]
    stated = np.mean([each.covariance / (each.u_volume * each.u_offset) for each in found])
    assert stated == pytest.approx(r, abs=4 * (1 - r * r) / math.sqrt(runs))


@pytest.mark.parametrize(
    ("amount", "density", "words"),
    [([1.0], [0.0], r"density\[0\]"), ([1.0, 2.0], [1.0], "density"), ([math.nan], [1.0], r"amount\[0\]")],
    ids=["vacuum", "lengths", "no amount"],
)
def test_refused_arguments(amount, density, words):
    with pytest.raises(ValueError, match=words):
        free_volume(amount, density)

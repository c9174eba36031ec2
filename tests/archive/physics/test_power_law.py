"""Power law and the length that goes with it."""

from __future__ import annotations

import math

import numpy as np
import pytest

from archive.physics.film_static import UNIVERSAL_JUMP
from archive.physics.power_law import bulk_superfluid_fraction, fit_power_law, transverse_correlation_length


@pytest.mark.parametrize(("zeta", "Tc"), [(0.6717, 2.1768), (0.81, 0.9), (0.5, 1.4)])
def test_exact_law_returns_its_input(zeta, Tc):
    T = Tc * np.linspace(0.85, 1.01, 200)
    rho = 3e-7 * np.maximum(1 - T / Tc, 0.0) ** zeta
    found = fit_power_law(T, rho, start_temperature=1.0005 * Tc)
    assert found.converged, found.message
    assert found.fit.value("transition_temperature") == pytest.approx(Tc, rel=1e-8)
    assert found.fit.value("exponent") == pytest.approx(zeta, rel=1e-6)
    assert found.fit.value("amplitude") == pytest.approx(3e-7, rel=1e-6)
    t = 1 - T / Tc
    np.testing.assert_array_equal(found.used, (t > 1e-3) & (t < 0.1))


@pytest.mark.parametrize(
    ("arguments", "message"),
    [({"window": (0.1, 0.01)}, "window"), ({"start_temperature": 9.0}, "found 0 points")],
    ids=["window", "no points"],
)
def test_refused(arguments, message):
    T = np.linspace(0.9, 1.0, 20)
    with pytest.raises(ValueError, match=message):
        fit_power_law(T, 1 - T, **({"start_temperature": 1.0} | arguments))


@pytest.mark.parametrize(("rho", "T", "angstrom"), [(1.0, 2.1768, 1193.803), (10.0, 2.15, 117.911)])
def test_transverse_correlation_length(rho, T, angstrom):
    assert float(transverse_correlation_length(T, superfluid_density=rho)) * 1e10 == pytest.approx(
        angstrom, abs=5e-4
    )


def test_slab_at_its_transition():
    """The length is pi d/2: xi = pi d/2 with rho_s = sigma_s/d on the universal line."""
    d, T = 5e-9, 0.8
    xi = transverse_correlation_length(T, superfluid_density=UNIVERSAL_JUMP * T / d)
    assert float(xi) == pytest.approx(math.pi * d / 2, rel=1e-12)


def test_amplitude_of_the_length():
    """3.400 angstrom for k_0 = 2.403 and rho = 146.1 kg/m^3, at T_lambda."""
    xi = transverse_correlation_length(2.1768, superfluid_density=2.403 * 146.1)
    assert float(xi) * 1e10 == pytest.approx(3.400, abs=6e-4)


def test_bulk_superfluid_fraction():
    """Leading term k_0 t^zeta close below; zero above; nothing beyond the expansion."""
    t = 1e-6
    found = bulk_superfluid_fraction(2.1768 * (1 - t), transition_temperature=2.1768)
    assert float(found) == pytest.approx(2.403 * t**0.6717, rel=1e-3)
    assert float(bulk_superfluid_fraction(2.2, transition_temperature=2.1768)) == 0
    assert math.isnan(float(bulk_superfluid_fraction(2.0, transition_temperature=2.1768)))


def test_points_at_the_edge_that_come_and_go_are_left_out():
    """The window follows the fitted T_c; with this noise two sets of points alternate, and the common ones count."""
    rng = np.random.default_rng(2)
    T = np.linspace(0.2, 0.32, 60)
    rho = np.maximum(1 - T / 0.3, 0) ** 0.67 + 2e-2 * rng.normal(size=T.size)
    found = fit_power_law(T, rho, start_temperature=0.3, window=(0.01, 0.3))
    assert found.converged
    Tc = found.fit.value("transition_temperature")
    reduced = 1 - T / Tc
    inside = (reduced > 0.01) & (reduced < 0.3)
    assert not (found.used & ~inside).any()
    assert 0 < np.count_nonzero(inside & ~found.used) <= 2
    assert abs(Tc - 0.3) < 4 * found.fit.standard_uncertainty("transition_temperature")

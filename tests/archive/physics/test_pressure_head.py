"""Hydrostatic and aerostatic heads against published figures."""

import numpy as np
import pytest
from scipy.integrate import quad

from archive.physics.pressure_head import (
    aerostatic_head,
    liquid_head,
    liquid_head_temperature,
    straight_profile,
)


@pytest.mark.parametrize(("T", "millikelvin"), [(4.2, 0.131), (3.0, 0.385), (2.5, 0.708)], ids=str)
def test_temperature_per_centimetre(T: float, millikelvin: float) -> None:
    """Computed apart from ITS-90 and the density table; three figures."""
    assert 1e3 * liquid_head_temperature(T, 0.01) == pytest.approx(millikelvin, abs=6e-4)


def test_pressure_of_a_column_at_the_lambda_point() -> None:
    """Rho g = 1432.8 Pa/m, as used for the gravity shift of the lambda point (Ahlers 1968)."""
    assert liquid_head(2.1768, 1.0) == pytest.approx(1432.8, abs=0.1)


def test_helium_ii_has_no_temperature_head() -> None:
    with pytest.raises(ValueError, match="temperature of its surface"):
        liquid_head_temperature([3.0, 2.0], 0.1)


def test_gas_column() -> None:
    """About 0.1 Pa per metre at 100 Pa and 4 K; 3He is lighter by the ratio of the masses."""
    heavy = aerostatic_head(100.0, height=1.0, temperature=4.0)
    assert heavy == pytest.approx(0.118, abs=1e-3)
    light = aerostatic_head(100.0, height=1.0, temperature=4.0, isotope="3He")
    assert light / heavy == pytest.approx(3.0160293 / 4.0026033, rel=1e-7)
    np.testing.assert_allclose(aerostatic_head([0.0, 200.0], height=1.0, temperature=4.0), [0.0, 2 * heavy])


def test_a_straight_profile_weighs_as_the_mean_of_the_inverse_temperature() -> None:
    """Against quadrature of 1/T from a bath at 4 K to a room at 295 K."""
    mean, _ = quad(lambda x: 1 / (4.0 + 291.0 * x), 0, 1, epsrel=1e-12)
    assert straight_profile(4.0, 295.0) == pytest.approx(1 / mean, rel=1e-10)

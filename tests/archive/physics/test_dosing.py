"""Doses, totals and dead volume against the numbers of the reference tables and the ideal gas."""

from __future__ import annotations

import math

import numpy as np
import pytest

from archive.physics.constants import GAS_CONSTANT
from archive.physics.dosing import dose_amount, dose_uncertainty, film_amount, running_total

DOSE = {"pressure_before": 13332.2, "pressure_after": 0.0, "volume": 1e-5, "temperature": 295.0}


def test_dose_example():
    """10 cm^3, 295 K, 100 Torr (133.322 Pa each), B = 11.86 cm^3/mol: ideal 54.35577 umol, corrected 54.35226 umol."""
    assert float(dose_amount(**DOSE)) == pytest.approx(54.35577e-6, abs=6e-12)
    assert float(dose_amount(**DOSE, second_virial=11.86e-6)) == pytest.approx(54.35226e-6, abs=6e-12)


def test_dose_in_parts_is_the_dose():
    first = dose_amount(**(DOSE | {"pressure_after": 5000.0}), second_virial=11.86e-6)
    second = dose_amount(**(DOSE | {"pressure_before": 5000.0}), second_virial=11.86e-6)
    assert float(first + second) == pytest.approx(
        float(dose_amount(**DOSE, second_virial=11.86e-6)), rel=1e-14
    )
    back = dose_amount(**(DOSE | {"pressure_before": 0.0, "pressure_after": 13332.2}))
    assert float(back) == -float(dose_amount(**DOSE))


def test_warmer_volume_after():
    found = dose_amount(**(DOSE | {"pressure_after": 13332.2}), temperature_after=296.0)
    expected = 1e-5 * 13332.2 / GAS_CONSTANT * (1 / 295 - 1 / 296)
    assert float(found) == pytest.approx(expected, rel=1e-12)


def test_cold_vapour_correction():
    """At 4.2 K and 1e4 Pa the correction is -2.3 per cent (B = -80.2 cm^3/mol): more gas than ideal by that much."""
    cold = {"pressure_before": 1e4, "pressure_after": 0.0, "volume": 1e-6, "temperature": 4.2}
    ratio = float(dose_amount(**cold, second_virial=-80.2e-6) / dose_amount(**cold))
    assert ratio == pytest.approx(1 / (1 - 0.023), abs=5e-4)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"pressure_before": -1.0}, "pressure_before"),
        ({"volume": 0.0}, "volume"),
        ({"temperature": -1.0}, "temperature"),
        ({"second_virial": -0.01}, "B p/RT"),
    ],
    ids=["pressure", "volume", "temperature", "virial"],
)
def test_refused_doses(change, message):
    with pytest.raises(ValueError, match=message):
        dose_amount(**(DOSE | change))


def test_dose_uncertainty():
    """Ideal gas: a gauge of 1 Pa twice, V/RT sqrt 2; one kelvin in 295 is 1/295 of the dose."""
    gauge = dose_uncertainty(**DOSE, u_pressure=1.0)
    assert float(gauge) == pytest.approx(1e-5 / (GAS_CONSTANT * 295) * math.sqrt(2), rel=1e-12)
    thermal = dose_uncertainty(**DOSE, u_pressure=0.0, u_temperature=1.0)
    assert float(thermal) == pytest.approx(float(dose_amount(**DOSE)) / 295, rel=1e-12)


def test_running_total():
    total, u = running_total([3.0, 4.0, -2.0], standard_uncertainty=[0.3, 0.4, 0.0], common_relative=0.01)
    np.testing.assert_allclose(total, [3.0, 7.0, 5.0])
    np.testing.assert_allclose(u, [math.hypot(0.3, 0.03), math.hypot(0.5, 0.07), math.hypot(0.5, 0.05)])
    with pytest.raises(ValueError, match="negative"):
        running_total([1.0], standard_uncertainty=-1.0)


def test_dead_volume():
    """1 cm^3 of saturated vapour at 1 K holds 1.87506 umol, at 1.5 K 38.2137 umol."""
    density = np.array([[1.87506], [38.2137]])
    found = film_amount(100e-6, molar_densities=density, volumes=[1e-6])
    np.testing.assert_allclose(found, [100e-6 - 1.87506e-6, 100e-6 - 38.2137e-6])
    with pytest.raises(ValueError, match="molar_densities"):
        film_amount(1.0, molar_densities=[1.0, 2.0], volumes=[1.0])

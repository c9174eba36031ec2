"""The uncertainty budget of a reading, worked by hand and against an independent GUM calculator."""

import GTC
import numpy as np
import pytest

from archive.physics.resistance_uncertainty import (
    excitation_power,
    lead_corrected_resistance,
    self_heating_uncertainty,
    temperature_uncertainty,
    zero_power_resistance,
)


def test_reading_alone() -> None:
    """u(R)/R = 1e-4 and S = -2 give u(T)/T = 5e-5."""
    assert temperature_uncertainty(
        2.0, relative_resistance_uncertainty=1e-4, sensitivity=-2.0
    ) == pytest.approx(1e-4)


def test_whole_budget_against_gtc() -> None:
    """T = (R/R1)^(1/S) K with four additive corrections of zero, propagated by the GUM Tree Calculator."""
    R, S = GTC.ureal(2610.0, 0.3), -0.33
    parts = {"calibration": 1e-3, "fit": 4e-4, "heating": 2e-4, "drift": 7e-4}
    T = GTC.pow(R / 2610.0, 1 / S) + sum(GTC.ureal(0.0, u) for u in parts.values())
    found = temperature_uncertainty(1.0, relative_resistance_uncertainty=0.3 / 2610.0, sensitivity=S, **parts)
    assert found == pytest.approx(GTC.uncertainty(T), rel=1e-12)


def test_arrays_broadcast() -> None:
    found = temperature_uncertainty(
        [1.0, 2.0], relative_resistance_uncertainty=1e-3, sensitivity=[-1.0, -2.0]
    )
    np.testing.assert_allclose(found, [1e-3, 1e-3])


def test_self_heating() -> None:
    """Linear in power: 1000 ohm cold, 2 ohm lost for each unit of power; a rectangle has 1/sqrt(3) of its half width."""
    assert zero_power_resistance(998.0, 996.0) == 1000.0
    assert self_heating_uncertainty(0.052, 0.05) == pytest.approx(0.002 / np.sqrt(3))


def test_power_and_leads() -> None:
    """1 nA through 10 kohm is 10 fW; 10 ohm of lead in 10 kohm are 0.1 per cent."""
    assert excitation_power(1e-9, 1e4) == pytest.approx(1e-14)
    assert lead_corrected_resistance(10010.0, 10.0) == 10000.0

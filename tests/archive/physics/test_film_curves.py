"""Slopes of the two curves against differences of the curves themselves."""

from __future__ import annotations

import math

import numpy as np
import pytest

from archive.physics.film_curves import PARAMETERS, curve_slopes, curves

OMEGA = 2 * math.pi * 1000
VALUES = {
    "transition_temperature": 0.6, "b": 5.5, "log_diffusivity": 12 + math.log(OMEGA), "F": 1.3, "scale": 75.6,
    "drop_offset": 2e-9, "dissipation_offset": 1e-9,
}  # fmt: skip
STEPS = {
    "transition_temperature": 1e-6, "b": 1e-4, "log_diffusivity": 1e-4, "F": 1e-3, "scale": 1e-3, "drop_offset": 1e-9,
    "dissipation_offset": 1e-9,
}  # fmt: skip
T = np.linspace(0.54, 0.70, 81)


@pytest.mark.parametrize("name", PARAMETERS)
@pytest.mark.parametrize("change", [{}, {"log_diffusivity": 30 + math.log(OMEGA)}, {"b": 15.0}], ids=["usual", "slow", "large b"])  # fmt: skip
def test_slopes_are_those_of_the_curves(name, change):
    values = VALUES | change
    # Four points of a central difference: the error goes as the fourth power of the step.
    sides = {
        k: curves(T, values | {name: values[name] + k * STEPS[name] / 4}, angular_frequency=OMEGA, x0=-0.5)
        for k in (-2, -1, 1, 2)
    }
    found = curve_slopes(T, values, (name,), angular_frequency=OMEGA, x0=-0.5)
    for kind in (0, 1):
        expected = (8 * (sides[1][kind] - sides[-1][kind]) - (sides[2][kind] - sides[-2][kind])) / (3 * STEPS[name])  # fmt: skip
        np.testing.assert_allclose(
            found[kind][:, 0], expected, rtol=1e-6, atol=1e-7 * np.max(np.abs(expected))
        )


def test_columns_stand_in_the_order_of_the_names():
    drop, loss = curve_slopes(T, VALUES, ("dissipation_offset", "drop_offset"), angular_frequency=OMEGA, x0=-0.5)  # fmt: skip
    np.testing.assert_array_equal(drop, np.column_stack([np.zeros(T.size), np.ones(T.size)]))
    np.testing.assert_array_equal(loss, np.column_stack([np.ones(T.size), np.zeros(T.size)]))

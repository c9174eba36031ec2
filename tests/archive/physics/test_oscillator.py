"""Oscillator: the example of the reference tables, exact against linear forms, and invariants."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import solve_ivp

from archive.physics.oscillator import (
    DriveReference,
    corrected_frequency,
    dissipation_from_amplitude,
    dissipation_from_torque,
    fractional_period_change,
    period,
    period_per_areal_density,
    period_per_mass,
    rim_velocity,
    torsion_constant,
    transient_correction,
)

EXAMPLE = {"period": 1e-3, "inertia": 5e-7, "mean_square_radius": 2.8e-5}
"""f = 1 kHz, I = 5.0e-7 kg m^2, R_g^2 = 2.8e-5 m^2."""


def test_example_oscillator():
    assert float(torsion_constant(frequency=1000.0, inertia=5e-7)) == pytest.approx(19.73921, abs=5e-6)
    assert period_per_mass(**EXAMPLE) == pytest.approx(0.028, rel=1e-12)
    assert period_per_areal_density(**EXAMPLE, area=1.5) == pytest.approx(0.042, rel=1e-12)
    # 0.1681093 ns per umol/m^2 with 4.002603e-9 kg/m^2 per umol/m^2.
    assert pytest.approx(0.1681093e-9, rel=3e-7) == 0.042 * 4.002603254e-9


def test_period_and_torsion_constant_are_inverse():
    kappa = torsion_constant(frequency=1000.0, inertia=5e-7)
    assert float(period(inertia=5e-7, torsion_constant=kappa)) == pytest.approx(1e-3, rel=1e-14)


@pytest.mark.parametrize(("change", "error"), [(1e-5, 2.5e-6), (1e-3, 2.5e-4), (1e-2, 2.5e-3)])
def test_linear_form_errs_as_stated(change, error):
    exact = float(fractional_period_change(change))
    assert (change / 2) / exact - 1 == pytest.approx(error, rel=2e-2)


def test_fractional_period_change_keeps_digits():
    assert float(fractional_period_change(1e-15)) == pytest.approx(5e-16, rel=1e-14)


def test_dissipation_from_torque():
    kappa = 19.73921
    theta = 2e-5
    assert float(
        dissipation_from_torque(torque=kappa * theta / 5e5, torsion_constant=kappa, amplitude=theta)
    ) == pytest.approx(2e-6)


REFERENCE = {"dissipation": 2e-6, "drive": 1.0, "signal": 5.0, "frequency": 1000.0}


@pytest.mark.parametrize(
    ("p", "s", "expected"),
    # Twice the drive, half the signal, one per cent lower frequency.
    [(1, 0, 2e-6 * 2 * 2), (2, 0, 2e-6 * 4 * 2), (1, 1, 2e-6 * 2 * 2 * 0.99), (2, 1, 2e-6 * 4 * 2 * 0.99)],
)
def test_dissipation_from_amplitude(p, s, expected):
    reference = DriveReference(**REFERENCE, drive_power=p, signal_power=s)
    found = dissipation_from_amplitude(signal=2.5, drive=2.0, frequency=990.0, reference=reference)
    assert float(found) == pytest.approx(expected, rel=1e-12)
    tilted = dissipation_from_amplitude(
        signal=2.5, drive=2.0, frequency=990.0, reference=reference, lock_phase=math.pi / 3
    )
    assert float(tilted) == pytest.approx(expected / 2, rel=1e-12)


@pytest.mark.parametrize(
    ("change", "message"),
    [({"drive_power": 3}, "drive_power"), ({"signal_power": 2}, "signal_power"), ({"drive": 0.0}, "drive")],
    ids=["p", "s", "zero"],
)
def test_refused_reference(change, message):
    with pytest.raises(ValueError, match=f"{message}: found"):
        DriveReference(**({**REFERENCE, "drive_power": 1, "signal_power": 0} | change))


def test_transient_correction_recovers_q_of_a_driven_rise():
    """Independent: integrate dtheta/dt = -(w/2Q) theta + N w/(2 kappa) and read Q back while theta still rises."""
    Q, f, target = 5e5, 1000.0, 2e-5
    w = 2 * math.pi * f
    t = np.linspace(0.0, 300.0, 601)
    solution = solve_ivp(
        lambda t, y: -(w / (2 * Q)) * (y - target), (0, 300), [1e-5], t_eval=t, rtol=1e-10, atol=1e-18
    )
    theta = solution.y[0]
    steady = target / (Q * theta)
    corrected = steady + transient_correction(t, theta, f)
    np.testing.assert_allclose(corrected[1:-1], 1 / Q, rtol=1e-5)
    assert steady[0] == pytest.approx(2 / Q)


@pytest.mark.parametrize("time", [[0.0, 1.0, 1.0], [0.0, 2.0, 1.0]], ids=["twice", "back"])
def test_transient_needs_rising_times(time):
    with pytest.raises(ValueError, match=r"time\[2\]: found 1.0"):
        transient_correction(time, [1.0, 1.0, 1.0], 1000.0)


def test_rim_velocity():
    """R = 7.5 mm, 1 kHz, 1 mm/s is 2.122e-5 rad."""
    assert float(rim_velocity(radius=7.5e-3, frequency=1000.0, amplitude=2.122e-5)) == pytest.approx(
        1e-3, rel=1e-4
    )


@given(st.floats(-0.2, 0.2), st.floats(1e4, 1e6))
def test_lock_phase_is_undone(phase, Q):
    """f_drive - f0 = (f0/2Q) tan(phi): put in a detuning, get the resonance back to first order."""
    f0 = 1000.0
    drive = f0 * (1 + math.tan(phase) / (2 * Q))
    found = corrected_frequency(
        drive_frequency=drive,
        dissipation=1 / Q,
        in_phase=math.cos(phase),
        quadrature=-math.sin(phase),
        sign=-1,
    )
    assert float(found) == pytest.approx(f0, abs=1e-6)


def test_one_degree_at_half_a_million():
    found = corrected_frequency(
        drive_frequency=1.0, dissipation=2e-6, in_phase=1.0, quadrature=math.tan(math.radians(1)), sign=1
    )
    assert 1 - float(found) == pytest.approx(1.7e-8, rel=0.03)


def test_refused_sign():
    with pytest.raises(ValueError, match="sign"):
        corrected_frequency(drive_frequency=1.0, dissipation=1e-6, in_phase=1.0, quadrature=0.0, sign=0)

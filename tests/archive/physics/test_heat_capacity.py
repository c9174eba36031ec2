"""The law of the heat capacity at the lambda point, and pulses."""

from __future__ import annotations

import math

import numpy as np
import pytest

from archive.physics.heat_capacity import LambdaLaw, heat_capacity_of_pulse, singular_term

PUBLISHED = {
    "amplitude": 5.6537,
    "exponent": -0.01264,
    "background": 460.19,
    "amplitude_ratio": 1.0525,
    "first": -0.0157,
    "second": 0.3311,
}
"""Lipa, Nissen, Stricker, Swanson, Chui, Phys. Rev. B 68, 174518 (2003); table of coefficients from memory."""


@pytest.mark.parametrize(("t", "C"), [(1e-8, 105.81), (1e-6, 84.58), (1e-4, 62.10), (1e-3, 50.38)])
def test_published_law_below(t, C):
    """Values that those coefficients give, computed twice by hand."""
    assert float(LambdaLaw.from_amplitudes(**PUBLISHED).value(t, below=True)) == pytest.approx(C, abs=5e-3)


@pytest.mark.parametrize("below", [True, False], ids=["below", "above"])
def test_the_published_form(below):
    """Plainly written, in 50 digits' worth of care where it matters not: the sum agrees to 1e-11 of the great terms."""
    p, t = PUBLISHED, 3e-5
    A = p["amplitude"] * (1.0 if below else p["amplitude_ratio"])
    great = A / p["exponent"] * t ** -p["exponent"] * (1 + p["first"] * t**0.529 + p["second"] * t**1.058)
    found = float(LambdaLaw.from_amplitudes(**p).value(t, below=below))
    assert found == pytest.approx(great + p["background"], abs=1e-11 * 460)


def test_names_of_the_published_form_come_back():
    law = LambdaLaw.from_amplitudes(**PUBLISHED)
    assert law.amplitude_ratio == pytest.approx(1.0525, rel=1e-14)
    assert law.background == pytest.approx(460.19, rel=1e-14)
    # P = (1 - A+/A-)/alpha is 4.17 with the published 1.053 and -0.0127; theory gives 4.39(26).
    assert law.asymmetry == pytest.approx(4.15, abs=0.01)


@pytest.mark.parametrize("alpha", [1e-3, -1e-6, 1e-9, 1e-13], ids=str)
def test_small_exponent_is_the_logarithm(alpha):
    """(t^-a - 1)/a = L + a L^2/2 + ...; without the series 1e-13 would keep three digits."""
    L = -math.log(1e-6)
    expected = L + alpha * L**2 / 2 + alpha**2 * L**3 / 6
    assert float(singular_term(1e-6, exponent=alpha)) == pytest.approx(
        expected, rel=max(2 * abs(alpha) ** 3 * L**3, 1e-14)
    )


def test_a_logarithm_has_one_amplitude_and_a_jump():
    law = LambdaLaw(5.4, 0.0, 15.0, 4.0)
    t = np.array([1e-6, 1e-3])
    np.testing.assert_allclose(law.value(t, below=True) - law.value(t, below=False), 4.0 * 5.4, rtol=1e-13)
    assert law.amplitude_ratio == 1
    assert law.background == -math.inf


def test_published_form_needs_an_exponent():
    with pytest.raises(ValueError, match="exponent: found 0"):
        LambdaLaw.from_amplitudes(**(PUBLISHED | {"exponent": 0.0}))


def test_pulses():
    """1 uW for 20 s in 40 uK is 0.5 J/K; half of a drift of 1 uK/s is heat from elsewhere; no step, no heat capacity."""
    found = heat_capacity_of_pulse(1e-6, duration=20.0, rise=[40e-6, 0.0, np.nan])
    assert found[0] == pytest.approx(0.5, rel=1e-12)
    assert np.isnan(found[1:]).all()
    drifting = heat_capacity_of_pulse(1e-6, duration=20.0, rise=40e-6, drift=1e-6)
    assert float(drifting) == pytest.approx(1.0, rel=1e-12)

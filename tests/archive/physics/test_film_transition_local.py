"""The moved fit against fits made anew, and the curves against the reference table of the dynamic theory."""

from __future__ import annotations

import math

import numpy as np
import pytest

from archive.physics.film_curves import curves
from archive.physics.film_static import UNIVERSAL_JUMP
from archive.physics.film_transition import fit_film_transition
from archive.physics.film_transition_local import local_solution, moved

OMEGA, SCALE = 2 * math.pi * 1000, 75.6
TRUTH = {
    "transition_temperature": 0.6, "b": 5.5, "log_diffusivity": 12 + math.log(OMEGA), "F": 1.0, "scale": SCALE,
    "drop_offset": 2e-9, "dissipation_offset": 1e-9,
}  # fmt: skip
FREE = ("transition_temperature", "b", "log_diffusivity", "scale", "drop_offset", "dissipation_offset")
U_DROP, U_LOSS = 6e-9, 2e-9


@pytest.mark.parametrize(
    ("ratio", "S", "q"),
    [(0.98, 1.198474, 2.89035e-04), (1.0, 1.058489, 5.70913e-03), (1.02, 0.061268, 1.66973e-01)],
    ids=["below", "at", "above"],
)
def test_the_curves_are_those_of_the_tabulated_trajectory(ratio, S, q):
    """Fixed x_0 = -0.5, b = 5.5, L = 12, F = 1: areal density and dissipation over those of the jump, two independent integrations."""
    drop, loss = curves(np.array([0.6 * ratio]), TRUTH, angular_frequency=OMEGA, x0=-0.5)
    jump = SCALE * UNIVERSAL_JUMP * 0.6
    # Half a unit of the last printed digit, and the quadrature of the fit.
    assert (drop[0] - 2e-9) / jump == pytest.approx(S, abs=6e-7)
    assert (loss[0] - 1e-9) / jump == pytest.approx(q, rel=2e-5)


@pytest.fixture(scope="module")
def fitted():
    """Fit one record with noise, and keep what is needed to move it."""
    rng = np.random.default_rng(4)
    T = np.linspace(0.56, 0.68, 120)
    drop, loss = curves(T, TRUTH, angular_frequency=OMEGA, x0=-0.5)
    drop, loss = drop + rng.normal(0, U_DROP, T.size), loss + rng.normal(0, U_LOSS, T.size)
    return T, drop, loss, anew(T, drop, loss)


def anew(T, drop, loss, start=None, F=1.0):
    """Return a fit made anew."""
    return fit_film_transition(
        T, drop, loss, standard_uncertainty_drop=U_DROP, standard_uncertainty_dissipation=U_LOSS, angular_frequency=OMEGA,
        scale=SCALE, free=FREE, start=start, F=F,
    )  # fmt: skip


def local_of(T, found):
    """Return the local solution of a fit."""
    return local_solution(
        found, temperature=T, u_drop=np.full(T.size, U_DROP), u_dissipation=np.full(T.size, U_LOSS), angular_frequency=OMEGA, x0=-0.5
    )  # fmt: skip


@pytest.mark.parametrize(
    ("dT", "factor_drop", "factor_loss"),
    [(1e-3, 1.0, 1.0), (0.0, 1.01, 1.0), (0.0, 1.0, 1.004)],
    ids=["temperatures a tenth of a per cent up", "drop a per cent up", "dissipation up"],
)
def test_a_moved_fit_agrees_with_a_fit_made_anew(fitted, dT, factor_drop, factor_loss):
    T, drop, loss, found = fitted
    data = T * (1 + dT), drop * factor_drop, loss * factor_loss
    quick = moved(
        local_of(T, found), temperature=data[0], twice_fractional_drop=data[1], dissipation=data[2], angular_frequency=OMEGA
    )  # fmt: skip
    slow = anew(*data, start=found.values)
    for name in FREE:
        change = slow.values[name] - found.values[name]
        assert quick[name] - found.values[name] == pytest.approx(
            change, rel=0.03, abs=0.02 * found.standard_uncertainty(name)
        ), name


def test_unmoved_data_leave_the_fit_where_it_is(fitted):
    T, drop, loss, found = fitted
    same = moved(
        local_of(T, found),
        temperature=T,
        twice_fractional_drop=drop,
        dissipation=loss,
        angular_frequency=OMEGA,
    )
    for name in FREE:
        assert abs(same[name] - found.values[name]) < 1e-3 * found.standard_uncertainty(name), name


def test_another_held_vortex_prefactor_moves_the_fit_like_a_fit_made_anew(fitted):
    T, drop, loss, found = fitted
    quick = moved(
        local_of(T, found), temperature=T, twice_fractional_drop=drop, dissipation=loss, angular_frequency=OMEGA, steps=8, F=1.3
    )  # fmt: skip
    slow = anew(T, drop, loss, F=1.3)
    for name in ("transition_temperature", "b", "log_diffusivity"):
        change = slow.values[name] - found.values[name]
        assert quick[name] - found.values[name] == pytest.approx(change, rel=0.1), name

"""The flow of the transition against a computed system of finite size, made by others."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from archive.physics.film_static import x_minus_log1p

REAL = Path(__file__).parents[2] / "real" / "bkt-bose-hubbard-dmrg"


def luttinger(size):
    """Stiffness of a chain from the variance of the particle number in a block: slope against ln[(L/pi) sin(pi l/L)], l >= L/8."""
    (file,) = REAL.glob(f"sigma2_L{size}_*.dat")
    row = np.loadtxt(file, encoding="utf-8")
    blocks = np.arange(1, row.size)
    chord = np.log(size / math.pi * np.sin(math.pi * blocks / size))
    used = blocks >= size / 8
    return float(np.polyfit(chord[used], row[1:][used], 1)[0]) * math.pi**2


@pytest.mark.parametrize(("size", "stiffness"), [(64, 2.148), (96, 2.138), (128, 2.133)])
def test_stiffness_of_a_computed_chain(size, stiffness):
    """SOURCE.md: K at U = 3.275, beside the transition."""
    assert luttinger(size) == pytest.approx(stiffness, abs=1e-3)


def test_the_flow_along_the_transition_is_that_of_a_computed_chain():
    """One-dimensional bosons at unit filling, the quantum twin of the film: K/2 flows as (pi/2) K of a film, l = ln L.

    M. Thamm et al., arXiv:2502.18622 (density-matrix renormalisation). At the transition the flow of `flow_invariant` = 0 is
    dx/dl = 4 (x - ln(1 + x)), so K falls towards its universal value only as 1/(2 l).
    """
    x0 = 2 / luttinger(64) - 1
    for size in (96, 128):
        flown = solve_ivp(lambda _, x: 4 * x_minus_log1p(x), (0, math.log(size / 64)), [x0], rtol=1e-10)
        found = 2 / (1 + float(flown.y[0, -1]))
        assert found == pytest.approx(luttinger(size), abs=2e-3)
    # Without the flow the difference from the smallest chain would be seven times that.
    assert luttinger(64) - luttinger(128) > 1.4e-2

"""All films on one line: closed forms, a common factor, correlated errors, and pulls of two hundred sets of films."""

from __future__ import annotations

import math

import numpy as np
import pytest

from archive.physics.constants import MASS_HELIUM4
from archive.physics.film_static import UNIVERSAL_JUMP
from archive.physics.universal_slope import proportion

T = np.array([0.30, 0.42, 0.55, 0.63, 0.74, 0.85])


def own(u):
    """Return the contributions of errors that each point has alone."""
    return np.diag(u)


def test_the_universal_constant():
    """0.0525 atoms per square angstrom and kelvin; 3.49e-9 g cm^-2 K^-1 (S. W. Kim et al., arXiv:2211.07672, SOURCE.md of its data)."""
    assert pytest.approx(0.0525, abs=5e-5) == UNIVERSAL_JUMP / MASS_HELIUM4 * 1e-20
    assert pytest.approx(3.49e-9, abs=5e-12) == UNIVERSAL_JUMP * 0.1


def test_independent_errors_give_the_weighted_ratio():
    y = 2.0 * T + np.array([0.01, -0.02, 0.01, 0.03, -0.01, 0.0])
    u = np.array([0.01, 0.02, 0.01, 0.03, 0.02, 0.02])
    zero = np.zeros((6, 6))
    # With errors of y alone that do not grow with y the weights would be 1/u^2; here u is scaled to the line.
    found = proportion(T, y, contributions_x=zero, contributions_y=own(u))
    w = 1 / (u * found.slope * T / y) ** 2
    assert found.slope == pytest.approx(float((w * T) @ y / (w @ T**2)), rel=1e-12)
    assert found.standard_uncertainty == pytest.approx(float((w @ T**2) ** -0.5), rel=1e-12)
    assert found.chi2 == pytest.approx(float(w @ (y - found.slope * T) ** 2), rel=1e-12)
    assert found.dof == 5


def test_a_common_factor_moves_the_slope_and_nothing_else():
    rng = np.random.default_rng(2)
    y = 2.0 * T * (1 + 0.02 * rng.normal(size=6))
    zero = np.zeros((6, 6))
    alone = proportion(T, y, contributions_x=zero, contributions_y=own(0.02 * y))
    common = np.vstack([own(0.02 * y), 0.10 * y])
    both = proportion(T, y, contributions_x=np.zeros((7, 6)), contributions_y=common)
    assert both.slope == pytest.approx(alone.slope, rel=1e-9)
    assert both.chi2 == pytest.approx(alone.chi2, rel=1e-9)
    assert both.standard_uncertainty**2 == pytest.approx(
        alone.standard_uncertainty**2 + (0.10 * both.slope) ** 2, rel=1e-9
    )


def test_one_film_has_a_slope_and_no_test():
    found = proportion([0.5], [1.0], contributions_x=[[0.0]], contributions_y=[[0.1]])
    assert found.slope == 2.0
    assert found.standard_uncertainty == pytest.approx(0.2, rel=1e-12)
    assert math.isnan(found.chi2)
    assert math.isnan(found.probability)


def test_the_line_stays_among_its_points():
    """Common parts of 8 % that grow with coverage, own parts of 0.3 %: by the whole covariance the line leaves its points.

    The effect: G. D'Agostini, Nuclear Instruments and Methods A 346, 306 (1994), from memory. The two lines are worked out here by hand.
    """
    each = np.array([0.998, 0.9985, 0.999, 0.9992, 0.9998, 1.000])
    y, common = UNIVERSAL_JUMP * T * each, np.linspace(0.06, 0.10, 6)
    found = proportion(
        T, y, contributions_x=np.zeros((7, 6)), contributions_y=np.vstack([own(0.003 * y), common * y])
    )
    ratio = found.slope / UNIVERSAL_JUMP
    # Own shares are equal, so every slope counts once: the mean.
    assert ratio == pytest.approx(float(np.mean(each)), rel=1e-5)
    # A source that all points share is propagated with the same weights: its mean share.
    assert found.standard_uncertainty / found.slope == pytest.approx(
        math.hypot(0.003 / math.sqrt(6), float(np.mean(common))), rel=1e-3
    )
    inverse = np.linalg.inv(0.003**2 * np.eye(6) + np.outer(common, common))
    of_all = float(np.sum(inverse @ each) / np.sum(inverse))
    assert not each.min() <= of_all <= each.max()
    # Chi squared is that of the whole covariance, by its own best slope: it depends on no weights.
    apart = each - of_all
    assert found.chi2 == pytest.approx(float(apart @ inverse @ apart), rel=5e-3)


def test_pulls_of_two_hundred_sets_of_films():
    """Area and mass sensitivity common (4 %), chi more at high coverage, thermometer common (1 mK), own 2 % and 3 mK in one source each."""
    rng = np.random.default_rng(17)
    truth = UNIVERSAL_JUMP * T
    chi = np.linspace(0.01, 0.05, 6)
    pulls, sums, chances = [], [], []
    for _ in range(200):
        common, warm, lone_y, lone_x = rng.normal(), rng.normal(), rng.normal(size=6), rng.normal(size=6)
        held, drag = rng.normal(), rng.normal()
        # `held` is a parameter of theory that moves temperature and density of all films together.
        x = T + 1e-3 * warm + 3e-3 * lone_x + 0.004 * held * T
        y = truth * (1 + 0.04 * common) * (1 + 0.02 * lone_y) * (1 + 0.01 * held) * (1 + chi * drag)
        part_x = np.vstack(
            [np.zeros(6), np.full(6, 1e-3), own(np.full(6, 3e-3)), np.zeros((6, 6)), 0.004 * x, np.zeros(6)]
        )
        part_y = np.vstack([0.04 * y, np.zeros(6), np.zeros((6, 6)), own(0.02 * y), 0.01 * y, chi * y])
        found = proportion(x, y, contributions_x=part_x, contributions_y=part_y)
        pulls.append((found.slope / UNIVERSAL_JUMP - 1) / (found.standard_uncertainty / UNIVERSAL_JUMP))
        sums.append(found.chi2)
        chances.append(found.probability)
    assert np.mean(pulls) == pytest.approx(0, abs=4 / math.sqrt(200))
    assert np.std(pulls) == pytest.approx(1, abs=4 / math.sqrt(400))
    # Chi squared of five degrees of freedom has mean 5 and variance 10.
    assert np.mean(sums) == pytest.approx(5, abs=4 * math.sqrt(10 / 200))
    assert np.mean(np.array(chances) < 0.1) == pytest.approx(0.1, abs=4 * math.sqrt(0.09 / 200))


def test_films_off_the_line_are_told_by_chi_squared():
    y = UNIVERSAL_JUMP * T * np.array([1, 1, 1, 1.25, 1, 1])
    found = proportion(T, y, contributions_x=np.zeros((6, 6)), contributions_y=own(0.02 * y))
    assert found.probability < 1e-6
    assert int(np.argmax(np.abs(found.residuals))) == 3


@pytest.mark.parametrize(
    ("x", "part_x", "part_y", "words"),
    [
        ([0.5, 0.0], np.zeros((2, 2)), own([0.1, 0.1]), r"x\[1\]"),
        ([0.5, 0.6], np.zeros((2, 3)), own([0.1, 0.1]), "contributions_x: found shape"),
        ([0.5, 0.6], np.zeros((3, 2)), own([0.1, 0.1]), "as many in both"),
        ([0.5, 0.6], np.zeros((2, 2)), own([0.1, 0.0]), r"y\[1\]: its residual has no uncertainty"),
        ([0.5, 0.6], np.zeros((1, 2)), [[0.1, 0.2]], "all sources are common"),
        ([0.5, 0.6], np.zeros((2, 2)), [[0.1, 0.2], [0.0, 0.1]], r"y\[0\]: no source is this point's alone"),
    ],
    ids=["zero", "shape", "sources", "none", "common only", "nothing alone"],
)
def test_refused_arguments(x, part_x, part_y, words):
    with pytest.raises(ValueError, match=words):
        proportion(x, [1.0, 1.2], contributions_x=part_x, contributions_y=part_y)

"""Residual tests and linear fits against scipy and cases by hand."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import stats

from archive.physics.linear_fit import linear_fit, straight_line
from archive.physics.residual_tests import aicc, chi2_probability, f_test, runs_test


def test_runs_by_hand():
    """Four plus, four minus: mean 1 + 2*16/8 = 5, variance 32*24/(64*7)."""
    found = runs_test([1, 1, 1, 1, -1, -1, -1, -1])
    assert (found.runs, found.expected) == (2, 5.0)
    assert found.z == pytest.approx((2.5 - 5) / math.sqrt(32 * 24 / (64 * 7)))


def test_runs_of_one_sign():
    assert runs_test([1.0] * 10).probability == pytest.approx(2.0**-9)
    assert runs_test([0.0, 0.0]).probability == 1.0
    assert runs_test([1.0, 0.0, -1.0]).runs == 2


def test_runs_are_as_rare_as_they_say():
    rng = np.random.default_rng(3)
    chance = np.array([runs_test(rng.normal(size=60)).probability for _ in range(1000)])
    assert np.mean(chance < 0.05) == pytest.approx(0.05, abs=0.025)


def test_f_test_of_a_slope_is_the_t_test():
    """Outside: the p-value of the slope in scipy's straight line equals the F-test of the slope."""
    rng = np.random.default_rng(5)
    x = np.linspace(0, 1, 15)
    y = 0.3 * x + rng.normal(0, 0.2, 15)
    line = straight_line(x, y, absolute=False)
    level = float(np.sum((y - y.mean()) ** 2))
    found = f_test(chi2_simple=level, dof_simple=14, chi2_full=line.chi2, dof_full=13)
    assert found == pytest.approx(stats.linregress(x, y).pvalue, rel=1e-9)


def test_f_test_edges():
    assert f_test(chi2_simple=1.0, dof_simple=3, chi2_full=0.0, dof_full=1) == 0.0
    assert f_test(chi2_simple=0.0, dof_simple=3, chi2_full=0.0, dof_full=1) == 1.0
    with pytest.raises(ValueError, match="dof_full"):
        f_test(chi2_simple=1.0, dof_simple=1, chi2_full=0.5, dof_full=1)


def test_chi2_probability():
    assert chi2_probability(3.841459, 1) == pytest.approx(0.05, abs=1e-7)
    assert math.isnan(chi2_probability(1.0, 0))


def test_aicc():
    assert aicc(residual_sum=10.0, points=10, parameters=2) == pytest.approx(0.0 + 6 + 24 / 6)
    assert aicc(residual_sum=1.0, points=4, parameters=2) == math.inf
    assert aicc(residual_sum=0.0, points=10, parameters=2) == -math.inf


def test_straight_line_against_scipy():
    rng = np.random.default_rng(6)
    x = np.linspace(5e3, 6e3, 30)
    y = 2e-9 * x + 1 + rng.normal(0, 1e-9, 30)
    found, expected = straight_line(x, y, absolute=False), stats.linregress(x, y)
    assert found.value("slope") == pytest.approx(expected.slope, rel=1e-6)
    assert found.standard_uncertainty("slope") == pytest.approx(expected.stderr, rel=1e-6)
    assert found.standard_uncertainty("intercept") == pytest.approx(expected.intercept_stderr, rel=1e-6)


def test_weights():
    """Two readings of one quantity: the weighted mean, and 1/sqrt(sum of weights)."""
    found = linear_fit(
        np.ones((2, 1)), [1.0, 2.0], names=("mean",), standard_uncertainty=[0.1, 0.2], absolute=True
    )
    assert found.value("mean") == pytest.approx((100 * 1 + 25 * 2) / 125)
    assert found.standard_uncertainty("mean") == pytest.approx(1 / math.sqrt(125))


def test_dependent_columns_are_said():
    x = np.linspace(0, 1, 8)
    found = linear_fit(np.column_stack([x, 2 * x]), x, names=("a", "b"), absolute=False)
    assert not found.converged
    assert "dependent" in found.message
    assert np.isinf(found.covariance).all()


def test_no_degrees_of_freedom():
    found = straight_line([0.0, 1.0], [0.0, 1.0], absolute=False)
    assert found.dof == 0
    assert np.isinf(found.covariance).all()


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ({"design": np.ones((3, 1)), "names": ("a", "b")}, "design: found shape"),
        ({"design": np.full((3, 1), np.nan), "names": ("a",)}, "not finite"),
        ({"design": np.ones((3, 4)), "names": tuple("abcd")}, "expected at least 4"),
        ({"design": np.ones((3, 1)), "names": ("a",), "absolute": True}, "absolute=True"),
        (
            {"design": np.ones((3, 1)), "names": ("a",), "standard_uncertainty": [1.0, 0.0, 1.0]},
            r"\[1\]: found 0.0",
        ),
        ({"design": np.ones((3, 1)), "names": ("a",), "standard_uncertainty": [1.0, 1.0]}, "found 2 points"),
    ],
    ids=["shape", "nan", "few", "absolute", "zero", "length"],
)
def test_refused(arguments, message):
    with pytest.raises(ValueError, match=message):
        linear_fit(**({"y": [1.0, 2.0, 3.0], "absolute": False} | arguments))

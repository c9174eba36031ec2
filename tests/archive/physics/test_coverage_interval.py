"""Coverage intervals of drawn values against closed forms, and the comparison with first order."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.stats import expon, norm

from archive.physics.coverage_interval import (
    comparison,
    numerical_tolerance,
    shortest_interval,
    symmetric_interval,
)

QUANTILES = (np.arange(1, 20_001) - 0.5) / 20_000
"""Places at which a distribution function's inverse stands for draws without noise."""


def test_both_intervals_of_a_normal_distribution_are_the_same() -> None:
    draws = norm.ppf(QUANTILES)
    for interval in (symmetric_interval(draws), shortest_interval(draws)):
        assert interval == pytest.approx((-1.959964, 1.959964), abs=2e-3)


def test_the_shortest_interval_of_an_exponential_distribution_begins_at_zero() -> None:
    draws = expon.ppf(QUANTILES)
    assert symmetric_interval(draws) == pytest.approx((-math.log(0.975), -math.log(0.025)), abs=4e-3)
    assert shortest_interval(draws) == pytest.approx((0.0, -math.log(0.05)), abs=2e-3)


@pytest.mark.parametrize(
    ("size", "probability", "expected"),
    [
        pytest.param(1000, 0.95, (25, 975), id="whole number of draws left over"),
        pytest.param(101, 0.95, (3, 99), id="rounded: 95.95 counts as 96, and 5 are left over"),
        pytest.param(100, 0.9, (5, 95), id="even number left over"),
        pytest.param(20, 0.95, (1, 20), id="as few as can be"),
    ],
)
def test_ends_are_the_draws_that_the_clause_names(
    size: int, probability: float, expected: tuple[int, int]
) -> None:
    """JCGM 101:2008, 7.7.2: q = pM or the integer part of pM + 1/2; r = (M - q)/2 or the integer part of (M - q + 1)/2."""
    assert symmetric_interval(np.arange(1.0, size + 1), probability=probability) == expected


@pytest.mark.parametrize("size", [0, 1, 9], ids=str)
def test_too_few_draws_are_refused(size: int) -> None:
    with pytest.raises(ValueError, match=r"draws: found \d, too few"):
        symmetric_interval(np.arange(float(size)))
    with pytest.raises(ValueError, match=r"draws: found \d, too few"):
        shortest_interval(np.arange(float(size)))


def test_a_probability_outside_zero_to_one_is_refused() -> None:
    with pytest.raises(ValueError, match="probability: found 1"):
        symmetric_interval(np.arange(100.0), probability=1.0)


@pytest.mark.parametrize(
    ("u", "digits", "expected"),
    [
        # JCGM 101:2008, 7.9.2, examples 1 and 2 (from memory): 0.00035 g and 2 K.
        pytest.param(0.00035, 2, 0.000005, id="two digits"),
        pytest.param(2.0, 1, 0.5, id="one digit"),
        pytest.param(0.0996, 2, 0.005, id="rounds up to the next place"),
        pytest.param(9.94e-13, 2, 5e-15, id="small"),
        pytest.param(1234.0, 2, 50.0, id="large"),
    ],
)
def test_tolerance_is_half_a_unit_of_the_last_digit(u: float, digits: int, expected: float) -> None:
    assert numerical_tolerance(u, digits=digits) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize(
    ("u", "digits", "words"),
    [(0.0, 1, "standard_uncertainty"), (math.nan, 1, "standard_uncertainty"), (1.0, 0, "digits")],
    ids=str,
)
def test_tolerance_of_nothing_is_refused(u: float, digits: int, words: str) -> None:
    with pytest.raises(ValueError, match=words):
        numerical_tolerance(u, digits=digits)


@pytest.mark.parametrize(
    ("size", "shift", "digits", "verdict"),
    [
        pytest.param(20_000, 0.0, 1, "agrees", id="the same"),
        pytest.param(20_000, 1.2, 1, "differs", id="a bias of more than half a unit of u = 2"),
        pytest.param(300, 0.3, 1, "undecided", id="too few draws to tell"),
        pytest.param(30, 0.0, 1, "undecided", id="no draw lies beyond the ends"),
        pytest.param(20_000, 0.02, 2, "undecided", id="two digits need more draws"),
    ],
)
def test_verdict(size: int, shift: float, digits: int, verdict: str) -> None:
    places = (np.arange(1, size + 1) - 0.5) / size
    draws = shift + 2 * norm.ppf(places)
    found = comparison(draws, symmetric_interval(draws), value=0.0, standard_uncertainty=2.0, digits=digits)
    assert found.agreement == verdict
    assert (found.low, found.high) == pytest.approx((-3.919928, 3.919928), abs=1e-5)


def test_the_ends_are_known_as_well_as_repetition_shows() -> None:
    """The numerical uncertainty of an end is what the ends of many sets of draws scatter by."""
    rng = np.random.default_rng(4)
    ends, stated = [], []
    for _ in range(200):
        draws = np.sort(rng.standard_normal(1000))
        interval = symmetric_interval(draws)
        ends.append(interval[1])
        stated.append(
            comparison(draws, interval, value=0.0, standard_uncertainty=1.0, digits=1).numerical_uncertainty
        )
    # The larger of two ends is stated, so it is on the large side.
    assert 0.85 < float(np.mean(stated)) / float(np.std(ends)) < 1.6

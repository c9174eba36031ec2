"""The linear regime: a known amplitude dependence gives its limit back, and what is not resolved gives none."""

from __future__ import annotations

import math

import numpy as np
import pytest

from archive.physics.linear_regime import level_means, linear_limit

DRIVE = np.repeat(np.linspace(0.1, 2.0, 20), 10)


def _sweep(change: float, sigma: float, seed: int = 0, power: int = 2):
    """Give levels of a period near 1 ms that has changed by a part `change` at the largest amplitude."""
    rng = np.random.default_rng(seed)
    amplitude = 5e-3 * DRIVE
    period = 1e-3 * (1 + change * (amplitude / amplitude.max()) ** power)
    return level_means(DRIVE, amplitude, period + rng.normal(0, sigma, period.size))


@pytest.mark.parametrize("power", [1, 2, 4])
def test_a_known_dependence_gives_its_limit(power: int) -> None:
    """The change reaches the limit where (a/a_max)^n is their ratio; the base, from a <= a_max/3, is part of the change."""
    found = linear_limit(_sweep(1e-6, 1e-14, power=power), limit=4e-10)
    low = np.mean((np.linspace(0.1, 2.0, 20)[:6] / 2.0) ** power)
    assert found.state == "found"
    # A straight line between levels 5 per cent of the range apart.
    assert found.amplitude == pytest.approx(1e-2 * (0.4 + low) ** (1 / power), rel=4e-3)
    assert found.base == pytest.approx(1e-3 * (1 + 1e-6 * low), rel=1e-10)


def test_the_uncertainty_is_that_of_many_sweeps() -> None:
    found = [linear_limit(_sweep(-1e-6, 5e-11, seed), limit=4e-10) for seed in range(300)]
    assert {each.state for each in found} == {"found"}
    amplitudes = np.array([each.amplitude for each in found])
    spread = np.array([each.standard_uncertainty for each in found])
    exact = linear_limit(_sweep(-1e-6, 1e-16), limit=4e-10).amplitude
    pulls = (amplitudes - exact) / spread
    assert abs(pulls.mean()) < 4 / math.sqrt(300)
    assert abs(pulls.std() - 1) < 4 / math.sqrt(600)


@pytest.mark.parametrize(
    ("change", "sigma", "limit", "state"),
    [
        (1e-9, 1e-12, 1e-10, "not reached"),
        (1e-9, 1e-9, 1e-10, "not resolved"),
        (1e-3, 1e-12, 1e-10, "not resolved"),
    ],
    ids=["constant", "noisy", "beyond from the start"],
)
def test_no_number_where_there_is_none(change: float, sigma: float, limit: float, state: str) -> None:
    found = linear_limit(_sweep(change, sigma, power=1), limit=limit)
    assert found.state == state
    assert math.isnan(found.amplitude)
    assert found.largest == pytest.approx(1e-2)


def test_one_level_off_by_itself_is_not_the_limit() -> None:
    amplitude = np.linspace(1.0, 10.0, 10)
    value = np.where(amplitude == 5.0, 1.5, np.where(amplitude > 8, 1.3, 1.0))
    levels = level_means(amplitude, amplitude, value, standard_uncertainty=0.01)
    found = linear_limit(levels, limit=0.1)
    assert found.state == "found"
    assert 8.0 < found.amplitude < 9.0


def test_each_level_counts_by_its_distance_from_the_crossing() -> None:
    """By hand: the change rises from 0 at level 8 to 0.3 at level 9, the limit is a third of the way; the base is three levels' mean."""
    amplitude = np.linspace(1.0, 10.0, 10)
    value = np.where(amplitude > 8, 1.3, 1.0)
    u = np.select([amplitude == 8, amplitude == 9], [0.02, 0.04], 0.01)
    found = linear_limit(level_means(amplitude, amplitude, value, standard_uncertainty=u), limit=0.1)
    assert found.amplitude == pytest.approx(8 + 1 / 3, rel=1e-12)
    parts = (2 / 3 * 0.02, 1 / 3 * 0.04, 0.01 / math.sqrt(3))
    assert found.standard_uncertainty == pytest.approx(math.hypot(*parts) / 0.3, rel=1e-12)


@pytest.mark.parametrize(
    ("call", "why"),
    [
        (lambda: level_means([1.0, 2.0, 3.0], [1, 2, 3], [1, 1, 1]), "no level has two rows"),
        (lambda: level_means([1.0, 2.0, -3.0], [1, 2, 3], [1, 1, 1]), r"drive\[2\]"),
        (lambda: linear_limit(_sweep(0.0, 1e-9), limit=0.0), "limit: found 0"),
        (
            lambda: linear_limit(level_means([1, 1, 2, 2], [1, 1, 2, 2], [1, 2, 1, 2]), limit=1.0),
            "found 2, expected at least 3",
        ),
        (
            lambda: linear_limit(
                level_means([1, 2, 3], [1, 1, 1], [1, 2, 3], standard_uncertainty=1.0), limit=1.0
            ),
            "does not change",
        ),
    ],
    ids=["no scatter", "negative", "no limit", "two levels", "one amplitude"],
)
def test_refusals_name_the_argument(call, why: str) -> None:
    with pytest.raises(ValueError, match=why):
        call()

"""The bracketed Newton inverse against closed forms and against scipy's root finder."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.optimize import brentq

from archive.physics.inversion import monotonic_inverse


@given(st.lists(st.floats(1e-6, 1e6), min_size=1, max_size=20))
def test_inverse_of_the_square_is_the_root(values: list[float]) -> None:
    x = monotonic_inverse(lambda x: (x * x, 2 * x), values, low=0.0, high=1e4)
    np.testing.assert_allclose(x, np.sqrt(values), rtol=1e-13)


def test_falling_function_with_a_flat_end() -> None:
    def law(x: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        return (1 - x) ** 3, -3 * (1 - x) ** 2

    assert monotonic_inverse(law, 0.125, low=0.0, high=1.0) == pytest.approx(0.5, abs=1e-14)
    assert monotonic_inverse(law, 0.0, low=0.0, high=1.0) == pytest.approx(1.0, abs=1e-5)


def test_agrees_with_an_independent_root_finder() -> None:
    def law(x: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        return x + np.exp(x) - 3 * np.arctan(1 / (x + 5)), 1 + np.exp(x) + 3 / (1 + (x + 5) ** 2)

    target = np.linspace(-1.0, 8.0, 7)
    expected = [brentq(lambda x, y=y: float(law(np.array(x))[0]) - y, -3, 3, xtol=1e-15) for y in target]
    np.testing.assert_allclose(monotonic_inverse(law, target, low=-3.0, high=3.0), expected, atol=1e-14)


def test_each_element_is_found_on_its_own() -> None:
    def law(x: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        return x**3 + x, 3 * x**2 + 1

    many = monotonic_inverse(law, [0.1, 5.0, 29.9], low=0.0, high=3.0)
    one = [float(monotonic_inverse(law, y, low=0.0, high=3.0)) for y in (0.1, 5.0, 29.9)]
    assert many.tolist() == one


def test_missing_stays_missing_and_brackets_may_differ() -> None:
    x = monotonic_inverse(lambda x: (x, np.ones_like(x)), [0.5, np.nan], low=[0.0, 0.0], high=[1.0, 2.0])
    assert x[0] == 0.5
    assert np.isnan(x[1])

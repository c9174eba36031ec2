"""Estimates keep the three classes of uncertainty apart."""

from __future__ import annotations

import numpy as np
import pytest

from archive.reduction.estimate import Estimate, covariance_between


def test_uncertainty_combines_point_and_named_sources() -> None:
    found = Estimate(
        np.array([1.0, 2.0]),
        "length",
        point=np.array([3.0, 0.0]),
        shared={"a": np.array([4.0, 5.0]), "b": np.array([0.0, 12.0])},
    )
    assert found.uncertainty == pytest.approx([5.0, 13.0])


def test_a_source_that_contributes_nothing_is_left_out() -> None:
    assert not Estimate(np.array(1.0), "length", shared={"a": np.array(0.0)}).shared


def test_covariance_between_scalars_is_the_sum_over_common_sources() -> None:
    first = Estimate(np.array(1.0), "length", shared={"a": np.array(2.0), "b": np.array(1.0)})
    second = Estimate(np.array(1.0), "length", shared={"a": np.array(-3.0), "c": np.array(1.0)})
    assert covariance_between(first, second) == -6.0


@pytest.mark.parametrize(
    ("value", "shared"),
    [
        pytest.param(np.zeros((2, 2)), {}, id="two dimensions"),
        pytest.param(np.zeros(2), {"a": np.zeros(3)}, id="a source of another length"),
    ],
)
def test_shapes_that_do_not_fit_are_refused(value: np.ndarray, shared: dict[str, np.ndarray]) -> None:
    with pytest.raises(ValueError, match="found"):
        Estimate(value, "length", shared=shared)

"""Propagation against calculation by hand, against GTC, and against a seeded Monte Carlo."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import GTC
import numpy as np
import pytest

from archive.physics.constants import MOLAR_MASS_HELIUM4
from archive.reduction.estimate import Estimate
from archive.reduction.film_steps import DensityParameters, superfluid_density
from archive.reduction.propagation import fit_contributions, propagate
from archive.reduction.step import Covariance, Outcome


def _product(values: Mapping[str, Any], _: Mapping[str, Any]) -> Outcome:
    return Outcome({"product": values["x"] * values["y"], "quotient": values["x"] / values["y"]})


def test_a_common_source_cancels_in_a_quotient_and_doubles_in_a_product() -> None:
    # By hand: relative uncertainty 1 % in both factors from one source.
    x = Estimate(np.array([2.0, 4.0]), "number", shared={"gain": np.array([0.02, 0.04])})
    y = Estimate(np.array(5.0), "number", shared={"gain": np.array(0.05)})
    found = propagate(_product, {"x": x, "y": y}, elementwise=True)
    assert found.shared["quotient"]["gain"] == pytest.approx([0.0, 0.0], abs=1e-15)
    assert found.shared["product"]["gain"] == pytest.approx([0.2, 0.4], rel=1e-12)


def test_point_uncertainty_goes_element_by_element() -> None:
    x = Estimate(np.array([2.0, 4.0]), "number", point=np.array([0.1, 0.0]))
    y = Estimate(np.array(5.0), "number")
    found = propagate(_product, {"x": x, "y": y}, elementwise=True)
    assert found.point["product"] == pytest.approx([0.5, 0.0])
    assert found.shared["product"] == {}


def test_areal_density_agrees_with_gtc() -> None:
    # Oracle: GTC, an independent implementation of the GUM with its own correlation bookkeeping.
    drop, below, past, area = (
        GTC.ureal(8e-10, 4e-12),
        GTC.ureal(1.12e-4, 3e-7),
        GTC.ureal(1.1e-5, 7e-8),
        GTC.ureal(1.5, 0.03),
    )
    volume = GTC.ureal(1.0, 0.002)
    oracle = drop * MOLAR_MASS_HELIUM4 / (area * (below * volume - past * volume))
    inputs = {
        "period_drop": Estimate(np.array([8e-10]), "period", point=np.array([4e-12])),
        "slope_below": Estimate(
            np.array(1.12e-4),
            "amount_sensitivity",
            shared={"s": np.array(3e-7), "v": np.array(1.12e-4 * 0.002)},
        ),
        "slope_past": Estimate(
            np.array(1.1e-5),
            "amount_sensitivity",
            shared={"p": np.array(7e-8), "v": np.array(1.1e-5 * 0.002)},
        ),
        "area": Estimate(np.array(1.5), "area", shared={"a": np.array(0.03)}),
    }

    def call(values: Mapping[str, Any], _: Mapping[str, Any]) -> Outcome:
        return superfluid_density(DensityParameters(), sample=None, **values)

    found = propagate(call, inputs, elementwise=True)
    combined = Estimate(
        found.outcome.array("superfluid_density"),
        "areal_mass_density",
        found.point["superfluid_density"],
        found.shared["superfluid_density"],
    )
    assert float(combined.value[0]) == pytest.approx(GTC.value(oracle), rel=1e-12)
    # Central differences of 2 per cent are second-order exact: (0.02)^2 is the most they may be off.
    assert float(combined.uncertainty[0]) == pytest.approx(GTC.uncertainty(oracle), rel=5e-4)


def test_monte_carlo_of_a_chain_has_the_stated_width() -> None:
    # 400 draws: the mean pull is uncertain by 0.05, its width by 0.035.
    random = np.random.default_rng(7)
    truth = {"x": 2.0, "y": 5.0}
    pulls = []
    for _ in range(400):
        gain, own = random.normal(0, 0.01), random.normal(0, 0.02)
        x = truth["x"] * (1 + gain) + own
        y = truth["y"] * (1 - gain)
        inputs = {
            "x": Estimate(
                np.array([x]), "number", point=np.array([0.02]), shared={"gain": np.array([0.01 * x])}
            ),
            "y": Estimate(np.array(y), "number", shared={"gain": np.array(-0.01 * y)}),
        }
        found = propagate(_product, inputs, elementwise=True)
        quotient = Estimate(
            found.outcome.array("quotient"), "number", found.point["quotient"], found.shared["quotient"]
        )
        pulls.append(float((quotient.value - 0.4)[0] / quotient.uncertainty[0]))
    assert abs(np.mean(pulls)) < 4 * 0.05
    assert abs(np.std(pulls) - 1) < 4 * 0.036


def test_axes_of_a_fit_reproduce_its_covariance() -> None:
    matrix = np.array([[4e-18, 1e-12, 0.0], [1e-12, 1e-6, 2e-4], [0.0, 2e-4, 9.0]])
    axes = fit_contributions(Covariance(("a", "b", "c"), matrix))
    back = sum(np.outer(list(axis.values()), list(axis.values())) for axis in axes)
    assert back == pytest.approx(matrix, rel=1e-9, abs=1e-20)


def test_an_undetermined_parameter_is_refused_by_name() -> None:
    with pytest.raises(ValueError, match="b: found no finite uncertainty"):
        fit_contributions(Covariance(("a", "b"), np.array([[1.0, 0.0], [0.0, np.inf]])))


def test_one_side_of_a_range_is_enough() -> None:
    def call(values: Mapping[str, Any], _: Mapping[str, Any]) -> Outcome:
        if values["x"] > 1:
            raise ValueError("x: found more than 1")
        return Outcome({"twice": 2 * values["x"]})

    found = propagate(
        call, {"x": Estimate(np.array(1.0), "number", shared={"s": np.array(0.1)})}, elementwise=True
    )
    assert float(found.shared["twice"]["s"]) == pytest.approx(0.2)

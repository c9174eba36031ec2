"""Steps of persistent currents: density at kept circulation, the way back, decay, and what they do not say."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

from archive.demo.current_forward import RING, coverage_run, cycle, hold
from archive.physics.helium_liquid import density, superfluid_fraction
from archive.reduction.current_decay_steps import (
    CoverageParameters,
    HeldParameters,
    current_against_coverage,
    current_decay,
)
from archive.reduction.current_steps import (
    CurrentParameters,
    current_reversibility,
    density_from_current,
)

LABORATORIES = 200
FULL: dict[str, Any] = {"amount": 0.34, "free_volume": RING.volume}


def slow(seed: int, highest: float = 2.10) -> tuple[np.ndarray, np.ndarray]:
    """Return temperature and angular momentum of a cycle."""
    record = cycle(RING, highest, np.random.default_rng(seed))
    return record.temperature, record.angular_momentum


def _u(values: np.ndarray) -> np.ndarray:
    return np.full(values.size, RING.noise)


def test_the_density_is_that_of_the_bulk_within_its_uncertainty() -> None:
    """Tables of Donnelly and Barenghi (1998), by which the record was made; the reference rows are few and cold."""
    T, L = slow(1)
    found = density_from_current(
        CurrentParameters(), temperature=T, angular_momentum=L, u_angular_momentum=_u(L), **FULL
    )
    rho = density(T) * superfluid_fraction(T)
    own = np.asarray(found.shared["superfluid_density"]["own level of the coldest rows"])
    u = np.hypot(np.asarray(found.point["superfluid_density"]), own)
    # 0.02 mK of the thermometer's own scatter, where the density falls steeply.
    u = np.hypot(u, np.gradient(rho[:150], T[:150])[np.r_[0:150, 149:-1:-1]] * RING.temperature_noise)
    pulls = (found.array("superfluid_density") - rho) / u
    assert np.std(pulls) == pytest.approx(1.0, abs=0.15)
    assert np.max(np.abs(pulls)) < 4.5
    assert abs(found.facts["largest_departure"]) < 2e-3
    assert found.findings == ()
    assert found.array("ratio")[0] == pytest.approx(1.0, abs=0.015)


def test_two_hundred_rings_pull_with_unit_width() -> None:
    pulls = []
    for seed in range(LABORATORIES):
        T, L = slow(500 + seed)
        found = density_from_current(
            CurrentParameters(), temperature=T, angular_momentum=L, u_angular_momentum=_u(L), **FULL
        )
        k = 120
        true = float(density(T[k]) * superfluid_fraction(T[k]))
        slope = float(density(T[k] + 1e-4) * superfluid_fraction(T[k] + 1e-4) - true) / 1e-4
        parts = [
            float(np.asarray(found.point["superfluid_density"])[k]), slope * RING.temperature_noise,
            float(np.asarray(found.shared["superfluid_density"]["own level of the coldest rows"])[k]),
        ]  # fmt: skip
        pulls.append(
            (float(found.array("superfluid_density")[k]) - true) / math.sqrt(sum(part**2 for part in parts))
        )
    each = np.array(pulls)
    assert abs(each.mean()) < 4 * each.std() / math.sqrt(LABORATORIES)
    assert abs(each.std() - 1) < 4 / math.sqrt(2 * LABORATORIES)


@pytest.mark.parametrize(
    ("given", "full"),
    [
        pytest.param({"amount": 0.34, "free_volume": 8e-6}, True, id="full"),
        pytest.param({"amount": 7e-4, "free_volume": 8e-6}, False, id="a film"),
        pytest.param({"amount": None, "free_volume": 8e-6}, False, id="amount not known"),
    ],
)
def test_a_density_is_given_for_a_full_ring_only(given: dict[str, Any], full: bool) -> None:  # noqa: FBT001
    T, L = slow(2)
    found = density_from_current(
        CurrentParameters(), temperature=T, angular_momentum=L, u_angular_momentum=None, **given
    )
    assert np.isfinite(found.array("superfluid_density")).all() == full
    assert np.isfinite(found.array("ratio")).all()


def test_a_current_that_has_decayed_is_no_density() -> None:
    T, L = slow(3, 2.165)
    found = density_from_current(
        CurrentParameters(), temperature=T, angular_momentum=L, u_angular_momentum=_u(L), **FULL
    )
    assert [finding.code for finding in found.findings] == ["current-not-bulk-density"]
    # The level is that before the loss.
    assert found.array("ratio")[0] == pytest.approx(1.0, abs=0.015)
    assert found.array("ratio")[-1] == pytest.approx(RING.lost, rel=0.015)


def test_reference_rows_must_be_there() -> None:
    with pytest.raises(ValueError, match="found 1 rows of reference among 8"):
        density_from_current(
            CurrentParameters(),
            temperature=np.linspace(1, 2, 8),
            angular_momentum=np.ones(8),
            u_angular_momentum=None,
            **FULL,
        )


@pytest.mark.parametrize(("highest", "left"), [(2.10, 1.0), (2.165, RING.lost)], ids=["kept", "lost"])
def test_the_way_back_tells_whether_the_circulation_was_kept(highest: float, left: float) -> None:
    T, L = slow(4, highest)
    found = current_reversibility(
        HeldParameters(),
        abscissa=T,
        angular_momentum=L,
        time=np.arange(T.size) * 60.0,
        u_angular_momentum=_u(L),
    )
    assert abs(float(found.outputs["remaining"]) - left) < 4 * float(np.asarray(found.point["remaining"]))
    assert [finding.code for finding in found.findings] == ([] if left == 1 else ["current-not-reversible"])


def test_rows_are_taken_in_the_order_of_time() -> None:
    T, L = slow(4, 2.165)
    time = np.arange(T.size) * 60.0
    mixed = np.random.default_rng(1).permutation(T.size)
    one, other = (
        current_reversibility(
            HeldParameters(),
            abscissa=T[rows],
            angular_momentum=L[rows],
            time=time[rows],
            u_angular_momentum=_u(L),
        )
        for rows in (np.arange(T.size), mixed)
    )
    assert float(other.outputs["remaining"]) == pytest.approx(float(one.outputs["remaining"]), rel=1e-12)


def test_a_current_cannot_grow() -> None:
    T, L = slow(5)
    L[150:] *= 1.1
    found = current_reversibility(
        HeldParameters(), abscissa=T, angular_momentum=L, time=np.arange(300.0), u_angular_momentum=_u(L)
    )
    assert "drift of the detector" in found.findings[0].what


@pytest.mark.parametrize(
    "T",
    [np.full(40, 1.5), np.linspace(1.3, 2.1, 40), np.linspace(1.3, 2.1, 10)],
    ids=["held", "one way", "few"],
)
def test_without_a_way_back_nothing_is_said(T: np.ndarray) -> None:
    found = current_reversibility(
        HeldParameters(),
        abscissa=T,
        angular_momentum=np.ones(T.size),
        time=np.arange(float(T.size)),
        u_angular_momentum=None,
    )
    assert found.verdicts == {"remaining": "no way back"}
    assert math.isnan(float(found.outputs["remaining"]))


def _decay(seed: int, **changes: Any) -> Any:
    record = hold(RING, 35e-6, np.random.default_rng(seed))
    given: dict[str, Any] = {
        "time": 1.7e9 + 300.0 * np.arange(record.temperature.size), "angular_momentum": record.angular_momentum, "temperature": record.temperature,
        "coverage": None, "u_angular_momentum": _u(record.temperature),
    }  # fmt: skip
    return current_decay(HeldParameters(), **given | changes)


def test_the_decay_of_a_film_gives_its_areal_density() -> None:
    """The exponent is pi K_R, so that sigma_s = (m/2) (3.491358e-8 kg/(m^2 K)) T."""
    found = _decay(1)
    u = dict(zip(found.covariance.names, np.sqrt(np.diag(found.covariance.matrix)), strict=True))
    truths = {
        "exponent": 3.6,
        "decay_time": 2000.0,
        "stiffness_ratio": 1.8,
        "areal_density_from_decay": 1.8 * 3.491358e-8 * 0.70,
    }
    for name, true in truths.items():
        assert abs(float(found.outputs[name]) - true) < 4 * u[name], name
    assert found.facts["chi2_exponential"] > 100 * found.facts["chi2_power"]


def test_without_a_temperature_the_decay_gives_no_density() -> None:
    found = _decay(2, temperature=None)
    assert found.verdicts == {"areal_density_from_decay": "temperature not recorded"}
    assert math.isfinite(float(found.outputs["exponent"]))


@pytest.mark.parametrize(
    ("changes", "verdict"),
    [
        pytest.param({"temperature": np.linspace(0.7, 0.8, 240)}, "temperature not held", id="temperature"),
        pytest.param({"coverage": np.linspace(35e-6, 34e-6, 240)}, "coverage not held", id="coverage"),
        pytest.param({"angular_momentum": np.full(240, np.nan)}, "too few readings", id="no readings"),
        pytest.param({"angular_momentum": 6e-10 + RING.noise * np.random.default_rng(3).normal(size=240)}, "no decay law", id="kept"),
    ],
)  # fmt: skip
def test_where_no_decay_is_looked_for_or_seen_a_word_says_so(changes: dict[str, Any], verdict: str) -> None:
    found = _decay(3, **changes)
    assert set(found.verdicts.values()) == {verdict}
    assert all(math.isnan(float(value)) for value in found.outputs.values())


def test_two_hundred_coverage_runs_pull_with_unit_width() -> None:
    pulls = []
    for seed in range(LABORATORIES):
        record = coverage_run(RING, np.linspace(35e-6, 47e-6, 13), np.random.default_rng(900 + seed))
        assert record.coverage is not None
        found = current_against_coverage(
            CoverageParameters(),
            coverage=record.coverage,
            angular_momentum=record.angular_momentum,
            u_angular_momentum=_u(record.coverage),
        )
        pulls.append(
            (float(found.outputs["onset_coverage"]) - RING.inert)
            / float(np.asarray(found.point["onset_coverage"]))
        )
    each = np.array(pulls)
    assert abs(each.mean()) < 4 * each.std() / math.sqrt(LABORATORIES)
    # Less scatter than stated does not narrow the result, more widens it.
    assert abs(each.std() - 1) < 4 / math.sqrt(2 * LABORATORIES)


def test_the_thickest_rows_alone_may_be_fitted() -> None:
    n = np.linspace(20e-6, 50e-6, 31)
    L = 1e-4 * np.maximum(n - 25e-6, 0)
    found = current_against_coverage(
        CoverageParameters(share=0.68), coverage=n, angular_momentum=L, u_angular_momentum=None
    )
    assert float(found.outputs["onset_coverage"]) == pytest.approx(25e-6, rel=1e-9)
    assert found.facts["points"] == 21


@pytest.mark.parametrize(
    ("n", "L", "words"),
    [pytest.param([30e-6] * 6, [1.0] * 6, "different coverages", id="one coverage"), pytest.param([1e-6, 2e-6, 3e-6, 4e-6], [4.0, 3.0, 2.0, 1.0], "no rise", id="falling")],
)  # fmt: skip
def test_a_run_without_a_line_is_refused(n: list[float], L: list[float], words: str) -> None:
    with pytest.raises(ValueError, match=words):
        current_against_coverage(
            CoverageParameters(), coverage=np.array(n), angular_momentum=np.array(L), u_angular_momentum=None
        )

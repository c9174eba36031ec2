"""The invented calibration cooldown is taken in without an error, and its plan gives back its truth."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from archive import Archive
from archive.demo.calibration_cooldown import (
    calibration_cooldown,
    calibration_truth,
    make_calibration_folders,
)
from archive.demo.calibration_forward import BENCH, germanium_resistance
from archive.reduction.calibration_sources import calibration_curve, temperature_contributions

SEED = 1


@pytest.fixture(scope="module")
def lab(tmp_path_factory):
    """Make an archive with the cooldown taken in and reduced."""
    place = tmp_path_factory.mktemp("calibration")
    (folder,) = make_calibration_folders(place / "folders", SEED)
    with Archive.create(place / "lab", name="Test laboratory") as made:
        outcome = made.ingest(folder)
        assert outcome.state == "ingested"
        assert [f.code for f in outcome.report.findings if f.severity != "note"] == []
        made.reduced = {each.sweep[-3:]: each for each in made.reduce("2024-11")}
        yield made


def readings(sweep, temperature):
    """Return what each sensor truly reads, without noise."""
    if sweep == "c01":
        return germanium_resistance(temperature)
    if sweep == "c02":
        R0, T0, n = BENCH.ruthenium_oxide
        return R0 * np.exp((T0 / temperature) ** n)
    return BENCH.offset + BENCH.constant / (temperature - BENCH.theta)


@pytest.mark.parametrize(
    ("sweep", "form", "scale"),
    [("c01", "log-polynomial", "ITS-90"), ("c02", "log-polynomial", "PLTS-2000"), ("c03", "curie-weiss", "PLTS-2000")],
)  # fmt: skip
def test_the_calibration_gives_back_the_truth(lab, sweep, form, scale):
    outcome = lab.reduced[sweep]
    assert outcome.problem is None
    assert [f.code for f in outcome.document.findings if f.severity != "note"] == []
    record = lab.calibration(outcome.address)
    assert (record.relation.form, record.scale) == (form, scale)
    truth = calibration_truth(SEED)[sweep].temperature
    T = np.geomspace(truth[0] * 1.002, truth[-1] * 0.998, 30)
    reading = readings(sweep, T)
    found = calibration_curve(record).temperature(reading)
    u = np.sqrt(sum(part**2 for _, part in temperature_contributions(record, reading, found)))
    assert np.all(np.abs(found - T) < 4 * u)
    assert np.all(u < 2 * record.relative_uncertainty * T)


def test_the_law_of_the_salt_is_found(lab):
    values = lab.array(f"{lab.reduced['c03'].address}#coefficients")
    truth = np.array([BENCH.offset, BENCH.constant, BENCH.theta])
    source = lab.reduced["c03"].document.covariances
    (matrix,) = [each["matrix"] for each in source.values()]
    # The reference's own part is larger than the fit's; both together are compared in the test above.
    assert np.all(np.abs(values - truth) < 40 * np.sqrt(np.diag(matrix)))
    assert np.abs(values / truth - 1) == pytest.approx(0, abs=5e-2)


def test_corrections_stand_in_the_steps_of_the_bulb_alone(lab):
    steps = {sweep: [s.name for s in each.document.steps] for sweep, each in lab.reduced.items()}
    assert steps["c01"][2:4] == ["gas-head", "thermal-transpiration"]
    assert "gas-head" not in steps["c02"]
    names = {each.name for each in lab.reduced["c01"].document.sources}
    assert {"equation of thermal transpiration", "VP-1.r1 tube diameter", "gain of gauge G3 in 2024-11"} <= names  # fmt: skip


def test_residuals_are_drawn_from_named_outputs(lab):
    address = lab.reduced["c02"].address
    reference, fitted, residual = (
        lab.array(f"{address}#{name}") for name in ("reference_temperature", "fitted_temperature", "residual")
    )
    np.testing.assert_allclose(reference - fitted, residual, atol=1e-15)
    assert lab.array(f"{address}#reading").size == residual.size


def test_a_replay_gives_the_same_bits(lab):
    assert lab.replay(lab.reduced["c03"].address).identical


def test_equal_seeds_give_equal_bytes_and_nothing_is_overwritten(tmp_path: Path):
    one, other, third = (calibration_cooldown(seed) for seed in (3, 3, 4))
    assert (one.sheet, one.files) == (other.sheet, other.files)
    assert one.files != third.files
    make_calibration_folders(tmp_path, 3)
    with pytest.raises(FileExistsError):
        make_calibration_folders(tmp_path, 3)

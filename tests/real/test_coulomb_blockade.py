"""Coulomb blockade thermometer of others: from HDF5 files to the charging energy that their SOURCE.md states."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import h5py
import numpy as np
import pytest
from scipy.interpolate import CubicSpline

from archive import Archive
from archive.lab import ReduceOutcome
from archive.physics import coulomb_blockade as cbt
from archive.physics.calibration_fit import fit_calibration

DATA = Path(__file__).parent / "coulomb-blockade-thermometer"
FILES = (475, 479, 483, 487, 491)
# SOURCE.md: charging energy of the global fit, and of the secondary calibration with its uncertainty, K.
GLOBAL, SECONDARY, U_SECONDARY = 736.8e-6, 764e-6, 36e-6
WIRES = 2 * 4127.5


def bath() -> np.ndarray:
    """Return mean and standard deviation of the mixing chamber's temperature for the five files, K."""
    return np.load(DATA / "calibration_BFdata.npy", allow_pickle=False)[::2]


def computed(group: str) -> tuple[np.ndarray, np.ndarray]:
    """Return temperature and normalised zero-bias conductance that the authors computed."""
    with h5py.File(DATA / "Calibration.h5") as file:
        name = next(key for key in file[group] if "zero bias conductance" in key and not key.startswith("std"))  # fmt: skip
        return file[f"{group}/temperature"][:, 0], file[f"{group}/{name}"][:, 0]


@pytest.fixture(scope="module")
def dips() -> dict[int, cbt.DipFit]:
    """Give the dips of all four records of each file, after the wires are taken off."""
    found = {}
    for number in FILES:
        with h5py.File(DATA / f"d{number}_time_c12.h5") as file:
            bias, read = file["y_array"][:].astype(float) * 1e-3, file["gCu"][:].astype(float)
        own = np.mean(1 / (1 / read - WIRES), axis=1)
        found[number] = cbt.fit_dip(bias * (1 - WIRES * float(np.mean(read))), own)
    return found


def test_the_series_is_the_computed_master_equation() -> None:
    T, G = computed("master_equation")
    known = T >= 2 * GLOBAL
    depth = cbt.zero_bias_depth(T[known], charging_energy=GLOBAL)
    assert known.sum() > 100
    np.testing.assert_allclose(depth, 1 - G[known], rtol=1e-3)
    np.testing.assert_allclose(
        cbt.temperature_from_depth(1 - G[known], charging_energy=GLOBAL), T[known], rtol=1.2e-3
    )


def test_the_conductance_far_away_is_the_stated_one(dips: dict[int, cbt.DipFit]) -> None:
    """21.683 uS, mean over |V| > 0.6 mV of all files."""
    assert np.mean([each.conductance for each in dips.values()]) == pytest.approx(21.683e-6, rel=2e-4)


def test_the_secondary_calibration_gives_the_stated_charging_energy(dips: dict[int, cbt.DipFit]) -> None:
    """From the third point on; the first of the nine is d475, the third d479."""
    depth = np.array([dips[number].depth for number in FILES[1:]])
    energies = [
        T / cbt.temperature_from_depth(d, charging_energy=1.0)
        for T, d in zip(bath()[1:, 0], depth, strict=True)
    ]
    assert np.mean(energies) == pytest.approx(SECONDARY, abs=U_SECONDARY)
    # At the lowest temperature the dip is deeper than the mixing chamber's thermometer says, by 16 per cent of T.
    cold = cbt.temperature_from_depth(dips[475].depth, charging_energy=float(np.mean(energies)))
    assert cold < bath()[0, 0]
    assert cold == pytest.approx(bath()[0, 0], rel=0.2)


def test_the_width_is_proportional_to_temperature(dips: dict[int, cbt.DipFit]) -> None:
    """The number of junctions is not in SOURCE.md; every file must give the same one, about 32, by 5.439 N k T/e."""
    junctions = []
    for number, (T, u_T) in zip(FILES[1:], bath()[1:], strict=True):
        fit = dips[number]
        u = np.hypot(np.sqrt(fit.covariance[2, 2]) / fit.width, u_T / T)
        junctions.append((fit.width / cbt.half_width(T, junctions=1), u))
    values, spread = np.array(junctions).T
    mean = np.sum(values / (spread * values) ** 2) / np.sum(1 / (spread * values) ** 2)
    assert mean == pytest.approx(32, abs=0.5)
    assert np.max(np.abs(values - mean) / (spread * values)) < 2


def test_depth_and_width_agree_on_temperature(dips: dict[int, cbt.DipFit]) -> None:
    for number in FILES:
        fit = dips[number]
        by_width = cbt.temperature_from_half_width(fit.width, junctions=32)
        by_depth = cbt.temperature_from_depth(fit.depth, charging_energy=SECONDARY)
        u = np.hypot(np.sqrt(fit.covariance[2, 2]) / fit.width, U_SECONDARY / SECONDARY)
        assert abs(by_width / by_depth - 1) < 2 * u, number


def test_the_computed_curve_is_a_calibration() -> None:
    """Their conductance against temperature as points of a calibration: T(1 - G), 10 to 44 mK."""
    T, G = computed("master_equation")
    keep = (T > 9.5e-3) & (T < 45e-3)
    fit = fit_calibration("log-polynomial", 1 - G[keep], T[keep])
    assert fit.leave_one_out / np.mean(T[keep]) < 1e-5
    between = np.exp(CubicSpline(np.log(T), np.log(1 - G))(np.log(0.02)))
    assert float(fit.curve.temperature(between)[0]) == pytest.approx(0.02, rel=1e-5)


@pytest.fixture(scope="module")
def reduced(tmp_path_factory: pytest.TempPathFactory) -> Iterator[tuple[Archive, list[ReduceOutcome]]]:
    """Give an archive with the folder taken in, and its dips."""
    with Archive.create(tmp_path_factory.mktemp("coulomb") / "lab", name="Open data") as lab:
        outcome = lab.ingest(DATA)
        assert outcome.state == "ingested", [finding.sentence() for finding in outcome.report.findings]
        yield lab, lab.reduce("open-coulomb", plan=DATA / "plan.toml")


def test_the_route_from_hdf5_to_depth_and_width(
    reduced: tuple[Archive, list[ReduceOutcome]], dips: dict[int, cbt.DipFit]
) -> None:
    lab, outcomes = reduced
    assert [each.problem for each in outcomes] == [None] * 5
    for number, each in zip(FILES, outcomes, strict=True):
        assert each.document is not None
        found = {entry.name: entry for entry in each.document.outputs}
        for name, expected in (("depth", dips[number].depth), ("width", dips[number].width)):
            entry = found[name]
            assert entry.value is not None
            assert entry.uncertainty is not None
            # One record of four against all four.
            assert abs(entry.value - expected) < 3.5 * entry.uncertainty, (number, name)
    assert lab.replay(outcomes[0].address or "").identical

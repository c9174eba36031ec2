"""Stability of an oscillator: white noise and drift with closed forms, and a folder reduced in an archive."""

from __future__ import annotations

import math
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from archive import Archive
from archive.physics.constants import MOLAR_MASS_HELIUM4
from archive.reduction.stability_steps import (
    SignalParameters,
    StabilityParameters,
    period_stability,
    signal_over_resolution,
)
from tests.small_cooldown import write_folder

LABORATORIES = 200
NOISE, P0 = 2e-12, 1e-3


def record(seed: int, *, rows: int = 512, drift: float = 0.0, interval: float = 60.0) -> dict[str, Any]:
    """Return a period record with white noise and a drift in s/s."""
    rng = np.random.default_rng(seed)
    t = 1.7e9 + interval * np.arange(rows)
    return {"time": t, "period": P0 + drift * (t - t[0]) + NOISE * rng.normal(size=rows)}


def test_white_noise_falls_with_the_root_of_the_averaging_time() -> None:
    """sigma(tau) = sigma_1 sqrt(tau_1/tau), sigma_1 the relative scatter of one reading."""
    found = period_stability(StabilityParameters(), **record(1, rows=4096))
    tau, sigma, u = (
        found.array("averaging_time"),
        found.array("allan_deviation"),
        np.asarray(found.point["allan_deviation"]),
    )
    expected = NOISE / P0 * np.sqrt(60.0 / tau)
    assert tau[:3] == pytest.approx([60.0, 120.0, 240.0])
    assert np.all(np.abs(sigma - expected) < 4 * u)
    assert abs(float(found.outputs["drift_per_hour"])) < 4 * float(np.asarray(found.point["drift_per_hour"]))
    assert found.facts["first_slope"] == pytest.approx(-0.5, abs=0.1)


def test_drift_rises_with_the_averaging_time_and_limits_it() -> None:
    """A drift D in s/s gives D tau/(P sqrt 2): at the longest averaging time it is all there is."""
    drift = 2e-15
    found = period_stability(StabilityParameters(), **record(2, rows=4096, drift=drift))
    tau, sigma = found.array("averaging_time"), found.array("allan_deviation")
    assert sigma[-1] == pytest.approx(drift * tau[-1] / (P0 * math.sqrt(2)), rel=0.05)
    assert float(found.outputs["drift_per_hour"]) == pytest.approx(3600 * drift, rel=0.01)
    # Where white noise and drift are equal, the deviation is least: tau^3 = 2 sigma_1^2 tau_1 P^2/D^2, within a factor of two.
    least = (2 * (NOISE / drift) ** 2 * 60.0) ** (1 / 3)
    assert 0.5 < float(found.outputs["resolution_time"]) / least < 2
    assert [finding.code for finding in found.findings] == ["drift-limits-averaging"]


def test_the_longest_stretch_between_gaps_is_taken() -> None:
    given = record(3, rows=300)
    given["time"][100:] += 3600
    given["period"][250] = np.nan
    found = period_stability(StabilityParameters(), **given)
    assert found.facts["readings"] == 150
    assert found.facts["gaps"] == 2
    assert found.findings[0].code == "record-with-gaps"


@pytest.mark.parametrize(
    ("rows", "spread", "words"),
    [pytest.param(10, 1.0, "found 10 readings", id="short"), pytest.param(40, 1.5, "in a row", id="uneven"), pytest.param(40, 0.0, "one instant", id="no time")],
)  # fmt: skip
def test_a_record_that_is_none_is_refused(rows: int, spread: float, words: str) -> None:
    given = record(4, rows=rows)
    given["time"] = given["time"][0] + 60.0 * np.arange(rows) ** spread if spread else np.full(rows, 1.7e9)
    with pytest.raises(ValueError, match=words):
        period_stability(StabilityParameters(), **given)


def test_the_signal_is_the_drop_at_the_jump() -> None:
    """0.042 s m^2/kg (disc of the reference oscillator) times 3.491358e-8 kg/(m^2 K) at 0.1 K: 1.46637e-10 s."""
    slope = 0.042 * MOLAR_MASS_HELIUM4 / 1.5
    found = signal_over_resolution(SignalParameters(), resolution=1e-12, slope=slope, area=1.5)
    assert float(found.outputs["signal"]) == pytest.approx(1.466370e-10, rel=1e-6)
    assert float(found.outputs["ratio"]) == pytest.approx(146.6370, rel=1e-6)
    assert found.findings == ()
    coarse = signal_over_resolution(SignalParameters(), resolution=1e-10, slope=slope, area=1.5)
    assert coarse.findings[0].code == "resolution-too-coarse"
    stated = signal_over_resolution(SignalParameters(signal_ns=0.5), resolution=1e-12, slope=None, area=None)
    assert float(stated.outputs["ratio"]) == pytest.approx(500)


@pytest.mark.parametrize(
    ("resolution", "slope", "words"), [(1e-12, None, "signal_ns"), (0.0, 1e-4, "resolution")], ids=["no sensitivity", "no resolution"]
)  # fmt: skip
def test_without_a_signal_nothing_is_said(resolution: float, slope: float | None, words: str) -> None:
    with pytest.raises(ValueError, match=words):
        signal_over_resolution(SignalParameters(), resolution=resolution, slope=slope, area=1.5)


def test_two_hundred_records_pull_with_unit_width() -> None:
    drift = 3e-17
    pulls: dict[str, list[float]] = {"white_level": [], "drift_per_hour": []}
    truth = {"white_level": NOISE / P0, "drift_per_hour": 3600 * drift}
    for seed in range(LABORATORIES):
        found = period_stability(StabilityParameters(), **record(100 + seed, drift=drift))
        for name, values in pulls.items():
            values.append((float(found.outputs[name]) - truth[name]) / float(np.asarray(found.point[name])))
    for name, values in pulls.items():
        each = np.array(values)
        assert abs(each.mean()) < 4 * each.std() / math.sqrt(LABORATORIES), name
        assert abs(each.std() - 1) < 4 / math.sqrt(2 * LABORATORIES), name


LOG = """
[[sweep]]
name = "s003"
kind = "log"
files = ["night.csv"]
layout = "bridge"
empty_cell = true
direction = "hold"
"""


def test_a_night_of_a_folder_is_reduced_in_an_archive(tmp_path: Path) -> None:
    folder = write_folder(tmp_path / "2026-03")
    sheet = folder / "cooldown.toml"
    sheet.write_text(sheet.read_text(encoding="utf-8") + LOG, encoding="utf-8")
    rng = np.random.default_rng(8)
    begin = datetime.fromisoformat("2026-03-03T20:00:00+02:00")
    rows = [
        f"{(begin + timedelta(seconds=60 * k)).isoformat()},0.3000,{1 + 2e-9 * rng.normal():.12f}" for k in range(400)
    ]  # fmt: skip
    (folder / "night.csv").write_text("\n".join(["time,T (K),P (ms)", *rows]) + "\n", encoding="utf-8")
    with Archive.create(tmp_path / "lab", name="Test laboratory") as lab:
        lab.ingest(folder)
        (outcome,) = lab.reduce("2026-03", plan="stability")
        assert outcome.problem is None
        assert outcome.document is not None
        found = {each.name: each for each in outcome.document.outputs if each.rows is None}
        assert abs(found["white_level"].value - 2e-9) < 4 * found["white_level"].uncertainty
        # The drop at a jump of 0.1 K: 168 ns/mmol x 1.60 m^2 x 8.7227 umol/(m^2 K) x 0.1 K = 0.2345 ns.
        assert found["signal"].value == pytest.approx(0.23446e-9, rel=1e-3)
        assert found["signal_over_resolution"].value > 100
        assert "Allan deviation" in outcome.document.steps[0].sentence
        assert lab.replay(outcome.address).identical

"""Turns of single checks: plateaus, isotherms by pressure, turned sweeps, odd doses, faulty entry points, real folders."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

from archive.intake.checks import registry, run_checks
from archive.intake.folder import read_cooldown
from archive.intake.reading import Reading
from archive.intake.thresholds import Thresholds
from archive.physics.helium_vapour import saturated_vapour_pressure
from schemas.finding import Finding
from tests.archive.intake.factories import (
    CHANNELS,
    columns,
    good_columns,
    make_reading,
    sheet_tables,
    temperatures,
)

PRESSURE = {"column": 1, "quantity": "pressure", "unit": "Pa", "convention": "absolute"}
AMOUNT = {"column": 2, "quantity": "amount", "unit": "umol"}
X = np.array([0.05, 0.10, 0.15, 0.20, 0.25, 0.30])
N = np.array([0.8846, 1.0194, 1.1134, 1.2019, 1.2945, 1.3960]) * 1e-6


def told(reading: Reading, code: str) -> list[Finding]:
    """Return the findings of one check."""
    return [finding for finding in run_checks(reading, Thresholds()) if finding.code == code]


def isotherm(channels: dict[str, Any], data: dict[str, np.ndarray], **fields: object) -> Reading:
    """Return a reading with an isotherm by pressures."""
    tables = sheet_tables()
    tables["gauge"].append({"name": "G2", "range": "300 Pa"})
    tables["sweep"].append(
        {"name": "iso", "kind": "isotherm", "files": ["iso.csv"], "channels": channels, **fields}
    )
    return make_reading(tables, {**good_columns(), "iso": data})


def without_scale(amplitude: np.ndarray) -> Reading:
    """Return a reading whose amplitude channel states no full scale."""
    tables = sheet_tables()
    del tables["layout"]["counter"]["channels"]["amplitude"]["full_scale"]
    data = good_columns()
    data["film"]["amplitude"] = amplitude
    return make_reading(tables, data)


def test_a_clipped_amplitude_is_seen_without_its_full_scale() -> None:
    amplitude = good_columns()["film"]["amplitude"] * (1 + 0.2 * np.sin(np.linspace(0, 3, 290)))
    clipped = np.minimum(amplitude, 0.117)
    (finding,) = told(without_scale(clipped), "saturated")
    assert finding.severity == "warning"
    assert finding.line == 2 + int(np.argmax(clipped == 0.117))
    assert not told(without_scale(amplitude), "saturated")


def test_a_coarse_column_is_not_clipped() -> None:
    assert not told(without_scale(np.round(good_columns()["film"]["amplitude"], 5)), "saturated")


@pytest.mark.parametrize("zero", [0.0, 20.0])
def test_an_isotherm_over_a_recorded_saturation_pressure(zero: float) -> None:
    channels = {"p0": {**PRESSURE, "column": 3}, "p": PRESSURE, "n": AMOUNT}
    corrections = [
        {"channel": "p", "correct": "zero", "value": f"{zero} Pa", "known": "measured", "source": "night"}
    ]
    data = {"p": 1000 * X + zero, "p0": np.full(6, 1000.0), "n": N}
    reading = isotherm(channels, data, gas="adsorptive", corrections=corrections)
    assert not told(reading, "isotherm-points")
    assert not told(reading, "bet-criteria")
    high = isotherm(channels, {**data, "p": 1100 * X / 0.3}, gas="adsorptive")
    assert [finding.line for finding in told(high, "isotherm-order")] == [7]


def test_an_isotherm_of_helium_is_taken_over_its_vapour_pressure() -> None:
    p0 = float(saturated_vapour_pressure(4.2))
    reading = isotherm({"p": PRESSURE, "n": AMOUNT}, {"p": p0 * X, "n": N}, bath_temperature="4.2 K")
    assert not told(reading, "isotherm-points")
    few = isotherm({"p": PRESSURE, "n": AMOUNT}, {"p": 10 * p0 * X, "n": N}, bath_temperature="4.2 K")
    assert told(few, "isotherm-points")


def test_an_isotherm_of_another_gas_without_saturation_is_not_judged() -> None:
    reading = isotherm({"p": PRESSURE, "n": AMOUNT}, {"p": 10.0 * X[::-1], "n": N}, gas="adsorptive")
    assert not told(reading, "isotherm-order")
    assert not told(reading, "isotherm-points")


def test_a_gauge_in_a_channel_has_its_range() -> None:
    gauged = {**PRESSURE, "gauge": "G2"}
    reading = isotherm({"p": gauged, "n": AMOUNT}, {"p": 1100 * X, "n": N}, gas="adsorptive")
    (finding,) = told(reading, "gauge-above-range")
    assert finding.found == "330 Pa"
    assert not told(
        isotherm({"p": gauged, "n": AMOUNT}, {"p": 900 * X, "n": N}, gas="adsorptive"), "gauge-above-range"
    )


@pytest.mark.parametrize(
    ("channel", "change", "word"),
    [
        ("pressure", {"quantity": "pressure", "unit": "Pa"}, "absolute or gauge"),
        ("amplitude", {**CHANNELS["amplitude"], "convention": "peak"}, "the detection says rms"),
    ],
)
def test_conventions_that_are_missing_or_contradict(channel: str, change: dict[str, Any], word: str) -> None:
    tables = sheet_tables()
    tables["layout"]["counter"]["channels"][channel] = {"column": "x", **change}
    data = good_columns()
    for each in data.values():
        each[channel] = each["amplitude"]
    (finding,) = told(make_reading(tables, data), "convention-missing")
    assert word in finding.what


def test_a_sweep_up_and_down_in_one_record() -> None:
    T = temperatures()
    up, down = columns(T, drop=50e-9), columns(T[::-1], drop=50e-9, at=0.596, seed=5)
    turned = {name: np.concatenate((up[name], down[name])) for name in up}
    turned["time"] = up["time"][0] + 60.0 * np.arange(len(turned["T"]))
    tables = sheet_tables()
    tables["sweep"][1]["direction"] = "both"
    (finding,) = told(make_reading(tables, {**good_columns(), "film": turned}), "thermal-lag")
    assert "in film (up) and film (down)" in finding.what


@pytest.mark.parametrize(
    ("change", "count"),
    [
        pytest.param({"pressure_after": "-0.1 Torr"}, 1, id="below zero"),
        pytest.param({"act": "remove", "pressure_after": "8.0 Torr"}, 1, id="nothing moved"),
        pytest.param({"act": "remove", "pressure_after": "9.0 Torr"}, 0, id="gas came back into the doser"),
    ],
)
def test_odd_doses(change: dict[str, Any], count: int) -> None:
    tables = sheet_tables()
    tables["dose"][0] |= change
    assert len(told(make_reading(tables), "dose-not-positive")) == count


def test_a_stated_amount_and_a_volume_are_above_zero() -> None:
    tables = sheet_tables()
    tables["dose"].append({"name": "d02", "at": "2026-03-12T08:00:00+00:00", "amount": "0 umol"})
    tables["doser"][0]["volume"] = "0 cm^3"
    assert {finding.place for finding in told(make_reading(tables), "dose-not-positive")} == {"d02", "D1"}


def test_a_file_named_twice_in_one_sweep() -> None:
    tables = sheet_tables()
    tables["sweep"][1]["files"] = ["film.csv", "film.csv"]
    (finding,) = told(make_reading(tables), "file-twice")
    assert "named twice" in finding.what


def test_an_entry_point_that_cannot_be_loaded_is_told_of(monkeypatch: pytest.MonkeyPatch) -> None:
    class Entry:
        name = "gone"

        def load(self) -> None:
            raise ImportError("no module named gone")

    monkeypatch.setattr(registry, "entry_points", lambda group: [Entry()])
    findings = run_checks(make_reading(), Thresholds())
    assert [finding.what for finding in findings if finding.code == "check-failed"] == [
        "the check gone could not be carried out: no module named gone"
    ]


SHEET = """format = "stillroom-cooldown/1"
name = "2026-04"
cryostat = "DR-1"
undated = "a test"
time_zone = "Europe/Helsinki"
operators = ["postdoc"]
purpose = "lines of findings"
outcome = "complete"
temperature_scale = "ITS-90"

[[record.cryostat]]
name = "DR-1"
revision = 1
kind = "dilution"

[gas_end]
state = "unknown"

[[sweep]]
name = "s001"
kind = "log"
files = ["log.csv"]
after_dose = "d09"

[sweep.dialect]
time_format = "epoch"

[sweep.channels.time]
column = "t"
quantity = "instant"

[sweep.channels.level]
column = "U"
quantity = "voltage"
unit = "mV"
"""


def test_findings_of_a_folder_name_lines_of_sheet_and_data(tmp_path: Path) -> None:
    (tmp_path / "cooldown.toml").write_text(SHEET)
    (tmp_path / "log.csv").write_text("# logger\nt,U\n100,1.5\n200,9.9E37\n150,1.4\n")
    reading = read_cooldown(tmp_path)
    assert reading.findings == []
    found = {
        finding.code: (finding.file, finding.line, finding.field)
        for finding in run_checks(reading, Thresholds())
    }
    lines = SHEET.splitlines()
    assert found["gas-end-unknown"] == (
        "cooldown.toml",
        lines.index('state = "unknown"') + 1,
        "gas_end.state",
    )
    assert found["unknown-name"] == (
        "cooldown.toml",
        lines.index('after_dose = "d09"') + 1,
        "sweep[1].after_dose",
    )
    assert found["time-reversed"] == ("log.csv", 5, None)
    assert found["sentinel-undeclared"] == ("log.csv", 4, None)

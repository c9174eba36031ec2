"""`calibration` and `drift`: what they print, write and refuse."""

from __future__ import annotations

import json
import tomllib
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from click.testing import Result

from archive.physics.calibration_drift import calibration_difference
from archive.reduction.calibration_comparison import Drift
from schemas.thermometer import Calibration
from tests.archive.commands.support import FakeArchive, parsed

Run = Callable[..., Result]
Fake = Callable[..., FakeArchive]
ADDRESS = "2024-11/c01@thermometer-calibration.1"

RECORD = Calibration.model_validate_json(
    json.dumps(
        {
            "name": "GE-7-cal", "revision": 1, "thermometer": "GE-7", "scale": "ITS-90", "date": "2024-11-06", "against": "VP-1", "reading_unit": "Ohm",
            "relation": {"form": "log-polynomial", "centre": 5.5, "half_width": 0.8, "coefficients": [0.7950900547130771, -0.58]},
            "temperature_low": "1.3 K", "temperature_high": "4.2 K", "relative_uncertainty": 1e-4, "readings": [115.0, 617.0], "made_from": ADDRESS,
            "contribution": [{"source": "reference \"A\"", "level": "laboratory", "description": "", "coefficients": [1e-5, 0.0]}],
        }
    )
)  # fmt: skip


def test_the_record_is_printed_or_written_once(tmp_path: Path, run: Run, fake: Fake) -> None:
    lab = fake(calibration=RECORD)
    shown = run("calibration", ADDRESS, "--revision", "1")
    assert shown.exit_code == 0
    assert lab.asked[-1] == ("calibration", (ADDRESS,), {"name": None, "revision": 1})
    assert shown.stdout.startswith(f"# GE-7-cal.r1: made from {ADDRESS}")
    (table,) = tomllib.loads(shown.stdout)["record"]["calibration"]
    assert table["relation"]["coefficients"] == [0.7950900547130771, -0.58]
    assert table["contribution"][0]["source"] == 'reference "A"'
    target = tmp_path / "ge7.toml"
    assert run("calibration", ADDRESS, "-o", str(target)).exit_code == 0
    assert target.read_text(encoding="utf-8") == shown.stdout
    alone = run("calibration", ADDRESS, "--alone").stdout
    assert tomllib.loads(alone)["format"] == "stillroom-revision/1"
    assert alone.endswith(shown.stdout.partition("\n")[2])
    other = tmp_path / "again.toml"
    assert parsed(run("calibration", ADDRESS, "-o", str(other), "--json")) == {"written": [str(other)]}
    assert parsed(run("calibration", ADDRESS, "--json"))["made_from"] == ADDRESS


@pytest.mark.parametrize(("name", "sentence"), [("ge7.toml", "this file is there already"), ("none/ge7.toml", "the file cannot be written")])  # fmt: skip
def test_no_file_is_overwritten(name: str, sentence: str, tmp_path: Path, run: Run, fake: Fake) -> None:
    fake(calibration=RECORD)
    (tmp_path / "ge7.toml").write_text("mine", encoding="utf-8")
    result = run("calibration", ADDRESS, "-o", str(tmp_path / name))
    assert result.exit_code == 2
    assert sentence in result.stderr
    assert (tmp_path / "ge7.toml").read_text(encoding="utf-8") == "mine"


def test_what_is_no_address_is_refused(run: Run) -> None:
    result = run("calibration", "not an address!")
    assert result.exit_code == 2
    assert "is no address" in result.stderr


def test_drift_is_a_table_in_millikelvin(run: Run, fake: Fake) -> None:
    T = np.linspace(1.0, 2.0, 5)
    found = calibration_difference(T, T + 2e-3, earlier_parts={"a": np.full(5, 5e-4)}, later_parts={})
    lab = fake(calibration_drift=[Drift("GE-7-cal.r1", "GE-7-cal.r2", "ITS-90", found), Drift("GE-7-cal.r2", "x.r1", "local:x", None, "no")])  # fmt: skip
    result = run("drift", "GE-7")
    assert lab.asked[-1][1] == ("GE-7",)
    assert "GE-7-cal.r2 minus GE-7-cal.r1, on ITS-90:" in result.stdout
    assert "2.00(50)" in result.stdout
    assert "Largest: 4 times its standard uncertainty" in result.stdout
    assert "x.r1 was not compared with GE-7-cal.r2: no" in result.stderr
    first, second = parsed(run("drift", "GE-7", "--json"))
    assert first["difference_K"] == pytest.approx([2e-3] * 5)
    assert second == {"earlier": "GE-7-cal.r2", "later": "x.r1", "scale": "local:x", "not_compared": "no"}


def test_one_calibration_is_nothing_to_compare(run: Run, fake: Fake) -> None:
    fake(calibration_drift=[])
    assert "fewer than two calibrations of GE-7" in run("drift", "GE-7").stdout

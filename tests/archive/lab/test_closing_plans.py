"""Plans that sum up a cell's sweeps: once for a cooldown, on the last sweep, or where they are asked for."""

from __future__ import annotations

from pathlib import Path

import pytest

from archive import Archive
from archive.errors import BadRequest

PLAN = """
name = "closing"
revision = 1
title = "Temperatures, once for the cell"
description = "test"

[applies]
sweep_kinds = ["temperature-sweep"]
last = {last}

[[step]]
use = "temperature-from-calibration"
take = {{ reading = "channel:@thermometer", calibration = "calibration:@thermometer" }}
give = {{ temperature = "temperature" }}
"""


@pytest.fixture
def plan(tmp_path: Path) -> Path:
    """Give a plan that is carried out once."""
    file = tmp_path / "closing.toml"
    file.write_text(PLAN.format(last="true"))
    return file


def test_it_is_carried_out_on_the_last_sweep(sqlite_lab: Archive, folder: Path, plan: Path) -> None:
    sqlite_lab.ingest(folder)
    assert [each.sweep for each in sqlite_lab.reduce("2026-03", plan=plan)] == ["2026-03/s002"]
    plan.write_text(PLAN.format(last="false").replace('"closing"', '"each"'))
    assert [each.sweep for each in sqlite_lab.reduce("2026-03", plan=plan)] == [
        "2026-03/s001",
        "2026-03/s002",
    ]


def test_it_is_carried_out_elsewhere_when_that_is_named(
    sqlite_lab: Archive, folder: Path, plan: Path
) -> None:
    sqlite_lab.ingest(folder)
    assert [each.sweep for each in sqlite_lab.reduce("2026-03/s001", plan=plan)] == ["2026-03/s001"]


def test_all_plans_of_a_sweep_leave_it_to_the_last(sqlite_lab: Archive, folder: Path) -> None:
    sqlite_lab.ingest(folder)
    done = {each.plan.partition(".")[0] for each in sqlite_lab.reduce("2026-03/s001")}
    assert "universal-jump" not in done
    with pytest.raises(BadRequest, match="no plan"):
        sqlite_lab.reduce("2026-03/s001", plan="universal-jump")

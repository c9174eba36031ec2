"""A small cooldown whose reductions rest on a calibration, on doses, on an area and on each other.

The thermometer reads ln(T/K) = 3 - 3 ln(R/kOhm), an invented relation; the film's filling comes from two doses over an area.
"""

from __future__ import annotations

import math
from pathlib import Path

from tests.small_cooldown import SHEET

__all__ = ["PLAN", "amendment", "calibration", "substrate", "write_calibrated"]

_THERMOMETER = """
[[record.thermometer]]
name = "RX"
revision = 1
kind = "ruthenium-oxide"
place = "cell"
"""
_TEMPERATURE = """\
column = "T (K)"
quantity = "temperature"
unit = "K"
scale = "ITS-90"
uncertainty = "0.1 mK"
"""
_RESISTANCE = """\
column = "R (kOhm)"
quantity = "resistance"
unit = "kOhm"
thermometer = "RX.r1"
calibration = "RX-cal.r1"
"""

PLAN = """\
name = "filling"
revision = REVISION
title = "Filling of the film"
CHANGED
headline = ["coverage"]

[applies]
sweep_kinds = ["temperature-sweep"]
empty_cell = false

[needs.empty]
plan = "empty-cell"
relation = "same-cell"

[[step]]
use = "amount-from-doses"
take = { gas = "sheet:gas", sample = "sheet:sample" }
give = { amount = "amount" }

[[step]]
use = "coverage-from-amount"
take = { amount = "amount", area = "sheet:substrate.area" }
give = { coverage = "coverage" }

[[step]]
use = "temperature-from-calibration"
take = { reading = "channel:@thermometer", calibration = "calibration:@thermometer" }
give = { temperature = "temperature" }

[[step]]
use = "period-drop"
take = { temperature = "temperature", period = "channel:@period", background = "need:empty#period_background", low = "need:empty#period_low", high = "need:empty#period_high" }
give = { shift = "shift" }
"""


def calibration(revision: int, *, first: float = 3.0, low: str = "50 mK", more: str = "") -> str:
    """Return the table of a calibration's revision."""
    return f"""
[[record.calibration]]
name = "RX-cal"
revision = {revision}
thermometer = "RX.r1"
scale = "ITS-90"
date = 2026-01-05
against = "an invented reference"
reading_unit = "kOhm"
relation = {{ form = "log-polynomial", coefficients = [{first}, -3.0] }}
temperature_low = "{low}"
temperature_high = "1.2 K"
uncertainty = "0.5 mK"
{more}
"""


def substrate(revision: int, area: str, more: str = "") -> str:
    """Return the table of a substrate's revision."""
    return f"""
[[record.substrate]]
name = "plastic"
revision = {revision}
material = "polyimide film"
area = {{ quantity = "{area}", known = "measured", source = "N2 isotherm" }}
{more}
"""


def amendment(body: str, *, cooldown: str = "2026-03", by: str = 'by = "data steward"') -> str:
    """Return an amendment sheet."""
    return f"""format = "stillroom-amendment/1"
cooldown = "{cooldown}"
{by}
because = "the notebook was misread at the ingest"
{body}
"""


def _table(day: int, shift: float) -> str:
    rows = ["time,R (kOhm),P (ms)"]
    for number in range(60):
        T = 0.2 + 0.01 * number
        reading = math.exp((3.0 - math.log(T)) / 3.0)
        minute = f"{10 + number // 30:02d}:{number % 30 * 2:02d}:00"
        rows.append(f"2026-03-{day:02d}T{minute}+02:00,{reading:.9f},{1 + 1e-6 * T + shift:.9f}")
    return "\n".join(rows) + "\n"


def write_calibrated(folder: Path, *, name: str = "2026-03", year: int = 2026) -> Path:
    """Write the cooldown's folder and return it."""
    folder.mkdir(parents=True, exist_ok=True)
    sheet = SHEET.replace("NAME", name).replace(_TEMPERATURE, _RESISTANCE)
    sheet = sheet.replace("[layout.bridge]", _THERMOMETER + calibration(1) + "\n[layout.bridge]", 1)
    files = {"cooldown.toml": sheet, "empty.csv": _table(3, 0.0), "film.csv": _table(8, 8e-6)}
    for file, text in files.items():
        (folder / file).write_text(text.replace("2026-03", f"{year}-03"), encoding="utf-8")
    return folder

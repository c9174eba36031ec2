"""A small cooldown folder for tests of the house itself: one oscillator, two sweeps, two doses."""

from __future__ import annotations

from pathlib import Path

__all__ = ["SHEET", "write_folder"]

SHEET = """\
format = "stillroom-cooldown/1"
name = "NAME"
cryostat = "fridge.r1"
begin = 2026-03-02T09:00:00+02:00
end = 2026-03-20T18:00:00+02:00
time_zone = "Europe/Helsinki"
operators = ["graduate student"]
purpose = "a small run for tests"
outcome = "complete"
temperature_scale = "ITS-90"
cell = "bob.r1"
sample = "well-helium.r1"

[gas_end]
state = "recovered"
warmest_temperature = "300 K"

[[record.cryostat]]
name = "fridge"
revision = 1
kind = "dilution"

[[record.cell]]
name = "bob"
revision = 1
kind = "torsional-oscillator"
rod_material = "Al5056"
rim_radius = "7.5(1) mm"
empty_period = "1.000000(1) ms"
mass_sensitivity = "168(3) ns/mmol"
substrate = "plastic.r1"
free_volume = "2.1(1) cm^3"

[[record.substrate]]
name = "plastic"
revision = 1
material = "polyimide film"
area = { quantity = "1.60(3) m^2", known = "measured", source = "N2 isotherm" }

[[record.sample]]
name = "well-helium"
revision = 1
isotope = "4He"
gas_source = "well gas, 0.2 ppm 3He as stated by the supplier"

[layout.bridge]
dialect = { time_format = "iso8601" }

[layout.bridge.channels.time]
column = "time"
quantity = "instant"

[layout.bridge.channels.temperature]
column = "T (K)"
quantity = "temperature"
unit = "K"
scale = "ITS-90"
uncertainty = "0.1 mK"

[layout.bridge.channels.period]
column = "P (ms)"
quantity = "period"
unit = "ms"
uncertainty = "2 ps"

[[dose]]
name = "d01"
at = 2026-03-04T10:00:00+02:00
amount = "40.0(1) umol"

[[dose]]
name = "d02"
at = 2026-03-06T10:00:00+02:00
amount = "8.0(1) umol"

[[sweep]]
name = "s001"
kind = "temperature-sweep"
files = ["empty.csv"]
layout = "bridge"
empty_cell = true
direction = "up"

[[sweep]]
name = "s002"
kind = "temperature-sweep"
files = ["film.csv"]
layout = "bridge"
after_dose = "d02"
direction = "up"
"""


def _table(day: int, shift: float) -> str:
    rows = ["time,T (K),P (ms)"]
    for number in range(60):
        T = 0.2 + 0.01 * number
        rows.append(
            f"2026-03-{day:02d}T{10 + number // 30:02d}:{number % 30 * 2:02d}:00+02:00,{T:.4f},{1 + 1e-6 * T + shift:.9f}"
        )
    return "\n".join(rows) + "\n"


def write_folder(folder: Path, *, name: str = "2026-03") -> Path:
    """Write the folder and return it."""
    folder.mkdir(parents=True, exist_ok=True)
    (folder / "cooldown.toml").write_text(SHEET.replace("NAME", name), encoding="utf-8")
    (folder / "empty.csv").write_text(_table(3, 0.0), encoding="utf-8")
    (folder / "film.csv").write_text(_table(8, 8e-6), encoding="utf-8")
    return folder

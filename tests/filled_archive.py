"""A small archive to look at: a cooldown that is reduced, one whose every text tries something, and what was said afterwards."""

from __future__ import annotations

from pathlib import Path

from archive import Archive
from tests.fuzz.hostile import EVIL, hostile_folder
from tests.small_cooldown import write_folder

__all__ = ["HOSTILE", "NAME", "PLAIN", "filled"]

NAME = "Cold <b>room</b> & annexe"
PLAIN = "2025-11"
HOSTILE = "2026-03"
# So that the things of the two cooldowns are not the same ones.
_RENAMED = {"bob": "TO-1", "plastic": "PI-1", "fridge": "DR-1", "well-helium": "W-4", "2026-03-": "2025-11-"}

_HEAD = 'format = "stillroom-revision/1"\nby = "data steward"\nbecause = "measured <b>again</b>"\n'


def _calibration(revision: int, constant: float) -> str:
    return f"""
[[record.calibration]]
name = "SALT-1-cal"
revision = {revision}
thermometer = "SALT-1"
scale = "PLTS-2000"
date = {2024 + revision}-01-15
against = "melting curve"
reading_unit = "uH"
temperature_low = "10 mK"
temperature_high = "1 K"
relative_uncertainty = 0.001
relation = {{ form = "curie-weiss", offset = 0.0, constant = {constant}, theta = 0.0 }}
"""


# After everything else, so that nothing is stale by it: for the same reading the second calibration gives 1 per cent more.
_LATER = (
    """
[[record.thermometer]]
name = "SALT-1"
revision = 1
kind = "paramagnetic"
place = "mixing chamber"
""",
    _calibration(1, 1.0),
    _calibration(2, 1.01),
    """
[[record.cell]]
name = "TO-1"
revision = 2
valid_from = 2026-01-15
changed = "seal <i>renewed</i>"
kind = "torsional-oscillator"
rod_material = "Al5056"
rim_radius = "7500(100) um"
empty_period = "0.999998(1) ms"
mass_sensitivity = "168(3) ns/mmol"
substrate = "PI-1.r1"
free_volume = "2.1(1) cm^3"
""",
)


def filled(folder: Path) -> Path:
    """Make the archive below a folder, and return its own."""
    with Archive.create(folder / "lab", name=NAME) as lab:
        lab.ingest(_plain(folder / PLAIN))
        lab.reduce(PLAIN)
        lab.ingest(hostile_folder(folder / HOSTILE))
        lab.withdraw(f"{HOSTILE}/s001", why=EVIL, by=EVIL)
        for number, record in enumerate(_LATER):
            sheet = folder / f"later-{number}.toml"
            sheet.write_text(f"{_HEAD}{record}", encoding="utf-8")
            outcome = lab.revise(sheet)
            assert outcome.state == "sealed", outcome.findings
        return lab.root


def _plain(folder: Path) -> Path:
    for file in write_folder(folder, name=PLAIN).iterdir():
        text = file.read_text(encoding="utf-8")
        for old, new in _RENAMED.items():
            text = text.replace(old, new)
        file.write_text(text, encoding="utf-8")
    return folder

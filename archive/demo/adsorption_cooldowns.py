"""The invented cooldowns 2025-05 (dead volume of an adsorption cell, by helium at 77 K) and 2025-07 (isotherm of helium in it at 4.2 K).

Rules: as in `first_cooldown`; the gas follows the virial equation of `archive.physics.helium_gas`, the powder the equation of Brunauer,
Emmett and Teller.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import timedelta
from pathlib import Path
from typing import Final

import numpy as np
from scipy.optimize import brentq

from archive.demo.adsorption_sheet import ADSORPTION_SHEET, dose_block, powder_records
from archive.demo.files import Column, comma_table
from archive.demo.recording import ZONE, CooldownFolder, at, concise, filled
from archive.demo.stated import generator
from archive.physics.constants import AVOGADRO
from archive.physics.helium_gas import molar_density
from archive.physics.vapour_pressure import pressure_its90

__all__ = [
    "adsorption_truth",
    "dead_volume_cooldown",
    "helium_isotherm_cooldown",
    "make_adsorption_folders",
]

EXPANSION: Final = "2025-05"
ISOTHERM: Final = "2025-07"


@dataclass(frozen=True)
class PowderTruth:
    """A cell with powder, and the panel that meters gas into it.

    Attributes
    ----------
    doser, cell, capillary : float
        m^3; the sheet states draws of the first and the last.
    doser_uncertainty, capillary_uncertainty : float
        m^3.
    monolayer, constant : float
        Of the equation of Brunauer, Emmett and Teller, mol.
    area_per_molecule : float
        m^2, an invented figure that the sheet states too.
    room, nitrogen, helium : float
        Temperatures of the panel and of the two baths, K.
    gauge_noise : float
        Of one reading, Pa.
    gauge_gain : float
        Relative standard uncertainty of the gauge's gain.
    """

    doser: float = 50.0e-6
    doser_uncertainty: float = 0.15e-6
    cell: float = 3.0e-6
    capillary: float = 12.0e-6
    capillary_uncertainty: float = 0.06e-6
    monolayer: float = 12.0e-3
    constant: float = 120.0
    area_per_molecule: float = 0.0847e-18
    room: float = 295.0
    nitrogen: float = 77.36
    helium: float = 4.2
    gauge_noise: float = 3.0
    gauge_gain: float = 5e-4


POWDER: Final = PowderTruth()


def adsorption_truth() -> Mapping[str, float]:
    """Return what reductions of the folders are compared with: dead volume (m^3), monolayer (mol), constant, area (m^2)."""
    area = POWDER.monolayer * AVOGADRO * POWDER.area_per_molecule
    return {"dead_volume": POWDER.cell, "monolayer": POWDER.monolayer, "constant": POWDER.constant, "area": area}  # fmt: skip


def _density(pressure: float, temperature: float) -> float:
    return float(molar_density(pressure, temperature)) if pressure > 0 else 0.0


def _held(pressure: float, bath: float) -> float:
    """Return the gas in the cell's volume and the capillary, mol."""
    return POWDER.cell * _density(pressure, bath) + POWDER.capillary * _density(pressure, POWDER.room)


def _expansions() -> list[tuple[float, float, float]]:
    """Return true pressures of the panel before and after each dose and of the cell: a panel filled higher and higher and opened to the cell."""
    found, cell = [], 0.0
    for full in np.linspace(1.8e4, 1.2e5, 9):

        def surplus(p: float, full: float = float(full), held: float = _held(cell, POWDER.nitrogen)) -> float:
            given = POWDER.doser * (_density(full, POWDER.room) - _density(p, POWDER.room))
            return given - (_held(p, POWDER.nitrogen) - held)

        cell = float(brentq(surplus, cell, float(full)))
        found.append((float(full), cell, cell))
    return found


def _doses_of_isotherm() -> list[tuple[float, float, float]]:
    """Return the same of twelve doses that take the film through its first layers."""
    saturated = float(pressure_its90(POWDER.helium))
    found, total = [], 0.0
    for x in np.linspace(0.02, 0.30, 12):
        p = float(x) * saturated
        film = POWDER.monolayer * POWDER.constant * x / ((1 - x) * (1 + (POWDER.constant - 1) * x))
        wanted, after = float(film) + _held(p, POWDER.helium), max(p, 3e4)
        need = (wanted - total) / POWDER.doser + _density(after, POWDER.room)
        found.append(
            (float(brentq(lambda q, need=need: _density(q, POWDER.room) - need, after, 3e6)), after, p)
        )
        total = wanted
    return found  # fmt: skip


def _folder(
    seed: int, name: str, *, bath: float, kind: str, begin: str, doses: Sequence[tuple[float, float, float]], words: Mapping[str, str]
) -> CooldownFolder:  # fmt: skip
    # Panel and capillary are believed the same in both runs; readings are drawn anew.
    believed, rng = generator(seed, "AC-1"), generator(seed, name, "readings")
    doser = POWDER.doser + POWDER.doser_uncertainty * believed.standard_normal()
    capillary = POWDER.capillary + POWDER.capillary_uncertainty * believed.standard_normal()
    gain = 1 + POWDER.gauge_gain * believed.standard_normal()
    first = at(begin)
    blocks, times, read = [], [], []
    for number, (before, after, cell) in enumerate(doses, 1):
        dosed = first + timedelta(hours=number)
        noise = POWDER.gauge_noise * rng.standard_normal(3)
        blocks.append(
            dose_block(number, dosed, before * gain + noise[0], after * gain + noise[1], POWDER.room)
        )
        times.append(dosed + timedelta(minutes=40))
        read.append(cell + noise[2])
    out = sum(
        POWDER.doser * (_density(before, POWDER.room) - _density(after, POWDER.room))
        for before, after, _ in doses
    )
    spread = 2e-3 * out
    values = {
        **words, "amount": f"{concise((out + spread * rng.standard_normal()) * 1e3, spread * 1e3, 3)} mmol", "name": name, "kind": kind, "bath": f"{bath:.3f}", "doses": "\n".join(blocks),
        "names": ", ".join(f'"d{number:02d}"' for number in range(1, len(doses) + 1)),
        "doser": concise(doser * 1e6, POWDER.doser_uncertainty * 1e6, 2), "capillary": concise(capillary * 1e6, POWDER.capillary_uncertainty * 1e6, 2),
    }  # fmt: skip
    table = comma_table(times, [Column("p", "Pa", np.array(read), 2)], zone=ZONE)
    return CooldownFolder(name, filled(ADSORPTION_SHEET, values), {"raw/pressures.csv": table})


def dead_volume_cooldown(seed: int) -> CooldownFolder:
    """Return the folder of 2025-05.

    Parameters
    ----------
    seed : int
        Seed of the whole demonstration, not negative.
    """
    return _folder(
        seed, EXPANSION, bath=POWDER.nitrogen, kind="dose-run", begin="2025-05-13 08:00", doses=_expansions(),
        words={
            "purpose": "Dead volume of the cell with its powder, by expansion of helium.", "begin": "2025-05-12T09:00:00+10:00", "end": "2025-05-15T17:00:00+10:00",
            "bath_is": "liquid nitrogen", "records": powder_records(), "recovered": "2025-05-14T17:00:00+10:00"
        },
    )  # fmt: skip


def helium_isotherm_cooldown(seed: int) -> CooldownFolder:
    """Return the folder of 2025-07.

    Parameters
    ----------
    seed : int
        Seed of the whole demonstration, not negative.
    """
    return _folder(
        seed, ISOTHERM, bath=POWDER.helium, kind="isotherm", begin="2025-07-08 08:00", doses=_doses_of_isotherm(),
        words={
            "purpose": "Isotherm of helium on the powder, for its area.", "begin": "2025-07-07T09:00:00+10:00", "end": "2025-07-11T17:00:00+10:00",
            "bath_is": "liquid helium", "records": "", "recovered": "2025-07-10T17:00:00+10:00"
        },
    )  # fmt: skip


def make_adsorption_folders(target: Path, seed: int) -> list[Path]:
    """Write both folders and return their paths, in the order in which they are to be taken in.

    Parameters
    ----------
    target : Path
        Folder that gets `2025-05` and `2025-07`; made if it is missing.
    seed : int
        Not negative.

    Raises
    ------
    FileExistsError
        If one of the folders is there already.
    """
    return [make(seed).write(target) for make in (dead_volume_cooldown, helium_isotherm_cooldown)]

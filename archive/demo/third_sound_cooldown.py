"""The invented cooldown 2025-06: third sound round a ring of glass while helium is added, and what is true of it.

Rules: as in `first_cooldown`; the law of the wave is that of `archive.physics.third_sound`, the ring is invented.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from datetime import timedelta
from pathlib import Path
from typing import Final

import numpy as np

from archive.demo.files import Column, comma_table
from archive.demo.recording import ZONE, CooldownFolder, amount_text, at, concise, filled
from archive.demo.stated import generator
from archive.demo.third_sound_sheet import THIRD_SOUND_SHEET
from archive.demo.truth import INERT
from archive.physics.constants import MOLAR_MASS_HELIUM4
from archive.physics.coverage import film_thickness_from_coverage
from archive.physics.film_static import UNIVERSAL_JUMP
from archive.physics.frenkel_halsey_hill import van_der_waals_strength
from archive.physics.third_sound import third_sound_speed

__all__ = ["make_third_sound_folders", "third_sound_cooldown", "third_sound_truth"]

NAME: Final = "2025-06"

COVERAGES: Final = 30.5e-6 + 1.0e-6 * np.arange(24)
"""True coverage after each dose, mol/m^2."""


@dataclass(frozen=True)
class RingTruth:
    """A ring of glass, coated with a film.

    Attributes
    ----------
    area, area_uncertainty : float
        m^2; the sheet states a draw.
    path : float
        Round the ring, m.
    gamma : float
        Attraction of the glass less that of helium itself, K layer^3 with layers of 0.36 nm.
    half_thickness : float
        Where retardation has halved it, m.
    temperature : float
        K.
    temperature_noise, frequency_noise : float
        Of one reading, K and Hz.
    """

    area: float = 1.60
    area_uncertainty: float = 0.02
    path: float = 0.100
    gamma: float = 27.0
    half_thickness: float = 15e-9
    temperature: float = 0.600
    temperature_noise: float = 1e-4
    frequency_noise: float = 0.05


RING: Final = RingTruth()


def third_sound_truth() -> Mapping[str, float]:
    """Return what a reduction of the folder is compared with: coverage at the transition (mol/m^2), least density seen over the jump."""
    jump = UNIVERSAL_JUMP * RING.temperature / MOLAR_MASS_HELIUM4
    return {"transition_coverage": INERT + jump, "lowest_ratio": (float(COVERAGES[0]) - INERT) / jump}


def _frequency(coverage: float) -> float:
    """Return the true frequency of the first resonance, Hz: all above the inert layer flows, and the film is as thick as liquid."""
    thickness = float(film_thickness_from_coverage(coverage))
    whole = third_sound_speed(
        thickness, strength=float(van_der_waals_strength(RING.gamma * 0.36e-9**3)), half_thickness=RING.half_thickness
    )  # fmt: skip
    return float(whole) * math.sqrt((coverage - INERT) / coverage) / RING.path


def third_sound_cooldown(seed: int) -> CooldownFolder:
    """Return the folder of 2025-06.

    Parameters
    ----------
    seed : int
        Seed of the whole demonstration, not negative.
    """
    random = generator(seed, NAME, "s001")
    area = RING.area + RING.area_uncertainty * generator(seed, NAME, "area").standard_normal()
    begin = at("2025-06-04 08:00")
    doses, times, before = [], [], 0.0
    for number, coverage in enumerate(COVERAGES, 1):
        dosed = begin + timedelta(hours=2 * number)
        amount = (float(coverage) - before) * RING.area * 1e6
        doses.append(
            amount_text(
                f"d{number:02d}", dosed, act="add", amount=f"{amount:.3f}(2) umol", notes="metered volume of the panel"
            )
        )  # fmt: skip
        times.append(dosed + timedelta(minutes=75))
        before = float(coverage)
    out = before * RING.area * 1e6
    doses.append(
        amount_text(
            "e01", at("2025-06-10 16:00"), act="recover", amount=f"{out + 0.05 * random.standard_normal():.2f}(5) umol", notes="All of it."
        )
    )  # fmt: skip
    frequencies = np.array([_frequency(float(each)) for each in COVERAGES])
    columns = [
        Column("T", "K", RING.temperature + RING.temperature_noise * random.standard_normal(COVERAGES.size), 5),
        Column("f", "Hz", frequencies + RING.frequency_noise * random.standard_normal(COVERAGES.size), 3),
    ]  # fmt: skip
    names = ", ".join(f'"d{number:02d}"' for number in range(1, COVERAGES.size + 1))
    values = {"doses": "\n".join(doses), "names": names, "area": concise(area, RING.area_uncertainty, 3)}
    return CooldownFolder(
        NAME,
        filled(THIRD_SOUND_SHEET, values),
        {"raw/third_sound.csv": comma_table(times, columns, zone=ZONE)},
    )


def make_third_sound_folders(target: Path, seed: int) -> list[Path]:
    """Write the folder of the third-sound cooldown and return its path, in a list.

    Parameters
    ----------
    target : Path
        Folder that gets `2025-06`; made if it is missing.
    seed : int
        Not negative.

    Raises
    ------
    FileExistsError
        If the folder is there already.
    """
    return [third_sound_cooldown(seed).write(target)]

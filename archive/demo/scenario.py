"""The demonstration: invented cooldowns of one laboratory, one for each kind of experiment, and what is true of its films.

Rules: equal seeds give equal bytes; nothing is read but the seed.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from archive.demo.adsorption_cooldowns import dead_volume_cooldown, helium_isotherm_cooldown
from archive.demo.bulk_cooldowns import calorimeter_cooldown, stack_cooldown
from archive.demo.calibration_cooldown import calibration_cooldown
from archive.demo.current_cooldown import current_cooldown
from archive.demo.first_cooldown import FIRST_COVERAGES, first_cooldown, first_stated
from archive.demo.forward import transition_temperature
from archive.demo.porous_cooldown import POROUS_COVERAGES, porous_cooldown, porous_stated
from archive.demo.resonator_cooldown import resonator_cooldown
from archive.demo.second_cooldown import SECOND_COVERAGES, TO4_LATER, second_cooldown, second_stated
from archive.demo.stated import Stated
from archive.demo.third_sound_cooldown import third_sound_cooldown
from archive.demo.truth import PG2, TO4, CellTruth

__all__ = ["SEED", "CooldownTruth", "make_folders", "truth"]

SEED = 20260301
"""Seed of the demonstration as it is shipped."""


@dataclass(frozen=True)
class CooldownTruth:
    """What is true in one cooldown.

    Attributes
    ----------
    cell : CellTruth
        Cell, film and sensor as they really are.
    stated : Stated
        What the sheet says instead.
    coverages : mapping of str to float
        True coverage of each temperature sweep with a film, mol/m^2.
    transitions : mapping of str to float
        T_KT (discs) or T_c (porous glass) of the same sweeps, K.
    """

    cell: CellTruth
    stated: Stated
    coverages: Mapping[str, float]
    transitions: Mapping[str, float]

    @classmethod
    def of(cls, cell: CellTruth, stated: Stated, coverages: Mapping[str, float]) -> CooldownTruth:
        """Return the truth of a cooldown with the transition of every coverage."""
        transitions = {name: transition_temperature(cell, coverage) for name, coverage in coverages.items()}
        return cls(cell, stated, dict(coverages), transitions)


def truth(seed: int = SEED) -> dict[str, CooldownTruth]:
    """Return what a reduction of the films on oscillators is compared with, by cooldown name; the other cooldowns tell their own truth.

    Parameters
    ----------
    seed : int
        Not negative; the films do not depend on it, what the sheets state does.
    """
    return {
        "2025-03": CooldownTruth.of(TO4, first_stated(seed), FIRST_COVERAGES),
        "2026-02": CooldownTruth.of(TO4_LATER, second_stated(seed), SECOND_COVERAGES),
        "2026-05": CooldownTruth.of(PG2, porous_stated(seed), POROUS_COVERAGES),
    }


_COOLDOWNS: Final = (
    calibration_cooldown, first_cooldown, dead_volume_cooldown, third_sound_cooldown, helium_isotherm_cooldown, stack_cooldown, calorimeter_cooldown,
    second_cooldown, porous_cooldown, current_cooldown, resonator_cooldown,
)  # fmt: skip
"""In the order of time, which is that of intake: what a later one rests on comes before it."""


def make_folders(target: Path, *, seed: int = SEED) -> list[Path]:
    """Write the cooldown folders and return their paths, in the order in which they are to be taken in.

    Parameters
    ----------
    target : Path
        Folder that gets `2024-11` to `2026-07`; made if it is missing.
    seed : int
        Not negative.

    Raises
    ------
    FileExistsError
        If one of the folders is there already; none is written then.
    """
    folders = [make(seed) for make in _COOLDOWNS]
    for folder in folders:
        if (target / folder.name).exists():
            raise FileExistsError(f"{target / folder.name} is there already; choose another folder")
    return [folder.write(target) for folder in folders]

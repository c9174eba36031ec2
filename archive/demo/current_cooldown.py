"""The invented cooldown 2026-06: a persistent-current ring, and what is true of it.

Rules: equal seeds give equal bytes; nothing is read but the seed.
"""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Final

import numpy as np

from archive.demo.current_forward import RING, CurrentRecord, coverage_run, cycle, hold
from archive.demo.current_sheet import CURRENT_SHEET
from archive.demo.files import Column, comma_table
from archive.demo.recording import ZONE, CooldownFolder, amount_text, at, filled, times_from
from archive.demo.stated import generator
from archive.physics.film_static import UNIVERSAL_JUMP

__all__ = ["current_cooldown", "current_truth", "make_current_folders"]

NAME: Final = "2026-06"

_FILM: Final = 35.0e-6
"""Coverage of the film that is left to decay, mol/m^2."""

_COVERAGES: Final = np.linspace(35.0e-6, 47.0e-6, 13)
"""Coverages of the run in which helium is added, mol/m^2."""

_FILLED: Final = 0.34
"""Helium of the full ring and its line, mol."""


def current_truth() -> Mapping[str, float]:
    """Return what a reduction of the folder is compared with.

    Returns
    -------
    mapping of str to float
        Exponent, decay time in s and areal density in kg/m^2 of the film's decay, coverage that does not flow in mol/m^2, and what
        is left of the current after the far cycle.
    """
    return {
        "exponent": RING.exponent, "decay_time": RING.decay_time, "onset_coverage": RING.inert, "remaining": RING.lost,
        "areal_density_from_decay": UNIVERSAL_JUMP * RING.film_temperature * RING.exponent / 2,
    }  # fmt: skip


def _table(record: CurrentRecord, begin: str, *, cadence: float) -> bytes:
    # g cm^2/s is 1e-7 kg m^2/s, exact.
    columns = [
        Column("T", "K", record.temperature, 6),
        Column("L", "g cm^2/s", record.angular_momentum * 1e7, 8),
    ]
    if record.coverage is not None:
        columns.append(Column("n", "umol/m^2", record.coverage * 1e6, 4))
    return comma_table(times_from(at(begin), record.temperature.size, cadence=cadence), columns, zone=ZONE)


def _doses() -> str:
    film, more = _FILM * RING.area, (float(_COVERAGES[-1]) - _FILM) * RING.area
    stated = (("d01", "2026-06-03 10:00", film, "one film"), ("d02", "2026-06-06 20:00", more, "in small amounts during s002, sum"),
              ("d03", "2026-06-08 10:00", _FILLED - film - more, "filled and closed"))  # fmt: skip
    blocks = [
        amount_text(name, at(time), act="add", amount=f"{amount * 1e6:.1f}({max(amount * 1e4, 0.1):.1f}) umol", notes=notes)
        for name, time, amount, notes in stated
    ]  # fmt: skip
    blocks.append(
        amount_text("e01", at("2026-06-18 18:00"), act="recover", amount=f"{_FILLED * 1e6:.0f}({_FILLED * 1e4:.0f}) umol", notes="Everything that came out.")
    )  # fmt: skip
    return "\n".join(blocks)


def current_cooldown(seed: int) -> CooldownFolder:
    """Return the folder of 2026-06.

    Parameters
    ----------
    seed : int
        Seed of the whole demonstration, not negative.
    """

    def draw(name: str) -> np.random.Generator:
        return generator(seed, NAME, name)

    files = {
        "raw/hold_film.csv": _table(hold(RING, _FILM, draw("s001")), "2026-06-04 09:00", cadence=300.0),
        "raw/coverage.csv": _table(coverage_run(RING, _COVERAGES, draw("s002")), "2026-06-06 09:00", cadence=600.0),
        "raw/cycle_slow.csv": _table(cycle(RING, 2.10, draw("s003")), "2026-06-10 09:00", cadence=120.0),
        "raw/cycle_far.csv": _table(cycle(RING, 2.165, draw("s004")), "2026-06-12 09:00", cadence=120.0),
    }  # fmt: skip
    return CooldownFolder(NAME, filled(CURRENT_SHEET, {"doses": _doses()}), files)


def make_current_folders(target: Path, seed: int) -> list[Path]:
    """Write the folder of the persistent-current cooldown and return its path, in a list.

    Parameters
    ----------
    target : Path
        Folder that gets `2026-06`; made if it is missing.
    seed : int
        Not negative.

    Raises
    ------
    FileExistsError
        If the folder is there already.
    """
    return [current_cooldown(seed).write(target)]

"""The invented cooldown 2024-11: three thermometers calibrated against two references, and what is true of them.

Rules: equal seeds give equal bytes; nothing is read but the seed.
"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Final

import numpy as np

from archive.demo.calibration_forward import (
    BENCH,
    CalibrationRecord,
    Errors,
    against_melting_curve,
    against_vapour,
)
from archive.demo.calibration_sheet import CALIBRATION_SHEET
from archive.demo.files import Column, comma_table
from archive.demo.recording import ZONE, CooldownFolder, at, concise, filled, times_from
from archive.demo.stated import generator

if TYPE_CHECKING:
    import numpy.typing as npt

__all__ = ["calibration_cooldown", "calibration_truth", "make_calibration_folders"]

NAME: Final = "2024-11"

_BULB: Final = np.linspace(1.30, 4.20, 48)
_COLD: Final = np.geomspace(0.020, 0.250, 45)
_COLDEST: Final = np.geomspace(0.008, 0.200, 40)


def calibration_truth(seed: int) -> dict[str, CalibrationRecord]:
    """Return what is true of each calibration sweep, by its name: temperatures in K on its scale, and the readings.

    Parameters
    ----------
    seed : int
        Seed of the whole demonstration, not negative.
    """
    errors = Errors.drawn(generator(seed, NAME, "errors"))
    return {
        "c01": against_vapour(BENCH, errors, _BULB, generator(seed, NAME, "c01")),
        "c02": against_melting_curve(BENCH, errors, _COLD, generator(seed, NAME, "c02"), sensor="ruthenium oxide"),
        "c03": against_melting_curve(BENCH, errors, _COLDEST, generator(seed, NAME, "c03"), sensor="salt"),
    }  # fmt: skip


def _table(
    begin: str, pressure: npt.NDArray[np.float64], unit: str, digits: int, sensor: Column, *, minutes: int
) -> bytes:
    rows = times_from(at(begin), pressure.size, cadence=60.0 * minutes)
    return comma_table(rows, [Column("p", unit, pressure, digits), sensor], zone=ZONE)


def calibration_cooldown(seed: int) -> CooldownFolder:
    """Return the folder of 2024-11.

    Parameters
    ----------
    seed : int
        Seed of the whole demonstration, not negative.
    """
    truth = calibration_truth(seed)
    bulb, cold, coldest = (truth[name] for name in ("c01", "c02", "c03"))
    files = {
        "raw/germanium.csv": _table("2024-11-06 09:00", bulb.pressure, "Pa", 4, Column("R_GE7", "Ohm", bulb.reading, 5), minutes=15),
        "raw/ruthenium_oxide.csv": _table("2024-11-14 09:00", cold.pressure / 1e6, "MPa", 9, Column("R_RX7", "kOhm", cold.reading / 1e3, 8), minutes=20),
        "raw/salt.csv": _table("2024-11-18 09:00", coldest.pressure / 1e6, "MPa", 9, Column("M_SP7", "uH", coldest.reading * 1e6, 6), minutes=40),
    }  # fmt: skip
    stated = {
        "diameter": concise(BENCH.diameter * 1e3, BENCH.diameter_uncertainty * 1e3, 2), "height": concise(BENCH.height, BENCH.height_uncertainty, 2),
        "gas": concise(BENCH.gas, BENCH.gas_uncertainty, 0), "zero": concise(BENCH.gauge_zero, BENCH.zero_uncertainty, 2), "gain": BENCH.gauge_gain,
        "pressure_noise": BENCH.pressure_noise * 100, "reading_noise": f"{BENCH.reading_noise * 100:.4f}",
        "melting_noise": BENCH.melting_noise, "melting_zero": f"0({BENCH.melting_zero:.0f}) Pa",
    }  # fmt: skip
    return CooldownFolder(NAME, filled(CALIBRATION_SHEET, stated), files)


def make_calibration_folders(target: Path, seed: int) -> list[Path]:
    """Write the folder of the calibration cooldown and return its path, in a list.

    Parameters
    ----------
    target : Path
        Folder that gets `2024-11`; made if it is missing.
    seed : int
        Not negative.

    Raises
    ------
    FileExistsError
        If the folder is there already.
    """
    return [calibration_cooldown(seed).write(target)]

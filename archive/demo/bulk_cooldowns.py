"""The invented cooldowns 2025-08 (stack of discs in bulk liquid) and 2025-11 (heat capacity).

Rules: as in `first_cooldown`.
"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Final

import numpy as np

from archive.demo.bulk_sheets import CALORIMETER_SHEET, STACK_SHEET
from archive.demo.bulk_truth import BULK, bulk_period, pulse_readings
from archive.demo.files import Column, comma_table
from archive.demo.recording import ZONE, CooldownFolder, at, concise, filled, times_from
from archive.demo.stated import generator
from archive.physics.constants import T_LAMBDA
from archive.physics.vapour_pressure import pressure_its90

if TYPE_CHECKING:
    import numpy.typing as npt

    Floats = npt.NDArray[np.float64]

__all__ = ["calorimeter_cooldown", "make_bulk_folders", "stack_cooldown"]

STACK: Final = "2025-08"
CALORIMETER: Final = "2025-11"

_GAP_UNCERTAINTY: Final = 0.03e-6
_GAUGE_NOISE: Final = 6.0
_AMOUNT_UNCERTAINTY: Final = 0.0005


def stack_temperatures() -> Floats:
    """Return the true temperatures of the sweep in liquid: every 10 mK far below, denser and denser towards the transition, and above it."""
    near = T_LAMBDA * (1 - np.geomspace(0.03, 1.2e-4, 120))
    return np.concatenate([np.arange(1.5, 2.11, 0.01), near, np.linspace(2.1795, 2.3, 60)])


def pulse_begins() -> tuple[Floats, Floats]:
    """Return temperature before each pulse and its step: each a fifth of its distance from the transition, which none holds."""
    t = np.geomspace(8e-3, 1.2e-6, 56)
    below, above = T_LAMBDA * (1 - t), T_LAMBDA * (1 + t[::-1])
    rise = 0.2 * T_LAMBDA * np.concatenate([t, t[::-1]])
    return np.concatenate([below, above]) - rise / 2, rise


def _sweep_file(seed: int, sweep: str, begin: str, temperature: Floats, *, filled_cell: bool) -> bytes:
    random = generator(seed, STACK, sweep)
    period = bulk_period(temperature, filled=filled_cell)
    columns = [
        Column("T", "K", temperature + BULK.temperature_noise * random.standard_normal(temperature.size), 7),
        Column("P", "us", (period + BULK.period_noise * random.standard_normal(temperature.size)) * 1e6, 9),
    ]
    if filled_cell:
        pressure = pressure_its90(temperature) + _GAUGE_NOISE * random.standard_normal(temperature.size)
        columns.append(Column("p", "Pa", pressure, 1))
    return comma_table(times_from(at(begin), temperature.size, cadence=240.0), columns, zone=ZONE)


def stack_cooldown(seed: int) -> CooldownFolder:
    """Return the folder of 2025-08.

    Parameters
    ----------
    seed : int
        Seed of the whole demonstration.
    """
    gap = BULK.gap + _GAP_UNCERTAINTY * generator(seed, "SD-1").standard_normal()
    values = {
        "gap": concise(gap * 1e6, _GAP_UNCERTAINTY * 1e6, 2),
        "head_state": "considered",
        "head": "the level stands 4 cm above the stack: 57 Pa, which is 5 uK of the lambda point",
        "transpiration_state": "considered",
        "transpiration": "wide line, 500 Pa and more",
        "amplitude": "rim velocity below 0.1 mm/s; half the drive gave the same period",
        "ring": "ring time 40 s, four minutes a point",
        "elastic": "the stack is clamped; full and empty cell alike",
        "slip_state": "applied",
        "slip": "the part of the normal liquid that the discs do not drag along is computed from gap and viscosity",
        "modes": "next mode 310 Hz higher",
        "drift": "empty cell measured before and after",
        "gravity_state": "considered",
        "gravity": "the nearest point is a hundred times farther from the transition than the spread over the stack",
    }
    files = {
        "raw/ts_empty.csv": _sweep_file(
            seed, "s001", "2025-08-05 18:00", np.linspace(1.48, 2.32, 120), filled_cell=False
        ),
        "raw/ts_full.csv": _sweep_file(
            seed, "s002", "2025-08-11 18:00", stack_temperatures(), filled_cell=True
        ),
    }
    return CooldownFolder(STACK, filled(STACK_SHEET, values), files)


def _pulse_file(seed: int, sweep: str, time: str, begin: Floats, rise: Floats, *, filled_cell: bool) -> bytes:
    power, read = pulse_readings(begin, rise, filled=filled_cell, random=generator(seed, CALORIMETER, sweep))
    columns = [
        Column("T", "K", begin, 10),
        Column("dT", "uK", read * 1e6, 7),
        Column("W", "nW", power * 1e9, 7),
        Column("t_on", "s", np.full(begin.size, 20.0), 1),
    ]
    return comma_table(times_from(at(time), begin.size, cadence=600.0), columns, zone=ZONE)


def calorimeter_cooldown(seed: int) -> CooldownFolder:
    """Return the folder of 2025-11.

    Parameters
    ----------
    seed : int
        Seed of the whole demonstration.
    """
    amount = BULK.amount + _AMOUNT_UNCERTAINTY * generator(seed, "CAL-2").standard_normal()
    values = {
        "amount": concise(amount, _AMOUNT_UNCERTAINTY, 4),
        "head_state": "not-applicable",
        "head": "no pressure was read",
        "transpiration_state": "not-applicable",
        "transpiration": "no pressure was read",
        "amplitude": "no oscillator",
        "ring": "no oscillator; five minutes between pulses",
        "elastic": "no oscillator",
        "slip_state": "not-applicable",
        "slip": "no oscillator",
        "modes": "no oscillator",
        "drift": "drift of the temperature extrapolated to the middle of each pulse",
        "gravity_state": "applied",
        "gravity": "the law is averaged over the 3 mm of height",
    }
    begin, rise = pulse_begins()
    empty = np.linspace(2.10, 2.25, 60)
    files = {
        "raw/pulses_empty.csv": _pulse_file(
            seed, "s001", "2025-11-05 09:00", empty, np.full(empty.size, 1e-3), filled_cell=False
        ),
        "raw/pulses_full.csv": _pulse_file(seed, "s002", "2025-11-12 09:00", begin, rise, filled_cell=True),
    }
    return CooldownFolder(CALORIMETER, filled(CALORIMETER_SHEET, values), files)


def make_bulk_folders(target: Path, *, seed: int) -> list[Path]:
    """Write the two cooldown folders and return their paths, in the order in which they are to be taken in.

    Parameters
    ----------
    target : Path
        Folder that gets `2025-08` and `2025-11`; made if it is missing.
    seed : int
        Not negative.

    Raises
    ------
    FileExistsError
        If one of the folders is there already; none is written then.
    """
    folders = [make(seed) for make in (stack_cooldown, calorimeter_cooldown)]
    for folder in folders:
        if (target / folder.name).exists():
            raise FileExistsError(f"{target / folder.name} is there already; choose another folder")
    return [folder.write(target) for folder in folders]

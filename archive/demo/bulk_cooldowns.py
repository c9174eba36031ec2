"""The invented cooldowns 2025-08 (stack of discs in bulk liquid) and 2025-11 (heat capacity), both at three pressures.

Rules: as in `first_cooldown`.
"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Final

import numpy as np

from archive.demo.bulk_liquids import SATURATED, UNDER_PRESSURE, LiquidTruth
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
_PRESSURE_UNCERTAINTY: Final = 1e3
_DENSITY_UNCERTAINTY: Final = 0.3


def stack_temperatures() -> Floats:
    """Return the true temperatures of the sweep in liquid: every 10 mK far below, denser and denser towards the transition, and above it."""
    near = T_LAMBDA * (1 - np.geomspace(0.03, 1.2e-4, 120))
    return np.concatenate([np.arange(1.5, 2.11, 0.01), near, np.linspace(2.1795, 2.3, 60)])


def pressed_temperatures(liquid: LiquidTruth) -> Floats:
    """Return the true temperatures of a sweep under pressure, as far from its transition as those in saturated liquid."""
    near = 1 - np.geomspace(0.03, 1.2e-4, 120)
    return liquid.lambda_temperature * np.concatenate(
        [np.arange(0.8, 0.97, 0.01), near, np.linspace(1.012, 1.05, 60)]
    )


def pulse_begins(
    lambda_temperature: float = T_LAMBDA, *, pulses: int = 56, nearest: float = 1.2e-6
) -> tuple[Floats, Floats]:
    """Return temperature before each pulse and its step: each a fifth of its distance from the transition, which none holds."""
    t = np.geomspace(8e-3, nearest, pulses)
    below, above = lambda_temperature * (1 - t), lambda_temperature * (1 + t[::-1])
    rise = 0.2 * lambda_temperature * np.concatenate([t, t[::-1]])
    return np.concatenate([below, above]) - rise / 2, rise


def _stated(seed: int, cooldown: str) -> dict[str, str]:
    """Return what the laboratory believes of the liquid under pressure: the truth and one draw for each value."""
    values = {}
    for number, (sweep, liquid) in enumerate(UNDER_PRESSURE.items(), 1):
        random = generator(seed, cooldown, sweep, "liquid")
        p = (liquid.pressure or 0.0) + _PRESSURE_UNCERTAINTY * random.standard_normal()
        rho = liquid.density + _DENSITY_UNCERTAINTY * random.standard_normal()
        values[f"pressure_{number}"] = concise(p * 1e-6, _PRESSURE_UNCERTAINTY * 1e-6, 4)
        values[f"density_{number}"] = concise(rho, _DENSITY_UNCERTAINTY, 1)
    return values


def _sweep_file(
    seed: int,
    sweep: str,
    begin: str,
    temperature: Floats,
    *,
    filled_cell: bool,
    liquid: LiquidTruth = SATURATED,
) -> bytes:
    random = generator(seed, STACK, sweep)
    period = bulk_period(temperature, filled=filled_cell, liquid=liquid)
    columns = [
        Column("T", "K", temperature + BULK.temperature_noise * random.standard_normal(temperature.size), 7),
        Column("P", "us", (period + BULK.period_noise * random.standard_normal(temperature.size)) * 1e6, 9),
    ]
    if filled_cell and liquid.pressure is None:
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
        **_stated(seed, STACK),
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
        **{
            f"raw/ts_{sweep}.csv": _sweep_file(seed, sweep, begin, pressed_temperatures(liquid), filled_cell=True, liquid=liquid)
            for begin, (sweep, liquid) in zip(("2025-08-12 18:00", "2025-08-13 18:00"), UNDER_PRESSURE.items(), strict=True)
        },
    }  # fmt: skip
    return CooldownFolder(STACK, filled(STACK_SHEET, values), files)


def _pulse_file(
    seed: int,
    sweep: str,
    time: str,
    pulses: tuple[Floats, Floats],
    *,
    filled_cell: bool,
    liquid: LiquidTruth = SATURATED,
) -> bytes:
    begin, rise = pulses
    random = generator(seed, CALORIMETER, sweep)
    power, read = pulse_readings(begin, rise, filled=filled_cell, random=random, liquid=liquid)
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
        **_stated(seed, CALORIMETER),
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
    empty = np.linspace(1.90, 2.25, 71)
    for number, (sweep, liquid) in enumerate(UNDER_PRESSURE.items(), 1):
        held = (
            BULK.amount_of(liquid) + _AMOUNT_UNCERTAINTY * generator(seed, "CAL-2", sweep).standard_normal()
        )
        values[f"amount_{number}"] = concise(held, _AMOUNT_UNCERTAINTY, 4)
        values[f"added_{number}"] = concise(held - amount, _AMOUNT_UNCERTAINTY, 4)
        amount = held
    values["recovered"] = concise(amount, _AMOUNT_UNCERTAINTY, 4)
    files = {
        "raw/pulses_empty.csv": _pulse_file(
            seed, "s001", "2025-11-05 09:00", (empty, np.full(empty.size, 1e-3)), filled_cell=False
        ),
        "raw/pulses_full.csv": _pulse_file(seed, "s002", "2025-11-12 09:00", pulse_begins(), filled_cell=True),
        **{
            f"raw/pulses_{sweep}.csv": _pulse_file(
                seed, sweep, begin, pulse_begins(liquid.lambda_temperature, pulses=40, nearest=3e-6), filled_cell=True, liquid=liquid
            )
            for begin, (sweep, liquid) in zip(("2025-11-14 09:00", "2025-11-18 09:00"), UNDER_PRESSURE.items(), strict=True)
        },
    }  # fmt: skip
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

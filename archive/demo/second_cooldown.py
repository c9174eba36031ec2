"""The invented cooldown 2026-02: the same discs a year later, remounted, with a new calibration of a drifted sensor.

Rules: as in `first_cooldown`. Volume, area, gauge and its zero are believed to be what they were; the calibration and
the cell's revision are new.
"""

from __future__ import annotations

from dataclasses import replace
from typing import Final

import numpy as np

from archive.demo.files import Column, comma_table, space_table
from archive.demo.first_cooldown import first_stated, sheet_values
from archive.demo.forward import film_sweep, oscillator_record, ringdown
from archive.demo.gas import dose_reading
from archive.demo.recording import (
    ZONE,
    CooldownFolder,
    amount_text,
    at,
    concise,
    dose_text,
    filled,
    log_polynomial_text,
    oscillator_columns,
    sweep_bytes,
    times_from,
)
from archive.demo.second_sheet import SECOND_SHEET
from archive.demo.stated import Stated, generator
from archive.demo.truth import TO4, remounted

__all__ = ["NIGHT_DRIFT", "SECOND_COVERAGES", "TO4_LATER", "second_cooldown", "second_stated"]

NAME: Final = "2026-02"

TO4_LATER: Final = remounted(TO4)
"""The cell a year later."""

SECOND_COVERAGES: Final = {"s003": 31.0e-6, "s004": 33.5e-6, "s005": 36.0e-6}
"""True coverage of each temperature sweep with a film, mol/m^2."""

_DOSES: Final = (
    ("2026-02-14 10:00", 7.0e-6),
    ("2026-02-14 15:00", 14.0e-6),
    ("2026-02-15 10:00", 21.0e-6),
    ("2026-02-15 15:00", 26.0e-6),
    ("2026-02-16 10:00", 31.0e-6),
    ("2026-02-20 10:00", 33.5e-6),
    ("2026-02-24 10:00", 36.0e-6),
)
"""Local time of each dose and true coverage after it."""

NIGHT_DRIFT: Final = 0.4e-12 / 3600
"""Drift of the period during the night of s006, s/s."""

_NIGHT_ROWS: Final = 600

_BREAK: Final = 190
"""Row of s004 at which the measuring program stopped."""

_RECOVERED_UNCERTAINTY: Final = 0.12e-6


_WAIVERS: Final = """\
# The rod is beryllium copper, and no drive sweep was taken in this run.
""" + "\n".join(
    f"""\
[[waiver]]
check = "{check}"
place = "{place}"
reason = "{reason}"
role = "postdoc"
date = 2026-03-12
"""
    for check, place, reason in (
        *(("rod-below-200-mk", place, "The drive sweeps of 2025-03 at 100 mK, empty and with a film, show no dependence of the period on the drive.") for place in ("s001", "s003", "s004", "s005")),
        ("calibration-drift", "RX-2-cal.r2", "The sensor had drifted; that is why it was calibrated again."),
        ("time-gap", "s004#time", "The measuring program stopped and was started again; the temperature was held meanwhile."),
    )
)  # fmt: skip


def second_stated(seed: int) -> Stated:
    """Return what the laboratory believes about TO-4 during this cooldown."""
    quality = Stated.drawn(
        TO4_LATER, generator(seed, "TO-4", "2"), calibration=generator(seed, "RX-2-cal", "2")
    )
    return replace(
        first_stated(seed),
        reference_quality=quality.reference_quality,
        reference_signal=quality.reference_signal,
        calibration_shift=quality.calibration_shift,
    )


def _doses(seed: int, stated: Stated) -> str:
    rng = generator(seed, NAME, "doses")
    area = TO4_LATER.film.area
    blocks: list[str] = []
    before = 0.0
    for number, (time, coverage) in enumerate(_DOSES, 1):
        reading = dose_reading(TO4_LATER, stated, (coverage - before) * area, rng)
        blocks.append(
            dose_text(
                f"d{number:02d}",
                at(time),
                reading,
                unit="Torr",
                doser="D1",
                gauge="G1",
                annealing="2 h at 0.8 K",
            )
        )
        before = coverage
    recovered = before * area + _RECOVERED_UNCERTAINTY * rng.standard_normal()
    blocks.append(
        amount_text(
            "e01",
            at("2026-03-03 18:00"),
            act="recover",
            amount=concise(recovered * 1e6, _RECOVERED_UNCERTAINTY * 1e6, 2) + " umol",
            notes="Everything that came out, in W2.",
        )
    )
    return "\n".join(blocks)


def _files(seed: int) -> dict[str, bytes]:
    cell = TO4_LATER
    empty = oscillator_record(cell, np.linspace(0.020, 0.97, 240), 0.0, generator(seed, NAME, "s001"))
    elapsed, magnitude, _ = ringdown(cell, 0.100, 0.0, generator(seed, NAME, "s002"))
    sweeps = {
        name: film_sweep(cell, coverage, generator(seed, NAME, name))
        for name, coverage in SECOND_COVERAGES.items()
    }
    night = oscillator_record(
        cell, np.full(_NIGHT_ROWS, 0.100), SECOND_COVERAGES["s005"], generator(seed, NAME, "s006")
    )
    night.period[:] += NIGHT_DRIFT * 60.0 * np.arange(_NIGHT_ROWS)
    broken = oscillator_columns(sweeps["s004"], sensor="RX2")
    before = [replace(column, values=column.values[:_BREAK]) for column in broken]
    after = [replace(column, values=column.values[_BREAK:]) for column in broken]
    rows = sweeps["s004"].period.size
    return {
        "raw/ts_empty.csv": sweep_bytes(empty, at("2026-02-12 20:00"), sensor="RX2"),
        "raw/ringdown_empty.dat": space_table(
            times_from(at("2026-02-13 10:00"), elapsed.size, cadence=2.0),
            [Column("A", "mV", magnitude * 1e3, 6)],
            remarks=["lock-in 1, magnitude, 0.3 s"],
        ),
        "raw/ts_d05.csv": sweep_bytes(sweeps["s003"], at("2026-02-18 20:00"), sensor="RX2"),
        "raw/ts_d06_part1.csv": comma_table(
            times_from(at("2026-02-20 23:00"), _BREAK, cadence=60.0), before, zone=ZONE
        ),
        "raw/ts_d06_part2.csv": comma_table(
            times_from(at("2026-02-21 03:00"), rows - _BREAK, cadence=60.0), after, zone=ZONE
        ),
        "raw/ts_d07.csv": sweep_bytes(sweeps["s005"], at("2026-02-25 20:00"), sensor="RX2"),
        "raw/night_d07.csv": sweep_bytes(night, at("2026-02-27 20:00"), sensor="RX2"),
    }


def second_cooldown(seed: int) -> CooldownFolder:
    """Return the folder of 2026-02.

    Parameters
    ----------
    seed : int
        Seed of the whole demonstration.
    """
    stated = second_stated(seed)
    values = {
        **sheet_values(TO4_LATER, stated),
        "coefficients": log_polynomial_text(TO4_LATER.sensor, stated.calibration_shift),
        "doses": _doses(seed, stated),
        "remounting_state": "applied",
        "remounting": "its own empty-cell run, s001",
        "ageing_state": "applied",
        "ageing_bound": "",
        "waiver": _WAIVERS,
        "ageing": "calibrated again before this run: it had moved 4 mK at 0.5 K in a year",
    }
    return CooldownFolder(NAME, filled(SECOND_SHEET, values), _files(seed))

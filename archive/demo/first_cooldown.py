"""The invented cooldown 2025-03: polyimide discs, dose run, four coverages.

Rules: what is true comes from `archive.demo.truth`; one random generator per thing, so that adding a sweep changes
no other.
"""

from __future__ import annotations

from datetime import timedelta
from typing import Final

import numpy as np

from archive.demo.files import Column, latin_table, space_table
from archive.demo.first_sheet import FIRST_SHEET
from archive.demo.forward import (
    OscillatorRecord,
    drive_sweep,
    film_sweep,
    oscillator_record,
    ringdown,
)
from archive.demo.gas import NITROGEN_PRESSURE, DoseReading, dose_reading, isotherm
from archive.demo.recording import (
    MBAR,
    TORR,
    ZONE,
    CooldownFolder,
    amount_text,
    at,
    concise,
    dose_text,
    filled,
    isotherm_columns,
    log_polynomial_text,
    sweep_bytes,
    times_from,
)
from archive.demo.stated import Stated, generator
from archive.demo.truth import TO4, CellTruth

__all__ = ["DOSE_COVERAGES", "FIRST_COVERAGES", "RUN_ROWS", "dose_run", "first_cooldown", "first_stated"]

NAME: Final = "2025-03"

DOSE_COVERAGES: Final = (
    *(3.0e-6, 6.0e-6, 9.0e-6, 12.0e-6, 15.0e-6, 17.0e-6, 19.0e-6, 21.0e-6, 22.2e-6, 23.2e-6),
    *(25.6e-6, 26.4e-6, 27.2e-6, 28.2e-6, 29.2e-6, 30.2e-6, 31.1e-6, 32.0e-6),
)
"""True coverage after each dose of the dose run, mol/m^2; one step across the onset, where 20 mK is not yet cold."""

FIRST_COVERAGES: Final = {"s006": 32.0e-6, "s008": 34.5e-6, "s009": 34.5e-6, "s010": 37.0e-6, "s012": 29.5e-6}
"""True coverage of each temperature sweep with a film, mol/m^2."""

RUN_ROWS: Final = 12
"""Rows of the dose run before the first dose and after each."""

_BASE: Final = 0.020
_CROSSED_OUT: Final = 9
"""Place of the dose that was crossed out: it has a number, and no gas went in."""

_POINTS: Final = 28
_REMOVED_UNCERTAINTY: Final = 0.03e-6
_RECOVERED_UNCERTAINTY: Final = 0.12e-6


def first_stated(seed: int) -> Stated:
    """Return what the laboratory believes about TO-4 during this cooldown."""
    return Stated.drawn(TO4, generator(seed, "TO-4"), calibration=generator(seed, "RX-2-cal", "1"))


def dose_run(
    cell: CellTruth, coverages: tuple[float, ...], base: float, rng: np.random.Generator
) -> OscillatorRecord:
    """Return the readings of a dose run at base temperature: `RUN_ROWS` rows empty and after each dose.

    Parameters
    ----------
    cell : CellTruth
    coverages : tuple of float
        True coverage in mol/m^2 after each dose.
    base : float
        K; the temperature wanders by 1 per cent.
    rng : numpy.random.Generator
    """
    coverage = np.repeat([0.0, *coverages], RUN_ROWS)
    temperature = base * (1 + 0.01 * np.clip(rng.standard_normal(coverage.size), -3, 3))
    return oscillator_record(cell, temperature, coverage, rng, cadence=300.0)


def _dose_times(count: int) -> list[str]:
    """Return the local times of the doses of the run: three a day, none at the weekend."""
    days = ("2025-03-19", "2025-03-20", "2025-03-21", "2025-03-24", "2025-03-25", "2025-03-26")
    return [f"{day} {hour}" for day in days for hour in ("09:30", "13:30", "17:30")][:count]


def _doses(seed: int, stated: Stated) -> tuple[str, list[str]]:
    """Return the dose blocks of the sheet and the names of the doses of the run."""
    cell = TO4
    rng = generator(seed, NAME, "doses")
    area = cell.film.area
    blocks: list[str] = []
    names: list[str] = []
    before = 0.0
    number = 0
    for coverage, time in zip(DOSE_COVERAGES, _dose_times(len(DOSE_COVERAGES)), strict=True):
        number += 1
        if number == _CROSSED_OUT:
            blank = dose_reading(cell, stated, 1.9e-6, rng)
            blocks.append(
                _block(
                    f"d{number:02d}",
                    time.replace(":30", ":10"),
                    blank,
                    crossed_out="V3 was still open: the gas went to the pump, none to the cell",
                )
            )
            number += 1
        names.append(f"d{number:02d}")
        reading = dose_reading(cell, stated, (coverage - before) * area, rng)
        blocks.append(_block(names[-1], time, reading, annealing="40 min at 0.8 K"))
        before = coverage
    for coverage, time in ((34.5e-6, "2025-03-29 10:00"), (37.0e-6, "2025-04-04 10:00")):
        number += 1
        reading = dose_reading(cell, stated, (coverage - before) * area, rng)
        blocks.append(_block(f"d{number:02d}", time, reading, annealing="2 h at 0.9 K"))
        before = coverage
    removed, left = (37.0e-6 - 29.5e-6) * area, 29.5e-6 * area
    draw = rng.standard_normal(2)
    blocks += [
        amount_text(
            "r01",
            at("2025-04-07 11:00"),
            act="remove",
            amount=concise((removed + _REMOVED_UNCERTAINTY * draw[0]) * 1e6, _REMOVED_UNCERTAINTY * 1e6, 2)
            + " umol",
            annealing="3 h at 0.8 K",
            notes="Pumped at 1.1 K into the weighed volume W2.",
        ),
        amount_text(
            "e01",
            at("2025-04-15 20:00"),
            act="recover",
            amount=concise((left + _RECOVERED_UNCERTAINTY * draw[1]) * 1e6, _RECOVERED_UNCERTAINTY * 1e6, 2)
            + " umol",
            notes="Everything that came out, in W2, while warming to 20 K.",
        ),
    ]
    return "\n".join(blocks), names


def _block(
    name: str,
    time: str,
    reading: DoseReading,
    *,
    annealing: str | None = None,
    crossed_out: str | None = None,
) -> str:
    return dose_text(
        name,
        at(time),
        reading,
        unit="Torr",
        doser="D1",
        gauge="G1",
        annealing=annealing,
        crossed_out=crossed_out,
    )


def _run_file(seed: int) -> bytes:
    rng = generator(seed, NAME, "s005")
    record = dose_run(TO4, DOSE_COVERAGES, _BASE, rng)
    first = [
        at("2025-03-19 07:00"),
        *(at(time) + timedelta(minutes=90) for time in _dose_times(len(DOSE_COVERAGES))),
    ]
    times = [time for begin in first for time in times_from(begin, RUN_ROWS, cadence=300.0)]
    return sweep_bytes(record, first[0], sensor="RX2", program="semicolon", times=times)


def _ringdown_file(seed: int, sweep: str, coverage: float, begin: str) -> bytes:
    elapsed, magnitude, _ = ringdown(TO4, 0.100, coverage, generator(seed, NAME, sweep))
    times = times_from(at(begin), elapsed.size, cadence=2.0)
    return space_table(
        times, [Column("A", "mV", magnitude * 1e3, 6)], remarks=["lock-in 1, magnitude, 0.3 s"]
    )


def _film_file(seed: int, sweep: str, begin: str, *, down: bool = False) -> bytes:
    record = film_sweep(TO4, FIRST_COVERAGES[sweep], generator(seed, NAME, sweep), down=down)
    overflow: tuple[int, ...] = ()
    if sweep == "s006":
        overflow = (203, 204, 205)
        # What the left-out rows hold: the loop off phase, up to 0.4 ns.
        record.period[40:52] += 4e-10 * np.sin(np.linspace(0.3, 2.8, 12))
    return sweep_bytes(record, at(begin), sensor="RX2", overflow=overflow)


def _isotherm_file(seed: int) -> bytes:
    rng = generator(seed, NAME, "s001")
    relative, amount = isotherm(TO4.film.area, rng, points=_POINTS)
    zero = (0.84 + 0.05 * rng.standard_normal()) * MBAR
    columns = isotherm_columns(
        relative,
        amount,
        saturation=NITROGEN_PRESSURE,
        zero=zero,
        noise=0.01 * MBAR * rng.standard_normal(_POINTS),
    )
    times = times_from(at("2025-03-12 08:00"), _POINTS, cadence=1500.0)
    return latin_table(times, columns, zone=ZONE, title="sorption set - N2 on polyimide discs - valve plan B")


def _files(seed: int) -> dict[str, bytes]:
    empty = oscillator_record(TO4, np.linspace(_BASE, 0.97, 240), 0.0, generator(seed, NAME, "s002"))
    first_drive = drive_sweep(TO4, 0.100, 0.0, generator(seed, NAME, "s004"))
    second_drive = drive_sweep(TO4, 0.100, 37.0e-6, generator(seed, NAME, "s011"))
    again = at("2025-04-06 02:30").replace(fold=1)
    return {
        "raw/sorption/pi2200_n2.txt": _isotherm_file(seed),
        "raw/ts_empty.csv": sweep_bytes(empty, at("2025-03-17 20:00"), sensor="RX2"),
        "raw/ringdown_empty.dat": _ringdown_file(seed, "s003", 0.0, "2025-03-18 09:30"),
        "raw/drive_empty.txt": sweep_bytes(
            first_drive, at("2025-03-18 11:00"), sensor="RX2", cadence=20.0, program="semicolon"
        ),
        "raw/doserun.txt": _run_file(seed),
        "raw/ts_d19.csv": _film_file(seed, "s006", "2025-03-27 21:00"),
        "raw/ringdown_d19.dat": _ringdown_file(seed, "s007", 32.0e-6, "2025-03-28 10:00"),
        "raw/ts_d20_up.csv": _film_file(seed, "s008", "2025-03-30 20:00"),
        "raw/ts_d20_down.csv": _film_file(seed, "s009", "2025-03-31 20:00", down=True),
        "raw/ts_d21.csv": _film_file(seed, "s010", "2025-04-05 22:00"),
        "raw/drive_d21.txt": sweep_bytes(
            second_drive, again, sensor="RX2", cadence=20.0, program="semicolon"
        ),
        "raw/ts_r01.csv": _film_file(seed, "s012", "2025-04-08 20:00"),
        "notes/notebook.txt": _NOTEBOOK.encode(),
    }


_NOTEBOOK: Final = """\
Copy of the notebook, pages 61 to 70 (invented).
18 March   G1 zero after a night of pumping: see sheet.
21 March   dose 9: V3 still open. Crossed out. Closed V3, filled again.
27 March   transfer at 21:41, loop lost phase for some ten minutes.
6 April    clocks back at 3:00. Bench computer shows 02:30 again.
15 April   warmed to 20 K, all gas in W2.
"""

_WAIVED: Final = ("s005", "s006", "s008", "s009", "s012")
"""Sweeps in which the rod went below 200 mK and whose warning a person answered."""

_WAIVER: Final = """\
# The rod is beryllium copper, and no drive sweep was taken at these coverages.
""" + "\n".join(
    f"""\
[[waiver]]
check = "rod-below-200-mk"
place = "{sweep}"
reason = "The drive sweeps at 100 mK, empty (s004) and with a thicker film (s011), show no dependence of the period on the drive."
role = "postdoc"
date = 2025-04-22
"""
    for sweep in _WAIVED
)


def first_cooldown(seed: int) -> CooldownFolder:
    """Return the folder of 2025-03.

    Parameters
    ----------
    seed : int
        Seed of the whole demonstration.
    """
    stated = first_stated(seed)
    doses, run = _doses(seed, stated)
    values = {
        **sheet_values(TO4, stated),
        "coefficients": log_polynomial_text(TO4.sensor, stated.calibration_shift),
        "doses": doses,
        "run_doses": ", ".join(f'"{name}"' for name in run),
        "remounting_state": "not-applicable",
        "remounting": "first cooldown of this cell",
        "ageing_state": "considered",
        "ageing_bound": "",
        "ageing": "calibrated two months before",
        "waiver": _WAIVER,
    }
    return CooldownFolder(NAME, filled(FIRST_SHEET, values), _files(seed))


def sheet_values(cell: CellTruth, stated: Stated) -> dict[str, str]:
    """Return what the sheets of TO-4 fill in from the laboratory's beliefs."""
    quality = stated.reference_quality
    return {
        "area": concise(stated.area, cell.area_uncertainty * cell.film.area, 3),
        "volume": concise(stated.doser_volume * 1e6, cell.volume_uncertainty * cell.doser_volume * 1e6, 3),
        "zero": concise(stated.gauge_zero / TORR, cell.zero_uncertainty / TORR, 5),
        "signal": concise(
            stated.reference_signal * 1e3, cell.oscillator.signal_noise * cell.oscillator.signal * 1e3, 5
        ),
        "sensitivity": "112.8(12)",
        "quality": f"{concise(quality / 1e5, cell.quality_uncertainty * quality / 1e5, 4)}e5",
        "centre": f"{cell.sensor.centre:.10f}",
        "velocity": concise(cell.oscillator.rim_velocity * 1e3, 0.01, 2),
    }

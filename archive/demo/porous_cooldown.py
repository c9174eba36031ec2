"""The invented cooldown 2026-05: helium film in porous glass, dose run, three coverages.

Rules: as in `first_cooldown`.
"""

from __future__ import annotations

from datetime import timedelta
from typing import Final

import numpy as np

from archive.demo.files import Column, comma_table, compressed, latin_table, space_table
from archive.demo.first_cooldown import RUN_ROWS, dose_run
from archive.demo.forward import (
    drive_sweep,
    film_sweep,
    frequency_sweep,
    oscillator_record,
    resistance,
    ringdown,
)
from archive.demo.gas import NITROGEN_PRESSURE, dose_reading, isotherm
from archive.demo.porous_sheet import POROUS_SHEET
from archive.demo.recording import (
    MBAR,
    ZONE,
    CooldownFolder,
    amount_text,
    at,
    concise,
    dose_text,
    filled,
    isotherm_columns,
    points_text,
    sweep_bytes,
    times_from,
)
from archive.demo.stated import Stated, generator
from archive.demo.truth import PG2, PorousFilm
from archive.physics.constants import MOLAR_MASS_HELIUM4
from archive.physics.film_static import STIFFNESS_UNIT
from archive.physics.porous_singularity import expected_amplitude, mean_shape

__all__ = ["POROUS_COVERAGES", "POROUS_DOSES", "porous_cooldown", "porous_stated", "singular_amplitude"]

NAME: Final = "2026-05"

POROUS_DOSES: Final = (
    *(3.0e-6, 6.0e-6, 9.0e-6, 12.0e-6, 15.0e-6, 17.5e-6, 19.5e-6, 21.0e-6),
    *(24.9e-6, 25.3e-6, 25.7e-6, 26.1e-6, 26.5e-6, 27.0e-6, 27.4e-6),
)
"""True coverage after each dose of the dose run, mol/m^2; one step across the onset, where 58 mK is not yet cold."""

POROUS_COVERAGES: Final = {"s006": 27.4e-6, "s007": 29.2e-6, "s008": 31.0e-6}
"""True coverage of each temperature sweep with a film, mol/m^2."""

_BASE: Final = 0.058
_CALIBRATION_SCATTER: Final = 1e-4
"""Relative scatter of the calibration points; the common part is `SensorTruth.calibration`."""

_PORE_AMOUNT: Final = 5.4e-3
"""mol of N2 that fill the pores: area x diameter/4 over the molar volume 34.7 cm^3/mol of liquid nitrogen at 77 K."""

HEAT_NOISE: Final = 1e-6
"""Of one reading of the heat capacity, J/K."""

VOLUME: Final = 1.062e-6
"""Of the rod of glass, m^3."""

_RECOVERED_UNCERTAINTY: Final = 6e-6


def porous_stated(seed: int) -> Stated:
    """Return what the laboratory believes about PG-2."""
    return Stated.drawn(PG2, generator(seed, "PG-2"), calibration=generator(seed, "GE-1-cal", "1"))


def _dose_times() -> list[str]:
    days = (
        "2026-05-12",
        "2026-05-13",
        "2026-05-14",
        "2026-05-15",
        "2026-05-18",
        "2026-05-19",
        "2026-05-20",
        "2026-05-21",
    )
    return [f"{day} {hour}" for day in days for hour in ("09:00", "16:00")][: len(POROUS_DOSES)]


def _doses(seed: int, stated: Stated) -> str:
    rng = generator(seed, NAME, "doses")
    area = PG2.film.area
    late = (("2026-05-24 09:00", 29.2e-6), ("2026-05-27 09:00", 31.0e-6))
    blocks: list[str] = []
    before = 0.0
    for number, (time, coverage) in enumerate([*zip(_dose_times(), POROUS_DOSES, strict=True), *late], 1):
        reading = dose_reading(PG2, stated, (coverage - before) * area, rng)
        blocks.append(
            dose_text(
                f"d{number:02d}",
                at(time),
                reading,
                unit="mbar",
                doser="D2",
                gauge="G3",
                annealing="1 h at 1 K",
            )
        )
        before = coverage
    recovered = before * area + _RECOVERED_UNCERTAINTY * rng.standard_normal()
    blocks.append(
        amount_text(
            "e01",
            at("2026-06-03 17:00"),
            act="recover",
            amount=concise(recovered * 1e3, _RECOVERED_UNCERTAINTY * 1e3, 4) + " mmol",
            notes="Pumped for two days, up to 60 K.",
        )
    )
    return "\n".join(blocks)


def _calibration_points(seed: int, stated: Stated) -> str:
    rng = generator(seed, "GE-1-cal", "points")
    temperature = np.geomspace(PG2.sensor.low * 0.98, PG2.sensor.high * 1.02, 28)
    read = temperature * (1 + stated.calibration_shift) * (1 + _CALIBRATION_SCATTER * rng.standard_normal(28))
    return points_text(resistance(PG2.sensor, temperature), read)


def _isotherm_file(seed: int) -> bytes:
    rng = generator(seed, NAME, "s001")
    relative, amount = isotherm(PG2.film.area, rng, points=64, pore_amount=_PORE_AMOUNT)
    zero = (0.61 + 0.05 * rng.standard_normal()) * MBAR
    columns = isotherm_columns(
        relative, amount, saturation=NITROGEN_PRESSURE, zero=zero, noise=0.01 * MBAR * rng.standard_normal(64)
    )
    times = times_from(at("2026-05-05 08:00"), 64, cadence=1500.0)
    return latin_table(times, columns, zone=ZONE, title="sorption set - N2 on porous glass - valve plan B")


def _run_file(seed: int) -> bytes:
    record = dose_run(PG2, POROUS_DOSES, _BASE, generator(seed, NAME, "s005"))
    first = [at("2026-05-12 07:00"), *(at(time) + timedelta(hours=3) for time in _dose_times())]
    times = [time for begin in first for time in times_from(begin, RUN_ROWS, cadence=300.0)]
    return sweep_bytes(record, first[0], sensor="GE1", program="semicolon", times=times)


def _resonance_file(seed: int) -> bytes:
    f, x, y = frequency_sweep(PG2, 0.100, generator(seed, NAME, "s003"))
    columns = [Column("f", "Hz", f, 8), Column("X", "mV", x * 1e3, 6), Column("Y", "mV", y * 1e3, 6)]
    return space_table(
        times_from(at("2026-05-09 09:00"), f.size, cadence=500.0), columns, remarks=["lock-in 2, exp(+i w t)"]
    )


def _film_file(seed: int, sweep: str, begin: str) -> bytes:
    record = film_sweep(PG2, POROUS_COVERAGES[sweep], generator(seed, NAME, sweep))
    return compressed(sweep_bytes(record, at(begin), sensor="GE1"))


def singular_amplitude() -> float:
    """Return the amplitude of the heat capacity at the transition of s007 that two-scale-factor universality asks for, J/K."""
    film = _film()
    flowing = film.amplitude * (POROUS_COVERAGES["s007"] - film.inert) * (1 - film.chi)
    density = MOLAR_MASS_HELIUM4 * flowing * film.area / VOLUME
    T_c = film.transition_temperature(POROUS_COVERAGES["s007"])
    return float(expected_amplitude(STIFFNESS_UNIT * T_c / density)) * VOLUME


def _film() -> PorousFilm:
    film = PG2.film
    if not isinstance(film, PorousFilm):
        raise TypeError("PG-2: found a planar film, expected one in pores")
    return film


def _heat_file(seed: int) -> bytes:
    """Return the heat capacity of cell and film about the transition: a smooth part and the singularity of `singular_amplitude`."""
    rng = generator(seed, NAME, "s010")
    t = np.linspace(-0.11, 0.11, 220)
    T = _film().transition_temperature(POROUS_COVERAGES["s007"]) * (1 + t)
    x = T / 0.6
    heat = 1.9e-3 * x + 1.1e-3 * x**2 + singular_amplitude() * mean_shape(t, width=0.22 / 219)
    heat = heat + HEAT_NOISE * rng.standard_normal(T.size)
    read = resistance(PG2.sensor, T) * (1 + PG2.sensor.reading * rng.standard_normal(T.size))
    columns = [Column("R_GE1", "Ohm", read, 4), Column("C", "uJ/K", heat * 1e6, 3)]
    return comma_table(times_from(at("2026-05-26 12:00"), T.size, cadence=60.0), columns, zone=ZONE)


def _files(seed: int) -> dict[str, bytes]:
    empty = oscillator_record(
        PG2, np.linspace(1.03 * PG2.sensor.low, 0.975, 240), 0.0, generator(seed, NAME, "s002")
    )
    elapsed, magnitude, _ = ringdown(PG2, 0.100, 0.0, generator(seed, NAME, "s004"))
    drive = drive_sweep(PG2, 0.100, 31.0e-6, generator(seed, NAME, "s009"))
    return {
        "raw/sorption/pgl7_n2.txt": _isotherm_file(seed),
        "raw/ts_empty.csv.gz": compressed(sweep_bytes(empty, at("2026-05-08 19:00"), sensor="GE1")),
        "raw/resonance_empty.dat": _resonance_file(seed),
        "raw/ringdown_empty.dat": space_table(
            times_from(at("2026-05-11 10:00"), elapsed.size, cadence=2.0),
            [Column("A", "mV", magnitude * 1e3, 6)],
            remarks=["lock-in 2, magnitude, 0.3 s"],
        ),
        "raw/doserun.txt": _run_file(seed),
        "raw/ts_d15.csv.gz": _film_file(seed, "s006", "2026-05-21 20:00"),
        "raw/ts_d16.csv.gz": _film_file(seed, "s007", "2026-05-25 20:00"),
        "raw/ts_d17.csv.gz": _film_file(seed, "s008", "2026-05-28 20:00"),
        "raw/heat_d16.csv": _heat_file(seed),
        "raw/drive_d17.txt": sweep_bytes(
            drive, at("2026-05-30 09:00"), sensor="GE1", cadence=20.0, program="semicolon"
        ),
    }


def porous_cooldown(seed: int) -> CooldownFolder:
    """Return the folder of 2026-05.

    Parameters
    ----------
    seed : int
        Seed of the whole demonstration.
    """
    stated = porous_stated(seed)
    quality = stated.reference_quality
    values = {
        "area": concise(stated.area, PG2.area_uncertainty * PG2.film.area, 2),
        "volume": concise(stated.doser_volume * 1e6, PG2.volume_uncertainty * PG2.doser_volume * 1e6, 2),
        "zero": concise(stated.gauge_zero / MBAR, PG2.zero_uncertainty / MBAR, 4),
        "quality": f"{concise(quality / 1e5, PG2.quality_uncertainty * quality / 1e5, 4)}e5",
        "signal": concise(
            stated.reference_signal * 1e3, PG2.oscillator.signal_noise * PG2.oscillator.signal * 1e3, 5
        ),
        "points": _calibration_points(seed, stated),
        "doses": _doses(seed, stated),
        "run_doses": ", ".join(f'"d{number:02d}"' for number in range(1, len(POROUS_DOSES) + 1)),
        "velocity": concise(PG2.oscillator.rim_velocity * 1e3, 0.01, 2),
    }
    return CooldownFolder(NAME, filled(POROUS_SHEET, values), _files(seed))

"""Small cooldowns in memory: a torsional oscillator with a film, as a reading that any check can look at."""

from __future__ import annotations

import json
from copy import deepcopy
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import numpy as np

from archive.intake.reading import ChannelFacts, Reading, SweepTable
from archive.intake.sheet import LineMap, SheetReading
from schemas.cooldown import CooldownSheet
from schemas.lineage import DoseEntry, RawFileEntry, Value
from schemas.quantity import unit_factor

BEGIN = datetime(2026, 3, 2, 9, 0, tzinfo=UTC)
PERIOD = 1.0e-3
NOISE = 1.5e-12

THERMOMETER = {"column": "R", "quantity": "resistance", "unit": "Ohm", "thermometer": "RX-2"}
CHANNELS: dict[str, Any] = {
    "time": {"column": "time", "quantity": "instant"},
    "thermometer": THERMOMETER,
    "period": {"column": "P", "quantity": "period", "unit": "s", "uncertainty": "1.5 ps"},
    "amplitude": {
        "column": "A",
        "quantity": "amplitude",
        "unit": "V",
        "convention": "rms",
        "full_scale": "1 V",
    },
    "drive": {"column": "D", "quantity": "drive", "unit": "V", "convention": "rms"},
}
EFFECT_STATES = {"state": "considered", "reason": "looked at in the notebook"}

SHEET: dict[str, Any] = {
    "format": "stillroom-cooldown/1",
    "name": "2026-03",
    "cryostat": "DR-1",
    "begin": "2026-03-02T08:00:00+00:00",
    "end": "2026-03-20T08:00:00+00:00",
    "time_zone": "Europe/Helsinki",
    "operators": ["graduate student"],
    "purpose": "test",
    "outcome": "complete",
    "temperature_scale": "ITS-90",
    "cell": "TO-4",
    "sample": "He4",
    "record": {
        "cryostat": [
            {"name": "DR-1", "revision": 1, "kind": "dilution", "site_contact": "cryogenics technician"}
        ],
        "cell": [
            {
                "name": "TO-4",
                "revision": 1,
                "kind": "torsional-oscillator",
                "rod_material": "Al5056",
                "substrate": "PI",
                "closable_volume": "2.0 cm^3",
                "closing_valve": "V7",
                "rated_pressure": "0.35 MPa gauge",
                "rating_document": "workshop sheet 4",
                "empty_period": "1.000 ms",
                "mass_sensitivity": "170 ns/mmol",
                "rim_radius": "7.5 mm",
            }
        ],
        "substrate": [{"name": "PI", "revision": 1, "material": "polyimide film", "area": "1.0 m^2"}],
        "sample": [
            {
                "name": "He4",
                "revision": 1,
                "isotope": "4He",
                "helium3_fraction": "0.2 ppm",
                "gas_source": "bottle 17",
            }
        ],
        "thermometer": [{"name": "RX-2", "revision": 1, "kind": "ruthenium-oxide", "place": "base"}],
        "calibration": [
            {
                "name": "RX-2-cal",
                "revision": 1,
                "thermometer": "RX-2",
                "scale": "ITS-90",
                "date": "2026-01-10",
                "against": "melting curve",
                "reading_unit": "Ohm",
                "relation": {"form": "log-polynomial", "coefficients": [1.0, -1.0]},
                "temperature_low": "0.05 K",
                "temperature_high": "4.0 K",
                "uncertainty": "1 mK",
            }
        ],
    },
    "detection": {
        "torque_exponent": 1,
        "signal_exponent": 1,
        "amplitude_convention": "rms",
        "reference_signal": "0.1 V rms",
        "reference_drive": "0.1 V rms",
        "reference_quality_factor": "4.0e5",
        "reference_period": "1.000 ms",
        "reference_rim_velocity": "0.1 mm/s peak",
    },
    "layout": {"counter": {"channels": CHANNELS}},
    "gauge": [{"name": "G1", "range": "10 Torr"}],
    "doser": [{"name": "D1", "volume": "50 cm^3", "how": "weighed"}],
    "dose": [
        {
            "name": "d01",
            "at": "2026-03-03T08:00:00+00:00",
            "doser": "D1",
            "gauge": "G1",
            "pressure_before": "8.0 Torr",
            "pressure_after": "2.0 Torr",
            "temperature_before": "295 K on ITS-90",
            "annealing": "1 h at 0.8 K",
        }
    ],
    "gas_end": {
        "state": "left-in-cell",
        "valve": "V7 closed",
        "valve_open": False,
        "warmest_temperature": "293.15 K on ITS-90",
    },
    "sweep": [
        {
            "name": "empty",
            "kind": "temperature-sweep",
            "files": ["empty.csv"],
            "layout": "counter",
            "empty_cell": True,
            "thermometer": "thermometer",
            "direction": "up",
        },
        {
            "name": "film",
            "kind": "temperature-sweep",
            "files": ["film.csv"],
            "layout": "counter",
            "after_dose": "d01",
            "thermometer": "thermometer",
            "direction": "up",
            "settled": "one night",
        },
    ],
}

Columns = dict[str, np.ndarray]


def sheet_tables() -> dict[str, Any]:
    """Return the tables of a good sheet, to be changed at will."""
    return deepcopy(SHEET)


def temperatures(rows: int = 300) -> np.ndarray:
    """Return rising temperatures in K."""
    return np.linspace(0.3, 1.0, rows)


def periods(
    T: np.ndarray, *, drop: float = 0.0, at: float = 0.6, width: float = 0.02, seed: int = 1
) -> np.ndarray:
    """Return periods in s with a smooth background, a drop below `at`, and noise."""
    rng = np.random.default_rng(seed)
    film = 0.5 * drop * (1 - np.tanh((T - at) / width))
    return PERIOD + 1e-9 * T - film + NOISE * rng.standard_normal(len(T))


def columns(T: np.ndarray, *, day: float = 0.0, amplitude: float = 0.1, **period: float) -> Columns:
    """Return the columns of a temperature sweep in SI units, one row a minute from `day` days after the begin."""
    rng = np.random.default_rng(2)
    return {
        "time": BEGIN.timestamp() + 86400 * day + 60.0 * np.arange(len(T)),
        "thermometer": 1.0 / T,
        "period": periods(T, **period),  # type: ignore[arg-type]
        "amplitude": amplitude * (1 + 1e-4 * rng.standard_normal(len(T))),
        "drive": np.full(len(T), 0.1),
        "T": T,
    }


def good_columns() -> dict[str, Columns]:
    """Return the columns of the two sweeps of the good sheet."""
    T = temperatures()
    return {"empty": columns(T, day=0.1), "film": columns(T[5:-5], day=2.0, drop=50e-9, seed=3)}


def facts_of(values: np.ndarray, quantity: str, factor: float, lines: np.ndarray) -> ChannelFacts:
    """Return what streaming would have found, in the unit of the file."""
    present = values[np.isfinite(values)]
    facts = ChannelFacts(missing=len(values) - len(present))
    if len(present):
        facts.low, facts.high = float(present.min() / factor), float(present.max() / factor)
    if quantity == "instant":
        steps = np.diff(values)
        facts.reversed_at = [(0, int(line)) for line in lines[1:][steps < 0]]
        facts.repeated_at = [(0, int(line)) for line in lines[1:][steps == 0]]
    return facts


def add_table(reading: Reading, name: str, given: Columns) -> SweepTable:
    """Add a sweep's table to a reading; the column `T` is the temperature of its thermometer."""
    sheet = reading.sheet
    number = next(i for i, sweep in enumerate(sheet.sweep) if sweep.name == name)
    sweep = sheet.sweep[number]
    channels = {n: c for n, c in sheet.channels_of(sweep).items() if n in given}
    rows = len(next(iter(given.values())))
    lines = np.arange(2, rows + 2)
    table = SweepTable(
        sweep=sweep,
        number=number,
        channels=channels,
        columns={n: np.asarray(given[n], dtype=np.float64) for n in channels},
        lines=lines,
        file_numbers=np.zeros(rows, dtype=np.int64),
        rows=rows,
        stride=1,
        facts={
            n: facts_of(
                np.asarray(given[n], dtype=np.float64),
                c.quantity,
                1.0 if c.quantity == "instant" else unit_factor(c.unit or "1", c.quantity),
                lines,
            )
            for n, c in channels.items()
        },
    )
    if "T" in given:
        calibration = (
            reading.calibration_of(channels[sweep.thermometer]) if sweep.thermometer in channels else None
        )
        T = np.asarray(given["T"], dtype=np.float64)
        table.calibration, table.scale = calibration, None if calibration is None else calibration.scale
        table.outside_calibration = np.zeros(rows, dtype=np.bool_)
        if calibration is not None:
            table.outside_calibration = (calibration.temperature_low.si > T) | (
                calibration.temperature_high.si < T
            )
        table.temperature = np.where(table.outside_calibration, np.nan, T)
    reading.tables[name] = table
    return table


def make_reading(
    tables: dict[str, Any] | None = None,
    data: dict[str, Columns] | None = None,
    *,
    folder: Path = Path("/nonexistent"),
) -> Reading:
    """Return a reading of a sheet given as tables, with the columns of its sweeps."""
    text = json.dumps(sheet_tables() if tables is None else tables)
    sheet = CooldownSheet.model_validate_json(text)
    reading = Reading(folder=folder, sheet_reading=SheetReading("cooldown.toml", "", sheet, (), LineMap("")))
    for record in sheet.records:
        reading.records[record.address] = record
    for position, sweep in enumerate(sheet.sweep):
        for name in sweep.files:
            digest = f"{position:064x}"
            reading.raw_files.setdefault(name, RawFileEntry(name=name, sha256=digest, size=1, role="sweep"))
    for name, given in (good_columns() if data is None else data).items():
        add_table(reading, name, given)
    return reading


def ledger_entry(
    name: str,
    amount: float,
    running: float,
    *,
    act: str = "add",
    uncertainty: float = 0.0,
    coverage: float | None = None,
) -> DoseEntry:
    """Return a line of the gas ledger, amounts in mol."""
    return DoseEntry(
        name=name,
        at=BEGIN,
        act=act,  # type: ignore[arg-type]
        counted=True,
        amount=Value(value=amount, uncertainty=uncertainty, unit="mol"),
        running_amount=Value(value=running, uncertainty=uncertainty, unit="mol"),
        running_coverage=None if coverage is None else Value(value=coverage, unit="mol/m^2"),
        method="test",
    )

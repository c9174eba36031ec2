"""From readings to files: which instrument program wrote what, and how a cooldown folder is put together.

Rules: a folder is text and bytes in memory until `CooldownFolder.write`; nothing here draws random numbers.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path
from string import Template
from typing import TYPE_CHECKING, Final
from zoneinfo import ZoneInfo

import numpy as np

from archive.demo.files import Column, comma_table, semicolon_table
from archive.demo.forward import OscillatorRecord
from archive.demo.gas import THERMOMETER, DoseReading
from archive.demo.truth import SensorTruth

if TYPE_CHECKING:
    import numpy.typing as npt

__all__ = [
    "MBAR",
    "TORR",
    "ZONE",
    "CooldownFolder",
    "amount_text",
    "at",
    "concise",
    "dose_text",
    "filled",
    "isotherm_columns",
    "log_polynomial_text",
    "oscillator_columns",
    "points_text",
    "sweep_bytes",
    "times_from",
]

ZONE: Final = ZoneInfo("Australia/Hobart")
"""Zone of the invented laboratory; its clocks go back in the southern autumn, on the first Sunday of April."""

TORR: Final = 101325 / 760
"""Pa, exact by definition of the torr."""

MBAR: Final = 100.0
"""Pa, exact."""


@dataclass(frozen=True)
class CooldownFolder:
    """A folder of raw data: the sheet and the files beside it, not yet on disk.

    Attributes
    ----------
    name : str
    sheet : str
        Text of `cooldown.toml`.
    files : mapping of str to bytes
        By relative path.
    """

    name: str
    sheet: str
    files: Mapping[str, bytes]

    def write(self, target: Path) -> Path:
        """Write the folder below `target` and return its path.

        Raises
        ------
        FileExistsError
            If the folder is there already; nothing is overwritten.
        """
        folder = target / self.name
        folder.mkdir(parents=True, exist_ok=False)
        for name, data in {"cooldown.toml": self.sheet.encode(), **self.files}.items():
            path = folder / name
            path.parent.mkdir(parents=True, exist_ok=True)
            path.write_bytes(data)
        return folder


def at(text: str) -> datetime:
    """Return the instant of a local time such as ``2025-03-14 21:30``; of an hour that ran twice, the first."""
    return datetime.strptime(text, "%Y-%m-%d %H:%M").replace(tzinfo=ZONE)


def times_from(begin: datetime, count: int, *, cadence: float) -> list[datetime]:
    """Return `count` instants from `begin`, `cadence` seconds of real time apart, across any change of the clock."""
    first = begin.timestamp()
    return [datetime.fromtimestamp(first + cadence * row, ZONE) for row in range(count)]


def stamp(time: datetime) -> str:
    """Return the RFC 3339 text of an instant, with the offset of the laboratory's zone."""
    return time.astimezone(ZONE).isoformat(timespec="seconds")


def concise(value: float, uncertainty: float, decimals: int) -> str:
    """Return a value with its standard uncertainty in the concise notation, with fixed decimals.

    Examples
    --------
    >>> concise(25.0593, 0.02, 3)
    '25.059(20)'
    """
    return f"{value:.{decimals}f}({round(uncertainty * 10**decimals)})"


def filled(template: str, values: Mapping[str, object]) -> str:
    """Return a sheet template with its blanks filled; a blank without a value is an error."""
    text = Template(template).substitute({name: str(value) for name, value in values.items()})
    return re.sub(r"[ \t]+\n", "\n", text).lstrip("\n")


def oscillator_columns(
    record: OscillatorRecord, *, sensor: str, overflow: Sequence[int] = (), with_drive: bool = True
) -> list[Column]:
    """Return the columns of an oscillator table: resistance, period in us, signal in mV, drive in V."""
    columns = [
        Column(f"R_{sensor}", "Ohm", record.resistance, 4),
        Column("P", "us", record.period * 1e6, 9),
        Column("A", "mV", record.amplitude * 1e3, 6, np.array(overflow, dtype=np.int64)),
    ]
    if with_drive:
        columns.append(Column("V", "V", record.drive, 4))
    return columns


def sweep_bytes(
    record: OscillatorRecord,
    begin: datetime,
    *,
    sensor: str,
    cadence: float = 60.0,
    overflow: Sequence[int] = (),
    program: str = "comma",
    times: Sequence[datetime] | None = None,
) -> bytes:
    """Return the file of an oscillator sweep as the `comma` or the `semicolon` program writes it."""
    stamps = times_from(begin, record.period.size, cadence=cadence) if times is None else times
    columns = oscillator_columns(record, sensor=sensor, overflow=overflow)
    writer = comma_table if program == "comma" else semicolon_table
    return writer(stamps, columns, zone=ZONE)


def isotherm_columns(
    relative: npt.NDArray[np.float64],
    amount: npt.NDArray[np.float64],
    *,
    saturation: float,
    zero: float,
    noise: npt.NDArray[np.float64],
) -> list[Column]:
    """Return the columns of a nitrogen isotherm: pressure with its zero, saturation pressure, amount in umol."""
    pressure = relative * saturation + zero + noise
    return [
        Column("p", "mbar", pressure / MBAR, 4),
        Column("p0", "mbar", np.full(relative.size, saturation / MBAR), 2),
        Column("n", "µmol", amount * 1e6, 4),
    ]


def dose_text(
    name: str,
    time: datetime,
    reading: DoseReading,
    *,
    unit: str,
    doser: str,
    gauge: str,
    annealing: str | None = None,
    crossed_out: str | None = None,
) -> str:
    """Return one dose as a block of the sheet."""
    scale = {"Torr": TORR, "mbar": MBAR}[unit]
    lines = [
        "[[dose]]",
        f'name = "{name}"',
        f"at = {stamp(time)}",
        f'doser = "{doser}"',
        f'gauge = "{gauge}"',
        f'pressure_before = "{reading.before / scale:.5f} {unit}"',
        f'pressure_after = "{reading.after / scale:.5f} {unit}"',
        f'temperature_before = "{concise(reading.temperature, THERMOMETER, 2)} K on ITS-90"',
    ]
    if annealing is not None:
        lines.append(f'annealing = "{annealing}"')
    if crossed_out is not None:
        lines.append(f'crossed_out = "{crossed_out}"')
    return "\n".join(lines) + "\n"


def amount_text(
    name: str, time: datetime, *, act: str, amount: str, notes: str, annealing: str | None = None
) -> str:
    """Return a removal or the final recovery, stated as an amount, as a block of the sheet."""
    lines = ["[[dose]]", f'name = "{name}"', f"at = {stamp(time)}", f'act = "{act}"', f'amount = "{amount}"']
    if annealing is not None:
        lines.append(f'annealing = "{annealing}"')
    lines.append(f'notes = "{notes}"')
    return "\n".join(lines) + "\n"


def log_polynomial_text(sensor: SensorTruth, shift: float) -> str:
    """Return the coefficients of a calibration that gives T (1 + shift) where the sensor is at T."""
    first, *rest = sensor.coefficients
    return ", ".join(f"{value:.7f}" for value in (first + float(np.log1p(shift)), *rest))


def points_text(resistances: npt.NDArray[np.float64], temperatures: npt.NDArray[np.float64]) -> str:
    """Return calibration points as lines of a TOML array."""
    pairs = zip(resistances, temperatures, strict=True)
    return "\n".join(f"  [{reading:.4f}, {temperature:.6f}]," for reading, temperature in pairs)

"""Cooldown folders with long and short logs, and the script that a person would write for them.

A log has a time stamp and ten numbers a row, as a logger prints them: six to nine significant digits, drifting and noisy.
"""

from __future__ import annotations

import hashlib
from pathlib import Path

import h5py
import numpy as np
import pandas as pd

__all__ = ["CHANNELS", "Stored", "script", "write_folder"]

CHANNELS = {
    "temperature": ("temperature", "K", "%.6f"),
    "period": ("period", "ms", "%.9f"),
    "amplitude": ("amplitude", "uV", "%.4f"),
    "drive": ("voltage", "mV", "%.5f"),
    "bridge": ("resistance", "Ohm", "%.4f"),
    "bath": ("resistance", "Ohm", "%.3f"),
    "pressure": ("pressure", "Pa", "%.4e"),
    "gauge": ("capacitance", "pF", "%.6f"),
    "heater": ("power", "uW", "%.4e"),
    "dissipation": ("dissipation", "1", "%.5e"),
}
"""Quantity, unit and format of each column beside the time."""

_HEAD = """\
format = "stillroom-cooldown/1"
name = "2026-03"
cryostat = "fridge.r1"
begin = 2026-03-02T09:00:00+02:00
end = 2026-03-30T18:00:00+02:00
time_zone = "Europe/Helsinki"
operators = ["graduate student"]
purpose = "a run to be measured"
outcome = "complete"
temperature_scale = "ITS-90"
cell = "bob.r1"

[gas_end]
state = "recovered"
warmest_temperature = "300 K"

[[record.cryostat]]
name = "fridge"
revision = 1
kind = "dilution"

[[record.cell]]
name = "bob"
revision = 1
kind = "torsional-oscillator"
rod_material = "Al5056"
rim_radius = "7.5(1) mm"
empty_period = "1.000000(1) ms"
mass_sensitivity = "168(3) ns/mmol"

[layout.log]
dialect = { time_format = "iso8601" }

[layout.log.channels.time]
column = "time"
quantity = "instant"
"""
_STEP_MS = 100
_AGAIN = 100_000
_BEGIN = np.datetime64("2026-03-03T10:00:00.000", "ms")


def _sheet(files: int) -> str:
    """Return the sheet of a folder with one sweep for each of so many files."""
    parts = [_HEAD]
    for name, (quantity, unit, _) in CHANNELS.items():
        scale = '\nscale = "ITS-90"' if quantity == "temperature" else ""
        parts.append(
            f'\n[layout.log.channels.{name}]\ncolumn = "{name}"\nquantity = "{quantity}"\nunit = "{unit}"{scale}\n'
        )
    parts += [
        f'\n[[sweep]]\nname = "s{number:03d}"\nkind = "temperature-sweep"\nfiles = ["log{number:03d}.csv"]\n'
        'layout = "log"\nempty_cell = true\ndirection = "up"\n'
        for number in range(files)
    ]
    return "".join(parts)


def _write_log(path: Path, rows: int, *, seed: int) -> None:
    """Write one log; the same rows for the same seed. The numbers, not the times, come again after so many rows."""
    body = _body(min(rows, _AGAIN), seed)
    with path.open("w", encoding="ascii") as stream:
        stream.write("time," + ",".join(CHANNELS) + "\n")
        for start in range(0, rows, _AGAIN):
            count = min(_AGAIN, rows - start)
            stamps = np.datetime_as_string(_BEGIN + _STEP_MS * np.arange(start, start + count), unit="ms")
            stream.writelines(map(str.__add__, stamps.tolist(), body[:count]))


def _body(rows: int, seed: int) -> list[str]:
    """Return what stands behind the time in each row, its offset from UTC first."""
    random = np.random.default_rng(seed)
    drift = np.cumsum(random.standard_normal(rows)) * 1e-6
    noise = random.standard_normal((len(CHANNELS), rows))
    columns = (
        0.3 + 5e-7 * np.arange(rows) + 1e-5 * noise[0],
        1.003 + drift * 1e-3 + 2e-9 * noise[1],
        120 + 100 * drift + 0.01 * noise[2],
        2.5 + 1e-4 * noise[3],
        15000 + 1e4 * drift + 0.05 * noise[4],
        2200 + 0.02 * noise[5],
        12 * np.exp(drift) + 1e-3 * noise[6],
        22.1 + drift + 2e-6 * noise[7],
        40 + 1e-2 * noise[8],
        2e-6 * (1 + drift) + 1e-10 * noise[9],
    )
    form = "+02:00," + ",".join(form for _, _, form in CHANNELS.values()) + "\n"
    return [form % row for row in zip(*(column.tolist() for column in columns), strict=True)]


def write_folder(folder: Path, rows: int, files: int = 1) -> Path:
    """Write a folder of so many logs, `log000.csv` and so on, and return it."""
    folder.mkdir(parents=True)
    (folder / "cooldown.toml").write_text(_sheet(files), encoding="utf-8")
    for number in range(files):
        _write_log(folder / f"log{number:03d}.csv", rows, seed=20260303 + number)
    return folder


def script(log: Path, target: Path, *, raw: bool) -> None:
    """Do what a person's script does: pandas reads the table, h5py writes its columns (gzip 4, shuffle).

    Parameters
    ----------
    log, target : Path
        The log, and the HDF5 file to be written, which is replaced.
    raw : bool
        Whether the log's bytes are kept too (gzip 4), with their SHA-256.
    """
    table = pd.read_csv(log, parse_dates=["time"], date_format="ISO8601")
    with h5py.File(target, "w") as file:
        for name in table.columns:
            values = table[name].to_numpy()
            if name == "time":
                values = table[name].dt.tz_convert("UTC").dt.tz_localize(None).to_numpy()
                values = values.astype("datetime64[us]").astype(np.int64) / 1e6
            file.create_dataset(name, data=values, compression="gzip", compression_opts=4, shuffle=True)
        if raw:
            content = log.read_bytes()
            kept = file.create_dataset(
                "raw", data=np.frombuffer(content, np.uint8), compression="gzip", compression_opts=4
            )
            kept.attrs["sha256"] = hashlib.sha256(content).hexdigest()


class Stored:
    """Columns of a file that one of the sides wrote, read when somebody asks for them.

    Parameters
    ----------
    path : Path
    group : str
        Where the columns lie.
    """

    def __init__(self, path: Path, group: str = "/") -> None:
        self._path, self._group = path, group

    def __array__(self, dtype: object = None, copy: object = None) -> np.ndarray:
        """Return all columns, each in the power of ten of its largest value, so that none hides behind another."""
        with h5py.File(self._path) as file:
            columns = [file[self._group][name][()] for name in ("time", *CHANNELS)]
        columns[0] -= _BEGIN.astype(np.int64) / 1e3
        return np.stack([each / 10.0 ** round(np.log10(np.abs(each).max())) for each in columns])

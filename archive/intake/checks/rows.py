"""Rows that count, and how well their readings are known.

Rules: rows that the sheet leaves out, and channels that are not to be used, are not checked. Where no uncertainty is
stated, the scatter from row to row stands for it.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from datetime import datetime

import numpy as np
from numpy.typing import NDArray

from archive.intake.reading import Reading, SweepTable
from schemas.quantity import Quantity
from schemas.sweep import Channel, LeftOut

__all__ = [
    "bound",
    "counting",
    "frequency_hz",
    "noise",
    "ring_time_s",
    "sigma",
    "stated_uncertainty",
    "tables",
    "temperature",
    "time_span",
]

Floats = NDArray[np.float64]
Mask = NDArray[np.bool_]

_SHARE = re.compile(r"^\s*([0-9]+(?:\.[0-9]*)?(?:[eE][-+]?[0-9]+)?)\s*(%|ppm|ppb)\s*$")
_SHARES = {"%": 1e-2, "ppm": 1e-6, "ppb": 1e-9}
# Standard deviation over median absolute deviation of a normal distribution, 1/Phi^-1(3/4).
_MAD = 1.4826


def tables(reading: Reading, *kinds: str) -> Iterator[SweepTable]:
    """Yield the sweeps that were read, in the order of the sheet; of the given kinds, if any."""
    for table in sorted(reading.tables.values(), key=lambda each: each.number):
        if table.rows and (not kinds or table.sweep.kind in kinds):
            yield table


def counting(table: SweepTable) -> Mask:
    """Return which kept rows are not left out by the sheet."""
    mask = np.ones(len(table.lines), dtype=np.bool_)
    for left_out in table.sweep.left_out:
        mask &= ~_left_out(table, left_out)
    return mask


def _left_out(table: SweepTable, left_out: LeftOut) -> Mask:
    if left_out.rows is not None:
        number = np.arange(len(table.lines)) * table.stride + 1
        return np.asarray((number >= left_out.rows[0]) & (number <= left_out.rows[1]))
    channel = table.channels.get(left_out.channel or "")
    column = table.columns.get(left_out.channel or "")
    inside = np.zeros(len(table.lines), dtype=np.bool_)
    if channel is None or column is None:
        return inside
    inside |= np.isfinite(column)
    try:
        if left_out.low is not None:
            inside &= column >= bound(left_out.low, channel)
        if left_out.high is not None:
            inside &= column <= bound(left_out.high, channel)
    except ValueError:  # told of by the check of the sheet's texts
        return np.zeros(len(table.lines), dtype=np.bool_)
    return inside


def bound(text: str, channel: Channel) -> float:
    """Return a bound of a left-out range in SI units, or POSIX seconds.

    Raises
    ------
    ValueError
        If the text is no quantity of that channel, or no time with its offset.
    """
    if channel.quantity != "instant":
        return Quantity.parse(text, channel.quantity).si
    instant = datetime.fromisoformat(text)
    if instant.tzinfo is None:
        raise ValueError(f"found {text!r}, expected a time with its offset from UTC")
    return instant.timestamp()


def time_span(table: SweepTable) -> tuple[float, float] | None:
    """Return first and last time of a sweep in POSIX seconds, with its corrections of the clock; None without times."""
    name = table.of_kind("instant")
    if name is None or np.isnan(table.facts[name].low):
        return None
    offset = 0.0
    for correction in table.sweep.corrections:
        if correction.channel == name and correction.correct == "clock":
            try:
                offset += Quantity.parse(correction.value, "time").si
            except ValueError:  # told of by the check of the sheet's texts
                continue
    return table.facts[name].low + offset, table.facts[name].high + offset


def stated_uncertainty(channel: Channel, values: Floats) -> Floats | None:
    """Return the stated standard uncertainty of each reading in SI units, or None.

    Raises
    ------
    ValueError
        If it cannot be read.
    """
    if channel.uncertainty is None:
        return None
    share = _SHARE.match(channel.uncertainty)
    if share is not None:
        return np.asarray(np.abs(values) * float(share[1]) * _SHARES[share[2]])
    kind = "temperature_difference" if channel.quantity == "temperature" else channel.quantity
    return np.full(values.shape, abs(Quantity.parse(channel.uncertainty, kind).si))


def noise(values: Floats) -> float:
    """Return the scatter from row to row by second differences, which a steady drift does not enter; NaN below 4 rows.

    Notes
    -----
    Median absolute deviation of y[i-1] - 2 y[i] + y[i+1], whose variance is 6 times that of white noise (derived).
    """
    present = values[np.isfinite(values)]
    if len(present) < 4:
        return float("nan")
    second = np.diff(present, n=2)
    return float(_MAD * np.median(np.abs(second - np.median(second))) / np.sqrt(6.0))


def sigma(table: SweepTable, name: str) -> float:
    """Return the standard uncertainty of one reading of a channel in SI units: stated, else from the scatter; NaN if neither."""
    channel, values = table.channels[name], table.columns[name]
    try:
        stated = stated_uncertainty(channel, values)
    except ValueError:  # told of by the check of the sheet's texts
        stated = None
    scatter = noise(values)
    if stated is None or not np.isfinite(stated).any():
        return scatter
    return float(np.nanmax([np.nanmedian(stated), scatter if channel.uncertainty_is == "run" else 0.0]))


def temperature(reading: Reading, table: SweepTable) -> Floats | None:
    """Return the temperature of each kept row in K, or None; a run at one temperature has that of its bath."""
    if table.temperature is not None:
        return table.temperature
    name = table.sweep.thermometer or table.of_kind("temperature")
    if name is not None and name in table.channels and table.channels[name].quantity == "temperature":
        return table.columns.get(name)
    bath = table.sweep.bath_temperature
    return None if bath is None else np.full(len(table.lines), bath.si)


def frequency_hz(reading: Reading, table: SweepTable) -> float | None:
    """Return the frequency of the oscillator in a sweep: as recorded, else as the sheet or the cell states it."""
    period = table.values("period")
    if period is not None and np.isfinite(period).any():
        middle = float(np.nanmedian(period))
        return 1.0 / middle if middle > 0 else None
    detection, cell = reading.detection_of(table.sweep), reading.cell_of(table.sweep)
    for stated in (getattr(detection, "reference_period", None), getattr(cell, "empty_period", None)):
        if stated is not None and stated.si > 0:
            return float(1.0 / stated.si)
    return None


def ring_time_s(reading: Reading, table: SweepTable) -> float | None:
    """Return the ring time tau = Q/(pi f) of the amplitude, or None.

    Notes
    -----
    Q as the sheet's detection states it, else that of the empty cell.
    """
    frequency = frequency_hz(reading, table)
    detection, cell = reading.detection_of(table.sweep), reading.cell_of(table.sweep)
    quality = getattr(detection, "reference_quality_factor", None) or getattr(
        cell, "empty_quality_factor", None
    )
    return None if frequency is None or quality is None else float(quality.si / (np.pi * frequency))

"""Findings with their place: a row of data, a sweep, or a line of the sheet."""

from __future__ import annotations

import math

from archive.intake.reading import Reading, SweepTable
from archive.intake.sheet import spelled
from schemas.finding import Finding, Severity
from schemas.quantity import unit_factor

__all__ = ["in_file_unit", "listed", "number", "on_row", "on_sheet", "on_sweep"]


def number(value: float, unit: str = "", digits: int = 4) -> str:
    """Return a number for a sentence, with its unit.

    Examples
    --------
    >>> number(0.00031234, "K"), number(1.5, "1")
    ('0.0003123 K', '1.5')
    """
    text = "no number" if math.isnan(value) else f"{value:.{digits}g}"
    return text if unit in ("", "1") else f"{text} {unit}"


def in_file_unit(table: SweepTable, name: str, value: float) -> str:
    """Return an SI value of a channel as the file writes it, with its unit."""
    channel = table.channels[name]
    unit = channel.unit or "1"
    factor = 1.0 if channel.quantity == "instant" else unit_factor(unit, channel.quantity)
    return number(value / factor, unit)


def listed(names: list[str], most: int = 8) -> str:
    """Return names with commas; the rest is counted."""
    shown = ", ".join(names[:most])
    return shown if len(names) <= most else f"{shown} and {len(names) - most} more"


def on_sheet(
    reading: Reading,
    code: str,
    severity: Severity,
    what: str,
    *path: str | int,
    place: str | None = None,
    found: str | None = None,
    expected: str | None = None,
    remedy: str | None = None,
) -> Finding:
    """Return a finding about a key path of the sheet."""
    return Finding(
        code=code,
        severity=severity,
        what=what,
        file=reading.sheet_reading.file,
        line=reading.line(*path),
        field=spelled(path) or None,
        place=place,
        found=found,
        expected=expected,
        remedy=remedy,
    )


def on_sweep(
    reading: Reading,
    table: SweepTable,
    code: str,
    severity: Severity,
    what: str,
    *,
    channel: str | None = None,
    key: str | None = None,
    found: str | None = None,
    expected: str | None = None,
    remedy: str | None = None,
) -> Finding:
    """Return a finding about a sweep, or one of its channels, at its line of the sheet."""
    path: tuple[str | int, ...] = ("sweep", table.number)
    if channel is not None:
        shared = channel not in table.sweep.channels and table.sweep.layout is not None
        path = (
            ("layout", str(table.sweep.layout), "channels", channel)
            if shared
            else (*path, "channels", channel)
        )
    elif key is not None:
        path += (key,)
    place = table.name if channel is None else f"{table.name}#{channel}"
    return on_sheet(
        reading, code, severity, what, *path, place=place, found=found, expected=expected, remedy=remedy
    )


def on_row(
    table: SweepTable,
    code: str,
    severity: Severity,
    what: str,
    row: int,
    *,
    channel: str | None = None,
    found: str | None = None,
    expected: str | None = None,
    remedy: str | None = None,
) -> Finding:
    """Return a finding about a kept row of data, at its file and line."""
    file, line = table.where(row)
    return Finding(
        code=code,
        severity=severity,
        what=what,
        file=file,
        line=line,
        column=None if channel is None else str(table.channels[channel].column),
        place=table.name if channel is None else f"{table.name}#{channel}",
        found=found,
        expected=expected,
        remedy=remedy,
    )

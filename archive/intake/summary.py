"""What search needs to know of each sweep, gathered once at ingest and sealed with it."""

from __future__ import annotations

import math
from datetime import UTC, datetime

import numpy as np

from archive.intake.reading import Reading, SweepTable
from archive.reduction.record_kinds import record_entry
from schemas.lineage import ChannelEntry, RecordEntry, SweepEntry, Value
from schemas.sweep import Channel, Sweep
from schemas.units import ucum

__all__ = ["record_entries", "sweep_entries"]


def record_entries(reading: Reading) -> tuple[RecordEntry, ...]:
    """Every record that holds in this accession, in order of address."""
    return tuple(record_entry(record) for _, record in sorted(reading.records.items()))


def sweep_entries(reading: Reading) -> tuple[SweepEntry, ...]:
    """One entry per sweep that was read, in the order of the sheet."""
    return tuple(
        _entry(reading, reading.tables[sweep.name])
        for sweep in reading.sheet.sweep
        if sweep.name in reading.tables
    )


def _entry(reading: Reading, table: SweepTable) -> SweepEntry:
    sweep = table.sweep
    cell, substrate = reading.cell_of(sweep), reading.substrate_of(sweep)
    sample = reading.record(sweep.sample or reading.sheet.sample)
    begin, end = _span(table)
    low, high, scale = _temperatures(reading, table)
    amount, coverage = _held(reading, sweep)
    thermometers = {
        record.address
        for channel in table.channels.values()
        if channel.use and (record := reading.thermometer_of(channel)) is not None
    }
    return SweepEntry(
        name=sweep.name,
        kind=sweep.kind,
        files=sweep.files,
        rows=table.rows,
        first_lines=table.first_lines,
        channels=tuple(_channel(reading, table, name, channel) for name, channel in table.channels.items()),
        cell=None if cell is None else cell.address,
        substrate=None if substrate is None else substrate.address,
        sample=None if sample is None else sample.address,
        empty_cell=sweep.empty_cell,
        after_dose=sweep.after_dose,
        doses=sweep.doses,
        thermometers=tuple(sorted(thermometers)),
        begin=begin,
        end=end,
        direction=sweep.direction,
        temperature_low=None if low is None else Value(value=low, unit="K", scale=scale),
        temperature_high=None if high is None else Value(value=high, unit="K", scale=scale),
        amount=amount,
        coverage=coverage,
    )


def _channel(reading: Reading, table: SweepTable, name: str, channel: Channel) -> ChannelEntry:
    facts = table.facts[name]
    thermometer, calibration = reading.thermometer_of(channel), reading.calibration_of(channel)
    unit = "s" if channel.quantity == "instant" else (channel.unit or "1")
    return ChannelEntry(
        name=name,
        quantity=channel.quantity,
        unit=unit,
        ucum=ucum(unit),
        description=channel.description,
        scale=channel.scale,
        thermometer=None if thermometer is None else thermometer.address,
        calibration=None if calibration is None else calibration.address,
        low=None if math.isnan(facts.low) else facts.low,
        high=None if math.isnan(facts.high) else facts.high,
        missing=facts.missing,
        use=channel.use,
        digest=facts.digest,
    )


def _span(table: SweepTable) -> tuple[datetime | None, datetime | None]:
    """First and last time of a sweep, from statistics over all its rows."""
    name = table.of_kind("instant")
    if name is None or math.isnan(table.facts[name].low):
        return None, None
    facts = table.facts[name]
    return datetime.fromtimestamp(facts.low, UTC), datetime.fromtimestamp(facts.high, UTC)


def _temperatures(reading: Reading, table: SweepTable) -> tuple[float | None, float | None, str | None]:
    if table.temperature is not None and np.isfinite(table.temperature).any():
        return float(np.nanmin(table.temperature)), float(np.nanmax(table.temperature)), table.scale
    bath = table.sweep.bath_temperature
    if bath is not None:
        return bath.si, bath.si, bath.scale or reading.sheet.temperature_scale
    return None, None, None


def _held(reading: Reading, sweep: Sweep) -> tuple[Value | None, Value | None]:
    """Helium amount and coverage during a sweep, from the ledger line of its last dose."""
    if sweep.gas != "helium":
        return None, None
    if sweep.empty_cell:
        return Value(value=0.0, unit="mol"), Value(value=0.0, unit="mol/m^2")
    entry = next((entry for entry in reading.ledger if entry.name == sweep.after_dose), None)
    return (None, None) if entry is None else (entry.running_amount, entry.running_coverage)

"""From a folder as read to all that can be said of it: temperatures, gas ledger, checks, waivers, cautions."""

from __future__ import annotations

import json
from typing import Any

import numpy as np

from archive.errors import BadRequest
from archive.intake.cautions import cautions
from archive.intake.checks import run_checks
from archive.intake.checks.check import History
from archive.intake.folder import SHEET_NAME
from archive.intake.reading import Reading, SweepTable
from archive.intake.thresholds import Thresholds
from archive.intake.waivers import apply_waivers
from archive.reduction.calibration_sources import temperature_contributions
from archive.reduction.ledger import gas_ledger
from archive.reduction.thermometry_steps import calibrated_temperature
from schemas.finding import Finding
from schemas.quantity import unit_factor
from schemas.substrate import Sample, Substrate
from schemas.sweep import Channel

__all__ = ["add_ledger", "add_temperatures", "examined"]


def examined(
    reading: Reading, thresholds: Thresholds, *, earlier: History | None = None
) -> tuple[tuple[Finding, ...], tuple[dict[str, Any], ...]]:
    """All findings on a reading, sorted, with waivers applied, and its cautions as plain data.

    Parameters
    ----------
    reading : Reading
        With a valid sheet; temperatures and ledger are added to it.
    thresholds : Thresholds
        Limits of the checks.
    earlier : History, optional
        What the archive knows of earlier cooldowns.
    """
    for table in reading.tables.values():
        add_temperatures(reading, table)
    add_ledger(reading)
    findings = [*reading.findings, *run_checks(reading, thresholds, earlier=earlier)]
    findings = apply_waivers(
        findings, reading.sheet.waiver, file=SHEET_NAME, line_of=lambda number: reading.line("waiver", number)
    )
    reading.findings[:] = sorted(findings, key=lambda finding: finding.order)
    plain = tuple(json.loads(each.model_dump_json(exclude_none=True)) for each in cautions(reading))
    return tuple(reading.findings), plain


def _counting_channel(table: SweepTable) -> str | None:
    """Channel whose temperature counts: the one the sheet names, else the only one that can be a temperature."""
    named = table.sweep.thermometer
    if named is not None:
        return named if named in table.columns else None
    able = [
        name
        for name, channel in table.channels.items()
        if channel.use and (channel.quantity == "temperature" or channel.thermometer or channel.calibration)
    ]
    return able[0] if len(able) == 1 else None


def add_temperatures(reading: Reading, table: SweepTable) -> None:
    """Temperature of the counting thermometer, from the reading and its calibration, where there is one."""
    name = _counting_channel(table)
    if name is None:
        return
    channel = table.channels[name]
    if channel.quantity == "temperature":
        table.temperature, table.scale = table.columns[name], channel.scale
        return
    calibration = reading.calibration_of(channel)
    if calibration is None:
        return
    try:
        factor = unit_factor(calibration.reading_unit, channel.quantity)
        values = np.asarray(table.columns[name] / factor, dtype=np.float64)
        table.temperature = calibrated_temperature(calibration, values, factor)
    except (ValueError, BadRequest) as error:
        _cannot(reading, table, name, channel, str(error))
        return
    table.scale, table.calibration = calibration.scale, calibration
    table.outside_calibration = np.isnan(table.temperature) & np.isfinite(table.columns[name])
    square = np.zeros(len(values))
    for _, part in temperature_contributions(calibration, values, table.temperature):
        square += part**2
    table.temperature_uncertainty = np.sqrt(square)


def _cannot(reading: Reading, table: SweepTable, name: str, channel: Channel, why: str) -> None:
    reading.findings.append(
        Finding(
            code="no-temperature",
            severity="error",
            what=f"the readings of {channel.thermometer or name} cannot be made temperatures: {why}",
            file=SHEET_NAME,
            line=reading.line("sweep", table.number),
            place=f"{table.name}#{name}",
            remedy="correct the channel's quantity and unit, or the calibration",
        )
    )


def add_ledger(reading: Reading) -> None:
    """Running amount and coverage after each dose."""
    sheet = reading.sheet
    if not sheet.dose:
        return
    sample = reading.record(sheet.sample)
    cell = reading.record(sheet.cell)
    substrate = reading.record(getattr(cell, "substrate", None))
    area = substrate.area if isinstance(substrate, Substrate) else None
    try:
        ledger = gas_ledger(sheet, sample=sample if isinstance(sample, Sample) else None, area=area)
    except (ValueError, BadRequest) as error:
        reading.findings.append(
            Finding(
                code="dose-amount",
                severity="error",
                what=f"the doses cannot be added up: {error}",
                file=SHEET_NAME,
                line=reading.line("dose", 0),
                remedy="complete the dose, its gauge or its doser",
            )
        )
        return
    reading.ledger[:] = ledger.entries

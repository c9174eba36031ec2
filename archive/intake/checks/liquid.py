"""Bulk liquid under pressure: what the sheet states of it, the gauge, and the rating of the cell."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from archive.intake.checks.rows import counting, tables
from archive.intake.checks.telling import number, on_sweep
from archive.intake.reading import Reading
from archive.intake.thresholds import Thresholds
from archive.physics.helium_liquid import density
from archive.physics.lambda_line import LAMBDA_PRESSURE, coarse_lambda_temperature
from schemas.finding import Finding

__all__ = ["liquid_above_rating", "liquid_state"]

ATMOSPHERE = 101325.0
"""Pa; the outside of a cell is a vacuum in the cold, and air when it is tested, so a gauge rating counts from here at most."""


def liquid_state(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find a stated liquid that cannot be, or that its own gauge contradicts."""
    for table in tables(reading):
        liquid = table.sweep.liquid
        if liquid is None:
            continue
        p = liquid.pressure.si
        try:
            coarse_lambda_temperature(p)
        except ValueError:
            yield on_sweep(
                reading, table, "liquid-state", "warning", f"the liquid of {table.name} is said to be where there is no lambda point", key="liquid",
                found=liquid.pressure.text, expected=f"above {LAMBDA_PRESSURE / 1e3:.4g} kPa and at most 3.003 MPa, absolute",
                remedy="correct the pressure; leave liquid out where it is at its own vapour pressure",
            )  # fmt: skip
            continue
        least = float(density(2.1768))
        if liquid.density.si <= least:
            yield on_sweep(
                reading, table, "liquid-state", "warning", f"the density of the liquid of {table.name} is not above that of saturated liquid", key="liquid",
                found=liquid.density.text, expected=f"more than {number(least, 'kg/m^3')}, that of saturated liquid at its lambda point",
                remedy="correct the density or its unit",
            )  # fmt: skip
        for name, channel in table.channels.items():
            if channel.quantity != "pressure" or not channel.use or channel.convention == "gauge":
                continue
            values = table.columns[name][counting(table)]
            if not np.isfinite(values).any():
                continue
            middle = float(np.nanmedian(values))
            if abs(middle - p) > thresholds.liquid_pressure_fraction * p:
                yield on_sweep(
                    reading, table, "liquid-state", "warning", f"channel {name} of {table.name} reads another pressure than is stated of the liquid", channel=name,
                    found=number(middle, "Pa"), expected=f"{liquid.pressure.text} within {100 * thresholds.liquid_pressure_fraction:.3g} per cent (liquid_pressure_fraction)",
                    remedy="correct the stated pressure, the unit or convention of the channel, or waive it with the reason",
                )  # fmt: skip


def liquid_above_rating(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find liquid that was pressed beyond the recorded rating of its cell."""
    for table in tables(reading):
        liquid, cell = table.sweep.liquid, reading.cell_of(table.sweep)
        rated = getattr(cell, "rated_pressure", None)
        if liquid is None or rated is None:
            continue
        limit = rated.si + (ATMOSPHERE if rated.convention == "gauge" else 0.0)
        if liquid.pressure.si > limit:
            yield on_sweep(
                reading, table, "liquid-above-rating", "warning", f"the liquid of {table.name} was pressed beyond the rating of its cell", key="liquid",
                found=liquid.pressure.text, expected=f"at most {rated.text}",
                remedy="correct the pressure or the record of the rating; if both are right, do not use the cell again before it was examined as local codes and licensed practice ask",
            )  # fmt: skip

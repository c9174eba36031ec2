"""Isotherms: order of the pressures, points where they are wanted, and whether a monolayer can be found."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from archive.intake.checks.film import film_pressure, saturation_pressure
from archive.intake.checks.rows import counting, tables, temperature
from archive.intake.checks.telling import listed, on_row, on_sweep
from archive.intake.reading import Reading, SweepTable
from archive.intake.thresholds import Thresholds
from archive.physics.adsorption import bet_area
from archive.physics.helium_vapour import saturated_vapour_pressure
from schemas.finding import Finding
from schemas.quantity import Quantity
from schemas.substrate import Sample

__all__ = ["bet_criteria", "isotherm_order", "isotherm_points", "relative_pressure"]


def relative_pressure(reading: Reading, table: SweepTable) -> tuple[str, np.ndarray] | None:
    """Return channel and p/p0 of an isotherm: as recorded, over a recorded or stated saturation pressure, or over that of 4He."""
    name = table.of_kind("relative_pressure") or table.of_kind("pressure_ratio")
    if name is not None:
        return name, np.where(counting(table), table.columns[name], np.nan)
    name = film_pressure(table)
    if name is None:
        return None
    p = np.where(counting(table), table.columns[name], np.nan)
    for correction in table.sweep.corrections:
        if correction.channel == name and correction.correct == "zero":
            p = p - _zero(correction.value)
    saturated = saturation_pressure(table)
    if saturated is not None:
        p0 = table.columns[saturated]
        return name, np.asarray(p / np.where(p0 > 0, p0, np.nan))
    if table.sweep.saturated_pressure is not None:
        return name, np.asarray(p / table.sweep.saturated_pressure.si)
    sample, T = reading.record(table.sweep.sample or reading.sheet.sample), temperature(reading, table)
    helium = table.sweep.gas == "helium" and isinstance(sample, Sample) and sample.isotope == "4He"
    if (
        not helium
        or T is None
        or not np.isfinite(T).any()
        or not 0.5 <= np.nanmin(T) <= np.nanmax(T) <= 4.2221
    ):
        return None
    return name, p / np.asarray(saturated_vapour_pressure(T))


def _zero(text: str) -> float:
    try:
        return Quantity.parse(text, "pressure").si
    except ValueError:
        return 0.0


def isotherm_order(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find adsorption isotherms whose pressure falls, and p/p0 above one."""
    for table in tables(reading, "isotherm"):
        found = relative_pressure(reading, table)
        if found is None:
            continue
        name, x = found
        rows = np.flatnonzero(np.isfinite(x))
        falls = np.flatnonzero(np.diff(x[rows]) < 0)
        above = rows[x[rows] > 1.02]
        if len(above):
            yield on_row(
                table,
                "isotherm-order",
                "warning",
                f"p/p0 of {table.name} reaches {float(x[above[0]]):.4g}",
                int(above[0]),
                channel=name,
                expected="at most 1",
                remedy="look at the saturation pressure and the temperature of the bath",
            )
        if len(falls) and table.sweep.direction in ("none", "up", "hold"):
            row = int(rows[falls[0] + 1])
            yield on_row(
                table,
                "isotherm-order",
                "warning",
                f"p/p0 of {table.name} falls at {len(falls)} place(s)",
                row,
                channel=name,
                found=f"{float(x[rows[falls[0]]]):.6g}, then {float(x[row]):.6g}",
                expected="pressures that do not fall",
                remedy='leave the desorption branch out or say direction = "both"; look whether equilibrium was waited for',
            )


def isotherm_points(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find isotherms with too few points where a monolayer is looked for."""
    for table in tables(reading, "isotherm"):
        found = relative_pressure(reading, table)
        if found is None:
            continue
        inside = int(np.sum((found[1] >= thresholds.bet_low) & (found[1] <= thresholds.bet_high)))
        if inside < thresholds.bet_points:
            yield on_sweep(
                reading,
                table,
                "isotherm-points",
                "warning",
                f"{table.name} has {inside} point(s) of p/p0 from {thresholds.bet_low:g} to {thresholds.bet_high:g}",
                expected=f"at least {thresholds.bet_points} (bet_low, bet_high, bet_points)",
                remedy="an area needs points there; waive it if no area is wanted of this isotherm",
            )


def bet_criteria(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find isotherms in which no range meets the criteria of a monolayer."""
    for table in tables(reading, "isotherm"):
        found = relative_pressure(reading, table)
        amount = next(
            (
                v
                for kind in ("specific_amount", "amount", "coverage")
                if (v := table.values(kind)) is not None
            ),
            None,
        )
        if found is None or amount is None or len(amount) > 2000:
            continue
        x = found[1]
        rows = np.isfinite(x) & np.isfinite(amount) & (amount > 0) & (x > 0) & (x < 1)
        inside = int(np.sum(rows & (x >= thresholds.bet_low) & (x <= thresholds.bet_high)))
        if inside < thresholds.bet_points or (np.diff(x[rows]) < 0).any():
            continue  # told of by the checks of points and order
        # The cross-section only scales the area, and no criterion depends on it.
        result = bet_area(x[rows], amount[rows], cross_section=1e-19)
        if not result.accepted:
            yield on_sweep(
                reading,
                table,
                "bet-criteria",
                "warning",
                f"no range of {table.name} meets the criteria for a monolayer",
                found=listed(list(result.reasons)),
                expected="positive constant, n(1 - x) rising, the monolayer inside the range",
                remedy="take the area from elsewhere, or waive it with the reason",
            )

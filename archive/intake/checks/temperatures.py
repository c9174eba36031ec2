"""Temperatures: calibration range, scale, thermal lag, drift, and what the cold does to a rod."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from archive.intake.checks.curves import Curve, curve_of, drop_width, lag
from archive.intake.checks.rows import counting, ring_time_s, tables, temperature
from archive.intake.checks.telling import listed, number, on_row, on_sweep
from archive.intake.reading import Reading, SweepTable
from archive.intake.thresholds import Thresholds
from archive.physics.constants import T_LAMBDA
from archive.physics.lambda_line import COARSE_UNCERTAINTY, coarse_lambda_temperature
from schemas.cell import TorsionalOscillator
from schemas.finding import Finding

__all__ = [
    "drift_rate",
    "lambda_temperature",
    "near_calibration_end",
    "outside_calibration",
    "rod_below_200_mk",
    "scales_mixed",
    "thermal_lag",
    "thermometer_missing",
]


def outside_calibration(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find readings outside the calibration of their thermometer."""
    for table in tables(reading):
        if table.outside_calibration is None or table.calibration is None:
            continue
        rows = np.flatnonzero(table.outside_calibration & counting(table))
        if len(rows) == 0:
            continue
        calibration = table.calibration
        yield on_row(
            table,
            "temperature-outside-calibration",
            # A log runs from room temperature to base; nobody reduces all of it.
            "warning" if table.sweep.kind == "log" else "error",
            f"{len(rows)} reading(s) of {table.name} lie outside calibration {calibration.address}",
            int(rows[0]),
            channel=table.sweep.thermometer,
            expected=f"{calibration.temperature_low.text} to {calibration.temperature_high.text}",
            remedy="leave the rows out with the reason, or name a calibration that reaches there; nothing is extrapolated",
        )


def near_calibration_end(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find temperatures close to an end of the calibration."""
    for table in tables(reading):
        if table.temperature is None or table.calibration is None:
            continue
        T = np.where(counting(table), table.temperature, np.nan)
        low, high = table.calibration.temperature_low.si, table.calibration.temperature_high.si
        share = thresholds.calibration_end_fraction
        hit = np.flatnonzero(
            ((low <= T) & (low * (1 + share) > T)) | ((high * (1 - share) < T) & (high >= T))
        )
        if len(hit):
            yield on_row(
                table,
                "temperature-near-calibration-end",
                "warning",
                f"{len(hit)} reading(s) of {table.name} lie within {100 * share:g} per cent of an end of {table.calibration.address}",
                int(hit[0]),
                channel=table.sweep.thermometer,
                found=number(float(T[hit[0]]), "K"),
                expected=f"{low * (1 + share):.4g} to {high * (1 - share):.4g} K (calibration_end_fraction)",
                remedy="a fit is least certain at its ends: compare with another thermometer, or waive it with the reason",
            )


def scales_mixed(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find sweeps whose temperature scale is not that of the sheet."""
    by_scale: dict[str, list[SweepTable]] = {}
    for table in tables(reading):
        name = table.of_kind("temperature")
        scale = table.scale or (table.channels[name].scale if name is not None else None)
        if (
            scale is not None
            and table.sweep.gas == "helium"
            and table.sweep.kind not in ("log", "calibration")
        ):
            by_scale.setdefault(scale, []).append(table)
    if len(by_scale) < 2:
        return
    for scale, found in by_scale.items():
        if scale != reading.sheet.temperature_scale:
            yield on_sweep(
                reading,
                found[0],
                "scales-mixed",
                "warning",
                f"the temperatures of {listed([table.name for table in found])} are on {scale}, others of this cooldown on "
                + ", ".join(each for each in by_scale if each != scale),
                key="thermometer",
                expected=f"one scale, such as {reading.sheet.temperature_scale}",
                remedy="convert when they are compared, or waive it with the reason",
            )


def thermometer_missing(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find sweeps in temperature without a thermometer, and thermometers without a calibration."""
    for table in tables(reading):
        name = table.sweep.thermometer
        channel = table.channels.get(name) if name is not None else None
        if (
            channel is not None
            and channel.quantity != "temperature"
            and reading.calibration_of(channel) is None
        ):
            yield on_sweep(
                reading,
                table,
                "thermometer-missing",
                "warning",
                f"channel {name} of {table.name} is a {channel.quantity.replace('_', ' ')} without a calibration",
                channel=name,
                remedy="name its thermometer and calibration; without them the sweep has no temperature",
            )
        elif (
            table.sweep.kind in ("temperature-sweep", "heat-capacity", "dose-run")
            and channel is None
            and table.temperature is None
            and temperature(reading, table) is None
        ):
            yield on_sweep(
                reading,
                table,
                "thermometer-missing",
                "warning",
                f"{table.name} does not say which channel is its thermometer",
                key="thermometer",
                remedy="name the channel whose temperature counts, or state bath_temperature",
            )


def lambda_temperature(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find a lambda point of the bulk that does not lie at its temperature."""
    for table in tables(reading, "heat-capacity"):
        heat = next(
            (
                v
                for k in ("heat_capacity", "molar_heat_capacity", "specific_heat")
                if (v := table.values(k)) is not None
            ),
            None,
        )
        T = temperature(reading, table)
        if heat is None or T is None:
            continue
        heat = np.where(counting(table) & np.isfinite(T), heat, np.nan)
        if np.isfinite(heat).sum() < 5:
            continue
        row = int(np.nanargmax(heat))
        at, least, where = _lambda_point(table, thresholds)
        away = float(T[row]) - at
        spacing = float(np.median(np.abs(np.diff(np.sort(T[np.isfinite(heat)])))))
        limit = max(least, spacing)
        # Farther away the largest value is another feature, or the peak was not reached.
        if limit < abs(away) < 0.05 and 0 < row < len(heat) - 1:
            yield on_row(
                table,
                "lambda-temperature",
                "warning",
                f"the peak of the heat capacity in {table.name} lies {number(1e3 * away, 'mK', 3)} from T_lambda",
                row,
                found=number(float(T[row]), "K", 6),
                expected=f"{at:.6g} K within {number(1e3 * limit, 'mK', 2)}, {where}",
                remedy="look at the scale and the calibration; state the liquid of a sweep under pressure; in pores waive it with the reason",
            )


def _lambda_point(table: SweepTable, thresholds: Thresholds) -> tuple[float, float, str]:
    """Return where the lambda point is expected (K), how well that is known (K), and why there."""
    saturated = T_LAMBDA, thresholds.lambda_temperature_k, "on ITS-90 (lambda_temperature_k), in bulk at saturated vapour pressure"  # fmt: skip
    if table.sweep.liquid is None:
        return saturated
    try:
        coarse = float(coarse_lambda_temperature(table.sweep.liquid.pressure.si))
    except ValueError:  # told of by the check of the liquid's state
        return saturated
    return coarse, max(COARSE_UNCERTAINTY, thresholds.lambda_temperature_k), "as the coarse lambda line has it at the stated pressure"  # fmt: skip


def rod_below_200_mk(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find readings with a beryllium copper rod so cold that it may be nonlinear, where no drive sweep shows otherwise."""
    limit = thresholds.rod_temperature_k
    probed = {
        _state(reading, table)
        for table in tables(reading, "drive-sweep")
        if (T := temperature(reading, table)) is not None
        and np.isfinite(T).any()
        and float(np.nanmin(T)) < limit
    }
    for table in tables(reading, "temperature-sweep", "dose-run"):
        cell, T = reading.cell_of(table.sweep), temperature(reading, table)
        if not isinstance(cell, TorsionalOscillator) or cell.rod_material != "BeCu" or T is None:
            continue
        T = np.where(counting(table), T, np.nan)
        if not np.isfinite(T).any() or float(np.nanmin(T)) >= limit or _state(reading, table) in probed:
            continue
        yield on_sweep(
            reading,
            table,
            "rod-below-200-mk",
            "warning",
            f"{table.name} goes to {number(float(np.nanmin(T)), 'K', 3)} with a rod of beryllium copper, and no drive sweep in the same state goes below {limit:g} K",
            expected=f"a drive sweep there, or T above {limit:g} K (rod_temperature_k)",
            remedy="show by a drive sweep that the period does not depend on the drive, or waive it with the reason",
        )


def _state(reading: Reading, table: SweepTable) -> tuple[str | None, str | None, bool]:
    return reading.sheet.cell_of(table.sweep), table.sweep.after_dose, table.sweep.empty_cell


def thermal_lag(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find sharp features that lie at different temperatures in sweeps up and down."""
    curves: dict[tuple[str | None, str | None, bool], dict[str, Curve]] = {}
    for table in tables(reading, "temperature-sweep"):
        for direction in _directions(table):
            curve = curve_of(reading, table, "period", direction=direction)
            if curve is not None:
                curves.setdefault(_state(reading, table), {}).setdefault(direction, curve)
    for (_, _, empty), both in curves.items():
        if empty or set(both) != {"up", "down"}:
            continue
        found = lag(both["up"], both["down"])
        if found is None:
            continue
        offset, at = found
        limit = max(thresholds.thermal_lag_k, thresholds.thermal_lag_fraction * at)
        if abs(offset) > limit:
            beyond = abs(offset) > thresholds.thermal_lag_error_factor * limit
            yield on_sweep(
                reading,
                both["down"].table,
                "thermal-lag",
                "error" if beyond else "warning",
                f"the drop near {number(at, 'K', 3)} lies {number(1e3 * abs(offset), 'mK', 3)} apart in {both['up'].table.name} (up) and {both['down'].table.name} (down)",
                expected=f"at most {number(1e3 * limit, 'mK', 3)} (thermal_lag_k, thermal_lag_fraction; error beyond {thresholds.thermal_lag_error_factor:g} times)",
                remedy="sweep more slowly, or leave the faster one out with the reason",
            )


def _directions(table: SweepTable) -> tuple[str, ...]:
    return {"up": ("up",), "down": ("down",), "both": ("up", "down")}.get(table.sweep.direction, ())


def drift_rate(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find sweeps so fast that the amplitude remembers the temperature before."""
    for table in tables(reading, "temperature-sweep"):
        tau, time, T = ring_time_s(reading, table), table.time, temperature(reading, table)
        curve = curve_of(reading, table, "period")
        if tau is None or time is None or T is None or curve is None or table.sweep.empty_cell:
            continue
        width = drop_width(curve)
        rows = counting(table) & np.isfinite(T) & np.isfinite(time)
        steps = np.diff(time[rows])
        if width is None or len(steps) < 4 or not (steps > 0).any():
            continue
        rate = float(np.median(np.abs(np.diff(T[rows])[steps > 0] / steps[steps > 0])))
        if rate * tau > thresholds.drift_width_fraction * width:
            yield on_sweep(
                reading,
                table,
                "drift-rate",
                "warning",
                f"T of {table.name} changes by {number(1e3 * rate * tau, 'mK', 3)} within a ring time of {number(tau, 's', 3)}",
                found=number(1e3 * rate, "mK/s", 3),
                expected=f"at most {thresholds.drift_width_fraction:g} of the width {number(1e3 * width, 'mK', 3)} of its drop (drift_width_fraction)",
                remedy="correct the amplitude for the finite ring time, or waive it with the reason",
            )

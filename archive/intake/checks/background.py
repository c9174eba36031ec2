"""The empty cell behind a film, and the period's own continuity: span, repetition, jumps, sign of the drop."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from archive.intake.checks.curves import Curve, curve_of
from archive.intake.checks.rows import counting, sigma, tables, temperature
from archive.intake.checks.telling import in_file_unit, listed, number, on_row, on_sweep
from archive.intake.reading import Reading, SweepTable
from archive.intake.thresholds import Thresholds
from schemas.cell import TorsionalOscillator
from schemas.finding import Finding

__all__ = [
    "background_drift",
    "background_missing",
    "background_span",
    "dissipation_sign",
    "drop_sign",
    "period_jump",
]

_NEIGHBOURS = 3


def _oscillator_sweeps(reading: Reading, *, empty: bool) -> list[SweepTable]:
    return [
        table
        for table in tables(reading, "temperature-sweep")
        if table.sweep.empty_cell is empty
        and table.sweep.gas == "helium"
        and table.of_kind("period") is not None
        and isinstance(reading.cell_of(table.sweep), TorsionalOscillator)
    ]


def _empty_of(reading: Reading, table: SweepTable) -> list[SweepTable]:
    cell = reading.sheet.cell_of(table.sweep)
    return [
        each for each in _oscillator_sweeps(reading, empty=True) if reading.sheet.cell_of(each.sweep) == cell
    ]


def background_missing(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find cells with films and without a temperature sweep of the empty cell."""
    lonely: dict[str | None, list[SweepTable]] = {}
    for table in _oscillator_sweeps(reading, empty=False):
        if not _empty_of(reading, table):
            lonely.setdefault(reading.sheet.cell_of(table.sweep), []).append(table)
    for cell, found in lonely.items():
        yield on_sweep(
            reading,
            found[0],
            "background-missing",
            "warning",
            f"there is no temperature sweep of {cell} empty in this cooldown, and {listed([each.name for each in found])} need its background",
            remedy="add the empty-cell sweep, or waive it naming the cooldown whose background is to serve",
        )


def background_span(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find temperatures of a film that no empty-cell run reached."""
    for table in _oscillator_sweeps(reading, empty=False):
        spans = [_span(reading, each) for each in _empty_of(reading, table)]
        known = [span for span in spans if span is not None]
        T = temperature(reading, table)
        if not known or T is None:
            continue
        low, high = min(span[0] for span in known), max(span[1] for span in known)
        T = np.where(counting(table), T, np.nan)
        outside = np.flatnonzero((low > T) | (high < T))
        if len(outside):
            yield on_row(
                table,
                "background-span",
                "warning",
                f"{len(outside)} of {int(np.isfinite(T).sum())} readings of {table.name} lie outside the empty-cell runs",
                int(outside[0]),
                found=number(float(T[outside[0]]), "K"),
                expected=f"{low:.4g} to {high:.4g} K",
                remedy="they will be flagged, since a background is never extrapolated; leave them out, or waive it with the reason",
            )


def _span(reading: Reading, table: SweepTable) -> tuple[float, float] | None:
    T = temperature(reading, table)
    if T is None:
        return None
    T = np.where(counting(table), T, np.nan)
    return (float(np.nanmin(T)), float(np.nanmax(T))) if np.isfinite(T).any() else None


def background_drift(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find two empty-cell runs of one cell that differ."""
    runs: dict[str | None, list[SweepTable]] = {}
    for table in _oscillator_sweeps(reading, empty=True):
        runs.setdefault(reading.sheet.cell_of(table.sweep), []).append(table)
    for cell, found in runs.items():
        first = curve_of(reading, found[0], "period")
        drop = _largest_drop(reading, cell)
        for table in found[1:]:
            second = curve_of(reading, table, "period")
            apart = None if first is None or second is None else _apart(first, second)
            if apart is None or first is None or second is None:
                continue
            limit = max(
                thresholds.background_sigma * float(np.hypot(_row_sigma(found[0]), _row_sigma(table))),
                0.0 if drop is None else thresholds.background_fraction * drop,
            )
            if apart > limit:
                yield on_sweep(
                    reading,
                    table,
                    "background-drift",
                    "warning",
                    f"the empty-cell runs {found[0].name} and {table.name} differ by up to {number(apart * 1e9, 'ns', 3)}",
                    expected=f"at most {number(limit * 1e9, 'ns', 3)} (background_sigma, background_fraction)",
                    remedy="align each film to the run taken after the same handling, or waive it with the reason",
                )


def _row_sigma(table: SweepTable) -> float:
    name = table.of_kind("period")
    return 0.0 if name is None else sigma(table, name)


def _apart(first: Curve, second: Curve) -> float | None:
    inside = (first.temperature >= second.temperature[0]) & (first.temperature <= second.temperature[-1])
    if inside.sum() < 3:
        return None
    other = np.interp(first.temperature[inside], second.temperature, second.values)
    return float(np.max(np.abs(first.values[inside] - other)))


def _largest_drop(reading: Reading, cell: str | None) -> float | None:
    heights = [
        float(np.ptp(curve.values))
        for table in _oscillator_sweeps(reading, empty=False)
        if reading.sheet.cell_of(table.sweep) == cell
        and (curve := curve_of(reading, table, "period")) is not None
    ]
    return max(heights, default=None)


def period_jump(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find steps of the period that neither a dose, a drive nor the temperature explains."""
    for table in tables(reading, "temperature-sweep", "dose-run", "drive-sweep"):
        name, T = table.of_kind("period"), temperature(reading, table)
        if name is None or T is None or table.stride != 1:
            continue
        rows = np.flatnonzero(counting(table) & np.isfinite(table.columns[name]) & np.isfinite(T))
        for index in _jumps(table.columns[name][rows], T[rows], sigma(table, name), thresholds):
            before, after = int(rows[index]), int(rows[index + 1])
            if _explained(reading, table, before, after):
                continue
            step = float(table.columns[name][after] - table.columns[name][before])
            yield on_row(
                table,
                "period-jump",
                "error",
                f"the period of {table.name} steps by {number(step * 1e9, 'ns', 3)} between neighbouring rows and stays there",
                after,
                channel=name,
                expected=f"at most {thresholds.period_jump_sigma:g} sigma of {number(sigma(table, name) * 1e9, 'ns', 3)} without a dose (period_jump_sigma)",
                remedy="add a disturbance at that time with new_segment = true, so that what follows is not referred to what went before",
            )
            break  # what follows is another segment; the first step is enough to look


def _jumps(P: np.ndarray, T: np.ndarray, u: float, thresholds: Thresholds) -> list[int]:
    """Return indices after which the period steps, far beyond its neighbours' steps, and stays."""
    if len(P) < 2 * _NEIGHBOURS + 2 or not u > 0:
        return []
    steps = np.diff(P)
    size = np.abs(steps)
    padded = np.pad(size, _NEIGHBOURS, constant_values=0.0)
    shifts = [k for k in range(2 * _NEIGHBOURS + 1) if k != _NEIGHBOURS]
    near = np.max([padded[k : k + len(size)] for k in shifts], axis=0)
    # A steep drop of a film has steep neighbours; a slipped joint has none.
    candidates = np.flatnonzero(
        (size > thresholds.period_jump_sigma * u)
        & (size > 5 * near)
        & (np.abs(np.diff(T)) < thresholds.period_jump_temperature_k)
    )
    found = []
    for i in candidates.tolist():
        before, after = P[max(0, i - _NEIGHBOURS + 1) : i + 1], P[i + 1 : i + 1 + _NEIGHBOURS]
        if min(len(before), len(after)) < 2:
            continue
        if abs(float(np.median(after) - np.median(before))) > 0.7 * size[i]:
            found.append(i)
    return found


def _explained(reading: Reading, table: SweepTable, before: int, after: int) -> bool:
    drive = table.values("drive")
    if drive is not None and abs(drive[after] - drive[before]) > 0.01 * abs(drive[before]):
        return True
    time = table.time
    if time is None or not np.isfinite(time[[before, after]]).all():
        # A dose run without time stamps may step anywhere.
        return table.sweep.kind == "dose-run"
    stated = [dose.at.timestamp() for dose in reading.sheet.dose if dose.crossed_out is None]
    stated += [each.at.timestamp() for each in table.sweep.disturbances if each.new_segment]
    return any(time[before] <= at <= time[after] for at in stated)


def drop_sign(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find films whose period lies above that of the normal film: the drop has the wrong sign."""
    for table in _oscillator_sweeps(reading, empty=False):
        if reading.substrate_of(table.sweep) is None:  # bulk liquid, not a film
            continue
        empty = [
            curve
            for each in _empty_of(reading, table)
            if (curve := curve_of(reading, each, "period")) is not None
        ]
        film, name = curve_of(reading, table, "period"), table.of_kind("period")
        if not empty or film is None or name is None:
            continue
        background = empty[0]
        inside = (film.temperature >= background.temperature[0]) & (
            film.temperature <= background.temperature[-1]
        )
        if inside.sum() < 10:
            continue
        excess = film.values[inside] - np.interp(
            film.temperature[inside], background.temperature, background.values
        )
        # The film is normal, if anywhere, at the warm end; there the background is aligned.
        warm = max(5, len(excess) // 10)
        drop = float(np.median(excess[-warm:])) - excess
        # Film, background, and the median that aligns them (its variance is pi/2 that of a mean).
        spread = float(np.hypot(sigma(table, name), _row_sigma(background.table)))
        limit = thresholds.drop_sigma * spread * float(np.sqrt(1 + np.pi / 2 / warm))
        negative = float(np.mean(drop < -limit))
        if negative > thresholds.drop_points_fraction:
            depth = -float(drop.min())
            largest = _largest_drop(reading, reading.sheet.cell_of(table.sweep)) or 0.0
            # A small dip is a drift between the runs; a drop that is mostly negative has the wrong sign or unit.
            wrong = depth > max(float(drop.max()), 3 * limit, thresholds.background_fraction * largest)
            yield on_sweep(
                reading,
                table,
                "drop-sign",
                "error" if wrong else "warning",
                f"the drop of the period in {table.name} is negative in {100 * negative:.3g} per cent of its range, down to {number(-depth * 1e9, 'ns', 3)}",
                channel=name,
                expected=f"at least -{number(limit * 1e9, 'ns', 3)} in {100 * (1 - thresholds.drop_points_fraction):g} per cent (drop_sigma, drop_points_fraction)",
                remedy="look at the unit of the period, at which run is the empty one, and at drifts between the two",
            )


def dissipation_sign(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find dissipations, quality factors and periods that are not above zero."""
    for table in tables(reading):
        for name, channel in table.channels.items():
            if not channel.use or channel.quantity not in (
                "dissipation",
                "quality_factor",
                "period",
                "frequency",
            ):
                continue
            values = table.columns[name]
            rows = counting(table) & np.isfinite(values)
            u = sigma(table, name) if channel.quantity == "dissipation" else 0.0
            wrong = np.flatnonzero(rows & (values <= -thresholds.drop_sigma * (u if np.isfinite(u) else 0.0)))
            if len(wrong) == 0:
                continue
            share = len(wrong) / int(rows.sum())
            yield on_row(
                table,
                "not-positive",
                "error" if share > thresholds.drop_points_fraction else "warning",
                f"channel {name} of {table.name} is not above zero in {len(wrong)} row(s), {100 * share:.3g} per cent",
                int(wrong[0]),
                channel=name,
                found=in_file_unit(table, name, float(values[wrong[0]])),
                expected=f"above zero; error beyond {100 * thresholds.drop_points_fraction:g} per cent (drop_points_fraction)",
                remedy="look at sign convention and unit, or declare a sentinel",
            )

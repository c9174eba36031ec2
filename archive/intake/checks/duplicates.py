"""One record that stands twice: same bytes, same numbers at other rounding, same stretch of time."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import combinations

import numpy as np

from archive.intake.checks.check import History
from archive.intake.checks.rows import noise, tables, time_span
from archive.intake.checks.telling import on_sheet, on_sweep
from archive.intake.reading import Reading, SweepTable
from archive.intake.thresholds import Thresholds
from schemas.finding import Finding

__all__ = ["file_archived", "file_twice", "same_data", "time_overlap"]

_LEAST_ROWS = 5


def file_twice(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find two files of sweeps with the same bytes, and one file read as the same columns by two sweeps."""
    seen: dict[str, tuple[str, int, SweepTable | None]] = {}
    for number, sweep in enumerate(reading.sheet.sweep):
        for name in sweep.files:
            entry = reading.raw_files.get(name)
            table = reading.tables.get(sweep.name)
            if entry is None:
                continue
            first = seen.setdefault(entry.sha256, (name, number, table))
            if first[0] == name and (first[1] == number or not _same_columns(first[2], table)):
                if first[1] == number and sweep.files.count(name) > 1:
                    yield _twice(reading, number, f"{name} is named twice in {sweep.name}")
                    break
                continue
            other = reading.sheet.sweep[first[1]].name
            what = (
                f"{sweep.name} reads the same columns of {name} as {other}"
                if first[0] == name
                else f"{name} ({sweep.name}) holds the same bytes as {first[0]} ({other})"
            )
            yield _twice(reading, number, what)


def _twice(reading: Reading, number: int, what: str) -> Finding:
    return on_sheet(
        reading,
        "file-twice",
        "error",
        what,
        "sweep",
        number,
        "files",
        place=reading.sheet.sweep[number].name,
        remedy="keep one; data that stand twice count twice in a fit",
    )


def _same_columns(first: SweepTable | None, second: SweepTable | None) -> bool:
    if first is None or second is None or first.sweep.left_out or second.sweep.left_out:
        return False

    def columns(table: SweepTable) -> set[tuple[str | int, str]]:
        return {(each.column, each.quantity) for each in table.channels.values() if each.use}

    return columns(first) == columns(second)


def same_data(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find two sweeps from different files whose numbers agree within rounding."""
    limit = thresholds.same_data_fraction
    for first, second in combinations(tables(reading), 2):
        if (
            set(first.sweep.files) & set(second.sweep.files)
            or first.rows != second.rows
            or first.rows < _LEAST_ROWS
        ):
            continue
        if first.stride != second.stride or _digests(reading, first) & _digests(reading, second):
            continue  # the same bytes are told of as such
        # A few rows tell most pairs apart, and a long record is compared in full only then.
        few = _largest_difference(
            first, second, slice(0, None, max(1, len(first.lines) // 64)), fraction=limit
        )
        if few is not None and few >= limit:
            continue
        largest = _largest_difference(first, second, slice(None), fraction=limit)
        if largest is not None and largest < limit:
            yield on_sweep(
                reading,
                second,
                "same-data",
                "warning",
                f"all {second.rows} rows of {second.name} equal those of {first.name} within a fraction {max(largest, 1e-16):.1e}",
                key="files",
                expected=f"a difference of more than {limit:g} (same_data_fraction)",
                remedy="they are one data set at different rounding: keep the one with more digits, the other under other_files",
            )


def _digests(reading: Reading, table: SweepTable) -> set[str]:
    return {entry.sha256 for name in table.sweep.files if (entry := reading.raw_files.get(name)) is not None}


def _largest_difference(
    first: SweepTable, second: SweepTable, rows: slice, *, fraction: float
) -> float | None:
    """Largest difference of the columns of like kind over the largest value of each; None if they are not alike."""
    left, right = _by_quantity(first), _by_quantity(second)
    if not left or [quantity for quantity, _ in left] != [quantity for quantity, _ in right]:
        return None
    largest, moving = 0.0, False
    for (_, all_a), (_, all_b) in zip(left, right, strict=True):
        a, b = all_a[rows], all_b[rows]
        if not np.array_equal(np.isfinite(a), np.isfinite(b)):
            return None
        known = np.isfinite(a)
        if not known.any():
            continue
        # Relative to each value; a value of zero must be zero in both.
        size = np.maximum(np.abs(a[known]), np.abs(b[known]))
        size[size == 0] = 1.0
        # A step of the last printed digit of a small value is small against the column.
        floor = 1e-3 * float(size.max())
        largest = max(largest, float(np.max(np.abs(a[known] - b[known]) / np.maximum(size, floor))))
        moving = moving or float(np.ptp(a[known])) > 0
        # A repeated measurement differs by its scatter, a copy by rounding only: a period to nine digits shows it.
        scatter = float(np.nanmax([noise(a[known]), noise(b[known]), 0.0]))
        rounding = max(0.5 * scatter, fraction * float(np.ptp(a[known])))
        if rows == slice(None) and float(np.std(a[known] - b[known])) > rounding:
            return None
    return largest if moving else None


def _by_quantity(table: SweepTable) -> list[tuple[str, np.ndarray]]:
    used = [
        (channel.quantity, table.columns[name])
        for name, channel in table.channels.items()
        if channel.use and channel.quantity != "instant"
    ]
    return sorted(used, key=lambda pair: pair[0])


def time_overlap(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find two sweeps of one cell in which one thermometer was read during the same time by different files."""
    spans = []
    for table in tables(reading):
        span = time_span(table)
        if span is None or table.sweep.kind == "log":
            continue
        thermometers = {
            record.name
            for channel in table.channels.values()
            if channel.use and (record := reading.thermometer_of(channel))
        }
        spans.append((table, *span, thermometers))
    for (first, a, b, left), (second, c, d, right) in combinations(spans, 2):
        shared = left & right
        if not shared or set(first.sweep.files) & set(second.sweep.files):
            continue
        if reading.sheet.cell_of(first.sweep) != reading.sheet.cell_of(second.sweep):
            continue
        if min(b, d) > max(a, c):
            yield on_sweep(
                reading,
                second,
                "time-overlap",
                "warning",
                f"{first.name} and {second.name} overlap by {(min(b, d) - max(a, c)) / 60:.3g} min, and both read {', '.join(sorted(shared))}",
                key="files",
                expected="no overlap",
                remedy="look whether a file was written twice or a clock was wrong, or waive it with the reason",
            )


def file_archived(reading: Reading, thresholds: Thresholds, earlier: History) -> Iterator[Finding]:
    """Find files of sweeps that the archive already holds in another cooldown."""
    for number, sweep in enumerate(reading.sheet.sweep):
        for name in sweep.files:
            entry = reading.raw_files.get(name)
            address = None if entry is None else earlier.files.get(entry.sha256)
            if address is not None and earlier.cooldown != address.split("/")[0].split(".")[0]:
                yield on_sheet(
                    reading,
                    "file-archived",
                    "warning",
                    f"{name} holds the same bytes as a file of {address}",
                    "sweep",
                    number,
                    "files",
                    place=sweep.name,
                    remedy="cite the sweep that is archived already, or waive it with the reason",
                )

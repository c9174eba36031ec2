"""Calibrations in a sheet: as their reduction made them, and not drifted from the one before by more than they allow."""

from __future__ import annotations

from collections.abc import Iterator

from archive.intake.checks.check import History
from archive.intake.checks.telling import listed, number, on_sheet
from archive.intake.reading import Reading
from archive.intake.thresholds import Thresholds
from archive.reduction.calibration_comparison import Drift, compared
from archive.reduction.calibration_record import FREE_FIELDS
from schemas.finding import Finding
from schemas.thermometer import Calibration

__all__ = [
    "calibration_as_made",
    "calibration_drifted",
    "calibration_without_thermometer",
    "differing_fields",
]


def calibration_as_made(reading: Reading, thresholds: Thresholds, earlier: History) -> Iterator[Finding]:
    """Find calibrations that say they come from a reduction and are not what it found."""
    for position, written in enumerate(reading.sheet.record.calibration):
        if written.made_from is None:
            continue
        path = ("record", "calibration", position, "made_from")
        made = earlier.made.get(written.address)
        if not isinstance(made, Calibration):
            yield on_sheet(
                reading, "calibration-not-archived", "error",
                f"calibration {written.address} says that {written.made_from} found it, and this archive cannot say the same: {made or 'it was not looked at'}",
                *path, place=written.address, found=written.made_from,
                remedy="ingest and reduce the calibration sweep first, or leave made_from out and say in `against` where the calibration is from",
            )  # fmt: skip
            continue
        differing = differing_fields(written, made)
        if differing:
            yield on_sheet(
                reading, "calibration-differs", "error",
                f"calibration {written.address} is not what {written.made_from} found: {listed(differing)} differ{'s' if len(differing) == 1 else ''}",
                *path, place=written.address, expected=f"the numbers of `stillroom calibration {written.made_from}`",
                remedy="take its output as it is (only the range may be made narrower), or leave made_from out",
            )  # fmt: skip


def differing_fields(written: Calibration, made: Calibration) -> list[str]:
    """Return the fields in which a calibration is not what its reduction found; what a person may choose is not compared."""
    # A thermometer may be cited with its revision.
    same = written.model_copy(update={"thermometer": written.thermometer.partition(".r")[0]})
    found = [
        name
        for name in type(made).model_fields
        if name not in FREE_FIELDS and getattr(same, name) != getattr(made, name)
    ]
    if written.temperature_low.si < made.temperature_low.si:
        found.append("temperature_low")
    if written.temperature_high.si > made.temperature_high.si:
        found.append("temperature_high")
    return found


def calibration_drifted(reading: Reading, thresholds: Thresholds, earlier: History) -> Iterator[Finding]:
    """Find calibrations that differ from the one before by more than both uncertainties allow."""
    limit = thresholds.calibration_drift_sigma
    for position, written in enumerate(reading.sheet.record.calibration):
        before = _before(reading, written, earlier)
        if before is None:
            continue
        drift = compared(before, written)
        path = ("record", "calibration", position)
        if drift.found is None:
            yield on_sheet(
                reading, "calibration-not-compared", "note",
                f"calibration {written.address} was not compared with {before.address}, the one before: {drift.why_not}",
                *path, place=written.address,
            )  # fmt: skip
        elif drift.found.significance > limit:
            yield _drifted(reading, drift, limit, *path)


def _before(reading: Reading, written: Calibration, earlier: History) -> Calibration | None:
    """Return the newest calibration of the same thermometer before this one, archived or in the same sheet."""
    thermometer = written.thermometer.partition(".r")[0]
    known = {each.address: each for each in earlier.calibrations.get(thermometer, ())}
    known |= {
        each.address: each
        for each in reading.sheet.record.calibration
        if each.thermometer.partition(".r")[0] == thermometer
    }
    order = (written.date, written.revision)
    older = [
        each
        for each in known.values()
        if each.address != written.address and (each.date, each.revision) < order
    ]
    return max(older, key=lambda each: (each.date, each.revision), default=None)


def _drifted(reading: Reading, drift: Drift, limit: float, *path: str | int) -> Finding:
    found = drift.found
    assert found is not None  # noqa: S101 - the caller looked
    k = found.worst
    shift, spread = 1e3 * float(found.difference[k]), 1e3 * float(found.uncertainty[k])
    converted = f", after conversion ({drift.conversion})" if drift.conversion else ""
    return on_sheet(
        reading, "calibration-drift", "warning",
        f"calibration {drift.later} gives {number(abs(shift), 'mK', 3)} {'more' if shift > 0 else 'less'} than {drift.earlier} at {number(float(found.temperature[k]), 'K', 4)}{converted}",
        *path, place=drift.later, found=f"{found.significance:.3g} times the standard uncertainty of the difference, {number(spread, 'mK', 2)}",
        expected=f"at most {limit:g} times (calibration_drift_sigma)",
        remedy="look for what changed (mounting, wires, excitation, thermal cycles) and say it in `changed`; temperatures taken between the two carry the drift",
    )  # fmt: skip


def calibration_without_thermometer(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find sweeps that calibrate a channel of which it is not said which thermometer it reads."""
    for position, sweep in enumerate(reading.sheet.sweep):
        channel = sweep.calibrates
        if channel is None:
            continue
        known = reading.sheet.channels_of(sweep)
        path = ("sweep", position, "calibrates")
        if channel not in known:
            yield on_sheet(
                reading, "unknown-name", "error", f"sweep {sweep.name} calibrates channel {channel}, which it does not have",
                *path, place=sweep.name, expected=f"one of {', '.join(known)}", remedy="correct the name",
            )  # fmt: skip
        elif known[channel].thermometer is None:
            yield on_sheet(
                reading, "calibrated-thermometer-missing", "warning",
                f"channel {channel} of {sweep.name} is calibrated, and it does not say which thermometer it reads",
                *path, place=f"{sweep.name}#{channel}", remedy="name its thermometer in the channel; without it no calibration record can be made",
            )  # fmt: skip

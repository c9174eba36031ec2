"""Calibrations made in the archive: the record that a reduction found, and what has drifted between calibrations."""

from __future__ import annotations

from archive.errors import ArchiveError, BadRequest, UnknownAddress
from archive.lab.source import LabSource
from archive.reduction.calibration_comparison import Drift, compared, drifts
from archive.reduction.calibration_record import calibration_from, calibration_thermometer
from schemas.thermometer import Calibration, Thermometer

__all__ = [
    "archived_calibrations",
    "calibration_drift",
    "calibrations_against_last",
    "made_calibration",
    "record_as_made",
]


def made_calibration(
    source: LabSource, address: str, *, name: str | None = None, revision: int | None = None
) -> Calibration:
    """Return the calibration record that a reduction found, as a new record or the next revision of one.

    Parameters
    ----------
    source : LabSource
    address : str
        Of the reduction.
    name : str, optional
        Of the record; the thermometer's with ``-cal`` behind it if left out.
    revision : int, optional
        One more than the newest that the archive holds if left out.

    Raises
    ------
    BadRequest, UnknownAddress
        As `calibration_from`; or the name belongs to another kind of record.
    """
    chosen = name or f"{calibration_thermometer(address, source)}-cal"
    known = source.find_record(chosen)
    if known is not None and not isinstance(known, Calibration):
        raise BadRequest(
            f"{chosen} is the name of another record, {known.address}", remedy="give the calibration another name"
        )  # fmt: skip
    return calibration_from(
        address, source, name=chosen, revision=revision or (1 if known is None else known.revision + 1)
    )


def record_as_made(source: LabSource, written: Calibration) -> Calibration | str:
    """Return what the reduction that a calibration names as its origin makes of it, or in words why there is none."""
    address = written.made_from or ""
    try:
        return calibration_from(address, source, name=written.name, revision=written.revision)
    except ArchiveError as problem:
        return problem.what


def archived_calibrations(source: LabSource, thermometer: str) -> tuple[Calibration, ...]:
    """Return every calibration of a thermometer that the archive holds, in whatever revision, oldest first."""
    found = [
        record
        for row in source.index.records(kind="calibration")
        if isinstance(record := source.record(row.address), Calibration)
        and record.thermometer.partition(".r")[0] == thermometer
    ]
    return tuple(sorted(found, key=lambda each: (each.date, each.revision, each.name)))


def calibration_drift(source: LabSource, thermometer: str) -> list[Drift]:
    """Return each calibration of a thermometer held against the one before it.

    Raises
    ------
    UnknownAddress
        The archive holds no thermometer of that name.
    """
    return drifts(archived_calibrations(source, _thermometer(source, thermometer)))


def calibrations_against_last(
    source: LabSource, thermometer: str
) -> tuple[tuple[Calibration, ...], list[Drift]]:
    """Return every calibration of a thermometer, oldest first, and the last one held against each before it.

    Raises
    ------
    UnknownAddress
        The archive holds no thermometer of that name.
    """
    every = archived_calibrations(source, _thermometer(source, thermometer))
    return every, [compared(each, every[-1]) for each in every[:-1]]


def _thermometer(source: LabSource, thermometer: str) -> str:
    name = thermometer.partition(".r")[0]
    if not isinstance(source.find_record(name), Thermometer):
        known = ", ".join(sorted({row.name for row in source.index.records(kind="thermometer")})) or "none yet"  # fmt: skip
        raise UnknownAddress(
            f"there is no thermometer {thermometer} in this archive", expected=f"one of: {known}"
        )
    return name

"""Checking a cooldown folder, with or without an archive at hand; nothing is stored."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any

from archive.errors import BadRequest
from archive.intake import ingest as intake_ingest
from archive.intake.checks.check import History
from archive.intake.examine import examined
from archive.intake.folder import read_cooldown
from archive.intake.reading import Reading
from archive.intake.thresholds import Thresholds
from archive.lab.calibrating import archived_calibrations, record_as_made
from archive.lab.earlier import history
from archive.lab.outcomes import CheckReport
from archive.lab.source import LabSource

__all__ = ["check_folder", "earlier_runs", "folder_report", "require_folder"]


def folder_report(
    reading: Reading, findings: Sequence[Any], cautions: Sequence[dict[str, Any]]
) -> CheckReport:
    """Report of a reading, with counts of what was read."""
    summary: dict[str, int | str] = {
        "folder": str(reading.folder),
        "sweeps": len(reading.tables),
        "files": len(reading.raw_files),
        "bytes": sum(entry.size for entry in reading.raw_files.values()),
        "rows": sum(table.rows for table in reading.tables.values()),
        "doses": len(reading.ledger),
    }
    if reading.sheet_reading.sheet is not None:
        summary["cooldown"] = reading.sheet.name
    return CheckReport(tuple(findings), tuple(cautions), summary, reading)


def require_folder(folder: Path) -> None:
    """Refuse what is no folder."""
    if not folder.is_dir():
        raise BadRequest(
            "there is no such folder", file=str(folder), remedy="name the folder that holds cooldown.toml"
        )


def earlier_runs(source: LabSource, reading: Reading) -> History:
    """What the archive knows of earlier runs of the cells that a reading uses, and of the origin of its calibrations."""
    cells = {cell.name for sweep in reading.sheet.sweep if (cell := reading.cell_of(sweep)) is not None}
    calibrations = reading.sheet.record.calibration
    thermometers = {each.thermometer.partition(".r")[0] for each in calibrations}
    return replace(
        history(source, reading.sheet.name, cells),
        calibrations={name: archived_calibrations(source, name) for name in thermometers},
        made={each.address: record_as_made(source, each) for each in calibrations if each.made_from},
    )


def check_folder(
    folder: Path,
    *,
    thresholds: Thresholds | None = None,
    source: LabSource | None = None,
    progress: Callable[[str], None] = lambda sentence: None,
) -> CheckReport:
    """Everything that can be said of a cooldown folder; nothing is stored.

    Parameters
    ----------
    folder : Path
        Folder with `cooldown.toml`.
    thresholds : Thresholds, optional
        Limits of the checks; the shipped ones if left out.
    source : LabSource, optional
        Archive that may hold records the sheet refers to, and earlier runs of the same cell.

    Raises
    ------
    BadRequest
        If there is no such folder.
    """
    require_folder(folder)
    archived = (lambda reference: None) if source is None else source.find_record
    reading = read_cooldown(folder, archived=archived, progress=progress)
    if reading.sheet_reading.sheet is None:
        return folder_report(reading, sorted(reading.findings, key=lambda finding: finding.order), ())
    if source is not None:
        reading.findings.extend(intake_ingest.records_differ(reading, archived))
    progress("checking")
    earlier = None if source is None else earlier_runs(source, reading)
    findings, cautions = examined(reading, thresholds or Thresholds(), earlier=earlier)
    return folder_report(reading, findings, cautions)

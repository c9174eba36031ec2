"""Reading revision and amendment sheets: every fault with its line, as for a cooldown sheet."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any, Generic, TypeVar

from archive.intake.sheet import LineMap, validated
from schemas.acts import AmendmentSheet, RevisionSheet
from schemas.base import Record
from schemas.finding import Finding
from schemas.plan import Plan
from schemas.toml_text import TomlFault, tables_of

__all__ = ["ActReading", "read_amendment", "read_revision"]

_LARGEST = 5_000_000  # bytes, as for a cooldown sheet

_Sheet = TypeVar("_Sheet", bound=Record)


@dataclass(frozen=True)
class ActReading(Generic[_Sheet]):
    """A sheet as read: the record when it is valid, and all that is wrong with it when it is not.

    Attributes
    ----------
    file : str
        Its name.
    data : bytes
        Its bytes, to be kept verbatim.
    sheet : record or None
    findings : tuple of Finding
    lines : LineMap
    """

    file: str
    data: bytes
    sheet: _Sheet | None
    findings: tuple[Finding, ...]
    lines: LineMap

    def fault(self, what: str, *path: str | int, remedy: str | None = None, **said: str | None) -> Finding:
        """Error about a place of the sheet."""
        return Finding(
            code="act-refused",
            severity="error",
            what=what,
            file=self.file,
            line=self.lines.line(path),
            remedy=remedy,
            **said,  # type: ignore[arg-type]
        )


def read_revision(path: Path) -> ActReading[RevisionSheet]:
    """Revision sheet, or a plan file as `stillroom plans NAME --toml` prints one.

    Parameters
    ----------
    path : Path
        The file.
    """
    file, data, tables, faults, lines = _tables(path)
    if tables is None:
        return ActReading(file, data, None, faults, lines)
    if "step" in tables and "format" not in tables:
        plan, findings = validated(Plan, tables, file=file, lines=lines)
        sheet = None if plan is None else RevisionSheet(format="stillroom-revision/1", plan=plan)
        return ActReading(file, data, sheet, findings, lines)
    found, findings = validated(RevisionSheet, tables, file=file, lines=lines)
    return ActReading(file, data, found, findings, lines)


def read_amendment(path: Path) -> ActReading[AmendmentSheet]:
    """Amendment sheet.

    Parameters
    ----------
    path : Path
        The file.
    """
    file, data, tables, faults, lines = _tables(path)
    if tables is None:
        return ActReading(file, data, None, faults, lines)
    sheet, findings = validated(AmendmentSheet, tables, file=file, lines=lines)
    return ActReading(file, data, sheet, findings, lines)


def _tables(
    path: Path,
) -> tuple[str, bytes, dict[str, Any] | None, tuple[Finding, ...], LineMap]:
    file, empty = path.name, LineMap("")

    def refused(what: str, remedy: str, **place: Any) -> tuple[Finding, ...]:
        return (
            Finding(code="sheet-unreadable", severity="error", what=what, file=file, remedy=remedy, **place),
        )

    try:
        if path.exists() and not path.is_file():
            # A pipe or a device would be read without end.
            return file, b"", None, refused("this is not a file", "name a plain text file"), empty
        with path.open("rb") as stream:
            data = stream.read(_LARGEST + 1)
    except OSError as error:
        said = (error.strerror or "it cannot be read").lower()
        return file, b"", None, refused(f"the sheet cannot be read: {said}", "check its name and path"), empty
    if len(data) > _LARGEST:
        return file, b"", None, refused("the sheet is larger than 5 MB", "name another file"), empty
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        return file, data, None, refused("this is not UTF-8 text", "save it as UTF-8", line=line), empty
    try:
        return file, data, tables_of(text), (), LineMap(text)
    except TomlFault as fault:
        where: dict[str, Any] = {"line": fault.line}
        where |= {} if fault.column is None else {"column": str(fault.column)}
        return (
            file,
            data,
            None,
            refused(f"this is not valid TOML: {fault}", "correct the line", **where),
            empty,
        )

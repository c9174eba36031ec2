"""Reading `cooldown.toml`: from text to a validated sheet, every fault with its line.

Rules: all faults are reported in one pass; nothing is guessed; a fault names the line of the table or key it is
about. TOML carries no positions after parsing, so a small scanner maps each key path to its line.
"""

from __future__ import annotations

import difflib
import json
import re
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from datetime import date, datetime, time
from functools import cache
from pathlib import Path
from typing import Any, TypeVar

from pydantic import ValidationError

from schemas.base import NAME_PATTERN, REFERENCE_PATTERN, Record
from schemas.cooldown import CooldownSheet
from schemas.finding import Finding
from schemas.sweep import CHANNEL_PATTERN, FILE_PATTERN
from schemas.thermometer import MADE_FROM_PATTERN
from schemas.time_faults import time_fault
from schemas.toml_text import TomlFault, tables_of

__all__ = ["LineMap", "SheetReading", "read_sheet", "validated"]

_Model = TypeVar("_Model", bound=Record)
PathKey = tuple[str | int, ...]

_LARGEST_SHEET = 5_000_000  # bytes; a sheet of hundreds of sweeps is some 200 kB
_DEEPEST = (
    30  # tables in tables; a sheet has at most six. The parsers behind this one give up from about 200 on.
)
_HINTED = 100  # unknown names that get a hint; looking for a near name takes a millisecond each
_FORMS = {
    r"^[^\x00-\x1f\x7f]+$": "text without control characters",
    FILE_PATTERN: "a path inside the cooldown folder, with forward slashes and without control characters",
    CHANNEL_PATTERN: "a name of small letters, digits and _, beginning with a letter, at most 64 long",
    NAME_PATTERN: "a name of letters, digits, - and _, without blanks or dots, at most 64 long",
    MADE_FROM_PATTERN: "the address of a reduction, e.g. 2024-11/c01@thermometer-calibration.1",
    REFERENCE_PATTERN: "the name of a record, with or without its revision, e.g. TO-4 or TO-4.r2",
}
# Possessive where a line could be split in many ways: a long line that fits nothing must not take minutes.
_HEADER = re.compile(r"^\s*+\[(\[)?(?P<path>[^\[\]]++)\]")
_STRING = re.compile(r""""(?:[^"\\]|\\.)*+"?|'[^']*+'?""")
_ASSIGNMENT = re.compile(
    r"""^\s*(?P<path>(?:[A-Za-z0-9_-]+|"[^"]*"|'[^']*')(?:\s*\.\s*(?:[A-Za-z0-9_-]+|"[^"]*"|'[^']*'))*)\s*="""
)
_PART = re.compile(r"""[A-Za-z0-9_-]+|"[^"]*"|'[^']*'""")


class LineMap:
    """Lines of the keys and tables of a TOML text.

    Parameters
    ----------
    text : str
        The TOML text; it need not be valid.
    """

    def __init__(self, text: str) -> None:
        self._lines: dict[PathKey, int] = {(): 1}
        self._counts: dict[PathKey, int] = {}
        table: PathKey = ()
        for number, line in _logical_lines(text):
            header = _HEADER.match(line)
            if header is not None:
                table = self._table(header["path"], is_array=header[1] is not None)
                self._lines.setdefault(table, number)
                continue
            assignment = _ASSIGNMENT.match(line)
            if assignment is not None:
                key = tuple(part.strip("\"'") for part in _PART.findall(assignment["path"]))
                for depth in range(1, len(key) + 1):
                    self._lines.setdefault(table + key[:depth], number)

    def _table(self, text: str, *, is_array: bool) -> PathKey:
        path: PathKey = ()
        parts = [part.strip("\"'") for part in _PART.findall(text)]
        for position, part in enumerate(parts):
            path += (part,)
            last = position == len(parts) - 1
            if last and is_array:
                self._counts[path] = self._counts.get(path, -1) + 1
            if path in self._counts:
                path += (self._counts[path],)
        return path

    def line(self, path: Sequence[str | int]) -> int:
        """Line of the deepest known part of a key path, from 1."""
        key = tuple(path)
        while key not in self._lines:
            key = key[:-1]
        return self._lines[key]


def _logical_lines(text: str) -> Iterator[tuple[int, str]]:
    """Lines outside multi-line strings and outside multi-line arrays."""
    closing: str | None = None
    depth = 0
    for number, line in enumerate(text.splitlines(), 1):
        if closing is not None:
            if closing in line:
                closing = None
            continue
        if depth == 0:
            yield number, line
        for mark in ('"""', "'''"):
            if line.count(mark) % 2 == 1:
                closing = mark
        if closing is None and (depth > 0 or _ASSIGNMENT.match(line)):
            bare = _STRING.sub("", line)
            bare = bare.partition("#")[0]
            depth = max(0, depth + bare.count("[") + bare.count("{") - bare.count("]") - bare.count("}"))


def spelled(path: Sequence[str | int]) -> str:
    """Key path as a person reads it: `dose[3].pressure_before`, counted from 1."""
    text = ""
    for part in path:
        text += f"[{part + 1}]" if isinstance(part, int) else (f".{part}" if text else part)
    return text


@dataclass(frozen=True)
class SheetReading:
    """A sheet as read: the record when it is valid, and all that is wrong with it when it is not."""

    file: str
    text: str
    sheet: CooldownSheet | None
    findings: tuple[Finding, ...]
    lines: LineMap

    def line(self, *path: str | int) -> int:
        """Line of a key path in the sheet."""
        return self.lines.line(path)


def _plain(value: Any) -> Any:
    if isinstance(value, datetime | date | time):
        return value.isoformat()
    raise TypeError(f"{type(value).__name__} cannot stand in a sheet")


def read_sheet(path: Path) -> SheetReading:
    """Sheet of a cooldown folder.

    Parameters
    ----------
    path : Path
        The `cooldown.toml`.

    Returns
    -------
    SheetReading
        With every fault that can be found in one pass; `sheet` is None if there is an error.
    """
    file = path.name
    data = _sheet_bytes(path)
    if isinstance(data, tuple):
        return _unreadable(file, *data)
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        return _unreadable(file, "the sheet is not UTF-8 text", "save it as UTF-8", line=line)
    lines = LineMap(text)
    try:
        tables = tables_of(text)
    except TomlFault as fault:
        finding = Finding(
            code="sheet-syntax",
            severity="error",
            what=f"this is not valid TOML: {fault}",
            file=file,
            line=fault.line,
            column=None if fault.column is None else str(fault.column),
            remedy="correct the line and check again",
        )
        return SheetReading(file, text, None, (finding,), lines)
    sheet, findings = validated(CooldownSheet, tables, file=file, lines=lines)
    return SheetReading(file, text, sheet, findings, lines)


def _sheet_bytes(path: Path) -> bytes | tuple[str, str]:
    """Content of the sheet, or what is wrong and what to do."""
    try:
        if path.exists() and not path.is_file() and not path.is_dir():
            # A pipe or a device would be read without end.
            return "the sheet is not a file", "write the sheet as a plain text file"
        with path.open("rb") as stream:
            data = stream.read(_LARGEST_SHEET + 1)
    except FileNotFoundError:
        return "there is no cooldown sheet here", "make one with: stillroom draft FOLDER"
    except OSError as error:
        return f"the sheet cannot be read: {error.strerror}", "check the file and its permissions"
    if len(data) > _LARGEST_SHEET:
        return (
            f"the sheet is larger than {_LARGEST_SHEET // 1_000_000} MB",
            "keep tables of numbers in data files",
        )
    return data


def _unreadable(file: str, what: str, remedy: str, line: int | None = None) -> SheetReading:
    finding = Finding(
        code="sheet-unreadable", severity="error", what=what, file=file, line=line, remedy=remedy
    )
    return SheetReading(file, "", None, (finding,), LineMap(""))


def validated(
    model: type[_Model], tables: Mapping[str, Any], *, file: str, lines: LineMap
) -> tuple[_Model | None, tuple[Finding, ...]]:
    """Record that TOML tables describe, or every fault that keeps them from being one."""
    if _is_too_deep(tables):
        finding = Finding(
            code="sheet-field",
            severity="error",
            what=f"tables or lists are nested more than {_DEEPEST} deep",
            file=file,
            remedy="remove what is nested; nothing here needs so many levels",
        )
        return None, (finding,)
    try:
        return model.model_validate_json(json.dumps(tables, default=_plain)), ()
    except ValidationError as error:
        faults = error.errors(include_url=False)
        hints = _hints(str(each["loc"][-1]) for each in faults if each["type"] == "extra_forbidden")
        known = [
            _finding(dict(each), tables, file=file, lines=lines, hints=hints)
            for each in _first_causes(faults)
        ]
        unique = {(each.field, each.what): each for each in known}
        return None, tuple(unique.values())


def _is_too_deep(tables: Mapping[str, Any]) -> bool:
    """Whether tables and lists are nested deeper than any record; without recursion, since that is what would fail."""
    level: list[Any] = [tables]
    for _ in range(_DEEPEST):
        level = [
            inner
            for each in level
            for inner in (each.values() if isinstance(each, Mapping) else each)
            if isinstance(inner, dict | list)
        ]
        if not level:
            return False
    return True


def _first_causes(faults: Sequence[Any]) -> Iterator[Any]:
    """Faults without those that only follow from others: a list is not too short because its one entry is wrong."""
    inside = {fault["loc"][:depth] for fault in faults for depth in range(len(fault["loc"]))}
    for fault in faults:
        if fault["type"] != "too_short" or fault["loc"] not in inside:
            yield fault


def _hints(unknown: Iterable[str]) -> dict[str, str]:
    """For names that no sheet knows, the known one that each is most like, if there is one."""
    found: dict[str, str] = {}
    for name in list(dict.fromkeys(unknown))[:_HINTED]:
        close = difflib.get_close_matches(name, _known_names(), n=1)
        if close and close[0] != name:
            found[name] = close[0]
    return found


def _finding(
    error: Mapping[str, Any],
    tables: Mapping[str, Any],
    *,
    file: str,
    lines: LineMap,
    hints: Mapping[str, str],
) -> Finding:
    kind = error["type"]
    path, _ = _real_path(error["loc"], tables, keep_last=kind in ("missing", "extra_forbidden"))
    context = error.get("ctx", {})
    found: str | None = None
    expected: str | None = None
    remedy = "correct it and check again"
    if kind == "missing":
        what, remedy = f"{path[-1]} is missing", f"add {path[-1]} to this table"
    elif kind == "extra_forbidden":
        name = str(path[-1])
        what = f"{name} is not a name that is known here"
        remedy = (
            f"did you mean {hints[name]}?"
            if name in hints
            else "remove it, or move it to the table it belongs to"
        )
    elif kind == "value_error":
        what = str(context.get("error", error["msg"]))
    elif (of_time := time_fault(kind)) is not None:
        what, remedy = of_time
    elif kind in {"literal_error", "union_tag_invalid"}:
        what = "this word is not one of those that can stand here"
        expected = str(context.get("expected") or context.get("expected_tags"))
    elif kind == "union_tag_not_found":
        what = f"the table does not say what it is: {context.get('discriminator')} is missing"
    elif kind == "string_pattern_mismatch":
        pattern = str(context.get("pattern"))
        what = "this text does not have the form that is needed here"
        expected = _FORMS.get(pattern, f"the form {pattern}")
    else:
        what = str(error["msg"])
    if kind not in ("missing", "extra_forbidden", "value_error") and not isinstance(
        error.get("input"), dict | list
    ):
        found = _shown(error.get("input"))
    return Finding(
        code="sheet-field",
        severity="error",
        what=what[:1].lower() + what[1:]
        if kind not in ("missing", "extra_forbidden", "value_error")
        else what,
        file=file,
        line=lines.line(path),
        field=spelled(path) or None,
        found=found,
        expected=expected,
        remedy=remedy,
    )


def _shown(value: object) -> str:
    text = json.dumps(value, default=str, ensure_ascii=False)
    return text if len(text) <= 80 else text[:77] + "..."


def _real_path(loc: Sequence[str | int], tables: Any, *, keep_last: bool) -> tuple[PathKey, Any]:
    """Key path without the tags that a union adds to it."""
    path: PathKey = ()
    here: Any = tables
    for position, part in enumerate(loc):
        inside = (isinstance(here, list) and isinstance(part, int) and part < len(here)) or (
            isinstance(here, dict) and part in here
        )
        if inside:
            here = here[part]
            path += (part,)
        elif keep_last and position == len(loc) - 1:
            path += (part,)
    return path, here


@cache
def _known_names() -> list[str]:
    names: set[str] = set()

    def collect(schema: Any) -> None:
        if isinstance(schema, dict):
            names.update(schema.get("properties", {}))
            for value in schema.values():
                collect(value)
        elif isinstance(schema, list):
            for value in schema:
                collect(value)

    collect(CooldownSheet.model_json_schema())
    return sorted(names)

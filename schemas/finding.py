"""Findings and waivers: what a check has to say, and what a person answered."""

from __future__ import annotations

from datetime import date
from typing import Annotated, Literal

from pydantic import Field, StringConstraints

from schemas.base import Record, Text

__all__ = ["Finding", "Severity", "Waiver"]

Severity = Literal["error", "warning", "note"]

_CODE = Annotated[str, StringConstraints(pattern=r"^[a-z][a-z0-9-]{1,63}$")]


class Finding(Record):
    """What one check has to say about one place."""

    code: _CODE = Field(description="Name of the check, e.g. `temperature-outside-calibration`.")
    severity: Severity
    what: str = Field(description="One sentence: what is wrong or notable, with the numbers.")
    file: str | None = Field(
        default=None, description="File in the cooldown folder, relative, with forward slashes."
    )
    line: int | None = Field(default=None, description="Line from 1.")
    column: str | None = Field(default=None, description="Column name or number from 1.")
    field: str | None = Field(default=None, description="Place in the sheet, e.g. `dose[3].pressure`.")
    place: str | None = Field(
        default=None,
        description="What it is about: sweep, dose, channel or record, e.g. `s017`, `s017#period`, `TO-4.r2`.",
    )
    expected: str | None = None
    found: str | None = None
    remedy: str | None = Field(default=None, description="What to do next.")
    waived: Waiver | None = Field(default=None, description="The waiver that accepted this warning, if any.")

    @property
    def order(self) -> tuple[str, int, int, str, str]:
        """Sort key: file, line, severity, code, place."""
        rank = {"error": 0, "warning": 1, "note": 2}[self.severity]
        return (self.file or "", self.line or 0, rank, self.code, self.place or "")

    def sentence(self) -> str:
        """One line for a terminal: place, what, found, expected, remedy."""
        place = ", ".join(
            part
            for part in (
                self.file,
                None if self.line is None else f"line {self.line}",
                None if self.column is None else f"column {self.column}",
                self.field or self.place,
            )
            if part
        )
        text = f"{place}: {self.what}" if place else self.what
        if self.found is not None:
            text += f"; found {self.found}"
        if self.expected is not None:
            text += f"; expected {self.expected}"
        if self.remedy is not None:
            text += f"; {self.remedy}"
        return text


class Waiver(Record):
    """A warning accepted by a person, with the reason; kept for ever and printed on the run sheet."""

    check: _CODE = Field(description="Code of the check whose warning is accepted.")
    place: str = Field(description="The place named by the finding, e.g. `s017` or `s017#period`.")
    reason: Annotated[Text, StringConstraints(min_length=8)] = Field(
        description="Why the warning is accepted; a sentence, not a nod."
    )
    role: str = Field(min_length=2, description="Role of the person who accepts it, e.g. `data steward`.")
    date: date


Finding.model_rebuild()

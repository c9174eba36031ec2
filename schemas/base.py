"""What every record shares: strict, frozen, closed, with names that fit an address.

Rules: a record is validated from JSON (a sheet's TOML goes through JSON first), so that lists become tuples and
text becomes dates, and nothing else is converted silently. A field that is not known is an error.
"""

from __future__ import annotations

from datetime import date
from typing import Annotated

from pydantic import BaseModel, ConfigDict, Field, StringConstraints

__all__ = ["NAME_PATTERN", "REFERENCE_PATTERN", "Name", "NamedRecord", "Record", "Reference", "Text"]

# A name is part of addresses, file names and LaTeX labels: letters, digits, hyphen, underscore, no dot (the dot
# separates the revision) and nothing that a file system folds or forbids.
NAME_PATTERN = r"^[A-Za-z0-9][A-Za-z0-9_-]{0,63}$"
REFERENCE_PATTERN = r"^[A-Za-z0-9][A-Za-z0-9_-]{0,63}(\.r[1-9][0-9]{0,5})?$"

Name = Annotated[str, StringConstraints(pattern=NAME_PATTERN)]
"""A name: letters, digits, hyphen and underscore, up to 64 characters."""

Reference = Annotated[str, StringConstraints(pattern=REFERENCE_PATTERN)]
"""A record cited by name and revision (`TO-4.r2`); without a revision the sheet's own or the newest one."""

Text = Annotated[str, StringConstraints(max_length=20_000)]


class Record(BaseModel):
    """Base of all schemas."""

    model_config = ConfigDict(strict=True, extra="forbid", frozen=True, allow_inf_nan=False)


class NamedRecord(Record):
    """A long-lived thing of the laboratory: it has a name, a revision number, and outlives a cooldown."""

    name: Name = Field(description="Name of the thing; the same over all its revisions.")
    revision: int = Field(
        ge=1, le=999_999, description="Revision number, from 1; raise it when anything changes."
    )
    description: Text = Field(default="", description="One or two sentences for a reader ten years from now.")
    valid_from: date | None = Field(default=None, description="Day from which this revision holds.")
    changed: Text | None = Field(default=None, description="What changed since the revision before, and why.")

    @property
    def address(self) -> str:
        """Address of this revision, such as `TO-4.r2`."""
        return f"{self.name}.r{self.revision}"

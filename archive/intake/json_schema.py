"""JSON Schema of what a person writes: the cooldown sheet, the plan, and the sheets of acts."""

from __future__ import annotations

from typing import Annotated, Any, Final, Literal

from pydantic import Field

from schemas.acts import AmendmentSheet, RevisionSheet
from schemas.base import Record, Reference
from schemas.cooldown import CooldownSheet
from schemas.plan import Plan
from schemas.thermometer import Calibration

__all__ = ["THINGS", "json_schema"]


class _Calibrations(Record):
    """Calibrations and nothing else."""

    calibration: Annotated[tuple[Calibration, ...], Field(min_length=1)]


class _CalibrationTable(Record):
    """What `stillroom calibration` writes: tables for a cooldown sheet, or with a head a sheet for `stillroom revise`."""

    format: Literal["stillroom-revision/1"] | None = None
    by: str | None = Field(default=None, description="Role of the person, for `stillroom revise`.")
    because: str | None = Field(default=None, description="Why, for `stillroom revise`.")
    supersedes: Reference | None = Field(
        default=None, description="Revision in whose place this one stands, for `stillroom revise`."
    )
    record: _Calibrations


# Identifiers only; nothing is fetched from them. A tag URI (RFC 4151) needs no registration with anybody.
_IDENTIFIERS = {
    "sheet": "tag:stillroom.invalid,2026:schema/cooldown/1",
    "plan": "tag:stillroom.invalid,2026:schema/plan/1",
    "revision": "tag:stillroom.invalid,2026:schema/revision/1",
    "amendment": "tag:stillroom.invalid,2026:schema/amendment/1",
    "calibration": "tag:stillroom.invalid,2026:schema/calibration/1",
}
_MODELS: Final[dict[str, type[Record]]] = {
    "sheet": CooldownSheet,
    "plan": Plan,
    "revision": RevisionSheet,
    "amendment": AmendmentSheet,
    "calibration": _CalibrationTable,
}
THINGS: Final = tuple(_MODELS)
"""What there is a schema of."""


def json_schema(thing: str) -> dict[str, Any]:
    """JSON Schema (2020-12) of what a person writes, with `$schema` and `$id`.

    Parameters
    ----------
    thing : str
        What to describe, one of `THINGS`.

    Examples
    --------
    >>> json_schema("sheet")["$schema"]
    'https://json-schema.org/draft/2020-12/schema'
    """
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "$id": _IDENTIFIERS[thing],
        **_MODELS[thing].model_json_schema(),
    }

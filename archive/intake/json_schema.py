"""JSON Schema of what a person writes: the cooldown sheet and the plan."""

from __future__ import annotations

from typing import Any

from schemas.base import Record
from schemas.cooldown import CooldownSheet
from schemas.plan import Plan

__all__ = ["json_schema"]

# Identifiers only; nothing is fetched from them. A tag URI (RFC 4151) needs no registration with anybody.
_IDENTIFIERS = {
    "sheet": "tag:stillroom.invalid,2026:schema/cooldown/1",
    "plan": "tag:stillroom.invalid,2026:schema/plan/1",
}
_MODELS: dict[str, type[Record]] = {"sheet": CooldownSheet, "plan": Plan}


def json_schema(thing: str) -> dict[str, Any]:
    """JSON Schema (2020-12) of a sheet or a plan, with `$schema` and `$id`.

    Parameters
    ----------
    thing : {"sheet", "plan"}
        What to describe.

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

"""JSON Schema of a quantity: its text with examples of its kind, and its tables."""

from __future__ import annotations

from typing import Any, Literal, get_args

from schemas.kind_units import expectation
from schemas.kinds import Kind
from schemas.quantity_text import MAX_TEXT

__all__ = ["Convention", "Known", "quantity_schema", "table_schema"]

Convention = Literal["rms", "peak", "peak-to-peak", "absolute", "gauge"]
Known = Literal["measured", "computed", "document", "assumed", "not stated"]


def quantity_schema(kind: Kind, *, convention: str | None) -> dict[str, Any]:
    """Return the schema of a field of one kind.

    Parameters
    ----------
    kind : Kind
        The kind.
    convention : str or None
        A word the examples must carry.

    Returns
    -------
    dict
        anyOf text, table forms and, for pure numbers, a number.
    """
    units = ["" if unit == "1" else f" {unit}" for unit in kind.examples]
    suffix = f" {convention}" if convention else ""
    numbers = ("1.234(5)", "1.2", "3.4", "5")
    forms: list[dict[str, Any]] = [
        {
            "type": "string",
            "minLength": 1,
            "maxLength": MAX_TEXT,
            "examples": [f"{number}{unit}{suffix}" for number, unit in zip(numbers, units, strict=False)],
        },
        *table_schema(kind)["anyOf"],
    ]
    if kind.pure:
        forms.append({"type": "number"})
    return {
        "title": kind.name,
        "description": f"{kind.description}; {expectation(kind)}; SI unit {kind.si[0]}",
        "anyOf": forms,
    }


def table_schema(kind: Kind | None) -> dict[str, Any]:
    """Return the JSON Schema of the table forms."""
    said = {
        "known": {"enum": list(get_args(Known)), "description": "how the value is known"},
        "source": {"type": "string", "minLength": 1, "description": "document or record behind the value"},
    }
    kind_schema: dict[str, Any] = {"type": "string"} if kind is None else {"const": kind.name}
    units: dict[str, Any] = {"type": "string", "minLength": 1, "maxLength": 64}
    words: list[str] = list(get_args(Convention) if kind is None else kind.conventions)
    if kind is not None:
        units["examples"] = list(kind.examples)
    full: dict[str, Any] = {
        "value": {"type": "number"},
        "uncertainty": {
            "type": "number",
            "minimum": 0,
            "description": "standard uncertainty in the same unit; 0 means exact",
        },
        "unit": units,
        "kind": kind_schema,
        "text": {"type": "string", "description": "what was written"},
        **said,
    }
    if words:
        full["convention"] = {"enum": words}
    if kind is None or kind.scaled:
        full["scale"] = {"type": "string", "minLength": 1, "maxLength": 40}
    needs = ["value"] if kind is not None and kind.pure else ["value", "unit"]
    named = ["kind"] if kind is None else []
    text = {"type": "string", "minLength": 1, "maxLength": MAX_TEXT}
    return {
        "anyOf": [
            {"type": "object", "properties": full, "required": needs + named, "additionalProperties": False},
            {
                "type": "object",
                "properties": {"quantity": text, "kind": kind_schema, **said},
                "required": ["quantity", *named],
                "additionalProperties": False,
            },
        ]
    }

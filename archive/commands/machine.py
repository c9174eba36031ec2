"""What programs read: JSON and CSV.

Rules: one JSON document on stdout and nothing else; a quantity is {"value", "uncertainty", "unit"}; times are RFC 3339;
what is not known is null. A text cell of CSV never begins like a formula of a spreadsheet; numbers stay numbers.
"""

from __future__ import annotations

import csv
import io
import json
import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import fields, is_dataclass
from datetime import date, datetime
from pathlib import Path
from typing import Any

import click

from schemas.visible_text import visible

__all__ = ["csv_text", "plain", "quantity", "write_csv", "write_json"]

_FORMULA = ("=", "+", "-", "@", "\t", "\r")

Cell = str | int | float | bool | datetime | None


def quantity(
    value: float | None, uncertainty: float | None, unit: str, *, scale: str | None = None
) -> dict[str, Any] | None:
    """Quantity as programs read it, or None if there is no value."""
    if value is None:
        return None
    found: dict[str, Any] = {"value": value, "uncertainty": uncertainty, "unit": unit}
    return found if scale is None else {**found, "scale": scale}


def plain(content: Any) -> Any:
    """Content as JSON holds it: records and tuples unfolded, times as RFC 3339, numbers that are none as null.

    Examples
    --------
    >>> plain({"T": {"value": 0.5, "unit": "K"}, "n": float("nan")})
    {'T': {'value': 0.5, 'unit': 'K', 'uncertainty': None}, 'n': None}
    """
    if hasattr(content, "model_dump"):
        content = content.model_dump(mode="json", exclude_none=True)
    elif hasattr(content, "record") and hasattr(content, "si_unit"):
        content = content.json()
    elif is_dataclass(content) and not isinstance(content, type):
        content = {field.name: getattr(content, field.name) for field in fields(content)}
    elif hasattr(content, "_asdict"):
        content = content._asdict()
    if isinstance(content, Mapping):
        found = {str(name): plain(value) for name, value in content.items()}
        if "value" in found and "unit" in found:
            found.setdefault("uncertainty", None)
        return found
    if isinstance(content, list | tuple | set | frozenset):
        return [plain(value) for value in content]
    if isinstance(content, date):
        return content.isoformat()
    if isinstance(content, float):
        return content if math.isfinite(content) else None
    if content is None or isinstance(content, str | int):
        return content
    return (
        str(content) if isinstance(content, Path) or not hasattr(content, "item") else plain(content.item())
    )


def write_json(content: Any) -> None:
    """Write one JSON document to stdout."""
    # ASCII alone: readable in any code page of a pipe, and no control character gets through.
    click.echo(json.dumps(plain(content), ensure_ascii=True, allow_nan=False, indent=2))


def csv_text(header: Sequence[str], rows: Iterable[Sequence[Cell]]) -> str:
    r"""Comma-separated values by RFC 4180, with text that a spreadsheet does not take for a formula.

    Examples
    --------
    >>> csv_text(["address", "T_K"], [["=1+1", -0.5]])
    "address,T_K\r\n'=1+1,-0.5\r\n"
    """
    stream = io.StringIO(newline="")
    writer = csv.writer(stream, lineterminator="\r\n")
    writer.writerow([_cell(name) for name in header])
    writer.writerows([_cell(cell) for cell in row] for row in rows)
    return stream.getvalue()


def write_csv(header: Sequence[str], rows: Iterable[Sequence[Cell]]) -> None:
    """Write CSV to stdout, with the line ends of the system."""
    click.echo(csv_text(header, rows).replace("\r\n", "\n"), nl=False)


def _cell(cell: Cell) -> str | int | float:
    if cell is None:
        return ""
    if isinstance(cell, bool):
        return "true" if cell else "false"
    if isinstance(cell, int | float):
        return cell if math.isfinite(cell) else ""
    text = cell.isoformat() if isinstance(cell, datetime) else visible(cell)
    return f"'{text}" if text.startswith(_FORMULA) else text

"""A thing of the archive in words: quantities as one text, lists of things as tables, the rest as named lines."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from typing import Any, Final

import click

from archive.commands.numbers import shown_quantity
from archive.commands.terminal import say, styled, table

__all__ = ["describe"]

# Columns of lists that occur in `show`; other lists are written one thing a line.
_COLUMNS: Final[dict[str, tuple[str, ...]]] = {
    "doses": ("name", "at", "act", "counted", "amount", "running_amount", "running_coverage"),
    "channels": ("name", "quantity", "unit", "low", "high", "missing", "thermometer"),
    "results": ("address", "result"),
    "raw_files": ("name", "role", "size", "sha256"),
    "records": ("kind", "address"),
    "sweeps": ("name", "kind", "rows", "cell", "coverage", "temperature_low", "temperature_high"),
    "steps": ("number", "name", "version", "sentence"),
    "outputs": ("name", "quantity", "rows", "result", "description"),
    "inputs": ("role", "address", "instead_of", "because"),
    "sources": ("name", "level", "description"),
    "differences": ("field", "before", "after"),
    "findings": ("severity", "place", "what", "remedy"),
}
_FIELD: Final = re.compile(r"[a-z][a-z0-9_]*")
_HIDDEN: Final = frozenset({"address", "what", "withdrawn", "rests_on_withdrawn"})


def describe(content: Mapping[str, Any]) -> None:
    """Write a thing to stdout.

    Parameters
    ----------
    content : mapping
        As `Archive.show` gives it, with `address` and `what`.
    """
    say(f"{content['address']}: {content['what']}")
    if content.get("withdrawn"):
        click.echo(styled("WITHDRAWN", "red", bold=True) + ": ", nl=False)
        say(str(content["withdrawn"]))
    for each in content.get("rests_on_withdrawn") or ():
        click.echo(styled("RESTS ON SOMETHING WITHDRAWN", "red", bold=True) + ": ", nl=False)
        say(str(each))
    _lines({name: value for name, value in content.items() if name not in _HIDDEN}, "  ")


def _lines(content: Mapping[str, Any], indent: str) -> None:
    content = _with_result(content)
    shown = {
        name: _plan_address(value) for name, value in content.items() if value not in (None, "", [], {}, ())
    }
    width = max((len(name) for name, value in shown.items() if _short(value)), default=0)
    for name, value in shown.items():
        if _short(value):
            # Further lines of a text stand below the first, so that none can pass for a field of its own.
            further = "\n" + " " * (len(indent) + width + 2)
            say(f"{indent}{_words(name):<{width}}  {_text(value).replace(chr(10), further)}")
    for name, value in shown.items():
        if _short(value):
            continue
        say(f"{indent}{_words(name)}:")
        if isinstance(value, Mapping):
            _lines(value, indent + "  ")
        else:
            _list(name, value, indent + "  ")


def _words(name: str) -> str:
    """Return the name of a field as words; file names and the like stay as they are."""
    return name.replace("_", " ") if _FIELD.fullmatch(name) else name


def _plan_address(value: Any) -> Any:
    """Return the address instead of a whole plan, which has an address of its own to be shown by."""
    if isinstance(value, Mapping) and {"name", "revision", "step"} <= set(value):
        return f"{value['name']}.r{value['revision']}"
    return value


def _with_result(content: Mapping[str, Any]) -> Mapping[str, Any]:
    """Content in which value, uncertainty, unit and scale of a result are one text."""
    if "unit" not in content or not ({"value", "verdict"} & set(content)):
        return content
    parts = ("value", "uncertainty", "unit", "scale", "verdict", "convention")
    rest = {name: value for name, value in content.items() if name not in parts}
    verdict = content.get("verdict")
    return {"result": verdict or shown_quantity({"value": None, **content}), **rest}


def _quantity(value: Any) -> bool:
    return isinstance(value, Mapping) and "value" in value and "unit" in value


def _short(value: Any) -> bool:
    if isinstance(value, Mapping):
        return _quantity(value)
    if isinstance(value, Sequence) and not isinstance(value, str):
        return all(not isinstance(each, Mapping | list | tuple) for each in value) and len(value) <= 4
    return True


def _text(value: Any) -> str:
    if isinstance(value, Mapping):
        text = shown_quantity(value)
        source = value.get("source")
        return f"{text} ({source})" if source else text
    if isinstance(value, Sequence) and not isinstance(value, str):
        return ", ".join(_text(each) for each in value)
    if isinstance(value, bool):
        return "yes" if value else "no"
    return f"{value:.6g}" if isinstance(value, float) else "-" if value is None else str(value)


def _list(name: str, values: Sequence[Any], indent: str) -> None:
    if not all(isinstance(value, Mapping) for value in values):
        for value in values:
            say(f"{indent}{_text(value)}".replace("\n", f"\n{indent}  "))
        return
    rows = [_with_result(value) for value in values]
    columns = [
        column for column in _COLUMNS.get(name, ()) if any(row.get(column) is not None for row in rows)
    ]
    if columns:
        table(
            [column.replace("_", " ") for column in columns],
            [[_text(row.get(column)) for column in columns] for row in rows],
        )
        return
    for row in rows:
        _lines(row, indent)
        say()

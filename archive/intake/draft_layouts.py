"""Layouts of a drafted sheet: files with one dialect and one set of headings share a layout."""

from __future__ import annotations

import json
import re
from collections.abc import Mapping, Sequence
from typing import Final

from archive.intake.guess import ColumnGuess, TableGuess
from schemas.kind_units import accepted_unit
from schemas.kinds import KINDS
from schemas.sweep import Dialect

__all__ = ["BLANK", "GUESSED", "layout_lines", "layouts_of"]

GUESSED: Final = "# guessed:"
BLANK: Final = "# to fill in:"

_NOT_IN_A_NAME: Final = re.compile(r"[^a-z0-9]+")
_SHOWN_KINDS: Final = 6


def layouts_of(guesses: Mapping[str, TableGuess]) -> list[list[str]]:
    """Files grouped by dialect and headings, in the order in which each kind of table first occurs."""
    groups: dict[tuple[object, ...], list[str]] = {}
    for file, guess in guesses.items():
        headings = tuple((column.heading, column.unit, column.kind) for column in guess.columns)
        groups.setdefault((guess.dialect, headings), []).append(file)
    return list(groups.values())


def layout_lines(number: int, members: Sequence[str], guesses: Mapping[str, TableGuess]) -> list[str]:
    """Lines of one layout: its dialect, then one table a channel."""
    name = f"layout-{number}"
    guess = guesses[members[0]]
    lines = [f"# {name}: {', '.join(members)}", *_dialect(name, guess)]
    names: set[str] = set()
    sentinels = _sentinels(members, guesses)
    for column in guess.columns:
        channel = _channel_name(column, names)
        names.add(channel)
        lines += _channel(name, channel, column, guess, sentinels.get(column.number, ()))
    return lines


def _dialect(name: str, guess: TableGuess) -> list[str]:
    lines = [f"[layout.{name}.dialect]"]
    plain = Dialect()
    stated = guess.dialect.model_dump()
    for field, value in stated.items():
        if value is None or field in ("time_zone", "fold", "names"):
            continue
        if value == getattr(plain, field) and (field not in guess.why or field == "comment"):
            continue
        why = guess.why.get(
            field, "the time stamps have this form" if field == "time_format" else "so the file is written"
        )
        lines.append(f"{field} = {_toml(value)}  {GUESSED} {why}")
    if guess.dialect.comment is None:
        lines.append("# comment: no line begins with a usual comment mark; the default # is not in the way")
    times = [column for column in guess.columns if column.kind == "time"]
    if any(column.needs_zone for column in times):
        lines.append(
            f'# time_zone = ""  {BLANK} zone of these time stamps, which tell none, such as Europe/Helsinki'
        )
    if times and guess.dialect.time_format is None:
        forms = ", ".join(dict.fromkeys(form for column in times for form in column.time_formats))
        lines.append(f'# time_format = ""  {BLANK} which one is meant: {forms}')
    return [*lines, ""]


def _toml(value: object) -> str:
    return json.dumps(value, ensure_ascii=False)


def _sentinels(members: Sequence[str], guesses: Mapping[str, TableGuess]) -> dict[int, tuple[str, ...]]:
    """Words for `no value` by column, from every file of a layout."""
    found: dict[int, dict[str, None]] = {}
    for member in members:
        for column in guesses[member].columns:
            found.setdefault(column.number, {}).update(dict.fromkeys(column.sentinels))
    return {number: tuple(words) for number, words in found.items() if words}


def _channel_name(column: ColumnGuess, taken: set[str]) -> str:
    """Name of a channel from its heading, in the letters that a channel may have."""
    base = _NOT_IN_A_NAME.sub("_", column.name.lower()).strip("_")
    if column.kind == "time":
        base = base if base.isascii() and base else "time"
    if not base or not base[0].isalpha():
        base = f"column_{column.number}"
    base = base[:60]
    return base if base not in taken else f"{base}_{column.number}"


def _channel(
    layout: str, name: str, column: ColumnGuess, guess: TableGuess, sentinels: Sequence[str]
) -> list[str]:
    span = "" if column.first is None else f"; first value {column.first}, last {column.last}"
    if column.kind == "text":
        return [
            f"# column {column.number}, {_toml(column.heading)}, holds words and is no channel ({column.why})",
            "",
        ]
    lines = [
        f"[layout.{layout}.channels.{name}]",
        f"column = {_column(column, guess)}  {GUESSED} {column.why}{span}",
    ]
    if column.kind == "time":
        return [*lines, f'quantity = "instant"  {GUESSED} a column of time stamps', ""]
    kinds = _kinds(column.unit)
    if len(kinds) == 1:
        lines.append(f'quantity = "{kinds[0]}"  {GUESSED} the only quantity with this unit')
    else:
        hint = (
            f"with this unit: {', '.join(kinds[:_SHOWN_KINDS])}"
            if kinds
            else "such as period, resistance, pressure"
        )
        lines.append(f'quantity = ""  {BLANK} {hint}')
    if column.unit is None:
        lines.append(f'# unit = ""  {BLANK} the file names none')
    else:
        doubt = "" if kinds else "; it is not a unit that Stillroom knows, so correct it"
        lines.append(f"unit = {_toml(column.unit)}  {GUESSED} as it stands in the file{doubt}")
    if "temperature" in kinds:
        lines.append(f'# scale = ""  {BLANK} if this is a temperature: ITS-90, PLTS-2000, ...')
    if sentinels:
        lines.append(f"sentinels = {_toml(list(sentinels))}  {GUESSED} these cells seem to mean `no value`")
    lines.append(
        f'# uncertainty = ""  {BLANK} standard uncertainty of one reading, such as "2 ns" or "0.01 %"'
    )
    return [*lines, ""]


def _column(column: ColumnGuess, guess: TableGuess) -> str:
    same = [each for each in guess.columns if each.heading == column.heading]
    return str(column.number) if column.heading is None or len(same) > 1 else _toml(column.heading)


def _kinds(unit: str | None) -> list[str]:
    """Quantity kinds that take a unit."""
    found = []
    for name in KINDS if unit else ():
        try:
            accepted_unit(unit or "", name)
        except ValueError:
            continue
        found.append(name)
    return found

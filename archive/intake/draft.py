"""Draft of a cooldown sheet: what the files of a folder show, and blanks for what only a person knows.

Rules: a guess stands with its reason beside it; what no file tells is a blank, never a likely value; a sheet that is
there is never overwritten.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Final, get_args

from archive.errors import ArchiveError, BadRequest
from archive.intake.draft_layouts import BLANK, GUESSED, layout_lines, layouts_of
from archive.intake.folder import SHEET_NAME
from archive.intake.guess import TableGuess, guess_table
from archive.intake.paths import folder_files, path_inside
from archive.intake.sources import is_array_source
from schemas.cooldown import CooldownSheet
from schemas.gas import GasEnd
from schemas.sweep import SweepKind

__all__ = ["Draft", "draft_text", "write_draft"]

_NAME_CHARACTERS: Final = frozenset("ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789_-")
_NO_CONTROLS: Final = dict.fromkeys((*range(0x20), *range(0x7F, 0xA0)), " ")

Progress = Callable[[str], None]


@dataclass(frozen=True)
class Draft:
    """Text of a drafted sheet, with counts of tables and blanks, and what is to be looked at."""

    text: str
    tables: int
    blanks: int
    doubts: tuple[str, ...]


def write_draft(folder: Path, *, progress: Progress = lambda sentence: None) -> tuple[Path, Draft]:
    """Path of the sheet that was written into a folder, and the draft.

    Parameters
    ----------
    folder : Path
        Folder with the files of one cooldown.
    progress : callable
        Told what is being read.

    Raises
    ------
    BadRequest
        If there is no such folder, no file in it, or a sheet already.
    """
    path = folder / SHEET_NAME
    sheet_there = BadRequest(
        "there is a sheet already; it is not overwritten",
        file=str(path),
        remedy="go on with stillroom check, or move it away first",
    )
    if path.exists() or path.is_symlink():
        raise sheet_there
    draft = draft_text(folder, progress=progress)
    try:
        with path.open("x", encoding="utf-8", newline="\n") as stream:
            stream.write(draft.text)
    except FileExistsError:
        raise sheet_there from None
    return path, draft


def draft_text(folder: Path, *, progress: Progress = lambda sentence: None) -> Draft:
    """Draft of the sheet of a folder; nothing is written.

    Parameters
    ----------
    folder : Path
        Folder with the files of one cooldown.
    progress : callable
        Told what is being read.

    Raises
    ------
    BadRequest
        If there is no such folder, or no file in it.
    """
    if not folder.is_dir():
        raise BadRequest(
            "there is no such folder", file=str(folder), remedy="name the folder that holds the data files"
        )
    guesses: dict[str, TableGuess] = {}
    others: dict[str, str] = {}
    for name in sorted(folder_files(folder)):
        if name == SHEET_NAME or any(part.startswith(".") for part in name.split("/")):
            continue
        progress(f"reading {name}")
        _look_at(folder, name, guesses, others)
    if not guesses and not others:
        raise BadRequest(
            "there are no files in this folder",
            file=str(folder),
            remedy="copy the cooldown's files there first",
        )
    layouts = layouts_of(guesses)
    lines = [
        *_head(folder, guesses),
        *_gas_end(),
        *(
            line
            for number, members in enumerate(layouts, 1)
            for line in layout_lines(number, members, guesses)
        ),
        *_sweeps(layouts, guesses),
        *_other_files_note(others),
    ]
    # Whys and file names carry text from files; a control character would end a comment or break the TOML.
    text = "\n".join(line.translate(_NO_CONTROLS) for line in lines) + "\n"
    doubts = tuple(f"{name}: {doubt}" for name, guess in guesses.items() for doubt in guess.doubts)
    return Draft(text, len(guesses), text.count(BLANK) - _EXPLAINED, doubts)


def _look_at(folder: Path, name: str, guesses: dict[str, TableGuess], others: dict[str, str]) -> None:
    if not _writable(name):
        shown = name.encode("utf-8", "backslashreplace").decode()
        others[shown] = "its name cannot stand in a sheet; rename it if it is to be kept"
        return
    if is_array_source(name):
        others[name] = "a NumPy or HDF5 file: describe its columns as a sweep of its own if it holds one"
        return
    path = path_inside(folder, name)
    if isinstance(path, str):
        others[name] = f"not looked at: it {path}"
        return
    try:
        guess = guess_table(path)
    except (ArchiveError, OSError, ValueError) as error:
        reason = error.what if isinstance(error, ArchiveError) else str(error)
        others[name] = f"not taken for a table: {reason}"
        return
    if any(column.kind == "number" for column in guess.columns):
        guesses[name] = guess
    else:
        others[name] = "not taken for a table: no column of it holds numbers"


def _writable(name: str) -> bool:
    """Whether a file's name can stand in a sheet."""
    try:
        name.encode("utf-8")
    except UnicodeEncodeError:
        return False
    return "\\" not in name and not any(ord(sign) in _NO_CONTROLS for sign in name)


def _quoted(text: str) -> str:
    """Text as a TOML basic string (JSON's escapes are TOML's, but for DEL)."""
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007f")


def _quoted_list(words: Iterable[str]) -> str:
    """Words as a TOML array."""
    return f"[{', '.join(_quoted(word) for word in words)}]"


_HEAD: Final = f"""# Draft of a cooldown sheet, made from the files in this folder.
#
# Two marks stand behind what needs a person:
#   {GUESSED} ...    read off the files, with the reason; look at it, correct it, remove the mark
#   {BLANK} ...   no file tells it; a line that begins with "# " counts once that is removed
# `stillroom check` on this folder names every line that is still open or wrong.
# `stillroom schema` describes every field, also those that are not in this draft.
"""
_EXPLAINED: Final = _HEAD.count(BLANK)


def _head(folder: Path, guesses: dict[str, TableGuess]) -> list[str]:
    name = folder.resolve().name
    spans = [(guess.time_span, file) for file, guess in guesses.items() if guess.time_span is not None]
    named = bool(name) and len(name) <= 64 and name[0] not in "_-" and set(name) <= _NAME_CHARACTERS
    outcomes = " or ".join(get_args(CooldownSheet.model_fields["outcome"].annotation))
    lines = [*_HEAD.splitlines(), "", 'format = "stillroom-cooldown/1"']
    if named:
        lines.append(f"name = {_quoted(name)}  {GUESSED} the name of this folder")
    else:
        lines.append(f'name = ""  {BLANK} such as 2026-03; letters, digits, - and _')
    lines.append(f'cryostat = ""  {BLANK} the name of its record, such as DR-1')
    lines += _span_lines(spans)
    lines += [
        f'# time_zone = ""  {BLANK} zone of the laboratory, such as Europe/Helsinki',
        f'operators = []  {BLANK} by role, such as ["graduate student"]',
        f'# purpose = ""  {BLANK} one or two sentences',
        f'outcome = ""  {BLANK} {outcomes}',
        f'temperature_scale = ""  {BLANK} scale of every temperature here that names no other, such as ITS-90',
        f'# cell = ""  {BLANK} the name of its record, if the run had one',
        f'# sample = ""  {BLANK} the helium of the run: the name of its record',
        "",
        "# Records of cryostat, cell, substrate, sample, thermometers and calibrations that no archive holds yet go into",
        "# tables [[record.cryostat]], [[record.cell]], ...; dosers, gauges and doses into [[doser]], [[gauge]], [[dose]].",
        "",
    ]
    return lines


def _span_lines(spans: Sequence[tuple[tuple[float, float] | None, str]]) -> list[str]:
    known = [(span, file) for span, file in spans if span is not None]
    if not known:
        return [
            f'begin = ""  {BLANK} with its offset and no quotes, such as 2026-03-02T09:10:00+02:00',
            f'end = ""  {BLANK} the same (or `undated` with the reason why neither is known)',
        ]
    first, begin_file = min((span[0], file) for span, file in known)
    last, end_file = max((span[1], file) for span, file in known)
    return [
        f"begin = {_instant(first)}  {GUESSED} the first time stamp, in {begin_file}; the cooldown began no later",
        f"end = {_instant(last)}  {GUESSED} the last time stamp, in {end_file}; it ended no earlier",
    ]


def _instant(seconds: float) -> str:
    return datetime.fromtimestamp(seconds, UTC).isoformat(timespec="seconds").replace("+00:00", "Z")


def _gas_end() -> list[str]:
    states = ", ".join(get_args(GasEnd.model_fields["state"].annotation))
    return [
        "[gas_end]",
        f'state = ""  {BLANK} where the gas is now: {states}',
        f'# valve = ""  {BLANK} valve of the cell and its state, such as V7 open to ballast',
        "",
    ]


def _sweeps(layouts: Sequence[Sequence[str]], guesses: dict[str, TableGuess]) -> list[str]:
    layout_of = {file: number for number, members in enumerate(layouts, 1) for file in members}
    kinds = ", ".join(get_args(SweepKind))
    lines = []
    for number, (file, guess) in enumerate(guesses.items(), 1):
        span = guess.time_span
        when = f"; from {_instant(span[0])} to {_instant(span[1])}" if span is not None else ""
        lines += [
            "[[sweep]]",
            f'name = "s{number:03d}"  {GUESSED} files in the order of their names',
            f'kind = ""  {BLANK} {kinds}',
            f"files = {_quoted_list([file])}  {GUESSED} one sweep a file; {guess.rows} rows{when}",
            f'layout = "layout-{layout_of[file]}"  {GUESSED} from its dialect and headings',
            f'# after_dose = ""  {BLANK} last dose before it; or empty_cell = true',
            f'# thermometer = ""  {BLANK} the channel whose temperature counts',
            *(f"{GUESSED} {doubt}" for doubt in guess.doubts),
            "",
        ]
    return lines


def _other_files_note(others: dict[str, str]) -> list[str]:
    if not others:
        return []
    return [
        "# Files that are not described above. Those to be kept go into `other_files` at the top of this sheet:",
        *(f"#   {_quoted(name)}: {reason}" for name, reason in others.items()),
    ]

"""The archive that a command works on, and the options that many commands share."""

from __future__ import annotations

import os
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from archive.commands.terminal import note
from archive.errors import told

if TYPE_CHECKING:
    from archive.lab import Archive

__all__ = [
    "archive_option",
    "archive_or_none",
    "jobs_option",
    "json_option",
    "open_archive",
    "require_address",
    "strict_option",
]


def _inherited(ctx: click.Context, parameter: click.Parameter, value: Path | None) -> Path | None:
    """Take what stands before the name of the command when nothing stands after it."""
    if value is None and ctx.parent is not None:
        found: Path | None = ctx.find_root().params.get("archive_dir")
        return found
    return value


def archive_option(function: Callable[..., Any]) -> Callable[..., Any]:
    """Add `--archive DIR`, which may stand before or after the name of the command."""
    return click.option(
        "--archive",
        "archive_dir",
        type=click.Path(path_type=Path),
        metavar="DIR",
        callback=_inherited,
        help="The archive; else STILLROOM_ARCHIVE, else the current folder and its parents.",
    )(function)


def json_option(function: Callable[..., Any]) -> Callable[..., Any]:
    """Add `--json`."""
    return click.option("--json", "as_json", is_flag=True, help="Write one JSON document instead of text.")(
        function
    )


def strict_option(function: Callable[..., Any]) -> Callable[..., Any]:
    """Add `--strict`."""
    return click.option(
        "--strict", is_flag=True, help="Exit with 1 if there are warnings that nobody waived."
    )(function)


def jobs_option(function: Callable[..., Any]) -> Callable[..., Any]:
    """Add `--jobs N` and `--executor dask://HOST:PORT`."""
    function = click.option(
        "--executor",
        metavar="ADDRESS",
        help="dask://HOST:PORT of a running cluster whose workers compute instead; they must see the archive.",
    )(function)
    return click.option(
        "--jobs",
        type=click.IntRange(1, 1024),
        default=1,
        show_default=True,
        metavar="N",
        help="Processes that compute; what comes out does not depend on it.",
    )(function)


def open_archive(folder: Path | None) -> Archive:
    """Archive of a folder, or the one that is found; what opening put in order is told on stderr.

    Raises
    ------
    NotAnArchive
        If there is none.
    """
    from archive.lab import Archive

    lab = Archive.open(folder)
    say_notices(lab)
    return lab


def say_notices(lab: Archive) -> None:
    """Tell on stderr what the archive has to say beside its answers, once."""
    for sentence in lab.notices:
        note(f"note: {sentence}")
    lab.notices.clear()


def require_address(text: str) -> None:
    """Refuse a text that is no address, before an archive is opened for it.

    Raises
    ------
    BadRequest
        With the forms that an address has.
    """
    from schemas.address import parse_address

    with told("ADDRESS"):
        parse_address(text)


def archive_or_none(folder: Path | None) -> Archive | None:
    """Archive of a folder, or None when none was named and none is found."""
    from archive.errors import NotAnArchive

    try:
        return open_archive(folder)
    except NotAnArchive:
        if folder is not None or os.environ.get("STILLROOM_ARCHIVE"):
            raise
        return None

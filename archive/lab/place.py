"""Where an archive lies: making its folder, taking back what was half made, finding it again."""

from __future__ import annotations

import glob
import os
from contextlib import suppress
from pathlib import Path

from archive.errors import NotAnArchive
from archive.index import Index
from archive.intake.settings import SETTINGS_NAME, Settings
from archive.store.durable import write_whole
from archive.store.journal import JOURNAL_NAME

__all__ = ["find_root", "made", "unmade"]

_PARTS = ("sealed", "staging")


def made(root: Path, settings: Settings, text: str) -> None:
    """Make what an archive consists of; its settings last, since they are what it is known by."""
    for part in _PARTS:
        (root / part).mkdir()
    Index.create(settings.index_address(root)).close()
    write_whole(root / SETTINGS_NAME, text.encode())


def unmade(root: Path, settings: Settings) -> None:
    """Take away what `made` left, in a folder that was empty before; only what lies in that folder."""
    with suppress(OSError):
        for part in _PARTS:
            if (root / part).is_dir():
                (root / part).rmdir()
        (root / JOURNAL_NAME).unlink(missing_ok=True)
        index = Path(settings.index_address(root).removeprefix("sqlite:///"))
        for path in root.glob(f"{glob.escape(index.name)}*") if index.parent == root else ():
            path.unlink()


def find_root(start: Path | None) -> Path:
    """Folder of the archive: the one named, else that of `STILLROOM_ARCHIVE`, else this folder or a parent.

    Raises
    ------
    NotAnArchive
        If there is none.
    """
    if start is None:
        named = os.environ.get("STILLROOM_ARCHIVE")
        start = Path(named) if named else None
    if start is not None:
        if not (start / SETTINGS_NAME).is_file():
            raise NotAnArchive(
                "there is no archive in this folder",
                file=str(start),
                remedy="make one with: stillroom init DIR",
            )
        return start.resolve()
    here = Path.cwd()
    for folder in (here, *here.parents):
        if (folder / SETTINGS_NAME).is_file():
            return folder.resolve()
    raise NotAnArchive(
        "there is no archive in this folder or above it",
        file=str(here),
        remedy="name it with --archive DIR or STILLROOM_ARCHIVE, or make one with: stillroom init DIR",
    )

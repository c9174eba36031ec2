"""Where an archive lies: making its folder, taking back what was half made, finding it again."""

from __future__ import annotations

import glob
import os
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from archive.errors import ArchiveError, BadRequest, NotAnArchive
from archive.index import Index
from archive.intake.settings import SETTINGS_NAME, Settings
from archive.store.durable import LOCK_NAME, STAGING_SUFFIX, make_folder, write_whole
from archive.store.journal import JOURNAL_NAME, Journal

__all__ = ["find_root", "made", "make_root", "unmade"]

_PARTS = ("sealed", "staging")


def made(root: Path, settings: Settings, text: str) -> None:
    """Make what an archive consists of; its settings last, since they are what it is known by."""
    with _told(root):
        for part in _PARTS:
            (root / part).mkdir()
        Index.create(settings.index_address(root)).close()
        write_whole(root / SETTINGS_NAME, text.encode())


def make_root(root: Path) -> None:
    """Make the folder of a new archive, so that its name lasts.

    Raises
    ------
    BadRequest
        If it holds something already that is not what an interrupted attempt to make an archive left.
    ArchiveError
        If it cannot be made.
    """
    if root.exists() and (not root.is_dir() or any(not _left_by_an_attempt(path) for path in root.iterdir())):
        raise BadRequest("this folder is not empty", file=str(root), remedy="name a new or an empty folder")
    with _told(root):
        make_folder(root)


def _left_by_an_attempt(path: Path) -> bool:
    """Whether `made` may have left this: nothing that was archived, since the settings come last."""
    if path.name in _PARTS:
        return path.is_dir() and not any(path.iterdir())
    if path.name == JOURNAL_NAME:
        last = Journal(path.parent).last()
        return last is None or last.number == 1
    if path.name.startswith("index.sqlite3"):
        return (path.parent / _PARTS[0]).is_dir()
    return path.name == LOCK_NAME or path.match(f".{SETTINGS_NAME}.*{STAGING_SUFFIX}")


@contextmanager
def _told(root: Path) -> Iterator[None]:
    """Tell a failed write as a sentence."""
    try:
        yield
    except OSError as error:
        raise ArchiveError(
            "the archive cannot be made here",
            file=str(error.filename or root),
            found=error.strerror,
            remedy="make room, or correct the permissions of the folder",
        ) from error


def unmade(root: Path, settings: Settings) -> None:
    """Take away what `made` left, in a folder that was empty before; only what lies in that folder."""
    with suppress(OSError):
        (root / SETTINGS_NAME).unlink(missing_ok=True)  # first: without them it is no archive
        for part in _PARTS:
            if (root / part).is_dir():
                (root / part).rmdir()
        (root / JOURNAL_NAME).unlink(missing_ok=True)
        index = Path(settings.index_address(root).removeprefix("sqlite:///"))
        for path in root.glob(f"{glob.escape(index.name)}*") if index.parent == root else ():
            path.unlink()
        for path in root.glob(f".{SETTINGS_NAME}.*{STAGING_SUFFIX}"):
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

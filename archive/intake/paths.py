"""Files of a cooldown folder: a path in a sheet stays inside it, links included, and is spelled as on disk."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path, PurePosixPath

__all__ = ["folder_files", "path_inside"]


def folder_files(folder: Path) -> Iterator[str]:
    """Names of the files below a folder, relative with forward slashes, sorted; hidden ones are left out.

    Links that lead out of the folder are listed too; before such a file is opened, `path_inside` has to be asked.
    """
    for path in sorted(folder.rglob("*")):
        relative = path.relative_to(folder)
        if path.is_file() and not any(part.startswith(".") for part in relative.parts):
            yield relative.as_posix()


def path_inside(folder: Path, name: str) -> Path | str:
    """Path of a file that a sheet names, or why it cannot be read, as the rest of a sentence."""
    pure = PurePosixPath(name)
    if pure.is_absolute() or ".." in pure.parts or ":" in name.partition("/")[0]:
        return "leads out of the cooldown folder"
    if str(pure) != name:
        # Two spellings of one path would be two raw files.
        return f"is spelled in a roundabout way; write {pure}"
    return _file_at(folder.joinpath(*pure.parts), folder)


def _file_at(path: Path, folder: Path) -> Path | str:
    try:
        resolved = path.resolve(strict=True)
    except (OSError, RuntimeError, ValueError):
        # RuntimeError: a link that leads to itself, before Python 3.13; ValueError: NUL, or a lone surrogate.
        return "is not there"
    if not resolved.is_relative_to(folder.resolve()):
        return "is a link that leads out of the cooldown folder"
    if not resolved.is_file():
        return "is not a file"
    # On a file system that folds case or normal forms, a sheet could name one file in two spellings.
    for part in (path, *path.parents):
        if part == folder:
            break
        if part.name not in {entry.name for entry in part.parent.iterdir()}:
            return "is spelled differently on disk"
    return path

"""Reports brought into a folder: each file whole or not at all, and a failure names what stands there already."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from pathlib import Path

from archive.errors import BadRequest
from archive.store.durable import write_whole

__all__ = ["manifest_digest", "written_reports"]


def manifest_digest(files: Mapping[str, bytes]) -> str:
    """SHA-256 of the list of files by name, one line each: digest, two spaces, name, as `sha256sum` writes it.

    Examples
    --------
    >>> manifest_digest({"a.txt": b""}) == manifest_digest({"a.txt": b"x"})
    False
    """
    lines = (f"{hashlib.sha256(files[name]).hexdigest()}  {name}\n" for name in sorted(files))
    return hashlib.sha256("".join(lines).encode()).hexdigest()


def written_reports(files: Mapping[str, bytes], target: Path) -> list[Path]:
    """Paths of reports that were written.

    Parameters
    ----------
    files : mapping of str to bytes
        Contents by name below the folder.
    target : Path
        The folder; made if need be. A report made before is replaced.

    Raises
    ------
    BadRequest
        If one cannot be written; it names those that were, and those that were not.
    """
    written: list[Path] = []
    for name, content in files.items():
        path = target / name
        try:
            path.parent.mkdir(parents=True, exist_ok=True)
            write_whole(path, content, replace=True)
        except BadRequest as problem:
            raise BadRequest(
                f"{problem.what}; {_told(written, list(files))}",
                file=problem.file,
                remedy="free space, or correct the permissions of the folder, then write the reports again",
            ) from problem
        except OSError as problem:
            raise BadRequest(
                f"the folder cannot be made: {problem.strerror}; {_told(written, list(files))}",
                file=str(path.parent),
                remedy="name another folder, or correct the permissions of the one above",
            ) from problem
        written.append(path)
    return written


def _told(written: list[Path], names: list[str]) -> str:
    if not written:
        return "none of the files was written"
    done = ", ".join(names[: len(written)])
    return f"written before it: {done}; not written: {', '.join(names[len(written) :])}"

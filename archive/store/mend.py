"""Damaged or lost sealed files brought back from another copy of the archive, byte for byte, or not at all.

Rules
-----
* What is brought back has the digest that the index records; a copy that has another is not used.
* The damaged file is set aside, never deleted: it may be all that is left of something.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from pathlib import Path

from archive.errors import BadRequest
from archive.store import durable
from archive.store.interface import SealedFile
from archive.store.local import LocalStore
from archive.store.sealed import writing

__all__ = ["SET_ASIDE", "Mended", "mended"]

SET_ASIDE = "set-aside"
"""Folder in the archive for damaged files that were replaced."""

_BLOCK = 1 << 20


@dataclass(frozen=True)
class Mended:
    """What became of one damaged file.

    Attributes
    ----------
    key : str
    mended : bool
    why : str
        Where it came from, or why it could not be brought back.
    set_aside : str or None
        Path below the archive where the damaged file is now.
    """

    key: str
    mended: bool
    why: str
    set_aside: str | None = None


def mended(
    store: LocalStore,
    wanted: Iterable[SealedFile],
    other: Path,
    *,
    progress: Callable[[int, int, str], None] | None = None,
) -> list[Mended]:
    """Return what became of each file that is to be brought back; the caller holds the archive's lock.

    Parameters
    ----------
    store : LocalStore
        Where they are to stand.
    wanted : iterable of SealedFile
        What was recorded of them.
    other : Path
        Another archive, a mirror, or the folder of its sealed files.
    progress : callable, optional
        Told ``(done, of, key)`` before each.

    Raises
    ------
    BadRequest
        If there are no sealed files in `other`, or it is this archive itself.

    Notes
    -----
    Each file is brought back on its own: copied into staging, synced, read back; then the damaged one gets a second name, and
    the copy takes its first. Stopped anywhere, one or the other stands there, and mending again goes on.
    """
    folder = other / "sealed" if (other / "sealed").is_dir() else other
    if not folder.is_dir():
        raise BadRequest(
            "there is no copy of an archive here", file=str(other), expected="a folder with `sealed` in it"
        )
    if folder.resolve() == (store.root / "sealed").resolve():
        raise BadRequest("this is the archive itself", file=str(other), remedy="name another copy of it")
    files = list(wanted)
    found = []
    for done, sealed in enumerate(files):
        if progress is not None:
            progress(done, len(files), sealed.key)
        found.append(_one(store, sealed, folder / store.path(sealed.key).relative_to(store.root / "sealed")))
    if progress is not None:
        progress(len(files), len(files), "")
    return found


def _one(store: LocalStore, sealed: SealedFile, copy: Path) -> Mended:
    if copy.is_symlink() or not copy.is_file():
        return Mended(sealed.key, mended=False, why=f"there is none in the copy: {copy}")
    if durable.file_digest(copy) != (sealed.sha256, sealed.size):
        return Mended(
            sealed.key, mended=False, why=f"the copy has other bytes than those that were sealed: {copy}"
        )
    final = store.path(sealed.key)
    with writing(final):
        staged = durable.staging_path(store.root, sealed.key)
        try:
            with copy.open("rb") as source, staged.open("xb") as target:
                while block := source.read(_BLOCK):
                    target.write(block)
            durable.settle(staged)
            if durable.file_digest(staged) != (sealed.sha256, sealed.size):
                return Mended(
                    sealed.key, mended=False, why="the disk gave back other bytes than it was given"
                )
            aside = durable.set_aside(final, store.root / SET_ASIDE / final.parent.name, below=store.root)
            durable.take_place(staged, final, below=store.root)
        finally:
            durable.discard(staged)
    place = None if aside is None else aside.relative_to(store.root).as_posix()
    return Mended(sealed.key, mended=True, why=f"from {copy}", set_aside=place)

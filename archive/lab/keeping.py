"""Keeping an archive alive: a mirror of it in another place, and damage mended from one."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Iterator
from contextlib import closing, contextmanager, nullcontext
from dataclasses import dataclass
from pathlib import Path

from archive.errors import ArchiveError, BadRequest
from archive.index import Index
from archive.intake.settings import SETTINGS_NAME, Settings, read_settings, settings_without_index
from archive.lab.reducing import rebuilt_index
from archive.store.durable import (
    LOCK_NAME,
    STAGING_SUFFIX,
    archive_lock,
    discard,
    make_folder,
    put_in_place,
    write_whole,
)
from archive.store.interface import Damage, SealedFile
from archive.store.journal import JOURNAL_NAME, Journal
from archive.store.local import LocalStore, open_store
from archive.store.mend import Mended, mended
from archive.store.mirror import Copied, mirrored
from archive.store.staging import sweep_staging

__all__ = ["MirrorOutcome", "mend", "mirror"]

Progress = Callable[[int, int, str], None]


@dataclass(frozen=True)
class MirrorOutcome:
    """What a mirror holds now.

    Attributes
    ----------
    target : Path
    copied : tuple of str
        Keys that were copied this time.
    present : int
        How many were there already.
    damage : tuple of Damage
    index : str
        How the mirror's index came to be.
    swept : tuple of str
        What a mirror that was stopped had left there, as sentences.
    """

    target: Path
    copied: tuple[str, ...]
    present: int
    damage: tuple[Damage, ...]
    index: str
    swept: tuple[str, ...] = ()


def mend(
    store: LocalStore, wanted: Iterable[SealedFile], other: Path, *, progress: Progress | None = None
) -> list[Mended]:
    """What became of each damaged or missing file; see `archive.store.mend.mended`."""
    return mended(store, wanted, other, progress=progress)


def mirror(
    store: LocalStore,
    settings: Settings,
    recorded: Callable[[], dict[str, SealedFile]],
    target: Path,
    *,
    snapshot: Callable[[Path], bool],
    entered: Callable[[str], None],
    thorough: bool = False,
    progress: Progress | None = None,
) -> MirrorOutcome:
    """Bring a mirror of an archive up to date.

    Parameters
    ----------
    store : LocalStore
        Sealed files of the archive.
    settings : Settings
        Its settings; the mirror's index is always a SQLite file of its own.
    recorded : callable
        Gives the sealed files that the index records, now.
    target : Path
        Folder of the mirror: new, empty, or a mirror that was made before.
    snapshot : callable
        Copies the index into a new file, as it is at one moment; False if this index cannot be copied so.
    entered : callable
        Enters in the journal of the archive, under its lock, what was mirrored; not called where nothing can be written.
    thorough : bool
        Whether what is there already is read again.
    progress : callable, optional

    Raises
    ------
    BadRequest
        If the target holds something that is no mirror of this archive.
    ArchiveError
        If it cannot be written to.

    Notes
    -----
    Most files are copied while others may write; then, under the lock of the archive, what came meanwhile, the index, the
    journal and the settings, so that all of them are of one moment. Stopped anywhere, the next call goes on.
    """
    target = target.resolve()
    if target == store.root.resolve() or store.root.resolve() in target.parents:
        raise BadRequest(
            "a mirror cannot lie in the archive itself", file=str(target), remedy="name another disk"
        )
    with _told(target):
        return _mirror(
            store, settings, recorded, target, snapshot=snapshot, entered=entered, thorough=thorough, progress=progress,
        )  # fmt: skip


@contextmanager
def _told(target: Path) -> Iterator[None]:
    """Tell a failed write as a sentence."""
    try:
        yield
    except OSError as error:
        raise ArchiveError(
            "the mirror could not be written to",
            file=str(error.filename or target),
            found=error.strerror,
            remedy="make room or mend the disk there, then mirror again; it goes on from there",
        ) from error


def _mirror(
    store: LocalStore,
    settings: Settings,
    recorded: Callable[[], dict[str, SealedFile]],
    target: Path,
    *,
    snapshot: Callable[[Path], bool],
    entered: Callable[[str], None],
    thorough: bool,
    progress: Progress | None,
) -> MirrorOutcome:
    _fit_for_mirror(target, settings)
    (target / "sealed").mkdir(parents=True, exist_ok=True)
    (target / "staging").mkdir(exist_ok=True)
    with archive_lock(target):
        swept = (*sweep_staging(target), *_swept_beside(target))
        copy = open_store(target)
        first = mirrored(store, recorded(), copy, thorough=thorough, progress=progress)
        # What may only be read has no writer to keep out.
        writable = os.access(store.root, os.W_OK)
        with archive_lock(store.root) if writable else nullcontext():
            last = mirrored(store, recorded(), copy)
            how = _copied_index(copy, snapshot)
            if writable:
                # Before the journal is copied, so that the mirror itself tells when it was made.
                many, faults = len(first.copied) + len(last.copied), len(_once(first, last))
                entered(f"{many} sealed files copied, {first.present} there before, {faults} faults")
            _copied_journal(store.root, target)
        # A mirror never writes to the database of the archive.
        write_whole(target / SETTINGS_NAME, settings_without_index(store.root), replace=True)
    if how == "made anew":
        rebuilt_index(target, read_settings(target).index_address(target), copy)
    copied = (*first.copied, *last.copied)
    return MirrorOutcome(target, copied, first.present, _once(first, last), how, swept)


def _swept_beside(target: Path) -> list[str]:
    """Remove what was to become the mirror's journal or settings, and return a sentence about each."""
    left = [
        path
        for name in (JOURNAL_NAME, SETTINGS_NAME)
        for path in sorted(target.glob(f".{name}.*{STAGING_SUFFIX}"))
        if path.is_file()
    ]
    for path in left:
        discard(path)
    return [f"{path}: the writing of it had not finished; it was removed" for path in left]


def _once(first: Copied, last: Copied) -> tuple[Damage, ...]:
    return tuple(dict.fromkeys((*first.damage, *last.damage)))


def _fit_for_mirror(target: Path, settings: Settings) -> None:
    if not target.exists():
        make_folder(target)
    if not target.is_dir():
        raise BadRequest("this is no folder", file=str(target))
    # Whoever prepared the folder could have led the copy to anywhere by a link in it.
    links = [path for path in (*target.iterdir(), *(target / "sealed").glob("*")) if path.is_symlink()]
    if links:
        raise BadRequest(
            "there is a link in this folder, and a mirror is not written through links", file=str(min(links)),
            remedy="name another folder, or put a folder in the place of the link",
        )  # fmt: skip
    # What a mirror that was stopped left of its small files is no stranger's.
    lying = {path.name for path in target.iterdir() if not path.match(f".*{STAGING_SUFFIX}")} - {LOCK_NAME}
    if (target / SETTINGS_NAME).is_file():
        other = read_settings(target)
        if other.name != settings.name:
            raise BadRequest(
                "there is another archive in this folder", file=str(target), expected=settings.name, found=other.name,
                remedy="name a new folder",
            )  # fmt: skip
    elif lying - {
        "sealed",
        "staging",
        JOURNAL_NAME,
        "index.sqlite3",
        "index.sqlite3.new",
        "index.sqlite3.new-journal",
        "index.sqlite3-wal",
        "index.sqlite3-shm",
    }:
        raise BadRequest(
            "this folder holds something that is no mirror", file=str(target), found=sorted(lying)[0],
            remedy="name a new or an empty folder",
        )  # fmt: skip


def _copied_index(target: LocalStore, snapshot: Callable[[Path], bool]) -> str:
    fresh = target.root / "index.sqlite3.new"
    for suffix in (
        "",
        "-journal",
    ):  # what a mirror that was stopped left; its journal would be taken for the new one's
        fresh.with_name(fresh.name + suffix).unlink(missing_ok=True)
    if not snapshot(fresh):
        return "made anew"
    for suffix in ("-wal", "-shm"):  # of the index that is replaced: all that it held is in the archive
        (target.root / f"index.sqlite3{suffix}").unlink(missing_ok=True)
    put_in_place(fresh, target.root / "index.sqlite3")
    with closing(Index.open(f"sqlite:///{target.root / 'index.sqlite3'}")) as index:
        index.statistics()
    return "copied"


def _copied_journal(root: Path, target: Path) -> None:
    if Journal(root).last() is not None:
        write_whole(target / JOURNAL_NAME, (root / JOURNAL_NAME).read_bytes(), replace=True)

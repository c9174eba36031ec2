"""Making files last: the only module that syncs, links and locks.

A sealed file appears under its name in one step, whole, or not at all::

    write staging file -> no more writing (mode 0444) -> sync it -> reopen it and compare digests
        -> link it to its final name, which fails if that is taken -> sync the folder -> unlink the staging name

What each system gives:

- Linux: `fsync` of file and folder. The digest is compared after the page cache was asked to drop the file
  (`posix_fadvise`), so that the comparison reads the disk where the kernel obliges; it does not have to.
- macOS: `fsync` leaves data in the drive's own cache; `fcntl(F_FULLFSYNC)` does not, and is used.
- Windows: folders cannot be synced; NTFS keeps its names in a journal instead. Files are given their name by
  `os.rename`, which fails there if the name is taken, because a second name would share the read-only mark that
  keeps the first from being removed.
- File systems without hard links (exFAT, some network shares): the name is taken by creating an empty file
  exclusively, then the staging file is renamed over it. A crash between the two leaves the empty file together
  with its staging file; `archive.store.staging` knows the pair and removes both.

No system promises that a disk which acknowledged a sync has kept its word. That is what fixity checks are for.
"""

from __future__ import annotations

import contextlib
import datetime
import errno
import hashlib
import os
import secrets
import sys
import time
from collections.abc import Callable, Iterator
from pathlib import Path

from archive.errors import AlreadySealed, ArchiveBusy, ArchiveError, BadRequest

if sys.platform == "win32":  # pragma: no cover - the other system
    import msvcrt
else:
    import fcntl

__all__ = [
    "LOCK_NAME",
    "STAGING_SUFFIX",
    "append_lines",
    "archive_lock",
    "discard",
    "file_digest",
    "folder_in_hand",
    "holds_lock",
    "make_folder",
    "put_in_place",
    "set_aside",
    "settle",
    "staging_path",
    "sync_file",
    "sync_folder",
    "take_folder_name",
    "take_name",
    "take_place",
    "unheld",
    "write_whole",
]

LOCK_NAME = "archive.lock"
STAGING_SUFFIX = ".partial"
# What a file system answers that knows no second names (Linux link(2), ERRORS; macOS answers ENOTSUP).
_NO_LINKS = {errno.EPERM, errno.ENOSYS, errno.EOPNOTSUPP, errno.ENOTSUP, errno.EMLINK}
_BLOCK = 1 << 20
_POLL_S = 0.01
_held: dict[Path, int] = {}  # lock files held by this process, so that sweeping can insist on one


def staging_path(root: Path, key: str) -> Path:
    """Return a new path in ``root/staging`` for writing `key`; the folder is made if need be.

    Notes
    -----
    The slash becomes ``~``, which no key holds, and a random part keeps two writers of one key apart.
    """
    folder = root / "staging"
    _make_folders(folder, below=root)
    return folder / f"{key.replace('/', '~')}.{secrets.token_hex(4)}{STAGING_SUFFIX}"


def settle(staged: Path) -> None:
    """Take the write permission from a finished file and bring its bytes to the disk.

    Notes
    -----
    Who may read it is what the user's umask left to the staging file.
    """
    # Opened before the permission goes: Windows syncs only what is open for writing.
    descriptor = os.open(staged, os.O_RDWR)
    try:
        os.chmod(staged, staged.stat().st_mode & 0o444)  # noqa: PTH101 - crash tests replace this module's `os`
        _sync(descriptor)
        if hasattr(os, "posix_fadvise"):  # so that reading it back reads the disk
            os.posix_fadvise(descriptor, 0, 0, os.POSIX_FADV_DONTNEED)
    finally:
        os.close(descriptor)


def file_digest(path: Path) -> tuple[str, int]:
    """Return the SHA-256 of a file and its size in bytes."""
    digest, size = hashlib.sha256(), 0
    with path.open("rb") as stream:
        while block := stream.read(_BLOCK):
            digest.update(block)
            size += len(block)
    return digest.hexdigest(), size


def take_name(staged: Path, final: Path, *, root: Path, key: str) -> None:
    """Give a settled file its final name, for ever.

    Raises
    ------
    AlreadySealed
        If the name is taken.
    ArchiveError
        If it has its name, but the disk did not confirm it: the next opening of the archive sees what became of it.
    """
    _make_folders(final.parent, below=root)
    try:
        if sys.platform == "win32":  # pragma: no cover - the other system
            os.rename(staged, final)  # noqa: PTH104 - as above; does not overwrite on Windows
        else:
            _link_or_rename(staged, final)
    except FileExistsError as error:
        raise AlreadySealed(
            f"{key} is sealed already",
            file=str(final),
            remedy="a correction is a new accession or revision that names what it supersedes",
        ) from error
    try:
        sync_folder(final.parent)
        discard(staged)
    except OSError as error:
        raise ArchiveError(
            f"{key} has its name, but the disk did not confirm it",
            file=str(final),
            found=error.strerror,
            remedy="make room or mend the disk; the next opening of the archive puts it in order",
        ) from error


def take_place(staged: Path, final: Path, *, below: Path) -> None:
    """Let a settled file take the place of a damaged or missing one, of which `set_aside` has kept what there was."""
    _make_folders(final.parent, below=below)
    os.replace(staged, final)  # noqa: PTH105 - crash tests replace this module's `os`
    sync_folder(final.parent)


def put_in_place(staged: Path, final: Path) -> None:
    """Bring a finished file to the disk and let it take the place of another: the one file or the other, never none."""
    sync_file(staged)
    os.replace(staged, final)  # noqa: PTH105 - crash tests replace this module's `os`
    sync_folder(final.parent)


def set_aside(path: Path, folder: Path, *, below: Path) -> Path | None:
    """Give a damaged file a second name, one that is free, and return it; None if the file is not there.

    Parameters
    ----------
    path : Path
        The file, or a link in its place.
    folder : Path
        Where to; made if need be.
    below : Path
        Folder of the archive, which is there.

    Notes
    -----
    Its own name stays with it until another file takes that, so that nothing is ever missing that was there. What cannot
    have two names (a link or a folder in its place, a file system without them, Windows, where the read-only mark would keep
    the first from being replaced) is moved.
    """
    if not path.is_symlink() and not path.exists():
        return None
    _make_folders(folder, below=below)
    number = 1
    while (aside := folder / f"{path.stem}.{number}{path.suffix}").exists():
        number += 1
    # The archive's lock is held, so the name stays free.
    if path.is_symlink() or not path.is_file() or not _second_name(path, aside):
        os.rename(path, aside)  # noqa: PTH104 - as above
        sync_folder(path.parent)
    sync_folder(folder)
    return aside


def _second_name(path: Path, other: Path) -> bool:
    """Give a file another name beside its own; False where it cannot have two."""
    if sys.platform == "win32":  # pragma: no cover - the other system
        return False
    try:
        os.link(path, other)  # not Path.hardlink_to, as above
    except OSError as error:
        if error.errno not in _NO_LINKS:
            raise
        return False
    return True


def write_whole(path: Path, content: bytes, *, replace: bool = False) -> None:
    """Write a small file of the archive's own, a setting or a report: whole under its name, or not at all.

    Parameters
    ----------
    path : Path
        Where it is to stand; the folder must be there.
    content : bytes
        All of it.
    replace : bool
        Whether a file that stands there may be replaced, as a report made anew replaces the one before.

    Raises
    ------
    BadRequest
        If the name is taken and must not be replaced, or the folder cannot be written to.
    """
    staged = path.with_name(f".{path.name[:100]}.{secrets.token_hex(4)}{STAGING_SUFFIX}")
    try:
        with staged.open("xb") as stream:
            stream.write(content)
            stream.flush()
            _sync(stream.fileno())
        _require_kept(staged, content)
        if replace:
            os.replace(staged, path)  # noqa: PTH105 - as above
        else:
            _link_or_rename(staged, path)
        sync_folder(path.parent)
    except FileExistsError as error:
        raise BadRequest(
            "this name is taken", file=str(path), remedy="name another file, or move this one away"
        ) from error
    except OSError as error:
        raise BadRequest(
            f"the file cannot be written: {error.strerror}",
            file=str(path),
            remedy="free space, or correct the permissions of the folder; nothing was written",
        ) from error
    finally:
        with contextlib.suppress(OSError):  # where it could not be made, it cannot be removed either
            discard(staged)


def _require_kept(staged: Path, content: bytes) -> None:
    if staged.read_bytes() != content:
        raise OSError(errno.EIO, "the disk gave back other bytes than it was given")


def append_lines(path: Path, content: bytes, *, cut: int = 0) -> None:
    """Append to a file that only grows, and bring it to the disk; the file is made if need be.

    Parameters
    ----------
    path : Path
    content : bytes
    cut : int
        So many bytes are taken off the end before: what an interrupted writer left of its line.

    Raises
    ------
    OSError
        If it cannot be written; a part of it may stand there then.
    """
    new = not path.exists()
    descriptor = os.open(path, os.O_RDWR | os.O_CREAT | os.O_APPEND, 0o666)
    try:
        if cut:
            os.ftruncate(descriptor, os.fstat(descriptor).st_size - cut)
        left = memoryview(content)
        while left:
            left = left[os.write(descriptor, left) :]
        _sync(descriptor)
    finally:
        os.close(descriptor)
    if new:
        sync_folder(path.parent)


def _link_or_rename(staged: Path, final: Path) -> None:
    try:
        os.link(staged, final)  # not Path.hardlink_to, as above
    except OSError as error:
        if error.errno not in _NO_LINKS:
            raise
        os.close(os.open(final, os.O_CREAT | os.O_EXCL | os.O_WRONLY, 0o444))
        os.rename(staged, final)  # noqa: PTH104 - as above


def discard(staged: Path) -> None:
    """Remove a staging file if it is there."""
    with contextlib.suppress(FileNotFoundError):
        os.unlink(staged)  # noqa: PTH108 - as above


def make_folder(folder: Path) -> None:
    """Make a folder and those above it, as far as they are missing, each synced into the one that holds it."""
    there = next((each for each in folder.parents if each.is_dir()), folder)
    _make_folders(folder, below=there)


def _make_folders(folder: Path, *, below: Path) -> None:
    """Make `folder` and its parents under `below`, each synced into its own parent."""
    missing = [f for f in (folder, *folder.parents) if f.is_relative_to(below) and not f.is_dir()]
    for path in reversed(missing):
        with contextlib.suppress(FileExistsError):  # another writer may have been quicker
            os.mkdir(path)  # noqa: PTH102 - as above
        sync_folder(path.parent)


def _sync(descriptor: int) -> None:
    if sys.platform == "darwin":  # pragma: no cover - the other system
        fcntl.fcntl(descriptor, fcntl.F_FULLFSYNC)
    else:
        os.fsync(descriptor)


def sync_folder(folder: Path) -> None:
    """Bring the names in a folder to the disk."""
    if sys.platform == "win32":  # pragma: no cover - the other system
        return
    descriptor = os.open(folder, os.O_RDONLY)
    try:
        _sync(descriptor)
    finally:
        os.close(descriptor)


def sync_file(path: Path) -> None:
    """Bring the bytes of a finished file to the disk."""
    descriptor = os.open(path, os.O_RDWR)
    try:
        _sync(descriptor)
    finally:
        os.close(descriptor)


def take_folder_name(staged: Path, final: Path) -> None:
    """Give a finished folder its name; an empty folder of that name makes way.

    Raises
    ------
    BadRequest
        If the name is taken.
    """
    try:
        if (
            sys.platform == "win32" and final.is_dir()
        ):  # pragma: no cover - a folder is in the way there even if empty
            os.rmdir(final)  # noqa: PTH106 - as above
        os.rename(staged, final)  # noqa: PTH104 - as above; POSIX refuses a folder that holds something
    except OSError as error:
        if error.errno not in (errno.ENOTEMPTY, errno.EEXIST, errno.ENOTDIR):
            raise
        raise BadRequest(
            "this name is taken", file=str(final), expected="a new or an empty folder", remedy="name another"
        ) from error
    sync_folder(final.parent)


def holds_lock(root: Path) -> bool:
    """Return whether this process holds the lock of the archive at `root`."""
    return (root / LOCK_NAME).resolve() in _held


@contextlib.contextmanager
def archive_lock(root: Path, *, wait_s: float = 5.0) -> Iterator[None]:
    """Return a context in which this process alone writes to the archive at `root`.

    Parameters
    ----------
    root : Path
        The archive's folder.
    wait_s : float
        How long to wait for another writer, in seconds, zero or more.

    Raises
    ------
    ArchiveBusy
        If another process, or another part of this one, still writes after that time.
    ArchiveError
        If the folder is not there or may not be written to.

    Notes
    -----
    The operating system holds the lock and releases it when its holder ends, however it ends. The lock file stays;
    what it says about the holder is for people only. It is not reentrant.
    """
    path = (root / LOCK_NAME).resolve()
    try:
        descriptor = os.open(path, os.O_RDWR | os.O_CREAT, 0o664)
    except OSError as error:
        raise ArchiveError(
            "the archive cannot be locked for writing",
            file=str(path),
            found=error.strerror,
            remedy="to write to it, the folder of the archive must be writable",
        ) from error
    deadline, owner = time.monotonic() + wait_s, os.getpid()
    try:
        with _turn(path.parent, deadline) as first:
            while not (first and _locked(descriptor)):
                if not first or time.monotonic() >= deadline:
                    raise ArchiveBusy(
                        "the archive is being written to",
                        file=str(root),
                        found=_holder(path),
                        remedy="wait for it to end and try again; the lock ends with its process",
                    )
                time.sleep(_POLL_S)
        _held[path] = descriptor
        now = datetime.datetime.now(datetime.UTC).isoformat(timespec="seconds")
        with contextlib.suppress(OSError):  # on a full disk the lock holds all the same
            os.ftruncate(descriptor, 0)
            # Byte 0 is what Windows locks, and locked bytes cannot be read there; the text begins after it.
            os.lseek(descriptor, 0, os.SEEK_SET)
            os.write(descriptor, f"\nprocess {owner}, since {now}\n".encode())
        yield
    finally:
        if os.getpid() == owner:  # a forked child that leaves this block has no lock to give back
            try:
                if _held.pop(path, None) is not None:
                    with contextlib.suppress(OSError):  # a name left in it harms nobody; a lock left would
                        os.ftruncate(descriptor, 0)
                    _unlock(descriptor)
            finally:
                os.close(descriptor)


@contextlib.contextmanager
def _turn(folder: Path, deadline: float) -> Iterator[bool]:
    """Return a context in which this one is the next to be let in; yields whether it is, as far as that can be told.

    Notes
    -----
    Without it, a writer that does one act after another would have the lock again before the others have looked: eight
    writers of 26 cooldowns each kept one of them out for two minutes. Whoever waits first holds a lock on the folder, which
    needs no file of its own.
    """
    if sys.platform == "win32":  # pragma: no cover - the other system
        yield True
        return
    descriptor = os.open(folder, os.O_RDONLY)
    try:
        while not (first := _first(descriptor)) and time.monotonic() < deadline:
            time.sleep(_POLL_S)
        yield first
    finally:
        os.close(descriptor)


def _first(descriptor: int) -> bool:
    try:
        return _locked(descriptor)
    except OSError:  # some network shares know no lock on a folder; then nobody is kept back
        return True


def _locked(descriptor: int) -> bool:
    """Return whether the lock could be had at once."""
    try:
        if sys.platform == "win32":  # pragma: no cover - the other system
            msvcrt.locking(descriptor, msvcrt.LK_NBLCK, 1)
        else:
            fcntl.flock(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError as error:
        if error.errno in {errno.EAGAIN, errno.EACCES, errno.EDEADLK}:
            return False
        raise
    return True


def _unlock(descriptor: int) -> None:
    if sys.platform == "win32":  # pragma: no cover - the other system
        os.lseek(descriptor, 0, os.SEEK_SET)
        msvcrt.locking(descriptor, msvcrt.LK_UNLCK, 1)
    else:
        fcntl.flock(descriptor, fcntl.LOCK_UN)


def _holder(path: Path) -> str:
    with path.open("rb") as stream:
        stream.seek(1)
        text = stream.read(200).decode("utf-8", "replace").strip()
    return text or "a process that did not say which"


@contextlib.contextmanager
def folder_in_hand(name: Callable[[], Path]) -> Iterator[Path]:
    """Return a context with a new folder that is held as long as its maker lives, so that `unheld` knows one that was left.

    Parameters
    ----------
    name : callable
        Gives a free name, another one each time.
    """
    while True:
        folder = name()
        os.mkdir(folder)  # noqa: PTH102 - as above
        with _waited_for(folder):
            if folder.is_dir():  # whoever sweeps may have been there between the two
                yield folder
                return


@contextlib.contextmanager
def _waited_for(folder: Path) -> Iterator[None]:
    if sys.platform == "win32":  # pragma: no cover - the other system
        yield
        return
    try:
        descriptor = os.open(folder, os.O_RDONLY)
    except FileNotFoundError:
        yield
        return
    try:
        with contextlib.suppress(
            OSError
        ):  # some network shares know no lock on a folder; nothing is swept there
            fcntl.flock(descriptor, fcntl.LOCK_EX)
        yield
    finally:
        os.close(descriptor)


@contextlib.contextmanager
def unheld(folder: Path) -> Iterator[bool]:
    """Return a context that yields whether the maker of a folder is gone; False where that cannot be told."""
    if sys.platform == "win32":  # pragma: no cover - the other system
        yield False
        return
    try:
        descriptor = os.open(folder, os.O_RDONLY)
    except OSError:
        yield False
        return
    try:
        try:
            free = _locked(descriptor)
        except OSError:
            free = False
        yield free
    finally:
        os.close(descriptor)


def _release_in_child() -> None:
    # A forked child shares the parent's lock; closing its copy lets the lock end with the parent.
    for descriptor in _held.values():
        os.close(descriptor)
    _held.clear()


if hasattr(os, "register_at_fork"):
    os.register_at_fork(after_in_child=_release_in_child)

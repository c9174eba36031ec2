"""Sealed files in a folder.

::

    root/sealed/<folder>/<name>.h5     what is sealed
    root/staging/                      what is being written

Any number of processes may read. Writers of one archive take `archive_lock` for the length of their transaction; a
writer without it harms no other writer, but its staging file may be swept away from under it.
"""

from __future__ import annotations

import contextlib
import os
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import h5py
import numpy as np
from numpy.typing import NDArray

from archive.errors import AlreadySealed, ArchiveError, DamagedFile, MissingFile, NotAnArchive, UnknownAddress
from archive.store import durable
from archive.store.audit import READ_ERRORS, datasets, mark_faults, structure_faults, text_of
from archive.store.examine import changed_datasets, examined
from archive.store.interface import Attributes, Damage, SealedFile, Writer
from archive.store.names import checked_key, is_key
from archive.store.sealed import SealedWriter, writing
from archive.store.unpacking import rows_of

__all__ = ["LocalStore", "open_store"]

_SUFFIX = ".h5"
_BLOCK = 1 << 22
_RESTORE = "run: stillroom fixity; then restore the file from a copy"
# What the dimension scale specification keeps in attributes; references mean nothing outside the file.
_SCALE_ATTRIBUTES = {"CLASS", "NAME", "DIMENSION_LIST", "REFERENCE_LIST", "DIMENSION_LABELS"}


def open_store(root: Path) -> LocalStore:
    """Return the store of the archive in folder `root`.

    Raises
    ------
    NotAnArchive
        If there is no such folder. Nothing is made before something is written.
    """
    if not root.is_dir():
        raise NotAnArchive("there is no such folder", file=str(root))
    return LocalStore(root)


class _LocalWriter(SealedWriter):
    """A sealed file being written in staging."""

    def __init__(self, store: LocalStore, key: str) -> None:
        self._root, self._final = store.root, store.path(key)
        with writing(self._final):
            staged = durable.staging_path(self._root, key)
        try:
            super().__init__(staged, key)
        except BaseException:  # HDF5 may have made the file before it failed
            durable.discard(staged)
            raise

    def seal(self) -> SealedFile:
        """Finish, read back, and give the file its name."""
        digests = self.finish()
        with writing(self._final):
            written = durable.file_digest(self.path)
            durable.settle(self.path)
            if durable.file_digest(self.path) != written or changed_datasets(self.path, digests):
                raise DamagedFile(
                    "the disk gave back other bytes than it was given; nothing was sealed",
                    file=str(self.path),
                    remedy="check the disk before anything else is written to it",
                )
            durable.take_name(self.path, self._final, root=self._root, key=self.key)
        return SealedFile(self.key, *written)

    def abandon(self) -> None:
        """Leave no trace."""
        self.close()
        with contextlib.suppress(OSError):  # what is left in staging is swept at the next opening, and told
            durable.discard(self.path)


class LocalStore:
    """Sealed HDF5 files under one folder; see `archive.store.interface.Store`.

    Parameters
    ----------
    root : Path
        The archive's folder; use `open_store`.

    Notes
    -----
    Reading checks marks, structure and the checksums of what it reads, in this process. It does not compare the digest
    of the whole file; before a file of doubtful history is read, `verify` it, which reads damaged files in a child process.
    """

    def __init__(self, root: Path) -> None:
        self.root = root
        self._sound: dict[str, tuple[int, int, int]] = {}  # keys audited, as the file was then

    def path(self, key: str) -> Path:
        """Return where `key` lies or would lie on disk."""
        return self.root / "sealed" / f"{checked_key(key)}{_SUFFIX}"

    @contextlib.contextmanager
    def writer(self, key: str) -> Iterator[Writer]:
        """Return a context that yields a writer and abandons it unless `seal` was called."""
        if self.contains(key):
            raise AlreadySealed(
                f"{key} is sealed already",
                file=str(self.path(key)),
                remedy="a correction is a new accession or revision that names what it supersedes",
            )
        writer = _LocalWriter(self, key)
        try:
            yield writer
        finally:
            writer.abandon()  # after sealing there is nothing left to remove

    def keys(self, prefix: str = "") -> list[str]:
        """Return the keys that begin with `prefix`, validated and sorted."""
        found = (self._key_of(path) for path in self._lying())
        return sorted(key for key in found if key is not None and key.startswith(prefix))

    def strays(self) -> list[str]:
        """Return the paths below the root of foreign things in ``sealed`` and ``staging``, sorted."""
        foreign = [path for path in self._lying() if self._key_of(path) is None]
        staging = self.root / "staging"
        left = list(staging.iterdir()) if staging.is_dir() else []
        return sorted(path.relative_to(self.root).as_posix() for path in [*foreign, *left])

    def _lying(self) -> Iterator[Path]:
        def refuse(
            error: OSError,
        ) -> None:  # os.walk passes over what it cannot read; "absent" would be a lie
            raise ArchiveError("a folder of the archive cannot be read", file=str(error.filename)) from error

        top = self.root / "sealed"
        if not top.exists():
            return
        for folder, subfolders, names in os.walk(top, onerror=refuse):
            links = [name for name in subfolders if (Path(folder) / name).is_symlink()]
            yield from (Path(folder) / name for name in [*names, *links])

    def _key_of(self, path: Path) -> str | None:
        name = path.relative_to(self.root / "sealed").as_posix()
        key = name.removesuffix(_SUFFIX)
        return key if name.endswith(_SUFFIX) and is_key(key) and not path.is_symlink() else None

    def contains(self, key: str) -> bool:
        """Return whether the key is taken, by a whole file or a damaged one."""
        path = self.path(key)
        try:
            path.lstat()
        except (FileNotFoundError, NotADirectoryError):
            return False
        except OSError as error:
            raise ArchiveError("the archive cannot be read", file=str(path), found=str(error)) from error
        return True

    def describe(self, key: str) -> SealedFile:
        """Return size and digest, computed afresh from the bytes."""
        path = self._present(key)
        try:
            return SealedFile(key, *durable.file_digest(path))
        except OSError as error:
            raise DamagedFile("the file cannot be read", file=str(path), found=str(error)) from error

    def document(self, key: str) -> str:
        """Return the JSON metadata document."""
        with self._opened(key) as file, self._damage_named(key, "document"):
            return bytes(_node(file, key, "document")[0]).decode("utf-8")

    def tables(self, key: str) -> dict[str, list[str]]:
        """Return the column names of each table, by the path of its group."""
        with self._opened(key) as file, self._damage_named(key, "/"):
            groups = dict.fromkeys(where.rpartition("/")[0] for where, _ in datasets(file))
            return {
                group: [text_of(name) for name in file[group].attrs["columns"].tolist()]
                for group in groups
                if group and "columns" in file[group].attrs
            }

    def column(self, key: str, path: str, start: int | None = None, stop: int | None = None) -> NDArray[Any]:
        """Return a column or array, or its rows from `start` to before `stop`; text as NumPy text."""
        with self._opened(key) as file, self._damage_named(key, path):
            dataset = _node(file, key, path)
            if not isinstance(dataset, h5py.Dataset):
                raise UnknownAddress("this is a group, not a column or array", file=key, field=path)
            values = rows_of(dataset, start, stop)
            return np.strings.decode(values, "utf-8") if values.dtype.kind == "S" else values

    def attributes(self, key: str, path: str) -> Attributes:
        """Return the attributes of a dataset or group; links between datasets are left out."""
        with self._opened(key) as file, self._damage_named(key, path):
            node = _node(file, key, path)
            return {name: _plain(node.attrs[name]) for name in node.attrs if name not in _SCALE_ATTRIBUTES}

    def raw_names(self, key: str) -> list[str]:
        """Return the names of the raw files, sorted."""
        with self._opened(key) as file, self._damage_named(key, "raw"):
            return sorted(path.removeprefix("raw/") for path, _ in datasets(file) if path.startswith("raw/"))

    def raw(self, key: str, name: str) -> Iterator[bytes]:
        """Yield a raw file's bytes in blocks."""
        with self._opened(key) as file, self._damage_named(key, f"raw/{name}"):
            dataset = _node(file, key, f"raw/{name}")
            for start in range(0, dataset.shape[0], _BLOCK):
                yield dataset[start : start + _BLOCK].tobytes()

    def raw_digest(self, key: str, name: str) -> str:
        """Return a raw file's recorded SHA-256."""
        return str(self.attributes(key, f"raw/{name}")["sha256"])

    def verify(self, key: str, sha256: str | None = None) -> list[Damage]:
        """Reread everything and return all damage found; an empty list means every byte is as sealed."""
        path = self.path(key)
        if not self.contains(key):
            return [Damage(key, "missing", "the file is not in the archive", expected=sha256)]
        if path.is_symlink():
            # Its bytes may be right today; they are kept by nobody.
            return [
                Damage(
                    key,
                    "damaged",
                    "a link stands in the place of the sealed file",
                    found=str(path.readlink()),
                )
            ]
        return examined(path, key, sha256)

    def _present(self, key: str) -> Path:
        if not self.contains(key):
            raise MissingFile(f"{key} is not in the archive", file=str(self.path(key)))
        return self.path(key)

    @contextlib.contextmanager
    def _opened(self, key: str) -> Iterator[h5py.File]:
        path = self._present(key)
        with self._damage_named(key, None):
            marks = mark_faults(path)
            if marks:
                raise DamagedFile(marks[0], file=str(path), remedy=_RESTORE)
            # Nobody writes a sealed file, so a lock that a read-only mount refuses is no loss.
            file = h5py.File(path, "r", locking="best-effort")
        with file:
            self._audit(key, path, file)
            yield file

    def _audit(self, key: str, path: Path, file: h5py.File) -> None:
        stat = path.stat()
        mark = (stat.st_ino, stat.st_size, stat.st_mtime_ns)
        if self._sound.get(key) == mark:
            return
        with self._damage_named(key, None):
            faults = structure_faults(file)
        if faults:
            where, sentence = faults[0]
            raise DamagedFile(sentence, file=str(path), field=where, remedy=_RESTORE)
        self._sound[key] = mark

    @contextlib.contextmanager
    def _damage_named(self, key: str, path: str | None) -> Iterator[None]:
        try:
            yield
        except ArchiveError:
            raise
        except READ_ERRORS as error:
            raise DamagedFile(
                "it is in the archive but cannot be read as it was sealed",
                file=str(self.path(key)),
                field=path,
                found=str(error),
                remedy=_RESTORE,
            ) from error


def _node(file: h5py.File, key: str, path: str) -> Any:
    """Return what lies at `path`; a link that is not there is unknown, one that leads nowhere is damage."""
    node: Any = file
    for part in filter(None, path.split("/")):
        if not isinstance(node, h5py.Group) or not node.id.links.exists(part.encode("utf-8", "replace")):
            raise UnknownAddress("the file holds nothing of this name", file=key, field=path)
        node = node[part]
    return node


def _plain(value: Any) -> Any:
    """Return an attribute's value as text, number or list of them."""
    if isinstance(value, np.ndarray):
        return [_plain(part) for part in value.tolist()]
    if isinstance(value, bytes | str):
        return text_of(value)
    return value.item() if isinstance(value, np.generic) else value

"""Sealed files that were made elsewhere, taken into the store with every byte as it is, all of them or none.

Their bytes are not trusted: each is compared with the digest that came with it while it is copied, then read by HDF5 in
a child process only, since a digest that came with a file vouches for the copy, not for the file.
"""

from __future__ import annotations

import contextlib
import hashlib
from collections.abc import Iterable, Iterator
from pathlib import Path

import h5py

from archive.errors import AlreadySealed, ArchiveError, BadRequest, DamagedFile
from archive.store import durable
from archive.store.audit import READ_ERRORS, datasets, text_of
from archive.store.examine import examined_apart
from archive.store.interface import Damage, SealedFile
from archive.store.local import LocalStore
from archive.store.sealed import writing
from archive.store.staging import decide, name_all, new_plan

__all__ = ["Adoption", "adoption"]


@contextlib.contextmanager
def adoption(store: LocalStore) -> Iterator[Adoption]:
    """Return a context that yields an adoption and leaves no trace of it unless `seal` came to its decision."""
    taken = Adoption(store)
    try:
        yield taken
    finally:
        taken.abandon()


class Adoption:
    """Sealed files on their way into a store; its lock must be held throughout.

    Parameters
    ----------
    store : LocalStore
        Where they are to go.
    """

    def __init__(self, store: LocalStore) -> None:
        self._store = store
        self._staged: dict[str, tuple[Path, SealedFile]] = {}
        self._decided = False

    @property
    def keys(self) -> list[str]:
        """Keys taken so far, in order."""
        return list(self._staged)

    def take(self, sealed: SealedFile, blocks: Iterable[bytes]) -> None:
        """Copy a file's bytes into staging, verbatim.

        Parameters
        ----------
        sealed : SealedFile
            Its key, and the digest and size that it must have.
        blocks : iterable of bytes
            Its bytes.

        Raises
        ------
        AlreadySealed
            If the key is taken.
        DamagedFile
            If the bytes are others than those promised, or the disk gives back others than it was given.
        """
        if self._store.contains(sealed.key) or sealed.key in self._staged:
            raise AlreadySealed(f"{sealed.key} is sealed already", file=str(self._store.path(sealed.key)))
        final = self._store.path(sealed.key)
        with writing(final):
            staged = durable.staging_path(self._store.root, sealed.key)
        self._staged[sealed.key] = staged, sealed
        digest, size = hashlib.sha256(), 0
        with writing(final):
            stream = staged.open("xb")
        with stream:
            for block in blocks:  # outside `writing`: what fails here is the source, not the archive
                digest.update(block)
                size += len(block)
                if size > sealed.size:
                    break
                with writing(final):
                    stream.write(block)
        if (digest.hexdigest(), size) != (sealed.sha256, sealed.size):
            raise DamagedFile(
                "the bytes are not those that were promised",
                file=sealed.key,
                expected=f"{sealed.size} bytes, sha256 {sealed.sha256}",
                found=f"{size} bytes, sha256 {digest.hexdigest()}",
            )
        with writing(final):
            durable.settle(staged)
            if durable.file_digest(staged) != (sealed.sha256, sealed.size):
                raise DamagedFile(
                    "the disk gave back other bytes than it was given; nothing was sealed",
                    file=str(staged),
                    remedy="check the disk before anything else is written to it",
                )

    def damage(self) -> list[Damage]:
        """Return all damage of the files taken, each read completely in a child process."""
        return examined_apart([(path, sealed) for path, sealed in self._staged.values()])

    def document(self, key: str) -> str:
        """Return the JSON metadata document of a file that `damage` found whole."""
        path, _ = self._found(key)
        try:
            with h5py.File(path, "r", locking="best-effort") as file:
                return bytes(file["document"][0]).decode("utf-8")
        except READ_ERRORS as error:
            raise DamagedFile(
                "the document inside this sealed file cannot be read",
                file=key,
                field="document",
                found=str(error),
            ) from error

    def digests(self, key: str) -> dict[str, str]:
        """Return the SHA-256 of each dataset of a file that `damage` found whole, by path."""
        path, _ = self._found(key)
        with h5py.File(path, "r", locking="best-effort") as file:
            return {where: text_of(dataset.attrs["sha256"]) for where, dataset in datasets(file)}

    def seal(self) -> list[SealedFile]:
        """Give every file its name, in the order in which they were taken, and return what they became.

        Notes
        -----
        Once the plan of the names is on disk the decision is made: what is stopped after that is finished by the next
        one who opens the archive or writes to it.
        """
        if not self._staged:
            return []
        first = next(iter(self._staged))
        plan = new_plan(self._store.root)
        try:
            with writing(self._store.path(first)):
                try:
                    decide(plan, [(path, key) for key, (path, _) in self._staged.items()])
                finally:
                    self._decided = plan.exists()
                name_all(self._store.root, plan)
        except ArchiveError as problem:
            if not self._decided or isinstance(problem, AlreadySealed):
                raise
            raise ArchiveError(
                "the import was decided, but not everything of it could be written yet",
                file=problem.file,
                found=problem.found,
                remedy="make room or mend the disk; the next opening of the archive finishes it",
            ) from problem
        return [sealed for _, sealed in self._staged.values()]

    def abandon(self) -> None:
        """Leave no trace, unless the decision was made."""
        if self._decided:
            return
        for path, _ in self._staged.values():
            with contextlib.suppress(
                OSError
            ):  # what is left in staging is swept at the next opening, and told
                durable.discard(path)
        self._staged.clear()

    def _found(self, key: str) -> tuple[Path, SealedFile]:
        if key not in self._staged:
            raise BadRequest("this file was not taken", file=key)
        return self._staged[key]

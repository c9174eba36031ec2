"""An archive that is open: made, opened, put in order after an interruption, locked while somebody writes.

Writing is done under the archive's lock; reading needs none, since sealed files never change.
"""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from datetime import UTC, datetime
from pathlib import Path
from types import TracebackType
from typing import TYPE_CHECKING, Self

from archive.errors import ArchiveBusy, ArchiveError, BadRequest
from archive.index import Index
from archive.index.engine import for_reading_only
from archive.intake.settings import SETTINGS_NAME, Settings, read_settings, settings_text
from archive.lab.journaling import AFTERWARDS, Acts
from archive.lab.place import find_root, made, make_root, unmade
from archive.lab.source import LabSource
from archive.store.durable import archive_lock
from archive.store.interface import SealedFile
from archive.store.local import open_store
from archive.store.staging import sweep_staging

if TYPE_CHECKING:
    from archive.store.local import LocalStore

__all__ = ["Clock", "Opened", "now"]

Clock = Callable[[], datetime]


def now() -> datetime:
    """Time of an act, in UTC, to the second."""
    return datetime.now(UTC).replace(microsecond=0)


class Opened:
    """What every part of the door to an archive has: its store, its index, its acts."""

    def __init__(self, root: Path, settings: Settings, store: LocalStore, index: Index, clock: Clock) -> None:
        self.root = root
        self.settings = settings
        self.notices: list[str] = []
        self._store = store
        self._index = index
        self._clock = clock
        self._source = LabSource(store, index)
        self._acts = Acts(root, clock)

    # Opening and closing ------------------------------------------------------------------------------------------

    @classmethod
    def create(
        cls, root: Path, *, name: str | None = None, index: str | None = None, clock: Clock = now
    ) -> Self:
        """Make a new archive.

        Parameters
        ----------
        root : Path
            Folder to make it in; it may exist if it is empty.
        name : str, optional
            Name of the archive; the folder's name if left out.
        index : str, optional
            Address of the index; a SQLite file in the folder if left out.

        Raises
        ------
        BadRequest
            If the folder holds something already.
        """
        root = root.resolve()
        if (root / SETTINGS_NAME).exists():
            raise BadRequest(
                "there is an archive here already", file=str(root), remedy="use it, or name another folder"
            )
        try:
            settings = Settings.model_validate(
                {"name": name or root.name, **({"index": index} if index else {})}
            )
        except ValueError:
            raise BadRequest(
                "an archive cannot have this name or index",
                found=repr((name or root.name)[:80]),
                expected="text of at most 20000 characters",
                remedy="give it another with --name",
            ) from None
        make_root(root)
        with archive_lock(root):
            if (root / SETTINGS_NAME).exists():
                raise BadRequest("another process has just made an archive here", file=str(root))
            unmade(root, settings)
            try:
                made(root, settings, settings_text(settings.name, index))
                begun = Acts(root, clock)
                begun.done("init", settings.name)
                begun.enter()
            except BaseException:
                unmade(root, settings)
                raise
        return cls.open(root, clock=clock)

    @classmethod
    def open(cls, start: Path | str | None = None, *, read_only: bool = False, clock: Clock = now) -> Self:
        """Open an archive.

        Parameters
        ----------
        start : Path, optional
            Folder of the archive; else `STILLROOM_ARCHIVE`, else the current folder and its parents are looked at.
        read_only : bool
            Only look: the database itself refuses writes, and what an interruption left is not put in order.

        Raises
        ------
        NotAnArchive
            If there is none.
        BadRequest
            If it is to be read only and an older Stillroom wrote its index.
        """
        root = find_root(None if start is None else Path(start))
        settings = read_settings(root)
        # A copy on a read-only medium, or another person's archive, can be read all the same.
        # So it can when the disk is full: whoever only looks is not kept out by that.
        index = Index.open(settings.index_address(root), read_only=read_only or for_reading_only(root))
        archive = cls(root, settings, open_store(root), index, clock)
        try:
            if not read_only:
                archive._put_in_order()
        except BaseException:
            index.close()
            raise
        return archive

    def close(self) -> None:
        """Close the index."""
        self._index.close()

    def __enter__(self) -> Self:
        """Enter a `with` block."""
        return self

    def __exit__(
        self, kind: type[BaseException] | None, value: BaseException | None, trace: TracebackType | None
    ) -> None:
        """Close at the end of a `with` block."""
        self.close()

    @property
    def name(self) -> str:
        """Name of the archive."""
        return self.settings.name

    def _put_in_order(self) -> None:
        """Sweep what an interrupted writer left, and complete the index from sealed files it does not know."""
        if not os.access(self.root, os.W_OK):
            return
        recorded = self._index.sealed_files()
        unknown = set(self._store.keys()) - set(recorded)
        staged = any((self.root / "staging").iterdir()) if (self.root / "staging").is_dir() else False
        if not unknown and not staged and not self._acts.behind(len(recorded)):
            return
        try:
            with archive_lock(self.root, wait_s=0.0):
                self.notices += sweep_staging(self.root)
                known = set(self._index.sealed_files())
                for key in sorted(self._store.keys(), key=_by_age(self._store)):
                    if key not in known:
                        self._complete(key)
                self._acts.enter()
                self._enter_missing()
        except ArchiveBusy:
            self.notices.append("another process is writing; what it has not finished is not shown yet")
        except (ArchiveError, OSError) as problem:
            # Reading needs none of this: whoever only looks is not kept out by a full disk.
            self.notices.append(f"what an interruption left could not be put in order yet: {problem}")

    def _complete(self, key: str) -> None:
        """Record a sealed file whose index rows an interruption cost, if the file is whole."""
        damage = self._store.verify(key)
        if damage:
            self.notices.append(f"{key} is sealed but not in the index, and it is damaged: {damage[0].what}")
            return
        try:
            self._record(self._store.describe(key), note=AFTERWARDS)
        except ArchiveError as problem:
            self.notices.append(f"{key} is sealed, but cannot be recorded in the index: {problem}")
            return
        self.notices.append(f"{key} had been sealed but not indexed; its rows were made from the file itself")

    def _enter_missing(self) -> None:
        recorded = {key: SealedFile(key, *row) for key, row in self._index.sealed_files().items()}
        if self._acts.behind(len(recorded)):
            order = sorted(set(recorded) & set(self._store.keys()), key=_by_age(self._store))
            count = self._acts.caught_up(recorded, self._source.document, order)
            self.notices += [f"{count} acts were entered in the journal afterwards"] if count else []

    def _record(self, sealed: SealedFile, *, note: str | None = None) -> None:
        document = self._source.document(sealed.key)
        self._index.record(document, key=sealed.key, sha256=sealed.sha256, size=sealed.size)
        self._acts.sealed(document, sealed, note=note)

    @contextmanager
    def _writing(self) -> Iterator[None]:
        with archive_lock(self.root):
            self.notices += sweep_staging(self.root)
            try:
                yield
            finally:
                self._acts.enter()


def _by_age(store: LocalStore) -> Callable[[str], tuple[bool, float, str]]:
    """Order in which sealed files can be recorded: accessions before reductions, older before newer."""
    return lambda key: ("@" in key, store.path(key).stat().st_mtime, key)

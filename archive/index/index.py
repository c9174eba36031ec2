"""The index: what a search needs to know of every sealed file, in relational tables.

Rules
-----
* The index is derivable: `rebuild` from the sealed files gives, row for row, what recording them one by one gave.
* Every write is one transaction; a reader sees one state throughout.
* Nothing in here opens a sealed file; documents come in, plain rows go out.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Iterable, Iterator
from contextlib import closing, contextmanager, suppress
from itertools import zip_longest
from pathlib import Path
from types import TracebackType
from typing import Any, Self

from sqlalchemy import Connection, Engine, Table

from archive.errors import BadRequest, DamagedFile, MissingFile
from archive.index import queries
from archive.index.acts import ActDocument, add_act
from archive.index.engine import (
    REBUILD,
    WAIT_SECONDS,
    connected,
    engine_of,
    for_reading_only,
    index_name,
    index_url,
    reading,
    sqlite_address,
    translated,
    writing,
)
from archive.index.looking import Looking
from archive.index.record import add_accession, add_reduction, clear
from archive.index.revision import make, raise_to_head
from archive.index.tables import Base
from schemas.lineage import AccessionDocument, ReductionDocument

__all__ = ["Document", "Entry", "Index"]


Document = AccessionDocument | ReductionDocument | ActDocument
"""What a sealed file says about itself."""

Entry = tuple[str, str, int, Document]
"""Key, SHA-256, size and document of one sealed file."""


class Index(Looking):
    """An open index; made by `create` or `open`, and a context manager that closes it.

    Every method raises `ArchiveBusy` when another process writes for longer than the wait, and `DamagedFile` when the
    database is not one any more.
    """

    @classmethod
    def create(cls, url: str, *, wait: float = WAIT_SECONDS) -> Self:
        """Return a new, empty index.

        Parameters
        ----------
        url : str
            `sqlite:///folder/index.sqlite3` (the folder must exist) or `postgresql+psycopg://...`.
        wait : float
            Longest wait for another writer, in seconds.

        Raises
        ------
        BadRequest
            If an index is there already, or the address is none.
        """
        place = index_url(url)
        if place.get_backend_name() == "sqlite":
            folder = Path(str(place.database)).absolute().parent
            if not folder.is_dir():
                raise MissingFile(
                    "the folder for the index is not there", file=str(folder), remedy="make the folder first"
                )
        engine = engine_of(place, read_only=False, new=True, wait=wait)
        with _disposed_on_failure(engine):
            make(engine, place)
        return cls(engine, place)

    @classmethod
    def passing(cls, folder: Path) -> Self:
        """Return a new index that is to be held against another one and then goes with its folder.

        Notes
        -----
        Its tables are made by the models, which the migrations equal and which need no Alembic.
        """
        place = index_url(f"sqlite:///{folder / 'index.sqlite3'}")
        engine = engine_of(place, read_only=False, new=True)
        with _disposed_on_failure(engine), connected(engine, place, writes=True) as connection:
            Base.metadata.create_all(connection, checkfirst=False)
        return cls(engine, place)

    @classmethod
    def open(cls, url: str, *, read_only: bool = False, wait: float = WAIT_SECONDS) -> Self:
        """Return an index that is there; one of an older revision is copied beside (SQLite) and raised.

        Parameters
        ----------
        url : str
            As for `create`.
        read_only : bool
            Open it so that the database itself refuses writes.
        wait : float
            Longest wait for another writer, in seconds.

        Raises
        ------
        MissingFile
            If it is not there.
        DamagedFile
            If its file is no database.
        BadRequest
            If a newer Stillroom wrote it, or it must be raised but is opened for reading only.
        """
        place = index_url(url)
        if place.get_backend_name() == "sqlite" and not (file := Path(index_name(place))).is_file():
            if file.exists():
                raise DamagedFile("the index is not a file", file=str(file), remedy=REBUILD)
            raise MissingFile("the index is not there", file=str(file), remedy=REBUILD)
        engine = engine_of(place, read_only=read_only, wait=wait)
        with _disposed_on_failure(engine):
            raise_to_head(engine, place, read_only=read_only)
        return cls(engine, place)

    @staticmethod
    def set_aside(url: str) -> Path | None:
        """Path to which an SQLite index is moved, so that a new one can be created; None when there is none to move.

        Notes
        -----
        For a damaged index, before `stillroom rebuild-index`; nobody may have it open. Its write-ahead log goes along.
        A PostgreSQL index cannot be set aside from here.
        """
        place = index_url(url)
        if place.get_backend_name() != "sqlite":
            raise BadRequest(
                "an index in PostgreSQL cannot be set aside", remedy="give `index` another database"
            )
        path = Path(str(place.database))
        if not path.exists():
            return None
        number = 1
        while (aside := path.with_name(f"{path.name}.set-aside-{number}")).exists():
            number += 1
        for suffix in ("-wal", "-shm"):
            if (beside := path.with_name(path.name + suffix)).exists():
                beside.rename(path.with_name(aside.name + suffix))
        return path.rename(aside)

    def snapshot(self, path: Path) -> bool:
        """Copy the index into a new file as it is at one moment; False for an index that is no SQLite file.

        Parameters
        ----------
        path : Path
            A name that is free.
        """
        if self._url.get_backend_name() != "sqlite":
            return False
        file = Path(str(self._url.database)).absolute()
        mode = "ro" if for_reading_only(file.parent) else "rw"
        path.touch(mode=0o666)  # SQLite itself would leave the group out, whatever the umask says
        # SQLite's own copy holds what still stands in the write-ahead log; a copy of the file alone would not.
        with (
            translated(self._url),
            closing(sqlite3.connect(sqlite_address(file, mode=mode), uri=True)) as source,
            closing(sqlite3.connect(path)) as target,
        ):
            source.backup(target)
        return True

    def close(self) -> None:
        """Let go of every connection."""
        self._engine.dispose()

    def __enter__(self) -> Self:
        """Return this index."""
        return self

    def __exit__(
        self, kind: type[BaseException] | None, fault: BaseException | None, trace: TracebackType | None
    ) -> None:
        """Close this index."""
        self.close()

    def record_accession(self, document: AccessionDocument, *, key: str, sha256: str, size: int) -> None:
        """Record a sealed accession; nothing changes when the same file is recorded already.

        Parameters
        ----------
        document : AccessionDocument
            What the file says about itself.
        key, sha256 : str
            Its name in the store and its digest.
        size : int
            Its bytes.

        Raises
        ------
        DamagedFile
            If the key is recorded with other bytes, or the document contradicts itself or the index.
        """
        with writing(self._engine, self._url) as connection:
            add_accession(connection, document, key=key, sha256=sha256, size=size)

    def record_reduction(self, document: ReductionDocument, *, key: str, sha256: str, size: int) -> None:
        """Record a sealed reduction; as `record_accession`."""
        with writing(self._engine, self._url) as connection:
            add_reduction(connection, document, key=key, sha256=sha256, size=size)

    def record_act(self, document: ActDocument, *, key: str, sha256: str, size: int) -> None:
        """Record a sealed revision, amendment or withdrawal; as `record_accession`."""
        with writing(self._engine, self._url) as connection:
            add_act(connection, document, key=key, sha256=sha256, size=size)

    def record(self, document: Document, *, key: str, sha256: str, size: int) -> None:
        """Record a sealed file of any kind; as `record_accession`."""
        if isinstance(document, AccessionDocument):
            self.record_accession(document, key=key, sha256=sha256, size=size)
        elif isinstance(document, ReductionDocument):
            self.record_reduction(document, key=key, sha256=sha256, size=size)
        else:
            self.record_act(document, key=key, sha256=sha256, size=size)

    def rebuild(self, entries: Iterable[Entry]) -> None:
        """Make all rows anew; when anything fails, also in `entries`, the old rows stay.

        Parameters
        ----------
        entries : iterable of (key, sha256, size, document)
            Every sealed file, in any order; they are taken one at a time.
        """
        with writing(self._engine, self._url) as connection:
            clear(connection)
            _add_all(connection, entries)

    def rehearse(self, entries: Iterable[Entry]) -> None:
        """Raise what recording sealed files would raise, and keep nothing of it.

        Parameters
        ----------
        entries : iterable of (key, sha256, size, document)
            In the order of recording.
        """
        with suppress(_RehearsedError), writing(self._engine, self._url) as connection:
            _add_all(connection, entries)
            raise _RehearsedError

    def rows(self) -> dict[str, list[tuple[Any, ...]]]:
        """Every row of every table, by key: equal indexes give equal rows, whatever the engine."""
        with reading(self._engine, self._url) as connection:
            return {
                name: [tuple(row) for row in connection.execute(queries.all_rows(table))]
                for name, table in sorted(Base.metadata.tables.items())
            }

    def faults(self) -> list[str]:
        """What the database itself finds wrong with its pages and its search trees; PostgreSQL has no such check."""
        if self._url.get_backend_name() != "sqlite":
            return []
        with reading(self._engine, self._url) as connection:
            said = [str(row[0]) for row in connection.exec_driver_sql("PRAGMA integrity_check(20)")]
        return [] if said == ["ok"] else said

    def disagreements(self, other: Index) -> list[str]:
        """What another index has otherwise, one sentence for each table that differs; rows are read one by one.

        Raises
        ------
        DamagedFile
            If a row of either cannot be read.
        """
        found = []
        with reading(self._engine, self._url) as one, reading(other._engine, other._url) as two:
            for name, table in sorted(Base.metadata.tables.items()):
                query = queries.all_rows(table)
                pairs = zip_longest(
                    map(tuple, one.execution_options(yield_per=1000).execute(query)),
                    map(tuple, two.execution_options(yield_per=1000).execute(query)),
                )
                first = next(((mine, its) for mine, its in pairs if mine != its), None)
                if first is not None:
                    found.append(f"table {name}: {_unequal(table, *first)}")
        return found


class _RehearsedError(Exception):
    """Ends the transaction of a rehearsal, so that nothing of it is kept."""


def _add_all(connection: Connection, entries: Iterable[Entry]) -> None:
    for key, sha256, size, document in entries:
        if isinstance(document, AccessionDocument):
            add_accession(connection, document, key=key, sha256=sha256, size=size)
        elif isinstance(document, ReductionDocument):
            add_reduction(connection, document, key=key, sha256=sha256, size=size)
        else:
            add_act(connection, document, key=key, sha256=sha256, size=size)


def _unequal(table: Table, mine: tuple[Any, ...] | None, its: tuple[Any, ...] | None) -> str:
    """What the first two unequal rows of a table tell."""
    row = mine if its is None else its
    key = (
        ", ".join(str(row[table.columns.keys().index(column.name)]) for column in table.primary_key)
        if row
        else ""
    )
    if mine is None or its is None:
        return f"the row of {key} is {'missing' if mine is None else 'one too many'}"
    columns = [name for name, a, b in zip(table.columns.keys(), mine, its, strict=True) if a != b]
    return f"the row of {key} differs in {', '.join(columns)}"


@contextmanager
def _disposed_on_failure(engine: Engine) -> Iterator[None]:
    try:
        yield
    except BaseException:
        engine.dispose()
        raise

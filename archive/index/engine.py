"""Connections: how each engine is opened, and what its errors mean here.

Rules
-----
* SQLite: foreign keys on, write-ahead log, every commit synced to the disk; one writer at a time, taken at the
  beginning of its transaction, so that waiting for it has an end and never fails half-way.
* An SQLite index in a folder that a reader may not write to (another person's, a backup) can be read all the same.
* PostgreSQL: repeatable read; writers queue on a table lock, with the same bound on waiting.
* "Damaged" is never reported as "absent", and "busy" as neither.
"""

from __future__ import annotations

import os
import shutil
import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from sqlalchemy import Connection, Engine, create_engine, event, exc, text
from sqlalchemy.engine import URL, make_url
from sqlalchemy.pool import NullPool, QueuePool

from archive.errors import ArchiveBusy, ArchiveError, BadRequest, DamagedFile, MissingFile
from archive.index.columns import UnreadableError

__all__ = [
    "REBUILD",
    "WAIT_SECONDS",
    "connected",
    "engine_of",
    "for_reading_only",
    "index_name",
    "index_url",
    "reading",
    "sqlite_address",
    "translated",
    "writing",
]

WAIT_SECONDS = 10.0
"""How long to wait for another writer (common practice, no source)."""

REBUILD = "make it anew from the sealed files: stillroom rebuild-index"

_DAMAGE = (
    "file is not a database",
    "malformed",
    "database corruption",
    "could not decode to utf-8",
    "unsupported file format",
)
# PostgreSQL, appendix A of its manual: class 55 lock_not_available, class 40 serialization_failure and deadlock_detected,
# class 23 integrity_constraint_violation, 42P01 undefined_table, 42501 insufficient_privilege, 53100 disk_full.
_BUSY_STATES = ("55P03", "40001", "40P01")
_CONTRADICTION = "23"
_NO_TABLE = "42P01"
_DISK_FULL = "53100"
_NO_PRIVILEGE = "42501"


def index_url(text_url: str) -> URL:
    """Return parsed address of an index.

    Raises
    ------
    BadRequest
        If it is none that Stillroom can use.
    """
    expected = "sqlite:///folder/index.sqlite3 or postgresql+psycopg://user@host/database"
    path = text_url.removeprefix("sqlite:///")
    if path not in (text_url, "", ":memory:"):
        # Taken as it stands: a path may hold "?", "#" and "%", which an address would read otherwise.
        return URL.create("sqlite+pysqlite", database=path)
    try:
        url = make_url(text_url)
    except exc.ArgumentError as fault:
        raise BadRequest(
            "the address of the index cannot be read", found=text_url, expected=expected
        ) from fault
    if url.drivername in ("postgresql", "postgresql+psycopg"):
        return url.set(drivername="postgresql+psycopg")
    raise BadRequest(
        "no index can be kept there", found=url.render_as_string(hide_password=True), expected=expected
    )


def index_name(url: URL) -> str:
    """Return the name that people know the index by: its file, or its address without the password."""
    if url.get_backend_name() == "sqlite":
        return str(url.database)
    return url.render_as_string(hide_password=True)


_ROOM = 1 << 16  # bytes: the log's index takes 32 KiB, and its first pages as much


def engine_of(url: URL, *, read_only: bool, new: bool = False, wait: float = WAIT_SECONDS) -> Engine:
    """Return an engine with the rules of this module.

    Parameters
    ----------
    url : URL
        From `index_url`.
    read_only : bool
        Whether the database itself refuses writes.
    new : bool
        Whether an SQLite file may be made.
    wait : float
        Longest wait for another writer, in seconds.
    """
    if url.get_backend_name() == "sqlite":
        return _sqlite(url, mode="ro" if read_only else "rwc" if new else "rw", wait=wait)
    return _postgresql(url, read_only=read_only, wait=wait)


def _sqlite(url: URL, *, mode: str, wait: float) -> Engine:
    path = Path(str(url.database)).absolute()

    def connection_to_file() -> sqlite3.Connection:
        # Asked anew for every connection, as a writer may have come or gone.
        if mode == "rwc":
            # SQLite makes its files for their owner alone to write; in a shared archive the umask is to say who may.
            os.close(os.open(path, os.O_RDWR | os.O_CREAT, 0o666))
        elif not path.exists():
            raise MissingFile("the index is not there", file=str(path), remedy=REBUILD)
        address = sqlite_address(path, mode=mode)
        return sqlite3.connect(address, uri=True, timeout=wait, check_same_thread=False)

    engine = create_engine(
        "sqlite+pysqlite://", creator=connection_to_file, poolclass=NullPool if mode == "ro" else QueuePool
    )

    @event.listens_for(engine, "connect")
    def _prepare(connection: Any, _record: object) -> None:
        # The driver would begin transactions by itself, too late and never as a writer; `_begin` does it instead.
        connection.isolation_level = None
        connection.execute("PRAGMA foreign_keys = ON")
        if mode != "ro":
            connection.execute("PRAGMA journal_mode = WAL")
            connection.execute("PRAGMA synchronous = FULL")

    @event.listens_for(engine, "begin")
    def _begin(connection: Connection) -> None:
        writes = connection.get_execution_options().get("writes", False)
        connection.exec_driver_sql("BEGIN IMMEDIATE" if writes else "BEGIN")

    return engine


def sqlite_address(path: Path, *, mode: str) -> str:
    """Return the address by which SQLite opens a file; what may only be read is opened as it lies there."""
    return path.as_uri() + f"?mode={mode}" + ("&immutable=1" if mode == "ro" and _at_rest(path) else "")


def for_reading_only(folder: Path) -> bool:
    """Whether an SQLite file in a folder can only be read: no right to write there, or no room for the log's own index."""
    return not os.access(folder, os.W_OK) or shutil.disk_usage(folder).free < _ROOM


def _at_rest(path: Path) -> bool:
    """Return whether nobody writes to a file, in a folder where this process could not lay the log's own index."""
    return not path.with_name(f"{path.name}-wal").exists() and for_reading_only(path.parent)


def _postgresql(url: URL, *, read_only: bool, wait: float) -> Engine:
    try:
        engine = create_engine(url, isolation_level="REPEATABLE READ", pool_pre_ping=True)
    except ImportError as fault:
        raise BadRequest(
            "the driver for PostgreSQL is not installed",
            remedy="install it: pip install 'stillroom[postgresql]'",
        ) from fault

    @event.listens_for(engine, "connect")
    def _prepare(connection: Any, _record: object) -> None:
        with connection.cursor() as cursor:
            cursor.execute(
                "SELECT set_config('lock_timeout', %s, false)", (f"{max(1, round(wait * 1000))}ms",)
            )
            cursor.execute(
                "SELECT set_config('default_transaction_read_only', %s, false)",
                ("on" if read_only else "off",),
            )
        connection.commit()

    return engine


@contextmanager
def connected(engine: Engine, url: URL, *, writes: bool) -> Iterator[Connection]:
    """Return a connection in one transaction, its errors told as Stillroom's own; tables need not exist."""
    with translated(url), engine.connect() as connection:
        connection.execution_options(writes=writes)
        with connection.begin():
            yield connection


@contextmanager
def reading(engine: Engine, url: URL) -> Iterator[Connection]:
    """Return a connection that sees one state of the index throughout."""
    with connected(engine, url, writes=False) as connection:
        yield connection


@contextmanager
def writing(engine: Engine, url: URL) -> Iterator[Connection]:
    """Return a connection in the one writing transaction: committed whole at the end, or not at all."""
    with connected(engine, url, writes=True) as connection:
        if connection.dialect.name == "postgresql":
            # Readers go on; the next writer waits here, before its snapshot is taken.
            connection.execute(text("LOCK TABLE sealed_file IN SHARE ROW EXCLUSIVE MODE"))
        yield connection


@contextmanager
def translated(url: URL) -> Iterator[None]:
    """Errors of the database in here, told as Stillroom's own.

    Raises
    ------
    ArchiveBusy
        If another process held the index longer than the wait.
    DamagedFile
        If the index is not a database any more, or contradicts itself.
    MissingFile
        If its file or its tables are not there.
    ArchiveError
        If the database refuses or cannot be reached for another reason.
    """
    try:
        yield
    except UnreadableError as fault:
        raise DamagedFile(f"the index is damaged: {fault}", file=index_name(url), remedy=REBUILD) from fault
    except UnicodeDecodeError as fault:
        # SQLite's own words for a damaged schema quote it, and what it quotes is no text any more.
        raise DamagedFile(
            "the index is damaged: it holds text that is none", file=index_name(url), remedy=REBUILD
        ) from fault
    except UnicodeEncodeError as fault:
        # Bytes of the command line that were no text in its code page come as lone surrogates.
        raise BadRequest(
            "what is asked for is not text", found=repr(fault.object[:80]), expected="text in UTF-8"
        ) from fault
    except exc.DBAPIError as fault:
        raise _meaning(fault.orig, index_name(url)) from fault
    except sqlite3.Error as fault:
        raise _meaning(fault, index_name(url)) from fault


def _meaning(fault: BaseException | None, name: str) -> ArchiveError:
    said = (str(fault).strip().splitlines() or [type(fault).__name__])[0]
    low = said.lower()
    state = getattr(fault, "sqlstate", None) or ""
    if "database is locked" in low or state in _BUSY_STATES:
        return ArchiveBusy(
            "another process is writing to the index", file=name, remedy="try again when it has finished"
        )
    if any(sign in low for sign in _DAMAGE):
        return DamagedFile(f"the index is damaged ({said})", file=name, remedy=REBUILD)
    if isinstance(fault, sqlite3.IntegrityError) or state.startswith(_CONTRADICTION):
        return DamagedFile(f"what is to be recorded contradicts itself or the index ({said})", file=name)
    if "no such table" in low or state == _NO_TABLE:
        return MissingFile(f"a table of the index is missing ({said})", file=name, remedy=REBUILD)
    return _refusal(said, low, state, name)


def _refusal(said: str, low: str, state: str, name: str) -> ArchiveError:
    """Return what it means when a sound and free database refuses."""
    if "disk is full" in low or state == _DISK_FULL:
        return ArchiveError(
            "the index cannot be written: the disk is full",
            file=name,
            remedy="make room and try again; what had been sealed is not lost",
        )
    if "readonly database" in low or "read-only transaction" in low:
        return BadRequest("the index is open for reading only", file=name)
    if state == _NO_PRIVILEGE:
        return BadRequest(
            f"your role in the database of the index may not do this ({said})",
            file=name,
            remedy="ask the owner of the index for the role stillroom_writer; see: stillroom roles",
        )
    remedy = "see whether the disk is full or failing, then try again" if "disk i/o error" in low else None
    return ArchiveError(f"the database of the index refused ({said})", file=name, remedy=remedy)

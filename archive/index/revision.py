"""The revision of the tables: made from zero, recognised, and raised to this program's.

Rules
-----
* Alembic makes and changes every table; it is imported only when there is something to make or change.
* Before an SQLite index is changed, a copy is laid beside it; a change is one transaction and leaves the old index if it fails.
"""

from __future__ import annotations

import sqlite3
from contextlib import closing
from importlib.resources import as_file, files
from itertools import count
from pathlib import Path
from typing import TYPE_CHECKING

from sqlalchemy import Column, Connection, Engine, MetaData, Table, Text, inspect, select, text
from sqlalchemy.engine import URL

from archive.errors import ArchiveBusy, ArchiveError, BadRequest, DamagedFile, MissingFile
from archive.index.engine import REBUILD, connected, index_name, reading, translated

if TYPE_CHECKING:
    from alembic.config import Config

__all__ = ["HEAD", "make", "migration_config", "raise_to_head", "upgrade"]

HEAD = "0002"
"""The revision this program works with."""

_VERSION = Table("alembic_version", MetaData(), Column("version_num", Text))


def _revision_of(connection: Connection, *, name: str) -> str:
    """Revision of the tables that a connection leads to.

    Parameters
    ----------
    connection : Connection
        Any.
    name : str
        What people call the index.

    Raises
    ------
    MissingFile
        If there are no tables, or they are not those of an index.
    """
    if not inspect(connection).has_table(_VERSION.name):
        raise MissingFile("there are no tables of an index here", file=name, remedy=REBUILD)
    revision = connection.execute(select(_VERSION.c.version_num)).scalar()
    if revision is None:
        raise MissingFile("the tables of the index are not there", file=name, remedy=REBUILD)
    return str(revision)


def _is_older(revision: str, *, name: str) -> bool:
    """Whether tables of a revision must be raised before this program can use them.

    Raises
    ------
    BadRequest
        If this program does not know the revision: a newer one wrote it.
    """
    if revision == HEAD:
        return False
    if _is_known(revision):
        return True
    raise BadRequest(
        "the index was written by a newer Stillroom than this one",
        file=name,
        expected=f"revision {HEAD} of its tables, or an older one",
        found=f"revision {revision}",
        remedy="use the newer Stillroom; nothing was changed",
    )


def _is_known(revision: str) -> bool:
    """Whether a migration of this program made that revision."""
    from alembic.script import ScriptDirectory

    known = ScriptDirectory.from_config(migration_config())
    return any(script.revision == revision for script in known.walk_revisions())


def migration_config(connection: Connection | None = None) -> Config:
    """Alembic's settings for this program's migrations, working on a connection.

    Raises
    ------
    MissingFile
        If the migrations are not installed as plain files.
    """
    from alembic.config import Config

    with as_file(files("migrations")) as folder:
        place = Path(folder)
    if not (place / "env.py").is_file():
        raise MissingFile(
            "the migrations of the index are not installed", file=str(place), remedy="install stillroom again"
        )
    config = Config(attributes={} if connection is None else {"connection": connection})
    # "%" begins an interpolation in these settings.
    config.set_main_option("script_location", str(place).replace("%", "%%"))
    return config


def upgrade(connection: Connection, to: str = "head") -> None:
    """Make or raise the tables, inside the transaction of a connection, which must be rolled back if it raises."""
    from alembic import command

    command.upgrade(migration_config(connection), to)


def make(engine: Engine, url: URL) -> None:
    """Make the tables in an empty database.

    Raises
    ------
    BadRequest
        If there are tables already.
    """
    with connected(engine, url, writes=True) as connection:
        if inspect(connection).has_table(_VERSION.name):
            raise BadRequest(
                "there is an index here already",
                file=index_name(url),
                remedy="open it, or set it aside first",
            )
        upgrade(connection)


def raise_to_head(engine: Engine, url: URL, *, read_only: bool) -> None:
    """Make sure that the tables are of this program's revision; older ones are raised, a copy kept beside.

    Raises
    ------
    MissingFile
        If there are no tables.
    BadRequest
        If a newer Stillroom wrote them, or they must be raised but the index is open for reading only.
    """
    name = index_name(url)
    with reading(engine, url) as connection:
        revision = _revision_of(connection, name=name)
    if not _is_older(revision, name=name):
        return
    if read_only:
        raise BadRequest(
            f"the tables of the index are of the older revision {revision}",
            file=name,
            remedy="open it once for writing; it is then raised, and a copy of the old one kept",
        )
    # Whatever a migration raises is told by this program, as what it means to the index.
    try:
        with connected(engine, url, writes=True) as connection:
            _raised(connection, url, name=name)
    except ArchiveBusy:
        raise
    except Exception as fault:
        raise _not_raised(fault, revision=revision, name=name) from fault


def _raised(connection: Connection, url: URL, *, name: str) -> None:
    """Raise older tables inside the one writing transaction; a copy is kept if it comes to its end."""
    if connection.dialect.name == "postgresql":
        # A second program that wants to raise the tables waits here, and then finds nothing left to do.
        connection.execute(text("LOCK TABLE alembic_version IN SHARE ROW EXCLUSIVE MODE"))
    revision = _revision_of(connection, name=name)
    if not _is_older(revision, name=name):
        return
    if connection.dialect.name != "sqlite":
        upgrade(connection)
        return
    with translated(url):
        copy = _copied_beside(Path(name), revision=revision)
    try:
        upgrade(connection)
    except BaseException:
        copy.unlink()  # the index itself is still the old one
        raise


def _not_raised(fault: Exception, *, revision: str, name: str) -> ArchiveError:
    """Return what it means to the index that its tables could not be raised."""
    remedy = (
        "go on with the Stillroom that wrote it; or move the index away, with the files whose names begin as its own, and "
        "make it anew from the sealed files: stillroom rebuild-index"
    )
    said = (str(fault).strip().splitlines() or [type(fault).__name__])[0]
    if isinstance(fault, ArchiveError):
        said = fault.what
        # A full disk or a missing right is mended and tried again; a table that is missing to a migration is not.
        if not isinstance(fault, MissingFile | DamagedFile) and fault.remedy is not None:
            remedy = fault.remedy
    elif isinstance(fault, OSError) and fault.strerror:
        said, remedy = fault.strerror, "make room or mend the disk, and open the archive again"
    return ArchiveError(
        f"the tables of the index could not be raised from revision {revision} to {HEAD}, and are as they were ({said})",
        file=name,
        remedy=remedy,
    )


def _copied_beside(path: Path, *, revision: str) -> Path:
    """Path of a consistent copy of an SQLite index, `index.sqlite3.before-0001`; an earlier copy is kept.

    Parameters
    ----------
    path : Path
        The index; the caller is the one who writes to it.
    revision : str
        Revision it has now.
    """
    # Under a name of its own until it is whole; what lies there was left by a program that was stopped.
    staged = path.with_name(f"{path.name}.before-{revision}.partial")
    for suffix in ("", "-journal"):
        staged.with_name(staged.name + suffix).unlink(missing_ok=True)
    staged.touch(mode=0o666)  # SQLite itself would leave the group out, whatever the umask says
    # SQLite's own copy holds what still stands in the write-ahead log; a copy of the file alone would not.
    with closing(sqlite3.connect(path)) as source, closing(sqlite3.connect(staged)) as target:
        source.backup(target)
    free = (
        path.with_name(f"{path.name}.before-{revision}" + (f".{attempt}" if attempt > 1 else ""))
        for attempt in count(1)
    )
    copy = next(each for each in free if not each.exists())
    return staged.rename(copy)

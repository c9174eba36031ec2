"""Archives for tests of faults whose index is a database on a server: each trial gets one of its own, copied from a template."""

from __future__ import annotations

import os
import re
import shutil
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import psycopg
from psycopg.sql import SQL, Identifier
from sqlalchemy.engine import URL, make_url

from archive import Archive
from archive.index import Index

__all__ = ["on_a_server", "own_database"]

_ADDRESS = re.compile(r'^index = "(postgresql[^"]*)"$', re.MULTILINE)


@contextmanager
def on_a_server(url: URL, beside: Path, folder: Path) -> Iterator[Path]:
    """Return a context that yields a folder like `beside`, in which the archives have their index on a server.

    Parameters
    ----------
    url : URL
        A database whose user may create others.
    beside : Path
        From `tests.crash.operations.prepared`.
    folder : Path
        Where to; it must be free.
    """
    prefix = f"crash{os.getpid()}"
    shutil.copytree(beside, folder)
    try:
        for start in ("empty", "filled"):
            root = folder / start
            for path in root.glob("index.sqlite3*"):
                path.unlink()
            named = url.set(database=f"{prefix}_{start}")
            _administer(url, SQL("CREATE DATABASE {}").format(Identifier(str(named.database))))
            address = named.render_as_string(hide_password=False)
            Index.create(address).close()
            settings = root / "stillroom.toml"
            settings.write_text(settings.read_text() + f'index = "{address}"\n')
            Archive.rebuild_index(root)
        yield folder
    finally:
        for name in _names(url, prefix):
            _administer(url, SQL("DROP DATABASE {} WITH (FORCE)").format(Identifier(name)))


def own_database(root: Path) -> bool:
    """Give a copied archive a copy of the database that its settings name; False if they name none."""
    settings = root / "stillroom.toml"
    text = settings.read_text()
    found = _ADDRESS.search(text)
    if found is None:
        return False
    url = make_url(found[1])
    own = url.set(database=f"{url.database}_{root.parent.name}")
    copied = SQL("CREATE DATABASE {} TEMPLATE {}").format(
        Identifier(str(own.database)), Identifier(str(url.database))
    )
    _administer(url.set(database="postgres"), copied)
    settings.write_text(text.replace(found[1], own.render_as_string(hide_password=False)))
    return True


def _administer(url: URL, statement: psycopg.sql.Composed) -> None:
    with _connection(url) as connection:
        connection.execute(statement)


def _names(url: URL, prefix: str) -> list[str]:
    with _connection(url) as connection:
        rows = connection.execute(
            "SELECT datname FROM pg_database WHERE starts_with(datname, %s)", [prefix]
        ).fetchall()
    return [name for (name,) in rows]


def _connection(url: URL) -> psycopg.Connection:
    plain = url.set(drivername="postgresql").render_as_string(hide_password=False)
    return psycopg.connect(plain, autocommit=True)

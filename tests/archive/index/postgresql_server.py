"""A PostgreSQL server for tests: the one that is named, or a fresh one made and thrown away here.

`STILLROOM_TEST_POSTGRESQL` names a server (`postgresql+psycopg://user@host/database`; each test makes its own schema
there and drops it). Without it a cluster is made with the server's own programs, when they are installed. With
`STILLROOM_REQUIRE_ALL=1` a server that cannot be had is a failure, not a skip.
"""

from __future__ import annotations

import os
import pwd
import shutil
import subprocess
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import psycopg
from sqlalchemy.engine import URL, make_url

from tests.outside import missing

__all__ = ["own_schema", "server"]


def _programs() -> Path | None:
    """Return the newest installed folder that holds initdb and pg_ctl."""
    found = [path for path in Path("/usr/lib/postgresql").glob("*/bin") if (path / "initdb").exists()]
    if found:
        return max(found, key=lambda path: int(path.parent.name))
    on_path = shutil.which("initdb")
    return None if on_path is None else Path(on_path).resolve().parent


def _as_nobody(folder: Path) -> list[str]:
    """Return the words before a command that give root's rights away: the server refuses to run as root."""
    if os.getuid() != 0:
        return []
    names = {entry.pw_name for entry in pwd.getpwall()}
    user = next(name for name in ("postgres", "nobody") if name in names)
    shutil.chown(folder, user)
    return ["runuser", "-u", user, "--"]


def _language_order(programs: Path) -> list[str]:
    said = subprocess.run([programs / "initdb", "--help"], capture_output=True, text=True, check=True).stdout
    return ["--locale-provider=icu", "--icu-locale=en-US"] if "--icu-locale" in said else []


@contextmanager
def server() -> Iterator[URL]:
    """Address of a running server."""
    named = os.environ.get("STILLROOM_TEST_POSTGRESQL")
    if named:
        yield make_url(named).set(drivername="postgresql+psycopg")
        return
    programs = _programs()
    if programs is None:
        missing(
            "PostgreSQL's server programs are not installed, and STILLROOM_TEST_POSTGRESQL names no server"
        )
        return
    # The path of a Unix socket may have about 100 characters only, so the folder is not pytest's.
    with tempfile.TemporaryDirectory(prefix="stillroom-pg-", ignore_cleanup_errors=True) as made:
        folder = Path(made)
        before = _as_nobody(folder)
        data = folder / "data"
        initialise = [
            *before,
            str(programs / "initdb"),
            "-D",
            str(data),
            "-U",
            "stillroom",
            "-A",
            "trust",
            "-E",
            "UTF8",
            "-N",
        ]
        # A language's own order of text, to see that the index does not follow it (ICU came to initdb with version 15).
        _run([*initialise, "--locale=C", *_language_order(programs)])
        settings = (
            f"-c listen_addresses='' -c unix_socket_directories='{folder}' -c fsync=off -c max_connections=30"
        )
        control = [*before, str(programs / "pg_ctl"), "-D", str(data)]
        _run([*control, "-l", str(folder / "log"), "-o", settings, "-w", "start"])
        try:
            yield URL.create(
                "postgresql+psycopg", username="stillroom", database="postgres", query={"host": made}
            )
        finally:
            _run([*control, "-m", "immediate", "-w", "stop"])


def _run(command: list[str]) -> None:
    finished = subprocess.run(
        command, stdout=subprocess.DEVNULL, stderr=subprocess.PIPE, check=False, timeout=60, cwd="/"
    )
    if finished.returncode:
        missing(f"{Path(command[-1]).name}: {finished.stderr.decode(errors='replace')[-500:]}")


@contextmanager
def own_schema(url: URL, name: str) -> Iterator[str]:
    """Address of an empty schema on a server, dropped afterwards."""
    plain = url.set(drivername="postgresql").render_as_string(hide_password=False)
    with psycopg.connect(plain, autocommit=True) as connection:
        connection.execute(psycopg.sql.SQL("CREATE SCHEMA {}").format(psycopg.sql.Identifier(name)))
        try:
            yield url.update_query_dict({"options": f"-csearch_path={name}"}).render_as_string(
                hide_password=False
            )
        finally:
            connection.execute(psycopg.sql.SQL("DROP SCHEMA {} CASCADE").format(psycopg.sql.Identifier(name)))

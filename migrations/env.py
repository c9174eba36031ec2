"""The environment that Alembic runs migrations in.

The index passes its own connection, in a transaction, as `config.attributes["connection"]`. Somebody who writes a
migration names a database instead: `alembic -x url=sqlite:///folder/index.sqlite3 revision --autogenerate -m "..."`.
"""

from __future__ import annotations

from alembic import context
from sqlalchemy import Connection, create_engine

from archive.index.tables import Base

__all__: list[str] = []


def _migrate(connection: Connection) -> None:
    # SQLite, too, takes changes of tables back with their transaction; Alembic assumes that it does not.
    context.configure(connection=connection, target_metadata=Base.metadata, transactional_ddl=True)
    with context.begin_transaction():
        context.run_migrations()


def _run() -> None:
    passed = context.config.attributes.get("connection")
    if passed is not None:
        _migrate(passed)
        return
    url = context.get_x_argument(as_dictionary=True).get("url")
    if url is None:
        raise SystemExit("name the database: alembic -x url=sqlite:///folder/index.sqlite3 ...")
    with create_engine(url).begin() as connection:
        _migrate(connection)


_run()

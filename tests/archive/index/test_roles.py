"""On PostgreSQL: who reads cannot write, who records cannot take tables away; both are told so in a sentence."""

from __future__ import annotations

import uuid
from collections.abc import Iterator
from importlib.resources import files

import psycopg
import pytest
from sqlalchemy.engine import URL, make_url

from archive.errors import BadRequest
from archive.index import Entry, Index, SearchQuery
from tests.archive.index.documents import accession, entry, reduction
from tests.archive.index.postgresql_server import own_schema

pytestmark = pytest.mark.postgresql

FIRST, REDUCED = entry(accession()), entry(reduction())


def _recorded(index: Index, one: Entry) -> None:
    index.record(one[3], key=one[0], sha256=one[1], size=one[2])


def _as(address: str, role: str) -> str:
    """Give an address at which everything is done in a role."""
    url = make_url(address)
    return url.update_query_dict({"options": f"{url.query['options']} -crole={role}"}).render_as_string(
        hide_password=False
    )


def _plain(address: str) -> str:
    return make_url(address).set(drivername="postgresql").render_as_string(hide_password=False)


@pytest.fixture(scope="module")
def shared(postgresql: URL) -> Iterator[str]:
    """Give the address of an index with one accession, to which the shipped roles were applied twice."""
    with own_schema(postgresql, f"t{uuid.uuid4().hex}") as address:
        with Index.create(address) as index:
            _recorded(index, FIRST)
        text = (files("archive.index") / "roles.sql").read_text(encoding="utf-8")
        with psycopg.connect(_plain(address), autocommit=True) as connection:
            connection.execute(text)
            connection.execute(text)
        yield address
        with psycopg.connect(_plain(address), autocommit=True) as connection:
            connection.execute("DROP OWNED BY stillroom_reader, stillroom_writer")
            connection.execute("DROP ROLE stillroom_reader, stillroom_writer")


def test_a_reader_searches_and_changes_nothing(shared: str) -> None:
    with Index.open(_as(shared, "stillroom_reader"), read_only=True) as index:
        assert index.search(SearchQuery())
    # Not the connection but the database refuses, when somebody forgets to ask for reading alone.
    with Index.open(_as(shared, "stillroom_reader")) as index:
        before = index.rows()
        with pytest.raises(BadRequest, match=r"may not do this.*permission denied.*stillroom roles"):
            _recorded(index, entry(accession("Z-1")))
        assert index.rows() == before


def test_a_writer_records_and_makes_rows_anew(shared: str) -> None:
    with Index.open(_as(shared, "stillroom_writer")) as index:
        _recorded(index, REDUCED)
        before = index.rows()
        index.rebuild([REDUCED, FIRST])
        assert index.rows() == before


@pytest.mark.parametrize("role", ["stillroom_reader", "stillroom_writer"])
@pytest.mark.parametrize(
    "statement",
    [
        "DROP TABLE sweep",
        "TRUNCATE sweep CASCADE",
        "ALTER TABLE sweep ADD COLUMN more text",
        "CREATE TABLE mine (a int)",
        "UPDATE alembic_version SET version_num = '9999'",
        "DROP SCHEMA CURRENT CASCADE",
    ],
)
def test_neither_takes_tables_away(shared: str, role: str, statement: str) -> None:
    schema = str(make_url(shared).query["options"]).removeprefix("-csearch_path=")
    with psycopg.connect(_plain(shared), autocommit=True) as connection:
        connection.execute(f"SET ROLE {role}".encode())
        with pytest.raises(psycopg.errors.InsufficientPrivilege):
            connection.execute(statement.replace("CURRENT", schema).encode())

"""Every test of the index runs on both engines."""

from __future__ import annotations

import uuid
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest
from sqlalchemy.engine import URL

from archive.index import Index
from tests.archive.index.postgresql_server import own_schema, server

_ENGINES = ["sqlite", pytest.param("postgresql", marks=pytest.mark.postgresql)]


@pytest.fixture(scope="session")
def postgresql() -> Iterator[URL]:
    """Give the address of a PostgreSQL server."""
    with server() as url:
        yield url


@contextmanager
def _address(request: pytest.FixtureRequest, folder: Path) -> Iterator[str]:
    if request.param == "sqlite":
        yield f"sqlite:///{folder}/index.sqlite3"
        return
    with own_schema(request.getfixturevalue("postgresql"), f"t{uuid.uuid4().hex}") as address:
        yield address


@pytest.fixture(params=_ENGINES)
def url(request: pytest.FixtureRequest, tmp_path: Path) -> Iterator[str]:
    """Give an address at which an index can be created."""
    with _address(request, tmp_path) as address:
        yield address


@pytest.fixture(scope="module", params=_ENGINES)
def shared_url(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Iterator[str]:
    """Give such an address to all tests of a module, which must only read."""
    with _address(request, tmp_path_factory.mktemp("shared")) as address:
        yield address


@pytest.fixture
def index(url: str) -> Iterator[Index]:
    """Give an empty index."""
    with Index.create(url) as made:
        yield made

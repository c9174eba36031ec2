"""The door is tested on both engines of the index."""

from __future__ import annotations

import shutil
import uuid
from collections.abc import Iterator
from pathlib import Path

import pytest
from sqlalchemy.engine import URL

from archive import Archive
from tests.archive.index.postgresql_server import own_schema, server
from tests.small_cooldown import write_folder


@pytest.fixture(scope="session")
def postgresql() -> Iterator[URL]:
    """Give the address of a PostgreSQL server."""
    with server() as url:
        yield url


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Give a small cooldown folder."""
    return write_folder(tmp_path / "2026-03")


@pytest.fixture(scope="session")
def empty(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give the folder of an empty archive; copying it takes a fifteenth of the time that its migrations take."""
    root = tmp_path_factory.mktemp("empty") / "lab"
    Archive.create(root, name="Test laboratory").close()
    return root


@pytest.fixture
def sqlite_lab(empty: Path, tmp_path: Path) -> Iterator[Archive]:
    """Give an empty archive with its index beside it."""
    with Archive.open(shutil.copytree(empty, tmp_path / "lab")) as lab:
        yield lab


@pytest.fixture(params=["sqlite", pytest.param("postgresql", marks=pytest.mark.postgresql)])
def lab(request: pytest.FixtureRequest, tmp_path: Path) -> Iterator[Archive]:
    """Give an empty archive on each engine."""
    if request.param == "sqlite":
        yield request.getfixturevalue("sqlite_lab")
        return
    with (
        own_schema(request.getfixturevalue("postgresql"), f"t{uuid.uuid4().hex}") as address,
        Archive.create(tmp_path / "lab", name="Test laboratory", index=address) as lab,
    ):
        yield lab

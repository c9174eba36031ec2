"""One archive and one application for all pages."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest
from starlette.testclient import TestClient

from archive.web import application
from tests.filled_archive import filled


@pytest.fixture(scope="session")
def root(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give the folder of a filled archive."""
    return filled(tmp_path_factory.mktemp("looked-at"))


@pytest.fixture(scope="session")
def client(root: Path) -> Iterator[TestClient]:
    """Give a client of its pages."""
    with TestClient(application(root), base_url="http://localhost:8321") as client:
        yield client

"""What takes a while to make and every test of faults uses: archives to begin from, and a process that lends children."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest

from tests.crash.operations import prepared
from tests.crash.traced import Warm, warm


@pytest.fixture(scope="session")
def beside(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give a folder with the archives that operations begin from."""
    return prepared(tmp_path_factory.mktemp("beside"))


@pytest.fixture(scope="session")
def child() -> Iterator[Warm]:
    """Give the warm process."""
    with warm() as process:
        yield process

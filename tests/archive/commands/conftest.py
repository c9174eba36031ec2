"""A command run in this process, a fake archive in its place, and the demonstration run once."""

from __future__ import annotations

import subprocess
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner, Result

from archive.commands import opening
from archive.commands.main import stillroom
from tests.archive.commands.support import FakeArchive, child


@pytest.fixture
def fake(monkeypatch: pytest.MonkeyPatch) -> Callable[..., FakeArchive]:
    """Put a fake in the place of the archive that commands open."""

    def put(**answers: Any) -> FakeArchive:
        archive = FakeArchive(**answers)
        monkeypatch.setattr(opening, "open_archive", lambda folder: archive)
        monkeypatch.setattr(opening, "archive_or_none", lambda folder: archive)
        return archive

    return put


@pytest.fixture
def run() -> Callable[..., Result]:
    """Run a command line in this process; what escapes it is a failure of the test."""

    def command(*words: str) -> Result:
        return CliRunner().invoke(stillroom, list(words), catch_exceptions=False)

    return command


@pytest.fixture(scope="session")
def demonstration(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, subprocess.CompletedProcess[str]]:
    """Folder of the demonstration, and how its command ended."""
    folder = tmp_path_factory.mktemp("commands") / "stillroom-demo"
    return folder, child("demo", str(folder), seconds=1200, counted=False)

"""Outside parts that some tests need; under STILLROOM_REQUIRE_ALL=1 a missing one is a failure, not a skip."""

from __future__ import annotations

import os
import shutil

import pytest

__all__ = ["missing", "program"]


def missing(reason: str) -> None:
    """Skip the test with its reason, or fail it where everything is required."""
    if os.environ.get("STILLROOM_REQUIRE_ALL") == "1":
        pytest.fail(reason)
    pytest.skip(reason)


def program(name: str) -> str:
    """Path of a program of the system."""
    path = shutil.which(name)
    if path is None:
        missing(f"{name} is not installed")
    return path or name

"""Stopping a writer at its critical moments.

Everything that makes a file last goes through `archive.store.durable`, and there through its `os`. A stand-in for that
module counts the calls that matter and stops at the n-th: by an exception, after which clean-up still runs, or by the
end of the process, after which nothing does.
"""

from __future__ import annotations

import contextlib
import os
import subprocess
import sys
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import numpy as np

from archive.store import Column, SealedFile, durable, open_store

__all__ = ["KEY", "StoppedError", "faulty", "run_child", "seal"]

KEY = "2026-03/2026-03.a1"
COUNTED = ("mkdir", "chmod", "fsync", "link", "rename", "replace", "unlink", "write", "ftruncate")


class StoppedError(Exception):
    """The fault that a test asked for."""


class _FaultyOs:
    """The module `os`, except that the n-th call that matters stops."""

    def __init__(self, stop_at: int | None, stop: Callable[[], None]) -> None:
        self.calls: list[str] = []
        self._stop_at, self._stop = stop_at, stop

    def __getattr__(self, name: str) -> Any:
        real = getattr(os, name)
        if name not in COUNTED:
            return real

        def counted(*arguments: Any, **options: Any) -> Any:
            self.calls.append(name)
            if len(self.calls) == self._stop_at:
                self._stop()
            return real(*arguments, **options)

        return counted


def by_exception() -> None:
    """Stop, with clean-up."""
    raise StoppedError


def by_exit() -> None:
    """Stop dead."""
    os._exit(77)


@contextlib.contextmanager
def faulty(stop_at: int | None, stop: Callable[[], None] = by_exception) -> Iterator[list[str]]:
    """Return a context in which the durable call number `stop_at` stops; yields the calls made."""
    stand_in = _FaultyOs(stop_at, stop)
    durable.os = stand_in  # type: ignore[assignment]
    try:
        yield stand_in.calls
    finally:
        durable.os = os


def seal(root: Path) -> SealedFile:
    """Seal a file of several chunks, always the same."""
    with open_store(root).writer(KEY) as writer:
        writer.raw("noise.bin", [np.random.default_rng(1).bytes(700_000)])
        table = writer.table("sweep", [Column("T", "float64", "K", "K", "temperature", "Temperature")])
        table.append({"T": np.arange(50_000) / 7})
        writer.document('{"name": "2026-03"}')
        return writer.seal()


def run_child(program: str, *arguments: object) -> subprocess.CompletedProcess[str]:
    """Run Python text that may use this module as `faults`, and return how it ended.

    Coverage is not measured in it: its own files would be cut short by the limits that tests set.
    """
    text = f"import sys; sys.path.insert(0, {str(Path(__file__).parent)!r}); import faults\n{program}"
    command = [sys.executable, "-c", text, *map(str, arguments)]
    quiet = {name: value for name, value in os.environ.items() if not name.startswith("COVERAGE_")}
    return subprocess.run(command, capture_output=True, text=True, timeout=60, check=False, env=quiet)

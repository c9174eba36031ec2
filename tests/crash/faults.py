"""Stopping a writer at its critical moments.

Every call that matters is counted, and the n-th stops: by an exception, after which clean-up still runs, or by the end of
the process, after which nothing does. `faulty` counts what goes through `archive.store.durable`; `Watch`, in a child of
its own, counts what anybody does below a folder, and the commits of the index before and after.
"""

from __future__ import annotations

import contextlib
import os
import subprocess
import sys
from collections.abc import Callable, Iterable, Iterator
from pathlib import Path
from typing import Any

import numpy as np
from sqlalchemy import Connection, Engine, event
from sqlalchemy.engine.default import DefaultDialect

from archive.store import Column, SealedFile, durable, open_store

__all__ = ["KEY", "StoppedError", "Watch", "by_exception", "by_exit", "faulty", "run_child", "seal"]

KEY = "2026-03/2026-03.a1"
COUNTED = ("mkdir", "rmdir", "chmod", "fsync", "link", "rename", "replace", "unlink", "write", "ftruncate")


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


class Watch:
    """A watch over this process, for good: each call below a folder is counted, and one of them stops.

    Parameters
    ----------
    stop : callable
        How: `by_exception` or `by_exit`.

    Notes
    -----
    Through `os` go `durable`, `pathlib` and `shutil`. A writing transaction of the index counts twice: before its commit, and
    after it.
    """

    def __init__(self, stop: Callable[[], None]) -> None:
        self._stop, self._stop_at, self._top = stop, None, Path()
        self._calls: list[str] = []
        for name in COUNTED:
            setattr(os, name, self._watched(name, getattr(os, name)))
        self._commit, self._writes = DefaultDialect.do_commit, False
        event.listen(Engine, "commit", self._before)
        DefaultDialect.do_commit = lambda _, connection: self._committed(_, connection)  # type: ignore[method-assign]

    def begin(self, top: Path, stop_at: int | None) -> list[str]:
        """Count anew, below another folder; return the list that the calls made go into."""
        self._top, self._stop_at, self._calls, self._writes = top, stop_at, [], False
        return self._calls

    def _met(self, what: str) -> None:
        self._calls.append(what)
        if len(self._calls) == self._stop_at:
            self._stop()

    def _watched(self, name: str, real: Callable[..., Any]) -> Callable[..., Any]:
        def call(*arguments: Any, **options: Any) -> Any:
            place = _below(self._top, (*arguments[:2], *options.values()))
            if place is not None:
                self._met(f"{name} {place}")
            return real(*arguments, **options)

        return call

    def _before(self, connection: Connection) -> None:
        if connection.get_execution_options().get("writes"):
            self._writes = True
            self._met("commit")

    def _committed(self, dialect: DefaultDialect, connection: Any) -> None:
        self._commit(dialect, connection)
        if self._writes:
            self._writes = False
            self._met("committed")


def _below(top: Path, arguments: Iterable[Any]) -> str | None:
    """Return where below a folder a call is about, as far as its paths and open files say so."""
    for each in arguments:
        path = each
        if isinstance(each, int):
            with contextlib.suppress(OSError):
                path = Path(f"/proc/self/fd/{each}").readlink()
        if isinstance(path, str | Path) and Path(path).is_relative_to(top):
            return str(Path(path).relative_to(top))
    return None


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

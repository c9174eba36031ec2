"""Operations watched from outside, system call by system call, and failed there: the program itself does not know.

`strace` attaches to a forked child of a warm process (`tests.crash.warm`) before the operation begins. It writes down what
is called, or makes the n-th call of a name fail or lie.
"""

from __future__ import annotations

import contextlib
import json
import os
import re
import subprocess
import sys
import time
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from tests.outside import missing, program

__all__ = ["Call", "Warm", "warm"]

WRITING = (
    "write", "pwrite64", "writev", "pwritev", "ftruncate", "truncate", "fallocate", "copy_file_range", "sendfile",
    "fsync", "fdatasync", "link", "linkat", "symlink", "symlinkat", "rename", "renameat", "renameat2", "unlink", "unlinkat",
    "mkdir", "mkdirat", "rmdir", "chmod", "fchmod", "fchmodat",
)  # fmt: skip
"""Calls by which a process changes files."""


@dataclass(frozen=True)
class Call:
    """One call in the list of an undisturbed run.

    Attributes
    ----------
    name : str
    number : int
        The how-manieth of its name, from 1.
    place : str
        What kind of file it was about, such as ``sealed`` or ``index.sqlite3-wal``.
    """

    name: str
    number: int
    place: str


class Warm:
    """The warm process."""

    def __init__(self, process: subprocess.Popen[str]) -> None:
        self._process = process

    def stopped(self, operation: str, how: str, folder: Path, beside: Path) -> list[dict[str, Any]]:
        """Return what became of an operation that was stopped at each of its durable calls; see `tests.crash.warm.stopped`."""
        asked = {"stopped": operation, "how": how, "folder": str(folder), "beside": str(beside)}
        found: list[dict[str, Any]] = json.loads(self._ask(asked))
        return found

    def run(
        self,
        operation: str,
        root: Path,
        beside: Path,
        *,
        options: Sequence[str] = (),
        longest: int | None = None,
    ) -> dict[str, str]:
        """Return how an operation ended that was traced with these options; none: not traced."""
        child = int(
            self._ask({"operation": operation, "root": str(root), "beside": str(beside), "longest": longest})
        )
        tracer = self._attached(child, options) if options else None
        told: dict[str, str] = json.loads(self._ask({}))
        if tracer is not None:
            tracer.communicate(timeout=60)
        return told

    def calls(self, operation: str, root: Path, beside: Path, log: Path) -> list[Call]:
        """Return the calls of an undisturbed run that are about files of the archive or beside it."""
        options = ["-y", "-e", f"trace={','.join(f'?{name}' for name in WRITING)}", "-o", str(log)]
        told = self.run(operation, root, beside, options=options)
        assert told["state"] == "done", told
        counts: dict[str, int] = {}
        found = []
        for line in log.read_text(encoding="utf-8", errors="replace").splitlines():
            name = line.partition("(")[0]
            if name not in WRITING:
                continue
            counts[name] = counts.get(name, 0) + 1
            if (place := _place(line, root)) is not None:
                found.append(Call(name, counts[name], place))
        return found

    def written(self, operation: str, root: Path, beside: Path, log: Path) -> list[str]:
        """Return the lines of an undisturbed run with all that was written, every text in hexadecimal."""
        names = (*WRITING, "open", "openat", "creat")
        options = [
            "-y",
            "-xx",
            "-s",
            "9000000",
            "-e",
            f"trace={','.join(f'?{name}' for name in names)}",
            "-o",
            str(log),
        ]
        told = self.run(operation, root, beside, options=options)
        assert told["state"] == "done", told
        return log.read_text(encoding="ascii").splitlines()

    def _ask(self, what: dict[str, Any]) -> str:
        assert self._process.stdin is not None
        assert self._process.stdout is not None
        self._process.stdin.write(json.dumps(what) + "\n")
        self._process.stdin.flush()
        return self._process.stdout.readline()

    def _attached(self, child: int, options: Sequence[str]) -> subprocess.Popen[str]:
        command = [program("strace"), "-q", "-s", "0", *options, "-p", str(child)]
        tracer = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.PIPE, text=True)
        for _ in range(600):
            status = Path(f"/proc/{child}/status").read_text(encoding="utf-8")
            if "TracerPid:\t0\n" not in status:
                return tracer
            if tracer.poll() is not None:
                break
            time.sleep(0.01)
        self._ask({})
        _, complaint = tracer.communicate(timeout=10)
        missing(f"strace cannot trace here: {complaint}")
        return tracer


def _place(line: str, root: Path) -> str | None:
    """Return what kind of file a line of the list is about: of an archive, its mirror or a package of it; else None."""
    beside = r"(?:-vault|-package)?(?:\.[0-9a-f]{8}\.partial)?"
    paths = re.findall(
        rf"{re.escape(str(root.parent))}/\.?{re.escape(root.name)}{beside}(?![-\w])/?([^\">]*)", line
    )
    if not paths:
        return None
    path = paths[-1]
    name = path.rpartition("/")[2]
    if path.startswith(("staging", "sealed", "set-aside", "data")):
        return str(path.partition("/")[0])
    return re.sub(r"^\.|\.[0-9a-f]{8}\.partial$", "", name) or "folder"


@contextlib.contextmanager
def warm() -> Iterator[Warm]:
    """Return a context that yields a warm process; a test that lets it be traced is skipped where nothing can be."""
    project = Path(__file__).parents[2]
    quiet = {name: value for name, value in os.environ.items() if not name.startswith("COVERAGE_")}
    with subprocess.Popen(
        [sys.executable, str(Path(__file__).with_name("warm.py")), str(project)],
        stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True, env=quiet, cwd=project,
    ) as process:  # fmt: skip
        assert process.stdout is not None
        assert process.stdout.readline() == "ready\n"
        try:
            yield Warm(process)
        finally:
            assert process.stdin is not None
            process.stdin.close()
            process.wait(timeout=30)

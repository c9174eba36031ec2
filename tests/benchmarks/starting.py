"""How soon the command line answers: processes that are started, do one small thing and end, against a bare interpreter.

`--version` and `--help` are held against an interpreter that does nothing, a search in an archive of the demonstration's size against one that
imports the library which a search cannot do without. Neither side writes or reads anything but its own modules and the archive.
"""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import tempfile
from collections.abc import Callable
from pathlib import Path

from archive import Archive
from tests.benchmarks.harness import Benchmark, Size, Work
from tests.benchmarks.wide_index import EACH, wide_index

__all__ = ["HELP", "SEARCH", "VERSION"]

_PROGRAM = "from archive.commands.main import main; main()"
_TIMES = {"small": 1, "default": 5, "full": 20}


def _started(words: list[str], *, folder: Path | None = None) -> float:
    environment = {**os.environ, "PYTHONPATH": os.pathsep.join(filter(None, sys.path))}
    if folder is not None:
        environment["STILLROOM_ARCHIVE"] = str(folder)
    ended = subprocess.run(
        [sys.executable, "-c", *words],
        env=environment,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.PIPE,
        check=False,
    )
    if ended.returncode or ended.stderr:
        raise RuntimeError(f"{words} ended with {ended.returncode}: {ended.stderr.decode(errors='replace')}")
    return float(ended.returncode)


def _row(
    name: str,
    description: str,
    words: list[str],
    bare: str,
    baseline: str,
    prepare: Callable[[], Path] | None = None,
) -> Benchmark:
    def work(size: Size) -> Work:
        folder = None if prepare is None else prepare()

        def close() -> None:
            if folder is not None:
                shutil.rmtree(folder.parent)

        times = _TIMES[size]
        return Work(
            lambda: [_started([_PROGRAM, *words], folder=folder) for _ in range(times)],
            lambda: [_started([bare]) for _ in range(times)],
            times,
            close,
        )

    return Benchmark(name, description, f"stillroom {' '.join(words)}", baseline, "starts", work)


def _small_archive() -> Path:
    """Path of the folder of an archive with a hundred sweeps, as many as the demonstration's."""
    folder = Path(tempfile.mkdtemp(prefix="stillroom-starting-")) / "lab"
    Archive.create(folder).close()
    with tempfile.TemporaryDirectory(prefix="stillroom-starting-") as beside:
        shutil.move(wide_index(Path(beside), EACH), folder / "index.sqlite3")
    return folder


HELP = _row("help", "the command line says what it can do", ["--help"], "pass", "python -c pass")
VERSION = _row(
    "version", "the command line says which version it is", ["--version"], "pass", "python -c pass"
)
SEARCH = _row(
    "search-command",
    "a search among a hundred sweeps, from the start of the process to its end",
    ["search"],
    "import sqlalchemy.orm",
    "python -c 'import sqlalchemy.orm'",
    _small_archive,
)

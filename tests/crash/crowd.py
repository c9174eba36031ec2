"""Many processes that write to one archive and search it, at once; run as a program.

Arguments: the project's folder, the archive, the folder with the cooldowns of each writer, how many writers, how many readers.
A writer that finds the archive busy tries again, for two minutes at most. Every process says what it did in a line of JSON.
"""

from __future__ import annotations

import json
import os
import sys
import time
import traceback
from collections.abc import Callable
from pathlib import Path

__all__: list[str] = []

LONGEST_S = 120.0
"""How long a writer tries; far beyond the wait for a lock, 5 s, times the writers that may stand before it."""


def write(root: Path, folders: list[Path]) -> dict[str, object]:
    """Return how each folder came in, and how often the archive was busy."""
    from archive import Archive
    from archive.errors import ArchiveBusy

    states, busy = [], 0

    def tried(act: Callable[[], object]) -> object:
        nonlocal busy
        deadline = time.monotonic() + LONGEST_S
        while True:
            try:
                return act()
            except ArchiveBusy:
                busy += 1
                if time.monotonic() > deadline:
                    raise

    with tried(lambda: Archive.open(root)) as lab:  # type: ignore[attr-defined]
        for folder in folders:
            outcome = tried(lambda folder=folder: lab.ingest(folder))
            states.append([folder.name, outcome.state])  # type: ignore[attr-defined]
    return {"states": states, "busy": busy}


def read(root: Path, done: Path) -> dict[str, object]:
    """Return how often it was searched until the writers had done; what was found once is found ever after, and whole."""
    from archive import Archive
    from archive.index import SearchQuery

    searches, before = 0, set[str]()
    while True:
        last = done.exists()
        with Archive.open(root) as lab:
            found = {row.address for row in lab.search(SearchQuery(limit=10_000))}
        cooldowns = {address.partition("/")[0] for address in found}
        whole = {f"{name}/{sweep}" for name in cooldowns for sweep in ("s001", "s002")}
        if not before <= found or found != whole:
            return {"lost": sorted(before - found), "in part": sorted(whole - found)}
        before, searches = found, searches + 1
        time.sleep(0.1)  # the writers are to have the processors
        if last:
            return {"searches": searches, "found": len(found)}


def _child(work: Callable[[], dict[str, object]]) -> int:
    child = os.fork()
    if child == 0:
        try:
            told = json.dumps(work())
        except BaseException:  # noqa: BLE001 - told as what it is
            told = json.dumps({"traceback": traceback.format_exc()})
        os.write(1, f"{told}\n".encode())
        os._exit(0)
    return child


def main(root: Path, folders: Path, writers: int, readers: int) -> None:
    """Let them loose, and wait for all."""
    import archive.intake.ingest
    import archive.lab.door
    import archive.lab.reducing  # noqa: F401

    done = folders / "done"
    common = folders / "common"
    writing = [
        _child(lambda own=own: write(root, [*own[:1], common, *own[1:]]))
        for own in (sorted((folders / f"w{number}").iterdir()) for number in range(writers))
    ]
    reading = [_child(lambda: read(root, done)) for _ in range(readers)]
    for child in writing:
        os.waitpid(child, 0)
    done.touch()
    for child in reading:
        os.waitpid(child, 0)


if __name__ == "__main__":
    sys.path.insert(0, sys.argv[1])
    main(Path(sys.argv[2]), Path(sys.argv[3]), int(sys.argv[4]), int(sys.argv[5]))

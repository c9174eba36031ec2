"""A process that has imported everything and lends a forked child to each operation, so that a trial takes no start.

It reads lines of JSON. One that names an `operation`: the answer is the number of the child, which waits; at the next line the
child begins, and when it has ended the answer is how. One that names a `stopped` operation: it is carried out again and again,
stopped at each of its durable calls in turn, and the answer is what became of each. Run as a program, with the project's folder
as argument.
"""

from __future__ import annotations

import contextlib
import hashlib
import importlib
import json
import os
import pkgutil
import re
import shutil
import signal
import sys
import traceback
from collections.abc import Iterable, Iterator, Sequence
from pathlib import Path
from typing import Any

import archive.lab

__all__: list[str] = []

_KNOWN: dict[str, dict[str, bool]] = {}
"""Of each operation: whether it had been done, by the digest of what it had left and was found sound."""
_REHEARSED: set[str] = set()
_LENT: set[str] = set()


def outcome(operation: str, root: Path, beside: Path) -> dict[str, str]:
    """Return how an operation ended: done, told as a sentence, or a traceback."""
    from archive.errors import ArchiveError
    from tests.crash.faults import StoppedError
    from tests.crash.operations import OPERATIONS

    try:
        OPERATIONS[operation].do(root, beside)
    except StoppedError:
        return {"state": "stopped", "what": ""}
    except ArchiveError as problem:
        return {"state": "told", "what": str(problem)}
    except BaseException:  # noqa: BLE001 - told as what it is
        return {"state": "traceback", "what": traceback.format_exc()}
    return {"state": "done", "what": ""}


def stopped(name: str, how: str, folder: Path, beside: Path) -> list[dict[str, Any]]:
    """Return what became of an operation that was stopped at each of its durable calls: by `exception`, or by `exit`.

    Returns
    -------
    list of dict
        For each call its number and what it was about, how the child ended, whether the operation had been done, what was
        wrong afterwards, and whether the remains were looked at or are those of an earlier call, byte for byte.
    """
    with _read_in_this_process():
        return _stopped(name, how, folder, beside)


def _stopped(name: str, how: str, folder: Path, beside: Path) -> list[dict[str, Any]]:
    from tests.crash.operations import require_whole_or_nothing

    rehearsed(name, folder, beside)
    calls = _each_stopped(name, how, folder, beside, [None])[0]["calls"]
    points: list[dict[str, Any]] = []
    known = _KNOWN.setdefault(f"{name} {beside}", {})
    ends = _each_stopped(name, how, folder, beside, range(1, len(calls) + 1))
    for number, (call, ended) in enumerate(zip(calls, ends, strict=True), 1):
        place = folder / str(number)
        # What is in the database of a server cannot be seen from here.
        remains = _remains(place) if (place / "lab" / "index.sqlite3").exists() else f"call {number}"
        point = {
            "call": f"{number} of {len(calls)}: {call}",
            "ended": ended["state"],
            "wrong": None,
            "as before": remains in known,
        }
        try:
            if remains not in known:
                known[remains] = require_whole_or_nothing(name, place / "lab", beside)
        except Exception:  # noqa: BLE001 - told as what it is
            point["wrong"] = traceback.format_exc()
        else:
            shutil.rmtree(place)
        points.append({**point, "done": known.get(remains)})
    return points


@contextlib.contextmanager
def _read_in_this_process() -> Iterator[None]:
    """Let sealed files be examined without a process for each: what stops is durable calls, not reading."""
    from archive.store import adopting, examine

    def read(files: Sequence[tuple[Path, Any]]) -> list[Any]:
        return [damage for path, sealed in files for damage in examine._inside(path, sealed.key)]

    apart, together = examine._inside_apart, adopting.examined_apart
    examine._inside_apart, adopting.examined_apart = lambda path, key, _: examine._inside(path, key), read
    try:
        yield
    finally:
        examine._inside_apart, adopting.examined_apart = apart, together


def rehearsed(name: str, folder: Path, beside: Path) -> None:
    """Carry an operation out once in this process: what it imports, compiles and keeps, every child has from then on."""
    from tests.crash.operations import OPERATIONS, begun

    if name not in _REHEARSED:
        _REHEARSED.add(name)
        (folder / "rehearsed").mkdir()
        OPERATIONS[name].do(begun(OPERATIONS[name], beside, folder / "rehearsed" / "lab"), beside)


def _each_stopped(
    name: str, how: str, folder: Path, beside: Path, points: Iterable[int | None]
) -> list[dict[str, Any]]:
    """Return how children ended that were stopped at some calls, and which calls they made; each call has a folder of its own.

    Notes
    -----
    An exception leaves its process alive, and what it left in that must not matter: one child meets all of them.
    """
    from tests.crash.operations import OPERATIONS, begun

    asked = [(folder / str(number), number) for number in points]
    for place, _ in asked:
        place.mkdir()
        begun(OPERATIONS[name], beside, place / "lab")
    if how == "exception":
        return _forked(name, how, beside, asked)
    return [each for one in asked for each in _forked(name, how, beside, [one])]


def _forked(
    name: str, how: str, beside: Path, asked: Sequence[tuple[Path, int | None]]
) -> list[dict[str, Any]]:
    from tests.crash import faults

    stop = {"exception": faults.by_exception, "exit": faults.by_exit}[how]
    answer, said = os.pipe()
    child = os.fork()
    if child == 0:
        ends = []
        watch = faults.Watch(stop)
        for place, stop_at in asked:
            calls = watch.begin(place, stop_at)
            ends.append({**outcome(name, place / "lab", beside), "calls": calls})
        with os.fdopen(said, "w") as stream:
            json.dump(ends, stream)
        os._exit(0)
    os.close(said)
    with os.fdopen(answer, "rb") as stream:
        text = stream.read()
    _, status = os.waitpid(child, 0)
    if not text:
        return [{"state": f"exit {os.waitstatus_to_exitcode(status)}", "calls": []}]
    found: list[dict[str, Any]] = json.loads(text)
    return found


def _remains(folder: Path) -> str:
    """Return a digest of what lies in a folder, in which only the random parts of names and what the lock says do not count."""
    chance = re.compile(rb"[0-9a-f]{8}(?=\.partial)|[0-9a-f]{16}(?=\.batch)")
    found = []
    for path in folder.rglob("*"):
        says = path.is_file() and path.name != "archive.lock" and not path.name.endswith("-shm")
        content = chance.sub(b"", path.read_bytes()) if says else b""
        name = chance.sub(b"", bytes(path.relative_to(folder)))
        found.append((name, path.lstat().st_mode, path.lstat().st_nlink, hashlib.sha256(content).hexdigest()))
    return hashlib.sha256(repr(sorted(found)).encode()).hexdigest()


def _compiled_once() -> None:
    """Let all engines of this process use what SQLAlchemy has compiled for one of them; else that is a third of a trial."""
    from sqlalchemy.engine import Engine

    made: dict[str, Any] = {}
    begin = Engine.__init__

    def shared(self: Engine, pool: Any, dialect: Any, *arguments: Any, **options: Any) -> None:
        first = made.setdefault(dialect.name, self)
        begin(self, pool, dialect if first is self else first.dialect, *arguments, **options)
        self._compiled_cache = first._compiled_cache

    Engine.__init__ = shared  # type: ignore[method-assign]


def _say(line: str) -> None:
    sys.stdout.write(f"{line}\n")
    sys.stdout.flush()


def _lent(asked: dict[str, Any]) -> None:
    name, root = asked["operation"], Path(asked["root"])
    if name in _LENT:  # a second time: it pays
        rehearsed(name, root.parent, Path(asked["beside"]))
    _LENT.add(name)
    waiting, go = os.pipe()
    answer, said = os.pipe()
    child = os.fork()
    if child == 0:
        os.close(go)
        os.close(answer)
        os.read(waiting, 1)
        if asked.get("longest") is not None:
            import resource

            signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
            resource.setrlimit(resource.RLIMIT_FSIZE, (asked["longest"], asked["longest"]))
        told = outcome(asked["operation"], Path(asked["root"]), Path(asked["beside"]))
        os.write(said, json.dumps(told).encode())
        os._exit(0)
    os.close(waiting)
    os.close(said)
    _say(str(child))
    sys.stdin.readline()
    os.close(go)
    with os.fdopen(answer, "rb") as stream:
        text = stream.read()
    os.waitpid(child, 0)
    _say(text.decode() or '{"state": "ended", "what": ""}')


def main() -> None:
    """Serve until there is no more input."""
    # What children will need; the door itself imports it when it is asked for.
    behind = [f"archive.lab.{module.name}" for module in pkgutil.iter_modules(archive.lab.__path__)]
    for name in (*behind, "archive.intake.ingest", "archive.reduction.steps", "tests.crash.operations"):
        importlib.import_module(name)
    _compiled_once()
    _say("ready")
    for line in sys.stdin:
        asked = json.loads(line)
        if "stopped" in asked:
            found = stopped(asked["stopped"], asked["how"], Path(asked["folder"]), Path(asked["beside"]))
            _say(json.dumps(found))
        else:
            _lent(asked)


if __name__ == "__main__":
    sys.path.insert(0, sys.argv[1])
    main()

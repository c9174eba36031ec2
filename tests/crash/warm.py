"""A process that has imported everything and lends a forked child to each operation, so that a trial takes no start.

It reads a line of JSON for each: what to do and where. It answers with the number of the child, which waits; at the next
line the child begins, and when it has ended the answer is how. Run as a program, with the project's folder as argument.
"""

from __future__ import annotations

import importlib
import json
import os
import signal
import sys
import traceback
from pathlib import Path
from typing import Any

__all__: list[str] = []


def outcome(operation: str, root: Path, beside: Path) -> dict[str, str]:
    """Return how an operation ended: done, told as a sentence, or a traceback."""
    from archive.errors import ArchiveError
    from tests.crash.operations import OPERATIONS

    try:
        OPERATIONS[operation].do(root, beside)
    except ArchiveError as problem:
        return {"state": "told", "what": str(problem)}
    except BaseException:  # noqa: BLE001 - told as what it is
        return {"state": "traceback", "what": traceback.format_exc()}
    return {"state": "done", "what": ""}


def _say(line: str) -> None:
    sys.stdout.write(f"{line}\n")
    sys.stdout.flush()


def _lent(asked: dict[str, Any]) -> None:
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
    for name in ("archive.lab.door", "archive.reduction.steps", "tests.crash.operations"):
        importlib.import_module(name)  # what children will need
    _say("ready")
    for line in sys.stdin:
        _lent(json.loads(line))


if __name__ == "__main__":
    sys.path.insert(0, sys.argv[1])
    main()

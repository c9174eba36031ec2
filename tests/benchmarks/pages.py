"""Pages on an index of very many sweeps against a bare route of the same framework that answers with a constant of the same size.

Both go through the same client in this process, so what a client and a framework cost stands on both sides. The sealed files behind
the index are not there: the pages measured here ask the index alone. On a whole archive, page by page:
`python -m tests.benchmarks.pages ARCHIVE [PATH ...]` writes the time to the first byte and the bytes of each.
"""

from __future__ import annotations

import shutil
import statistics
import sys
import tempfile
import time
from collections.abc import Sequence
from contextlib import ExitStack
from pathlib import Path
from urllib.parse import quote

import numpy as np
from starlette.applications import Starlette
from starlette.requests import Request
from starlette.responses import HTMLResponse, Response
from starlette.routing import Route
from starlette.testclient import TestClient

from archive import Archive
from archive.web import application
from tests.benchmarks.harness import ROUNDS, Benchmark, Size, Work
from tests.benchmarks.wide_index import wide_index

__all__ = ["BENCHMARK", "PAGES"]

PAGES = (
    "/search",
    "/search?cell=TO-4&sort=coverage&descending=true",
    "/search?result=T_KT%3D0.4:0.6+K",
    "/search?words=polyimide",
    "/cooldowns",
    "/cells",
    "/thermometers",
    "/state",
    "/at/2500-0599",
)
"""Pages that need no sealed file; the last is of an address that does not exist."""

_BASE = "http://localhost"


def _prepare(size: Size) -> Work:
    folder = Path(tempfile.mkdtemp(prefix="stillroom-pages-"))
    Archive.create(folder / "lab").close()
    made = wide_index(folder, 100_000 if size != "small" else 200)
    shutil.move(made, folder / "lab" / made.name)
    held = ExitStack()
    client = held.enter_context(TestClient(application(folder / "lab"), base_url=_BASE))
    sizes = [len(client.get(path).content) for path in PAGES]
    bare = held.enter_context(TestClient(_constants(sizes), base_url=_BASE))

    def subject() -> np.ndarray:
        return np.array([len(client.get(path).content) for path in PAGES], dtype=np.float64)

    def baseline() -> np.ndarray:
        return np.array([len(bare.get(f"/{k}").content) for k in range(len(PAGES))], dtype=np.float64)

    def close() -> None:
        held.close()
        shutil.rmtree(folder)

    return Work(subject, baseline, len(PAGES), close)


def _constants(sizes: Sequence[int]) -> Starlette:
    contents = [b"x" * size for size in sizes]

    async def constant(request: Request) -> Response:
        return HTMLResponse(contents[int(request.path_params["which"])])

    return Starlette(routes=[Route("/{which}", constant)])


BENCHMARK = Benchmark(
    name="pages",
    description="search, lists, state and an unknown address on an index of 100,000 sweeps, each asked for once",
    subject="pages of the archive",
    baseline="a bare route that answers with a constant of the same size",
    unit="pages",
    prepare=_prepare,
)


def _each(root: Path, paths: Sequence[str]) -> None:
    """Write the median time to the first byte and the bytes of each page, which are made once before."""
    with TestClient(application(root), base_url=_BASE) as client:
        for path in paths:
            client.get(path)
            taken = []
            for _ in range(ROUNDS):
                begin = time.perf_counter()
                with client.stream("GET", path) as answer:
                    taken.append(time.perf_counter() - begin)
                    size = len(answer.read())
            print(f"{path:52} {answer.status_code} {1e3 * statistics.median(taken):9.1f} ms {size:8} bytes")  # noqa: T201 - a table for people


def _usual(root: Path) -> list[str]:
    """Return the pages of any archive, and those of its newest cooldown and sweep."""
    with Archive.open(root, read_only=True) as lab:
        names = lab.cooldown_names()
        sweeps = lab.sweeps(names[-1]) if names else []
    own = [f"/at/{names[-1]}"] if names else []
    own += [f"/at/{quote(sweeps[0].address)}"] if sweeps else []
    return ["/", "/search", "/cooldowns", "/cells", "/thermometers", "/state", *own, "/at/nowhere"]


if __name__ == "__main__":
    where = Path(sys.argv[1])
    _each(where, sys.argv[2:] or _usual(where))

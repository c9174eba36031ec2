"""Every operation is stopped at every durable call, by an exception and by the end of its process: all or nothing.

A durable call is one by which Python changes or syncs something below the folder of the archive, or the commit of the index:
each is stopped before it happens, and the commit after it, too.
"""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from tests.archive.index.postgresql_server import server
from tests.crash.databases import on_a_server
from tests.crash.operations import OPERATIONS
from tests.crash.traced import Warm


@pytest.fixture(scope="module")
def on_server(beside: Path, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Path]:
    """Give such a folder with the index of each archive on a server."""
    with server() as url, on_a_server(url, beside, tmp_path_factory.mktemp("server") / "beside") as folder:
        yield folder


def require_all_or_nothing(points: list[dict[str, Any]]) -> None:
    """See that nothing was wrong after any call, and that before some call nothing was there, and from then on all of it."""
    print(*points, sep="\n")  # noqa: T201 - shown when something is wrong
    wrong = [f"{point['call']}: {point['wrong']}" for point in points if point["wrong"]]
    assert not wrong, "\n".join(wrong)
    done = [point["done"] for point in points]
    assert done == sorted(done)


@pytest.mark.slow
@pytest.mark.parametrize("how", ["exception", "exit"])
@pytest.mark.parametrize("name", list(OPERATIONS))
def test_stopped_at_every_durable_call(
    name: str, how: str, beside: Path, child: Warm, tmp_path: Path
) -> None:
    points = child.stopped(name, how, tmp_path, beside)
    require_all_or_nothing(points)
    # Whatever a migration raises is told as a sentence; everything else lets the fault through that the test asked for.
    ended = "exit 77" if how == "exit" else "told" if name == "migrate" else "stopped"
    assert {point["ended"] for point in points} == {ended}
    # Each operation is stopped before its first durable call and, where it leaves a file of its own, after its last one, too.
    assert [points[0]["done"], points[-1]["done"]] == [
        name == "put in order",
        bool(OPERATIONS[name].key) or name == "export",
    ]


@pytest.mark.slow
@pytest.mark.postgresql
@pytest.mark.parametrize("name", ["ingest", "reduce"])
def test_stopped_dead_with_the_index_on_a_server(
    name: str, on_server: Path, child: Warm, tmp_path: Path
) -> None:
    points = child.stopped(name, "exit", tmp_path, on_server)
    require_all_or_nothing(points)
    assert {point["ended"] for point in points} == {"exit 77"}
    assert [points[0]["done"], points[-1]["done"]] == [False, True]
    assert sum("commit" in point["call"] for point in points) == 2

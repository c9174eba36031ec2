"""Eight processes ingest at once while others search: nothing is lost, doubled, seen in part, or stuck.

An ordinary run lets each ingest one cooldown and one that all ingest; `STILLROOM_CROWD=25` is the full size.
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

from archive import Archive
from tests.archive.index.postgresql_server import own_schema, server
from tests.small_cooldown import write_folder

WRITERS, READERS = 8, 2
EACH = int(os.environ.get("STILLROOM_CROWD", "1"))


@pytest.fixture(params=["sqlite", pytest.param("postgresql", marks=pytest.mark.postgresql)])
def address(request: pytest.FixtureRequest) -> Iterator[str | None]:
    """Give the address of an index; none for the file in the archive."""
    if request.param == "sqlite":
        yield None
        return
    with server() as url, own_schema(url, f"crowd{os.getpid()}") as named:
        yield named


@pytest.mark.slow
def test_many_write_and_search_at_once(address: str | None, tmp_path: Path) -> None:
    root, folders = tmp_path / "lab", tmp_path / "folders"
    Archive.create(root, name="Group", index=address).close()
    names = {f"w{writer}-{number:02d}" for writer in range(WRITERS) for number in range(EACH)} | {"common"}
    for name in names:
        write_folder(
            folders / name.partition("-")[0] / name if name != "common" else folders / name, name=name
        )
    quiet = {name: value for name, value in os.environ.items() if not name.startswith("COVERAGE_")}
    project = Path(__file__).parents[2]
    command = [
        sys.executable,
        Path(__file__).with_name("crowd.py"),
        project,
        root,
        folders,
        str(WRITERS),
        str(READERS),
    ]
    ended = subprocess.run(
        command, capture_output=True, text=True, check=False, timeout=600, env=quiet, cwd=project
    )
    print(ended.stdout)  # noqa: T201 - shown when something is wrong
    told = [json.loads(line) for line in ended.stdout.splitlines()]
    assert ended.returncode == 0, ended.stderr
    assert len(told) == WRITERS + READERS
    assert not [each for each in told if not {"states", "searches"} & set(each)], told
    states = [tuple(state) for each in told for state in each.get("states", ())]
    assert sorted(name for name, state in states if state == "ingested") == sorted(names)
    assert sorted(state for name, state in states if name == "common") == ["already"] * (WRITERS - 1) + [
        "ingested"
    ]
    assert {each["found"] for each in told if "found" in each} == {2 * len(names)}
    with Archive.open(root) as lab:
        keys = sorted(f"{name}/{name}.a1" for name in names)
        assert (lab._store.keys(), sorted(lab._index.sealed_files())) == (keys, keys)
        assert sorted(each.act.key for each in lab.journal() if each.act.key) == keys
        assert lab.fixity() == []
        assert not list((root / "staging").iterdir())

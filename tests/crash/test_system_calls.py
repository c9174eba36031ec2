"""System calls that fail under every operation, as the kernel would have them fail: all or nothing, told in a sentence.

The calls of an undisturbed run are listed; of every kind of call on every kind of file one is failed. Only a part of these
is drawn in an ordinary run; `STILLROOM_CRASH_SAMPLES=1000` takes them all.
"""

from __future__ import annotations

import os
import random
from pathlib import Path

import pytest

from archive import Archive
from archive.errors import ArchiveError, DamagedFile
from archive.store.local import open_store
from tests.crash.operations import OPERATIONS, begun, require_whole_or_nothing
from tests.crash.traced import Call, Warm

SAMPLES = int(os.environ.get("STILLROOM_CRASH_SAMPLES", "2"))


def drawn(calls: list[Call], chance: random.Random) -> list[Call]:
    """Return one call of every kind on every kind of file, in a drawn order, and no more than are asked for."""
    kinds: dict[tuple[str, str], list[Call]] = {}
    for call in calls:
        kinds.setdefault((call.name, call.place), []).append(call)
    every = [chance.choice(kinds[kind]) for kind in sorted(kinds)]
    chance.shuffle(every)
    return every[:SAMPLES]


@pytest.mark.slow
@pytest.mark.parametrize("name", list(OPERATIONS))
def test_a_call_that_fails(name: str, beside: Path, child: Warm, tmp_path: Path) -> None:
    operation, chance = OPERATIONS[name], random.Random(name)  # noqa: S311 - no secret
    calls = child.calls(name, begun(operation, beside, tmp_path / "good"), beside, tmp_path / "calls")
    assert len(calls) > 20
    require_whole_or_nothing(name, tmp_path / "good", beside)
    wrong = []
    for call in drawn(calls, chance):
        error = chance.choice(["EIO", "ENOSPC"])
        told = f"{call.name} {call.number} on {call.place}: {error}"
        root = begun(operation, beside, tmp_path / f"{call.name}-{call.number}")
        inject = f"inject={call.name}:error={error}:when={call.number}"
        ended = child.run(name, root, beside, options=["-e", f"trace={call.name}", "-e", inject])
        try:
            assert ended["state"] in ("done", "told"), ended["what"]
            require_whole_or_nothing(name, root, beside)
        except (AssertionError, ArchiveError, OSError) as problem:
            wrong.append(f"{told}; it had ended: {ended}; then {problem!r}")
    assert not wrong, "\n\n".join(wrong)


@pytest.mark.slow
@pytest.mark.parametrize("name", ["ingest", "import"])
def test_a_write_that_says_less_than_it_should_and_lies(
    name: str, beside: Path, child: Warm, tmp_path: Path
) -> None:
    """The kernel answers that one byte was written, and wrote none: nothing wrong gets the name of a sealed file."""
    operation, chance = OPERATIONS[name], random.Random(name)  # noqa: S311 - no secret
    calls = child.calls(name, begun(operation, beside, tmp_path / "good"), beside, tmp_path / "calls")
    writes = [
        call for call in calls if "write" in call.name and call.place in ("staging", "index.sqlite3-wal")
    ]
    for call in chance.sample(writes, min(len(writes), SAMPLES)):
        root = begun(operation, beside, tmp_path / f"{call.name}-{call.number}")
        inject = f"inject={call.name}:retval=1:when={call.number}"
        ended = child.run(name, root, beside, options=["-e", f"trace={call.name}", "-e", inject])
        assert ended["state"] in ("done", "told"), (call, ended["what"])
        store = open_store(root)
        assert [damage for key in list(store.keys()) for damage in store.verify(key)] == [], call
        if _tells_of_its_index(root):
            Archive.rebuild_index(root)
        require_whole_or_nothing(name, root, beside)


def _tells_of_its_index(root: Path) -> bool:
    try:
        with Archive.open(root) as lab:
            return any(each.key == "index" for each in lab.fixity())
    except DamagedFile as problem:
        return "rebuild-index" in str(problem)


@pytest.mark.slow
@pytest.mark.parametrize("name", ["ingest", "reduce", "import", "rebuild from nothing", "mirror"])
def test_files_that_may_not_grow(name: str, beside: Path, child: Warm, tmp_path: Path) -> None:
    """A limit on their size makes writes short, then fail: in HDF5, in the database, in the archive's own files."""
    operation, chance = OPERATIONS[name], random.Random(name)  # noqa: S311 - no secret
    for number, share in enumerate(sorted(chance.random() for _ in range(min(SAMPLES, 3)))):
        root = begun(operation, beside, tmp_path / str(number))
        longest = int(100 * 2 ** (12 * share))  # from 100 bytes to 400 kB
        ended = child.run(name, root, beside, longest=longest)
        assert ended["state"] in ("done", "told"), (longest, ended["what"])
        require_whole_or_nothing(name, root, beside)


def test_what_is_drawn_covers_every_kind_of_call() -> None:
    calls = [Call("fsync", 1, "sealed"), Call("fsync", 2, "sealed"), Call("link", 1, "sealed")]
    found = drawn(calls, random.Random(1))  # noqa: S311 - no secret
    assert {call.name for call in found} == {"fsync", "link"}
    assert len(found) == 2


def test_the_archive_of_each_operation_is_what_it_says(beside: Path) -> None:
    starts = {operation.start for operation in OPERATIONS.values()} - {""}
    assert starts == {"empty", "filled", "reduced", "without an index", "older", "damaged", "half imported"}
    with Archive.open(beside / "damaged") as lab:
        assert len(lab.fixity()) > 0

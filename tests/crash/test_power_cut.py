"""The power goes, or the process is killed: at any point of any operation, whatever the disk has kept of what was not synced, the archive is whole.

The system calls of an undisturbed run are carried out on a model of a disk (`tests.crash.disk`), which is then laid out as a
power cut would leave it. Only a part of the points is drawn in an ordinary run; `STILLROOM_CRASH_SAMPLES` says how many.
"""

from __future__ import annotations

import os
import random
import sqlite3
from pathlib import Path

import pytest

from archive.errors import ArchiveError
from archive.index.engine import engine_of, index_url
from tests.crash.disk import Chance, Disk, Everything, NewestName, SyncedOnly
from tests.crash.operations import OPERATIONS, begun, require_whole_or_nothing, vault
from tests.crash.traced import Warm

SAMPLES = int(os.environ.get("STILLROOM_CRASH_SAMPLES", "1"))


@pytest.mark.slow
@pytest.mark.parametrize("name", list(OPERATIONS))
def test_the_power_goes(name: str, beside: Path, child: Warm, tmp_path: Path) -> None:
    operation = OPERATIONS[name]
    (tmp_path / "run").mkdir()
    root = begun(operation, beside, tmp_path / "run" / "lab")
    # The folder above is watched, too: the name of the archive itself must last.
    disk = Disk([tmp_path / "run"])
    lines = child.written(name, root, beside, tmp_path / "calls")
    chance = random.Random(name)  # noqa: S311 - no secret
    # At the end, and where the last thing done was about names or syncs, there is most to lose.
    telling = [
        number for number, line in enumerate(lines) if not line.startswith(("pwrite64", "write", "open"))
    ]
    points = {*chance.sample(telling, min(len(telling), SAMPLES)), chance.randrange(len(lines))}
    wrong = []
    for number, line in enumerate(lines):
        disk.call(line)
        if number in points:
            how = chance.choice(["synced only", "newest name", "drawn", "drawn", "everything"])
            power = {
                "synced only": SyncedOnly(), "newest name": NewestName(), "everything": Everything(),
            }.get(how, Chance(chance.random))  # fmt: skip
            target = tmp_path / f"{number}-{how}"
            target.mkdir()
            disk.laid(target, power)
            try:
                require_whole_or_nothing(name, target / "run" / "lab", beside)
            except (AssertionError, ArchiveError, OSError) as problem:
                wrong.append(f"after call {number} of {len(lines)}, {line[:60]}, {how}: {problem!r}")
    assert not wrong, "\n\n".join(wrong)
    (tmp_path / "end").mkdir()
    disk.laid(tmp_path / "end", SyncedOnly())
    done = require_whole_or_nothing(name, tmp_path / "end" / "run" / "lab", beside)
    # What was told as done is done, whatever the disk forgot.
    assert done == (bool(operation.key) or name == "export")
    assert (tmp_path / "end" / "run" / "lab" / "stillroom.toml").is_file()
    assert name != "mirror" or vault(tmp_path / "end" / "run" / "lab").is_dir()


def test_the_database_waits_for_the_disk(tmp_path: Path) -> None:
    """FULL: the log is synced at every commit, so that what was told as recorded is recorded."""
    sqlite3.connect(tmp_path / "index.sqlite3").close()
    engine = engine_of(index_url(f"sqlite:///{tmp_path / 'index.sqlite3'}"), read_only=False)
    with engine.connect() as connection:
        assert connection.exec_driver_sql("PRAGMA synchronous").scalar() == 2
        assert connection.exec_driver_sql("PRAGMA journal_mode").scalar() == "wal"
    engine.dispose()


def hexed(text: bytes | str) -> str:
    """Return a text as the list of calls has it."""
    return "".join(f"\\x{byte:02x}" for byte in (text.encode() if isinstance(text, str) else text))


def test_the_model_keeps_what_is_synced_and_forgets_the_rest(tmp_path: Path) -> None:
    top = tmp_path / "top"
    top.mkdir()
    (top / "old").write_bytes(b"old")
    disk = Disk([top])
    folder, one = hexed(str(top)), hexed(f"{top}/one")

    def laid() -> Path:
        target = tmp_path / f"left-{len(list(tmp_path.iterdir()))}"
        target.mkdir()
        disk.laid(target, SyncedOnly())
        return target / "top"

    def left() -> dict[str, bytes]:
        return {path.name: path.read_bytes() for path in laid().iterdir()}

    assert disk.call(f'openat(AT_FDCWD<{folder}>, "{one}", O_RDWR|O_CREAT|O_EXCL, 0666) = 9<{one}>')
    assert disk.call(f'write(9<{one}>, "{hexed(b"whole")}", 5) = 5')
    assert left() == {"old": b"old"}
    assert disk.call(f"fsync(3<{folder}>) = 0")
    assert left() == {"old": b"old", "one": b""}
    assert disk.call(f"fsync(9<{one}>) = 0")
    assert disk.call(f'pwrite64(9<{one}>, "{hexed(b"HO")}", 2, 1) = 2')
    assert not disk.call(f'link("{one}", "{hexed(f"{top}/old")}") = -1 EEXIST (File exists)')
    assert disk.call(f'rename("{one}", "{hexed(f"{top}/two")}") = 0')
    assert left() == {"old": b"old", "one": b"whole"}
    assert disk.call(f"fsync(3<{folder}>) = 0")
    assert left() == {"old": b"old", "two": b"whole"}
    assert disk.call(f'mkdir("{hexed(f"{top}/deep")}", 0777) = 0')
    assert disk.call(f'rename("{hexed(f"{top}/two")}", "{hexed(f"{top}/deep/two")}") = 0')
    assert disk.call(f'rename("{hexed(f"{top}/deep")}", "{hexed(f"{top}/wide")}") = 0')
    assert left() == {"old": b"old", "two": b"whole"}
    assert disk.call(f"fsync(3<{folder}>) = 0")
    assert sorted(path.name for path in laid().rglob("*")) == ["old", "two", "wide"]
    assert not disk.call(f'write(9<{hexed(str(tmp_path / "calls"))}>, "{hexed(b"x")}", 1) = 1')

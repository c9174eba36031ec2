"""An archive that a group shares: who may read and write is what umask and folder say, and sealed files are nobody's to write."""

from __future__ import annotations

import os
import stat
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest

from archive import Archive
from tests.small_cooldown import write_folder

_ROOT = Path(__file__).parents[3]

pytestmark = pytest.mark.skipif(sys.platform == "win32", reason="Windows has no umask")


@contextmanager
def umask(mask: int) -> Iterator[None]:
    """Work under a umask."""
    before = os.umask(mask)
    try:
        yield
    finally:
        os.umask(before)


def _mode(path: Path) -> int:
    return stat.S_IMODE(path.stat().st_mode)


@pytest.mark.parametrize(
    ("mask", "folders", "files", "sealed"),
    [(0o002, 0o775, 0o664, 0o444), (0o022, 0o755, 0o644, 0o444), (0o007, 0o770, 0o660, 0o440), (0o077, 0o700, 0o600, 0o400)],
    ids=["group-writes", "group-reads", "group-alone", "owner-alone"],
)  # fmt: skip
def test_modes_follow_the_umask(tmp_path: Path, mask: int, folders: int, files: int, sealed: int) -> None:
    root = tmp_path / "shared" / "lab"
    root.parent.mkdir()
    root.parent.chmod(0o2777)
    with umask(mask), Archive.create(root, name="Shared") as lab:
        assert lab.ingest(write_folder(tmp_path / "in")).state == "ingested"
        assert lab.reduce("2026-03", plan="empty-cell")[0].problem is None
    seen = {path.relative_to(root).as_posix(): path for path in root.rglob("*")}
    assert {"sealed/2026-03", "staging", "index.sqlite3", "journal.jsonl", "stillroom.toml"} <= set(seen)
    for name, path in {".": root, **seen}.items():
        if path.is_dir():
            # Folders made in a folder with the set-group-ID bit have it too (mkdir(2)): the group stays the group's.
            assert _mode(path) == folders | stat.S_ISGID, name
        elif path.suffix == ".h5":
            assert _mode(path) == sealed, name
        elif name != "archive.lock":
            assert _mode(path) == files, name
    assert _mode(root / "archive.lock") & 0o777 == 0o664 & ~mask
    assert not list(root.rglob("*.partial"))


# Everything is imported, by doing it once, before root is given up: the interpreter may lie where only root can read.
_PEOPLE = """
import os, sys, tempfile
from pathlib import Path
from archive import Archive
from archive.index import SearchQuery
from tests.small_cooldown import write_folder

place, group = Path(sys.argv[1]), 60001
with tempfile.TemporaryDirectory() as made:
    with Archive.create(Path(made) / "lab") as lab:
        lab.ingest(write_folder(Path(made) / "in"))
        lab.search(SearchQuery())
    Archive.open(Path(made) / "lab").close()
for name in ("2026-03", "2026-04"):
    write_folder(place / name, name=name)
root = place / "lab"
root.mkdir()
os.chown(root, 60002, group)
root.chmod(0o2775)

def make():
    with Archive.create(root) as lab:
        assert lab.ingest(place / "2026-03").state == "ingested"

def add():
    with Archive.open(root) as lab:
        assert lab.ingest(place / "2026-04").state == "ingested"

def look():
    with Archive.open(root) as lab:
        assert len(lab.search(SearchQuery())) == 4
        try:
            lab.ingest(place / "2026-03")
        except Exception as error:
            assert "cannot be locked" in str(error), error
        else:
            raise AssertionError("an outsider wrote")

for user, member, act in ((60002, group, make), (60003, group, add), (60004, 60004, look)):
    child = os.fork()
    if child == 0:
        os.setgroups([])
        os.setgid(member)
        os.setuid(user)
        os.umask(0o002)
        act()
        os._exit(0)
    if os.waitstatus_to_exitcode(os.waitpid(child, 0)[1]):
        sys.exit(f"{act.__name__} failed")
"""


@pytest.mark.skipif(sys.platform == "win32" or os.getuid() != 0, reason="only root can be several people")
def test_another_member_of_the_group_writes_and_an_outsider_only_reads() -> None:
    """One person makes the archive; another one of the group takes a cooldown in; a third one may only look."""
    # Not pytest's own folders, which only their owner may enter.
    with tempfile.TemporaryDirectory(prefix="stillroom-shared-") as made:
        Path(made).chmod(0o755)
        ended = subprocess.run(
            [sys.executable, "-c", _PEOPLE, made], check=False, capture_output=True, text=True, cwd=_ROOT
        )
    assert ended.returncode == 0, ended.stderr

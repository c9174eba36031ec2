"""An archive that a group shares: who may read and write is what umask and folder say, and sealed files are nobody's to write."""

from __future__ import annotations

import os
import stat
import subprocess
import sys
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


_MAKE = "with Archive.create(root, name='Shared') as lab: assert lab.ingest(root.parent / '2026-03').state == 'ingested'"
_ADD = "with Archive.open(root) as lab: assert lab.ingest(root.parent / '2026-04').state == 'ingested'"
_LOOK = "with Archive.open(root) as lab: assert len(lab.search(SearchQuery())) == 4"


@pytest.mark.skipif(sys.platform == "win32" or os.getuid() != 0, reason="only root can be several people")
def test_another_member_of_the_group_writes_and_an_outsider_reads(tmp_path: Path) -> None:
    """One person makes the archive; another one of the group takes a cooldown in; a third one may only look."""
    if not all(_is_open(Path(place)) for place in (_ROOT, sys.executable, sys.prefix, sys.base_prefix)):
        pytest.skip("program or interpreter lie where only root can read")
    group, first, second, outsider = 60001, 60002, 60003, 60004
    root = tmp_path / "lab"
    root.mkdir()
    os.chown(root, first, group)
    root.chmod(0o2775)
    for folder in (tmp_path, *tmp_path.parents):
        if not _mode(folder) & 0o001:
            folder.chmod(_mode(folder) | 0o011)  # pytest's own folders are for root alone
    for name in ("2026-03", "2026-04"):
        write_folder(tmp_path / name, name=name)
    for user, member, act in ((first, group, _MAKE), (second, group, _ADD), (outsider, outsider, _LOOK)):
        program = f"from pathlib import Path\nfrom archive import Archive\nfrom archive.index import SearchQuery\nroot = Path({str(root)!r})\n{act}\n"
        ended = subprocess.run(
            [sys.executable, "-c", program], user=user, group=member, extra_groups=[], umask=0o002, check=False,
            capture_output=True, text=True, cwd=_ROOT, env={"PATH": os.environ["PATH"], "HOME": "/nonexistent", "PYTHONPATH": str(_ROOT), "MPLCONFIGDIR": "/nonexistent"},
        )  # fmt: skip
        assert ended.returncode == 0, (act, ended.stderr)


def _is_open(place: Path) -> bool:
    """Whether everybody can get to a place."""
    return all(_mode(folder) & 0o001 for folder in (place.resolve(), *place.resolve().parents))

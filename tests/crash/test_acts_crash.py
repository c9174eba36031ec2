"""A revision, amendment or withdrawal that is stopped anywhere is in the archive whole or has left no trace."""

from __future__ import annotations

import shutil
from collections.abc import Callable
from pathlib import Path

import pytest

from archive import Archive
from archive.index import Index
from tests.crash import faults
from tests.small_cooldown import write_folder

REVISION = """\
format = "stillroom-revision/1"
by = "data steward"
because = "measured again"
[[record.sample]]
name = "well-helium"
revision = 2
isotope = "4He"
gas_source = "well gas, cleaned over charcoal"
"""
AMENDMENT = """\
format = "stillroom-amendment/1"
cooldown = "2026-03"
by = "data steward"
because = "the notebook was misread"
[[change]]
address = "2026-03/d02"
field = "amount"
value = "9.0(1) umol"
"""

ACTS: dict[str, tuple[Callable[[Archive, Path], object], str]] = {
    "revise": (lambda lab, folder: lab.revise(folder / "revision.toml"), "lab.records/well-helium.r2"),
    "amend": (lambda lab, folder: lab.amend(folder / "amendment.toml"), "2026-03/2026-03.m1"),
    "withdraw": (
        lambda lab, folder: lab.withdraw("2026-03/s001", why="the magnet was ramped", by="data steward"),
        "2026-03/2026-03.w1",
    ),
}


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Make an archive with one cooldown, and the sheets beside it."""
    root = tmp_path_factory.mktemp("acts")
    with Archive.create(root / "lab") as lab:
        lab.ingest(write_folder(root / "2026-03"))
    (root / "revision.toml").write_text(REVISION, encoding="utf-8")
    (root / "amendment.toml").write_text(AMENDMENT, encoding="utf-8")
    return root


def copy(made: Path, tmp_path: Path, name: object) -> Path:
    """Return a copy of the archive."""
    return Path(shutil.copytree(made / "lab", tmp_path / str(name)))


def assert_whole_or_nothing(root: Path, made: Path, act: str, *, again: bool = True) -> bool:
    """Open, look, act again where nothing was done and it is asked for, look again; return whether it had been done."""
    do, key = ACTS[act]
    with Archive.open(root) as lab:
        assert lab._store.keys() == sorted(lab._index.sealed_files())
        assert not list((root / "staging").iterdir())
        done = key in lab._index.sealed_files()
        if not done and not again:
            return False
        if not done:
            do(lab, made)
        assert key in lab._index.sealed_files()
        assert lab._store.describe(key).sha256 == lab._index.sealed_files()[key][0]
        rows = lab._index.rows()[{"revise": "revision", "amend": "amendment", "withdraw": "withdrawal"}[act]]
        assert len(rows) == 1
    return done


@pytest.mark.parametrize("act", list(ACTS))
def test_stopped_by_an_exception_at_every_durable_call(made: Path, tmp_path: Path, act: str) -> None:
    do, _ = ACTS[act]
    with Archive.open(copy(made, tmp_path, "count")) as lab, faults.faulty(None) as calls:
        do(lab, made)
    total = len(calls)
    assert total >= 4
    done = []
    for stop_at in range(1, total + 1):
        root = copy(made, tmp_path, stop_at)
        with Archive.open(root) as lab, pytest.raises(faults.StoppedError), faults.faulty(stop_at):
            do(lab, made)
        # A second try is made after the first, the third, ... of the calls; between them only the first try's end is looked at.
        done.append(assert_whole_or_nothing(root, made, act, again=stop_at % 2 == 1))
    # Once the name is given, the act is done; before, it is not.
    assert done == sorted(done)
    assert not done[0]


@pytest.mark.parametrize("act", list(ACTS))
def test_stopped_at_the_index_commit(
    made: Path, tmp_path: Path, act: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    do, _ = ACTS[act]
    root = copy(made, tmp_path, act)

    def stopped(*arguments: object, **options: object) -> None:
        raise faults.StoppedError

    with Archive.open(root) as lab:
        monkeypatch.setattr(Index, "record_act", stopped)
        with pytest.raises(faults.StoppedError):
            do(lab, made)
        monkeypatch.undo()
    assert assert_whole_or_nothing(root, made, act)

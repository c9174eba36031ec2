"""An ingest that is stopped anywhere is in the archive whole or has left no trace, and a second try succeeds."""

from __future__ import annotations

import hashlib
import sys
from pathlib import Path

import pytest

from archive import Archive
from archive.index import Index
from tests.crash import faults
from tests.small_cooldown import write_folder

CHILD = """
from pathlib import Path
from archive import Archive
lab = Archive.open(Path(sys.argv[1]))
with faults.faulty(int(sys.argv[3]) or None, faults.by_exit) as calls:
    lab.ingest(Path(sys.argv[2]))
print(len(calls))
"""


def archive_with(tmp_path: Path, name: str) -> tuple[Path, Path]:
    """Give an empty archive and a folder to ingest."""
    root = tmp_path / name
    Archive.create(root).close()
    return root, write_folder(tmp_path / "2026-03")


def durable_calls(tmp_path: Path) -> int:
    """Count the durable calls of a good ingest."""
    root, folder = archive_with(tmp_path, "count")
    with Archive.open(root) as lab, faults.faulty(None) as calls:
        lab.ingest(folder)
    return len(calls)


def assert_all_or_nothing(root: Path, folder: Path) -> None:
    """Open, look, try again, and look again."""
    with Archive.open(root) as lab:
        assert lab.fixity() == []
        held = [row.name for row in lab.cooldowns()]
        assert held in ([], ["2026-03"])
        outcome = lab.ingest(folder)
        assert outcome.state == ("already" if held else "ingested")
        assert lab.fixity() == []
        digests = {entry["name"]: entry["sha256"] for entry in lab.show("2026-03.a1")["raw_files"]}
        assert digests["film.csv"] == hashlib.sha256((folder / "film.csv").read_bytes()).hexdigest()
        assert not list((root / "staging").iterdir())


def test_stopped_by_an_exception_at_every_durable_call(tmp_path: Path) -> None:
    total = durable_calls(tmp_path)
    assert total >= 6
    for stop_at in range(1, total + 1):
        root, folder = archive_with(tmp_path, f"exception-{stop_at}")
        with (
            Archive.open(root) as lab,
            pytest.raises(faults.StoppedError),
            faults.faulty(stop_at, faults.by_exception),
        ):
            lab.ingest(folder)
        assert_all_or_nothing(root, folder)


@pytest.mark.slow
def test_stopped_dead_at_every_third_durable_call(tmp_path: Path) -> None:
    total = durable_calls(tmp_path)
    # A process each: the model of the disk in `test_power_cut.py` dies at all of them.
    for stop_at in {*range(1, total + 1, 3), total}:
        root, folder = archive_with(tmp_path, f"dead-{stop_at}")
        ended = faults.run_child(CHILD, root, folder, stop_at)
        assert ended.returncode == 77, ended.stderr
        assert_all_or_nothing(root, folder)


@pytest.mark.parametrize("moment", ["before", "after"])
def test_stopped_at_the_index_commit(tmp_path: Path, moment: str, monkeypatch: pytest.MonkeyPatch) -> None:
    root, folder = archive_with(tmp_path, moment)
    real = Index.record_accession

    def stopped(self: Index, *arguments: object, **options: object) -> None:
        if moment == "after":
            real(self, *arguments, **options)  # type: ignore[arg-type]
        raise faults.StoppedError

    with Archive.open(root) as lab:
        monkeypatch.setattr(Index, "record_accession", stopped)
        with pytest.raises(faults.StoppedError):
            lab.ingest(folder)
        monkeypatch.undo()
    with Archive.open(root) as lab:
        assert [row.name for row in lab.cooldowns()] == ["2026-03"]
        # The rows are made from the sealed file where they were lost; the journal was not written yet in either case.
        assert any("not indexed" in each for each in lab.notices) == (moment == "before")
        assert [each.act.note for each in lab.journal()] == [None, "entered afterwards, from the sealed file"]
    assert_all_or_nothing(root, folder)


def test_a_killed_reduction_leaves_the_archive_whole(tmp_path: Path) -> None:
    root, folder = archive_with(tmp_path, "reduction")
    with Archive.open(root) as lab:
        lab.ingest(folder)
    with Archive.open(root) as lab, faults.faulty(None) as calls:
        lab.reduce("2026-03", plan="empty-cell")
    assert len(calls) >= 4
    for stop_at in range(1, len(calls) + 1):
        other, _ = archive_with(tmp_path, f"reduction-{stop_at}")
        with Archive.open(other) as lab:
            lab.ingest(folder)
            with pytest.raises(faults.StoppedError), faults.faulty(stop_at, faults.by_exception):
                lab.reduce("2026-03", plan="empty-cell")
        with Archive.open(other) as lab:
            assert lab.fixity() == []
            (outcome,) = lab.reduce("2026-03", plan="empty-cell")
            assert outcome.problem is None
            assert outcome.address == "2026-03/s001@empty-cell.1"
            assert lab.replay(outcome.address).identical


def test_the_child_sees_this_program(tmp_path: Path) -> None:
    ended = faults.run_child("import archive; print(archive.__version__)")
    assert ended.returncode == 0, ended.stderr
    assert ended.stdout.strip() == "0.1.0"
    assert sys.executable

"""The plan by which an import gives names, full disks, and what an export leaves that was stopped; all other points: `test_stopped.py`."""

from __future__ import annotations

import shutil
from collections.abc import Callable
from pathlib import Path

import pytest

from archive import Archive
from archive.exchange.bag_writing import new_bag
from archive.store import archive_lock, durable, open_store, staging
from tests.crash import faults
from tests.small_cooldown import write_folder


@pytest.fixture(scope="module")
def places(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, Path, Path]:
    """Give a filled archive, a package of it, and an empty archive; all for reading."""
    folder = tmp_path_factory.mktemp("crash")
    with Archive.create(folder / "lab") as lab:
        lab.ingest(write_folder(folder / "2026-03"))
        lab.reduce("2026-03", plan="empty-cell")
        lab.export(["2026-03"], folder / "package", reports=False)
    Archive.create(folder / "empty").close()
    return folder / "lab", folder / "package", folder / "empty"


def full_disk(calls_before: int) -> Callable[[], None]:
    """Give a function that says that the disk is full, after some calls."""
    left = [calls_before]

    def stop() -> None:
        left[0] -= 1
        if left[0] < 0:
            raise OSError(28, "No space left on device")

    return stop


def test_a_full_disk_is_told_in_a_sentence_and_leaves_nothing(
    places: tuple[Path, Path, Path], tmp_path: Path
) -> None:
    from archive.errors import ArchiveError

    lab_root, package, empty = places
    with Archive.open(lab_root) as lab:
        with pytest.raises(ArchiveError, match="No space left"), faults.faulty(3, full_disk(0)):
            lab.export(["2026-03"], tmp_path / "out", reports=False)
        assert list(tmp_path.iterdir()) == []
    with Archive.open(shutil.copytree(empty, tmp_path / "count")) as lab, faults.faulty(None) as calls:
        lab.import_package(package)
    settling = calls.index("chmod") + 2  # the first file is written and its bytes are to go to the disk
    root = shutil.copytree(empty, tmp_path / "lab")
    with Archive.open(root) as lab:
        with pytest.raises(ArchiveError, match="No space left"), faults.faulty(settling, full_disk(0)):
            lab.import_package(package)
        assert not list((root / "staging").iterdir())


def test_what_a_killed_export_left_is_swept_by_the_next_one_and_a_living_one_is_left(
    places: tuple[Path, Path, Path], tmp_path: Path
) -> None:
    dead = tmp_path / ".package.0123abcd.partial"
    others = [tmp_path / ".thesis.0123abcd.partial", tmp_path / ".package.partial"]
    for other in others:  # named alike or made of other things: somebody else's
        other.mkdir()
        (other / "thesis.tex").touch()
    with Archive.open(places[0]) as lab:
        with new_bag(tmp_path / "other") as living:
            living.add("a.txt", [b"a"])
            (dead / "data" / "sealed").mkdir(parents=True)
            (dead / "data" / "sealed" / "a.h5").write_bytes(b"half")
            outcome = lab.export(["2026-03"], tmp_path / "package", reports=False)
            assert living.folder.is_dir()
            living.finish([])
        assert outcome.swept == (
            f"{dead}: the writing of a package had not finished; what there was of it (files: 1) was removed",
        )
        assert lab.export(["2026-03"], tmp_path / "again", reports=False).swept == ()
    assert sorted(path.name for path in tmp_path.iterdir()) == sorted(
        [*(other.name for other in others), "again", "other", "package"]
    )


# The plan of the names -------------------------------------------------------------------------------------------------


def staged(root: Path, key: str, content: bytes = b"whole") -> Path:
    """Put a settled file into staging."""
    path = durable.staging_path(root, key)
    path.write_bytes(content)
    durable.settle(path)
    return path


def test_a_plan_is_finished_by_the_next_writer(tmp_path: Path) -> None:
    files = [(staged(tmp_path, key), key) for key in ("2026-03/2026-03.a1", "2026-03/s001@x.1")]
    plan = staging.new_plan(tmp_path)
    staging.decide(plan, files)
    with archive_lock(tmp_path):
        (sentence,) = staging.sweep_staging(tmp_path)
    assert "was finished: 2026-03/2026-03.a1, 2026-03/s001@x.1" in sentence
    assert open_store(tmp_path).keys() == ["2026-03/2026-03.a1", "2026-03/s001@x.1"]
    assert not list((tmp_path / "staging").iterdir())


@pytest.mark.parametrize("stop_after", range(4))
def test_a_plan_is_finished_from_wherever_it_stood(tmp_path: Path, stop_after: int) -> None:
    files = [(staged(tmp_path, key), key) for key in ("2026-03/a", "2026-03/b", "2026-03/c")]
    plan = staging.new_plan(tmp_path)
    staging.decide(plan, files)
    for path, key in files[:stop_after]:
        durable.take_name(path, tmp_path / "sealed" / f"{key}.h5", root=tmp_path, key=key)
    with archive_lock(tmp_path):
        staging.sweep_staging(tmp_path)
    assert open_store(tmp_path).keys() == ["2026-03/a", "2026-03/b", "2026-03/c"]


def test_a_plan_without_hard_links_is_finished_too(tmp_path: Path) -> None:
    """The name was taken by an empty file, and the rename did not follow."""
    path = staged(tmp_path, "2026-03/a")
    plan = staging.new_plan(tmp_path)
    staging.decide(plan, [(path, "2026-03/a")])
    final = tmp_path / "sealed" / "2026-03" / "a.h5"
    final.parent.mkdir(parents=True)
    final.touch()
    with archive_lock(tmp_path):
        staging.sweep_staging(tmp_path)
    assert final.read_bytes() == b"whole"


def test_a_plan_outlasts_no_file_that_it_names(tmp_path: Path) -> None:
    """A power cut may keep one name of a folder and lose an older one, so the older ones are synced first."""
    files = [(staged(tmp_path, key), key) for key in ("2026-03/a", "2026-03/b")]
    plan = staging.new_plan(tmp_path)
    with faults.faulty(None) as calls:
        staging.decide(plan, files)
    assert calls == [
        "fsync",
        "fsync",
        "link",
        "fsync",
        "unlink",
    ]  # the folder; the plan, its name, the folder again
    durable.discard(files[1][0])
    with archive_lock(tmp_path):
        assert "could not be finished" in staging.sweep_staging(tmp_path)[0]
    assert open_store(tmp_path).keys() == []


@pytest.mark.parametrize("what", ["taken", "gone", "unreadable", "another"])
def test_a_plan_that_cannot_be_finished_is_told_and_kept(tmp_path: Path, what: str) -> None:
    path = staged(tmp_path, "2026-03/a")
    plan = staging.new_plan(tmp_path)
    staging.decide(plan, [(path, "2026-03/a")])
    if what == "taken":
        final = tmp_path / "sealed" / "2026-03" / "a.h5"
        final.parent.mkdir(parents=True)
        final.write_bytes(b"another")
    elif what == "gone":
        durable.discard(path)
    elif what == "unreadable":
        plan.write_text("{")
    else:
        plan.write_text('{"format": "stillroom-batch/1", "files": [["../x.partial", "2026-03/a"]]}')
    with archive_lock(tmp_path):
        sentences = staging.sweep_staging(tmp_path)
    assert "could not be finished" in sentences[0]
    assert plan.exists()
    assert path.exists() == (what != "gone")


def test_an_unfinished_plan_is_swept(tmp_path: Path) -> None:
    path = staged(tmp_path, "2026-03/a")
    (tmp_path / "staging" / ".0123456789abcdef.batch.01234567.partial").write_text("{")
    with archive_lock(tmp_path):
        sentences = staging.sweep_staging(tmp_path)
    assert "had not been decided" in sentences[0]
    assert not path.exists()

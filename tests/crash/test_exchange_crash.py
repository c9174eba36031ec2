"""An import that is stopped anywhere is in the archive whole or has left no trace; an export leaves no half package."""

from __future__ import annotations

import shutil
from collections.abc import Callable, Sequence
from pathlib import Path

import pytest

from archive import Archive
from archive.index import Index
from archive.store import Damage, SealedFile, archive_lock, durable, examine, open_store, staging
from tests.crash import faults
from tests.small_cooldown import write_folder

CHILD = """
from pathlib import Path
from archive import Archive
lab = Archive.open(Path(sys.argv[1]))
with faults.faulty(int(sys.argv[3]), faults.by_exit):
    lab.import_package(Path(sys.argv[2]))
"""
ALL = ["2026-03.a1", "2026-03/s001@empty-cell.1"]


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


@pytest.fixture(autouse=True)
def in_this_process(monkeypatch: pytest.MonkeyPatch) -> None:
    """Let files be read in this process; what stops here is durable calls, not reading."""

    def read(files: Sequence[tuple[Path, SealedFile]]) -> list[Damage]:
        return [damage for path, sealed in files for damage in examine._inside(path, sealed.key)]

    monkeypatch.setattr("archive.store.adopting.examined_apart", read)
    monkeypatch.setattr(examine, "_inside_apart", lambda path, key, size: examine._inside(path, key))


def assert_sound(lab: Archive) -> int:
    """See that every recorded file is there, byte for byte, and nothing else; return how many there are."""
    recorded = lab._index.sealed_files()
    assert sorted(recorded) == lab._store.keys()
    assert [
        damage for key, (sha256, _) in recorded.items() for damage in lab._store.verify(key, sha256)
    ] == []
    assert lab._store.strays() == []
    return len(recorded)


def assert_all_or_nothing(root: Path, package: Path) -> str:
    """Open, look, try again, and look again; return what the second try was."""
    with Archive.open(root) as lab:
        held = assert_sound(lab)
        assert held in (0, len(ALL))
        outcome = lab.import_package(package)
        assert outcome.state == ("already" if held else "imported")
        assert sorted(outcome.held or outcome.taken) == ALL
        assert assert_sound(lab) == len(ALL)
        return outcome.state


def test_an_import_stopped_by_an_exception_at_every_durable_call(
    places: tuple[Path, Path, Path], tmp_path: Path
) -> None:
    _, package, empty = places
    with Archive.open(shutil.copytree(empty, tmp_path / "count")) as lab, faults.faulty(None) as calls:
        lab.import_package(package)
    assert len(calls) >= 15
    ended = []
    for stop_at in range(1, len(calls) + 1):
        root = shutil.copytree(empty, tmp_path / f"exception-{stop_at}")
        with (
            Archive.open(root) as lab,
            pytest.raises(faults.StoppedError),
            faults.faulty(stop_at, faults.by_exception),
        ):
            lab.import_package(package)
        ended.append(assert_all_or_nothing(root, package))
    # Before the plan of the names is on disk nothing stays, from then on everything; never in turns.
    assert ended == sorted(ended, key=["imported", "already"].index)
    assert set(ended) == {"imported", "already"}


@pytest.mark.slow
def test_an_import_stopped_dead_after_its_decision(places: tuple[Path, Path, Path], tmp_path: Path) -> None:
    _, package, empty = places
    with Archive.open(shutil.copytree(empty, tmp_path / "count")) as lab, faults.faulty(None) as calls:
        lab.import_package(package)
    stop_at = calls.index("link") + 5  # the plan is on disk, the first file has its name, the second has not
    root = shutil.copytree(empty, tmp_path / "dead")
    ended = faults.run_child(CHILD, root, package, stop_at)
    assert ended.returncode == 77, ended.stderr
    assert assert_all_or_nothing(root, package) == "already"


@pytest.mark.parametrize("moment", ["before the first row", "after the first file"])
def test_an_import_stopped_at_the_index(
    places: tuple[Path, Path, Path], tmp_path: Path, moment: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    lab_root, package, empty = places
    root = shutil.copytree(empty, tmp_path / "lab")
    real = Index.record
    calls: list[str] = []

    def stopped(self: Index, *arguments: object, **options: object) -> None:
        calls.append("record")
        if moment == "before the first row" or len(calls) > 1:
            raise faults.StoppedError
        real(self, *arguments, **options)  # type: ignore[arg-type]

    with Archive.open(root) as lab:
        monkeypatch.setattr(Index, "record", stopped)
        with pytest.raises(faults.StoppedError):
            lab.import_package(package)
        monkeypatch.setattr(Index, "record", real)
    with Archive.open(root) as lab, Archive.open(lab_root) as origin:
        assert any("sealed but not indexed" in sentence for sentence in lab.notices)
        assert lab._index.rows() == origin._index.rows()
    assert assert_all_or_nothing(root, package) == "already"


def test_an_export_stopped_at_every_durable_call_leaves_nothing_under_its_name(
    places: tuple[Path, Path, Path], tmp_path: Path
) -> None:
    lab_root, _, empty = places
    folder = tmp_path / "out"
    folder.mkdir()
    with Archive.open(lab_root) as lab:
        with faults.faulty(None) as calls:
            lab.export(["2026-03"], folder / "count", reports=False)
        shutil.rmtree(folder / "count")
        last = calls.index("rename") + 1
        for stop_at in range(1, len(calls) + 1):
            with pytest.raises(faults.StoppedError), faults.faulty(stop_at, faults.by_exception):
                lab.export(["2026-03"], folder / "package", reports=False)
            if stop_at <= last:
                assert list(folder.iterdir()) == []
            else:  # the name was taken, and only the word of the disk about it is missing
                shutil.rmtree(folder / "package")
        lab.export(["2026-03"], folder / "package", reports=False)
    with Archive.open(shutil.copytree(empty, tmp_path / "lab")) as there:
        assert there.import_package(folder / "package").state == "imported"


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

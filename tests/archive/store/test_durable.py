"""Names taken exclusively, locks that end with their holder, staging that is swept and explained."""

from __future__ import annotations

import errno
import os
import subprocess
import sys
import threading
from pathlib import Path

import pytest

from archive.errors import AlreadySealed, ArchiveBusy, ArchiveError, BadRequest, NotAnArchive
from archive.store import archive_lock, durable, open_store, sweep_staging

KEY = "2026-03/2026-03.a1"


def seal(root: Path, text: str = "{}") -> Path:
    """Seal a minimal file and return its path."""
    store = open_store(root)
    with store.writer(KEY) as writer:
        writer.document(text)
        writer.seal()
    return store.path(KEY)


def no_links(*_: object) -> None:
    """Answer as a file system without hard links does."""
    raise OSError(errno.EPERM, os.strerror(errno.EPERM))


def test_a_store_needs_a_folder_and_makes_none(tmp_path: Path) -> None:
    with pytest.raises(NotAnArchive):
        open_store(tmp_path / "none")
    store = open_store(tmp_path)
    assert (store.keys(), store.strays(), list(tmp_path.iterdir())) == ([], [], [])


def test_who_may_read_is_the_umask(tmp_path: Path) -> None:
    before = os.umask(0o027)
    try:
        assert seal(tmp_path).stat().st_mode & 0o777 == 0o440
    finally:
        os.umask(before)


def test_without_hard_links_a_name_is_still_taken_once(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(durable.os, "link", no_links)
    path = seal(tmp_path)
    assert path.stat().st_mode & 0o222 == 0
    store = open_store(tmp_path)
    assert store.verify(KEY) == []
    staged = tmp_path / "staging" / "x.partial"
    staged.write_bytes(b"other")
    with pytest.raises(AlreadySealed):
        durable.take_name(staged, path, root=tmp_path, key=KEY)
    assert store.verify(KEY) == []
    assert staged.read_bytes() == b"other"


def test_without_hard_links_a_crash_between_name_and_file_is_swept(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(durable.os, "link", no_links)
    final = tmp_path / "sealed" / f"{KEY}.h5"
    final.parent.mkdir(parents=True)
    final.touch()
    staged = durable.staging_path(tmp_path, KEY)
    staged.write_bytes(b"whole")
    with archive_lock(tmp_path):
        (sentence,) = sweep_staging(tmp_path)
    assert "had not finished" in sentence
    assert seal(tmp_path) == final


def test_another_fault_of_linking_is_not_taken_for_a_lack_of_links(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def fail(*_: object) -> None:
        raise OSError(errno.EIO, os.strerror(errno.EIO))

    monkeypatch.setattr(durable.os, "link", fail)
    with pytest.raises(ArchiveError, match="could not be written"):
        seal(tmp_path)
    assert open_store(tmp_path).strays() == []


def test_sweeping_explains_each_thing_and_leaves_foreign_ones(tmp_path: Path) -> None:
    sealed = seal(tmp_path)
    staged = durable.staging_path(tmp_path, KEY)
    os.link(sealed, staged)
    unfinished = durable.staging_path(tmp_path, "2026-04/x")
    unfinished.write_bytes(b"1234")
    foreign = tmp_path / "staging" / "notes.txt"
    foreign.write_text("mine")
    with archive_lock(tmp_path):
        sentences = sweep_staging(tmp_path)
        assert len(sentences) == 3
        assert f"{KEY} had been sealed whole" in sentences[0]
        assert "2026-04/x had not finished; its 4 bytes" in sentences[1]
        assert "left alone" in sentences[2]
    assert list((tmp_path / "staging").iterdir()) == [foreign]
    assert open_store(tmp_path).verify(KEY) == []


def test_sweeping_needs_the_lock(tmp_path: Path) -> None:
    with pytest.raises(BadRequest, match="one writer"):
        sweep_staging(tmp_path)
    with archive_lock(tmp_path):
        assert sweep_staging(tmp_path) == []


def test_foreign_things_among_sealed_files_are_strays(tmp_path: Path) -> None:
    path = seal(tmp_path)
    (path.parent / "notes.txt").write_text("mine")
    (path.parent / "way.h5").symlink_to(path)
    (tmp_path / "sealed" / "loose.h5").write_bytes(b"")
    store = open_store(tmp_path)
    assert store.keys() == [KEY]
    assert store.strays() == ["sealed/2026-03/notes.txt", "sealed/2026-03/way.h5", "sealed/loose.h5"]


def test_a_second_writer_is_told_who_holds_the_lock(tmp_path: Path) -> None:
    with archive_lock(tmp_path):
        with (
            pytest.raises(ArchiveBusy, match=rf"process {os.getpid()}, since 20") as caught,
            archive_lock(tmp_path, wait_s=0),
        ):
            pytest.fail("two hold one lock")
        assert caught.value.exit_code == 4
    with archive_lock(tmp_path, wait_s=0):
        pass


def test_a_report_on_a_read_only_medium_is_refused_by_its_own_name(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Neither making nor removing the staging file is possible there, and neither is what the person asked about."""

    def read_only(path: Path, *arguments: object) -> None:
        raise OSError(errno.EROFS, os.strerror(errno.EROFS), str(path))

    monkeypatch.setattr(Path, "open", read_only)
    monkeypatch.setattr(os, "unlink", read_only)
    with pytest.raises(BadRequest, match=r"report\.html: the file cannot be written: Read-only") as caught:
        durable.write_whole(tmp_path / "report.html", b"x")
    assert "partial" not in str(caught.value)


def test_the_lock_holds_on_a_full_disk(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """What the lock file says is for people only; that it cannot be written does not matter."""

    def full(descriptor: int, data: bytes) -> int:
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    monkeypatch.setattr(os, "write", full)
    with archive_lock(tmp_path), pytest.raises(ArchiveBusy), archive_lock(tmp_path, wait_s=0.0):
        pass


def test_a_folder_that_is_not_there_cannot_be_locked(tmp_path: Path) -> None:
    with pytest.raises(ArchiveError, match="cannot be locked"), archive_lock(tmp_path / "none"):
        pytest.fail("a lock on nothing")


def test_a_second_writer_waits_for_the_first(tmp_path: Path) -> None:
    entered, order = threading.Event(), []

    def first() -> None:
        with archive_lock(tmp_path):
            entered.set()
            threading.Event().wait(0.2)
            order.append("first")

    thread = threading.Thread(target=first)
    thread.start()
    entered.wait()
    with archive_lock(tmp_path, wait_s=10):
        order.append("second")
    thread.join()
    assert order == ["first", "second"]


def test_the_lock_ends_with_its_holder(tmp_path: Path) -> None:
    program = (
        "import sys, pathlib, time; from archive.store import archive_lock\n"
        "with archive_lock(pathlib.Path(sys.argv[1])): print('held', flush=True); time.sleep(60)"
    )
    with subprocess.Popen([sys.executable, "-c", program, tmp_path], stdout=subprocess.PIPE) as holder:
        assert holder.stdout is not None
        assert holder.stdout.readline() == b"held\n"
        with pytest.raises(ArchiveBusy, match=f"process {holder.pid}"), archive_lock(tmp_path, wait_s=0):
            pytest.fail("two hold one lock")
        holder.kill()
    with archive_lock(tmp_path, wait_s=0):
        pass


@pytest.mark.skipif(not hasattr(os, "fork"), reason="no fork on this system")
def test_a_forked_child_holds_no_lock(tmp_path: Path) -> None:
    reader, writer = os.pipe()
    with archive_lock(tmp_path):
        child = os.fork()
        if child == 0:
            os.close(writer)
            os.read(reader, 1)  # lives until the parent lets it go
            os._exit(0)
    try:
        with archive_lock(tmp_path, wait_s=0):
            pass
    finally:
        os.close(writer)
        os.waitpid(child, 0)
        os.close(reader)

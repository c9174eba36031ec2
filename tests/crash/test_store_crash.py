"""All or nothing: whatever stops a writer, the file is in the archive whole, or has left no trace.

The end of the process at each call, as part of whole operations: `test_stopped.py`.
"""

from __future__ import annotations

import errno
import os
import signal
import subprocess
import sys
from pathlib import Path

import pytest

from archive.errors import AlreadySealed, ArchiveError
from archive.store import SealedFile, archive_lock, open_store, sweep_staging
from archive.store.chunks import ChunkStream
from archive.store.sealed import SealedWriter
from tests.crash import faults


def undisturbed(folder: Path) -> tuple[list[str], SealedFile]:
    """Return the durable calls of a good seal and what it sealed."""
    folder.mkdir()
    with faults.faulty(None) as calls:
        sealed = faults.seal(folder)
    return calls, sealed


def require_all_or_nothing(root: Path, sealed: SealedFile) -> bool:
    """Return whether the file was sealed; fail if it is there in part, or a second try does not end well."""
    store = open_store(root)
    whole = store.contains(faults.KEY)
    assert store.keys() == ([faults.KEY] if whole else [])
    if whole:
        assert store.verify(faults.KEY, sealed.sha256) == []
    with archive_lock(root, wait_s=0):
        sweep_staging(root)
        if whole:
            with pytest.raises(AlreadySealed):
                faults.seal(root)
        else:
            assert faults.seal(root) == sealed
    assert store.verify(faults.KEY, sealed.sha256) == []
    assert store.strays() == []
    return whole


def test_a_good_seal_syncs_before_and_after_taking_its_name(tmp_path: Path) -> None:
    calls, _ = undisturbed(tmp_path / "good")
    link = calls.index("link")
    assert calls[:link].count("mkdir") == 3  # staging, sealed, sealed/2026-03
    assert calls[:link].count("fsync") == 4  # a folder for each, and the file
    assert calls.index("chmod") < link
    assert calls[link:] == ["link", "fsync", "unlink", "unlink"]


def test_stopped_by_an_exception_at_every_durable_call(tmp_path: Path) -> None:
    calls, sealed = undisturbed(tmp_path / "good")
    ends = []
    for number in range(1, len(calls) + 1):
        root = tmp_path / str(number)
        root.mkdir()
        with pytest.raises(faults.StoppedError), faults.faulty(number):
            faults.seal(root)
        if number < len(calls):  # the last call is the clean-up itself
            assert not list((root / "staging").glob("*"))
        ends.append(require_all_or_nothing(root, sealed))
    assert ends == [number > calls.index("link") + 1 for number in range(1, len(calls) + 1)]


def test_killed_in_the_middle_of_writing(tmp_path: Path) -> None:
    good = tmp_path / "good"
    _, sealed = undisturbed(good)
    root = tmp_path / "killed"
    root.mkdir()
    program = (
        "import sys, time, pathlib; from archive.store import open_store\n"
        "with open_store(pathlib.Path(sys.argv[1])).writer('2026-03/2026-03.a1') as writer:\n"
        "    def blocks():\n"
        "        for i in range(9): yield bytes([i]) * 300_000\n"
        "        print('writing', flush=True); time.sleep(60)\n"
        "    writer.raw('log', blocks())\n"
    )
    with subprocess.Popen([sys.executable, "-c", program, root], stdout=subprocess.PIPE) as child:
        assert child.stdout is not None
        assert child.stdout.readline() == b"writing\n"
        child.send_signal(signal.SIGKILL)
    (left,) = open_store(root).strays()
    assert left.startswith("staging/2026-03~2026-03.a1.")
    assert not require_all_or_nothing(root, sealed)


def test_a_full_disk_leaves_no_trace(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def full(*_: object) -> None:
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    with monkeypatch.context() as patch:
        patch.setattr(ChunkStream, "_write", full)
        with pytest.raises(ArchiveError, match=r"No space left on device.*make room"):
            faults.seal(tmp_path)
    store = open_store(tmp_path)
    assert (store.keys(), store.strays()) == ([], [])
    faults.seal(tmp_path)


@pytest.mark.parametrize("share", [0, 0.001, 0.3, 0.9, 1])
def test_a_file_that_the_system_will_not_let_grow_leaves_no_trace(tmp_path: Path, share: float) -> None:
    """The limit on file sizes makes HDF5's own writes fail: at the beginning, in chunks, at the last byte."""
    pytest.importorskip("resource")
    _, sealed = undisturbed(tmp_path / "good")
    limit = int(share * (sealed.size - 1))
    root = tmp_path / "full"
    root.mkdir()
    program = (
        "import resource; from pathlib import Path; from archive.errors import ArchiveError\n"
        "resource.setrlimit(resource.RLIMIT_FSIZE, (int(sys.argv[2]), int(sys.argv[2])))\n"
        "try: faults.seal(Path(sys.argv[1]))\n"
        "except ArchiveError as error: print(error)\n"
        "else: print('sealed')\n"
    )
    run = faults.run_child(program, root, limit)
    assert "could not be written" in run.stdout, run.stderr
    store = open_store(root)
    assert (store.keys(), store.strays()) == ([], [])
    assert not require_all_or_nothing(root, sealed)


@pytest.mark.parametrize("spot", [0, 64, 320, 832, -3600, 300_000])
@pytest.mark.parametrize("moment", ["before the first look", "after it"])
def test_a_disk_that_gives_back_other_bytes_seals_nothing(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, spot: int, moment: str
) -> None:
    """Some bytes are lost: in marks, in what leads to the data, in the data; before anybody has a digest of them, or later."""
    finish, settle = SealedWriter.finish, faults.durable.settle

    def spoil(staged: Path) -> None:
        data = bytearray(staged.read_bytes())
        place = spot % len(data)
        assert any(data[place : place + 64])
        data[place : place + 64] = bytes(64)
        staged.write_bytes(data)

    def finished(writer: SealedWriter) -> dict[str, str]:
        digests = finish(writer)
        spoil(writer.path)
        return digests

    def settled(staged: Path) -> None:
        spoil(staged)
        settle(staged)

    with monkeypatch.context() as patch:
        if moment == "after it":
            patch.setattr(faults.durable, "settle", settled)
        else:
            patch.setattr(SealedWriter, "finish", finished)
        with pytest.raises(ArchiveError, match="gave back other bytes"):
            faults.seal(tmp_path)
    store = open_store(tmp_path)
    assert (store.keys(), store.strays()) == ([], [])


def test_a_small_file_that_comes_back_otherwise_takes_no_name(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    sync = faults.durable._sync

    def spoil(descriptor: int) -> None:
        os.ftruncate(descriptor, 1)
        sync(descriptor)

    with monkeypatch.context() as patch:
        patch.setattr(faults.durable, "_sync", spoil)
        with pytest.raises(ArchiveError, match="gave back other bytes"):
            faults.durable.write_whole(tmp_path / "stillroom.toml", b"name = 1")
    assert list(tmp_path.iterdir()) == []

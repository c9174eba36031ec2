"""Reports are written whole, and when the disk fills, it is said which of them stand there."""

from __future__ import annotations

import errno
import os
from pathlib import Path

import pytest

from archive.errors import BadRequest
from archive.lab.report_files import written_reports
from archive.store import durable

FILES = {"appendix.tex": b"\\section{}", "figures/one.pdf": b"%PDF", "appendix.bib": b"@article"}


@pytest.mark.parametrize(
    ("room", "said"),
    [
        (0, "none of the files was written"),
        (1, "written before it: appendix.tex; not written: figures/one.pdf, appendix.bib"),
        (2, "written before it: appendix.tex, figures/one.pdf; not written: appendix.bib"),
    ],
)
def test_a_disk_that_fills_is_told_with_what_was_written(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, room: int, said: str
) -> None:
    synced = []
    real = durable.os.fsync

    def full(descriptor: int) -> None:
        # A report is synced, then its folder.
        if len(synced) >= 2 * room:
            raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))
        synced.append(descriptor)
        real(descriptor)

    with monkeypatch.context() as patch:
        patch.setattr(durable.os, "fsync", full)
        with pytest.raises(BadRequest, match="No space left on device") as caught:
            written_reports(FILES, tmp_path)
    assert caught.value.what.endswith(said)
    found = {path.relative_to(tmp_path).as_posix() for path in tmp_path.rglob("*") if path.is_file()}
    assert found == set(list(FILES)[:room])
    assert [path.read_bytes() for path in written_reports(FILES, tmp_path)] == list(FILES.values())


def test_a_file_where_a_folder_is_to_be_is_told(tmp_path: Path) -> None:
    (tmp_path / "figures").write_bytes(b"")
    with pytest.raises(BadRequest, match=r"cannot be made: .*written before it: appendix\.tex; not written"):
        written_reports(FILES, tmp_path)

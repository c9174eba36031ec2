"""What opening says of an ingest that was stopped at the commit of the index; all other points: `test_stopped.py`."""

from __future__ import annotations

from pathlib import Path

import pytest

from archive import Archive
from archive.index import Index
from tests.crash import faults
from tests.small_cooldown import write_folder


@pytest.mark.parametrize("moment", ["before", "after"])
def test_stopped_at_the_index_commit(tmp_path: Path, moment: str, monkeypatch: pytest.MonkeyPatch) -> None:
    root, folder = tmp_path / "lab", write_folder(tmp_path / "2026-03")
    Archive.create(root).close()
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
        assert lab.fixity() == []
        assert lab.ingest(folder).state == "already"

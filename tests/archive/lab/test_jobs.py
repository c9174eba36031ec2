"""Several processes compute what one would: the same bytes, the same order; whoever dies or is stopped loses nothing sealed."""

from __future__ import annotations

import multiprocessing
import os
import shutil
from collections.abc import Callable
from datetime import UTC, datetime
from functools import partial
from pathlib import Path
from typing import Any

import pytest

from archive import Archive
from archive.commands.failures import EXIT_INTERRUPTED, stopped
from archive.errors import ArchiveError, Stopped
from tests.revisable_cooldown import PLAN, calibration, write_calibrated

MOMENT: Callable[[], datetime] = partial(datetime, 2026, 4, 1, 12, tzinfo=UTC)


def deadly() -> datetime:
    """Tell the time, but end every process that computes for another one."""
    if multiprocessing.parent_process() is not None:
        os._exit(9)
    return MOMENT()


@pytest.fixture(scope="module")
def calibrated(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give the folder of an archive with a cooldown that rests on a calibration, not reduced."""
    place = tmp_path_factory.mktemp("jobs")
    (place / "filling.toml").write_text(
        PLAN.replace("REVISION", "1").replace("CHANGED", ""), encoding="utf-8"
    )
    (place / "revision.toml").write_text(
        'format = "stillroom-revision/1"\nby = "data steward"\nbecause = "calibrated again"\n'
        + calibration(2, first=3.01),
        encoding="utf-8",
    )
    with Archive.create(place / "lab", name="Test laboratory", clock=MOMENT) as lab:
        lab.ingest(write_calibrated(place / "2026-03"))
    return place


def _carried_out(place: Path, root: Path, jobs: int) -> dict[str, Any]:
    with Archive.open(shutil.copytree(place / "lab", root), clock=MOMENT) as lab:
        outcomes = lab.reduce("2026-03", jobs=jobs)
        outcomes += lab.reduce("2026-03", plan=place / "filling.toml", jobs=jobs)
        lab.revise(place / "revision.toml")
        stale = len(lab.stale())
        renewed = lab.reduce_stale(jobs=jobs)
        assert stale == len(renewed) > 1
        assert not lab.stale()
        return {
            "outcomes": [(each.address, str(each.problem)) for each in (*outcomes, *renewed)],
            "sealed": {path.name: path.read_bytes() for path in (root / "sealed").rglob("*.h5")},
            "rows": lab.reductions(),
            "acts": lab.journal(),
            "replayed": list(lab.replay_all(jobs=jobs)),
        }


def test_two_processes_seal_what_one_does(calibrated: Path, tmp_path: Path) -> None:
    one, two = (_carried_out(calibrated, tmp_path / f"lab{jobs}", jobs) for jobs in (1, 2))
    assert len(one["sealed"]) > 5
    assert all(told.identical for _, told in one["replayed"])
    assert two == one


def test_a_process_that_dies_loses_nothing(calibrated: Path, tmp_path: Path) -> None:
    root = shutil.copytree(calibrated / "lab", tmp_path / "lab")
    with Archive.open(root, clock=deadly) as lab:
        (first, *_) = lab.reduce("2026-03", plan="empty-cell")
        with pytest.raises(ArchiveError, match=r"ended by itself.*fewer --jobs"):
            lab.reduce("2026-03", jobs=2)
        assert [row.address for row in lab.reductions()] == [first.address]
        assert not lab.fixity()
        assert [each.already for each in lab.reduce("2026-03", plan="empty-cell")] == [True]


def test_stopping_tells_how_far_it_came(
    calibrated: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    def stop(sentence: str) -> None:
        if "(2 of " in sentence:
            raise KeyboardInterrupt

    with Archive.open(shutil.copytree(calibrated / "lab", tmp_path / "lab"), clock=MOMENT) as lab:
        with pytest.raises(Stopped, match=r"^1 of \d+ reductions are made and sealed$") as told:
            lab.reduce("2026-03", jobs=2, progress=stop)
        assert not multiprocessing.active_children()
        assert len(lab.reductions()) == 1
        assert not lab.fixity()
    assert stopped(told.value) == EXIT_INTERRUPTED
    assert "stopped: 1 of " in capsys.readouterr().err

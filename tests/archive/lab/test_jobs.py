"""Several processes compute what one would: the same bytes, the same order; whoever dies or is stopped loses nothing sealed."""

from __future__ import annotations

import logging
import multiprocessing
import os
import shutil
import signal
import time
from collections.abc import Callable
from datetime import UTC, datetime
from functools import partial
from pathlib import Path
from typing import Any

import pytest
from distributed import LocalCluster

from archive import Archive
from archive.commands.failures import EXIT_INTERRUPTED, stopped
from archive.errors import ArchiveError, BadRequest, Stopped
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


def _carried_out(
    place: Path, root: Path, *, progress: Callable[[str], None] = print, **crew: Any
) -> dict[str, Any]:
    with Archive.open(shutil.copytree(place / "lab", root), clock=MOMENT) as lab:
        outcomes = lab.reduce("2026-03", progress=progress, **crew)
        outcomes += lab.reduce("2026-03", plan=place / "filling.toml", **crew)
        lab.revise(place / "revision.toml")
        stale = len(lab.stale())
        renewed = lab.reduce_stale(**crew)
        assert stale == len(renewed) > 1
        assert not lab.stale()
        return {
            "outcomes": [(each.address, str(each.problem)) for each in (*outcomes, *renewed)],
            "sealed": {path.name: path.read_bytes() for path in (root / "sealed").rglob("*.h5")},
            "rows": lab.reductions(),
            "acts": lab.journal(),
            "replayed": list(lab.replay_all(**crew)),
        }


@pytest.fixture(scope="module")
def alone(calibrated: Path, tmp_path_factory: pytest.TempPathFactory) -> dict[str, Any]:
    """Give what one process seals and replays."""
    one = _carried_out(calibrated, tmp_path_factory.mktemp("alone") / "lab")
    assert len(one["sealed"]) > 5
    assert all(told.identical for _, told in one["replayed"])
    return one


def test_two_processes_seal_what_one_does(calibrated: Path, alone: dict[str, Any], tmp_path: Path) -> None:
    assert _carried_out(calibrated, tmp_path / "lab", jobs=2) == alone


def test_a_cluster_seals_what_one_process_does_and_a_killed_worker_loses_nothing(
    calibrated: Path, alone: dict[str, Any], tmp_path: Path
) -> None:
    with LocalCluster(  # type: ignore[no-untyped-call]
        n_workers=2, threads_per_worker=1, dashboard_address=":0", silence_logs=logging.CRITICAL
    ) as cluster:
        killed: list[int] = []

        def kill(sentence: str) -> None:
            until = time.monotonic() + 20
            while not killed and time.monotonic() < until:
                at_work = [each.pid for each in cluster.scheduler.workers.values() if each.processing]
                killed[:] = at_work[:1]
                for pid in killed:
                    os.kill(pid, signal.SIGKILL)

        address = cluster.scheduler_address.replace("tcp://", "dask://")
        assert _carried_out(calibrated, tmp_path / "lab", executor=address, progress=kill) == alone
        assert killed


@pytest.mark.parametrize(
    ("crew", "words"),
    [
        pytest.param({"executor": "somewhere:8786"}, "dask://HOST:PORT", id="no address"),
        pytest.param({"executor": "dask://127.0.0.1:1", "jobs": 2}, "exclude each other", id="both"),
        pytest.param({"jobs": 0}, "at least 1", id="nobody"),
    ],
)
def test_a_crew_that_cannot_be_is_refused(
    calibrated: Path, tmp_path: Path, crew: dict[str, Any], words: str
) -> None:
    with (
        Archive.open(shutil.copytree(calibrated / "lab", tmp_path / "lab")) as lab,
        pytest.raises(BadRequest, match=words),
    ):
        lab.reduce("2026-03", **crew)


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

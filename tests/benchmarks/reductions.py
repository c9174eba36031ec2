"""Reductions against the calls of their steps alone, and by all cores against one process."""

from __future__ import annotations

import hashlib
import re
import shutil
import tempfile
import time
from pathlib import Path
from typing import Any
from unittest.mock import patch

from archive import Archive
from archive.reduction.step_call import StepCall
from archive.store.cores import usable_cores
from tests.benchmarks.film_cooldown import COOLDOWN, MOMENT, SWEEP, film_archive
from tests.benchmarks.harness import Benchmark, Size, Timed, Work

__all__ = ["FILM", "RENEWAL"]

_PLAN = "film-transition"
_REVISION = """\
format = "stillroom-revision/1"
by = "data steward"
because = "calibrated again"
"""


def _film(size: Size) -> Work:
    place = Path(tempfile.mkdtemp(prefix="stillroom-film-"))
    root = film_archive(place, rows=400 if size == "small" else 5000)
    with Archive.open(root, clock=MOMENT) as lab:
        for plan in ("empty-cell", "dose-run"):
            lab.reduce(COOLDOWN, plan=plan)
    calls = _step_calls(place, root)
    first = {each.step.name: number for number, (each, _, _) in reversed(list(enumerate(calls)))}

    def subject() -> Timed:
        fresh = shutil.copytree(root, place / "fresh")
        with Archive.open(fresh, clock=MOMENT) as lab:
            begin = time.perf_counter()
            (outcome,) = lab.reduce(SWEEP, plan=_PLAN)
            seconds = time.perf_counter() - begin
        shutil.rmtree(fresh)
        assert outcome.document is not None
        told = {each.name: each.value for each in outcome.document.outputs}
        return Timed([told["T_KT"], told["T_KT_by_peak"]], seconds)

    def baseline() -> list[Any]:
        found = [call.step.function(parameters, **given) for call, parameters, given in calls]
        names = ("static-transition", "transition-from-peak")
        return [found[first[name]].outputs["transition_temperature"] for name in names]

    return Work(subject, baseline, len(calls), lambda: shutil.rmtree(place))


def _step_calls(place: Path, root: Path) -> list[tuple[StepCall, Any, dict[str, Any]]]:
    """Return every call of a step's function that the reduction makes, shifted inputs too, with its arguments."""
    found: list[tuple[StepCall, Any, dict[str, Any]]] = []
    whole = StepCall.__call__

    def noted(self: StepCall, values: Any, held: Any) -> Any:
        chosen = self.parameters.model_copy(update=dict(held)) if held else self.parameters
        given = {
            port: float(value) if value.ndim == 0 else value
            for port, value in values.items()
            if self.step.takes[port].form != "record"
        }
        found.append((self, chosen, {**given, **self.fixed}))
        return whole(self, values, held)

    fresh = shutil.copytree(root, place / "calls")
    with patch.object(StepCall, "__call__", noted), Archive.open(fresh, clock=MOMENT) as lab:
        (outcome,) = lab.reduce(SWEEP, plan=_PLAN)
    if outcome.problem is not None:
        raise outcome.problem
    shutil.rmtree(fresh)
    return found


_MORE: dict[Size, int] = {"small": 0, "default": 11, "full": 999}


def _renewal(size: Size) -> Work:
    place = Path(tempfile.mkdtemp(prefix="stillroom-renewal-"))
    root = film_archive(place, rows=320, more=_MORE[size])
    with Archive.open(root, clock=MOMENT) as lab:
        for plan in ("empty-cell", "dose-run"):
            lab.reduce(COOLDOWN, plan=plan)
        # Not the demonstration's other films: they are of other lengths.
        for number in range(_MORE[size] + 1):
            lab.reduce(f"{COOLDOWN}/m{number:04d}" if number else SWEEP, plan=_PLAN)
        lab.revise(_revision(place))
        stale = len(lab.stale())

    def renewed(jobs: int) -> Timed:
        fresh = shutil.copytree(root, place / "fresh")
        with Archive.open(fresh, clock=MOMENT) as lab:
            begin = time.perf_counter()
            outcomes = lab.reduce_stale(jobs=jobs)
            seconds = time.perf_counter() - begin
        made = [hashlib.sha256((fresh / "sealed" / f"{each.address}.h5").read_bytes()) for each in outcomes]
        shutil.rmtree(fresh)
        return Timed([float(int(each.hexdigest()[:12], 16)) for each in made], seconds)

    return Work(lambda: renewed(usable_cores()), lambda: renewed(1), stale, lambda: shutil.rmtree(place))


def _revision(place: Path) -> Path:
    """Write the next revision of the cooldown's calibration: its first coefficient moved by a ten-thousandth."""
    sheet = (place / COOLDOWN / "cooldown.toml").read_text(encoding="utf-8")
    (block,) = re.findall(r'^\[\[record\.calibration\]\]\nname = "RX-2-cal"\n(?:.+\n)+', sheet, re.MULTILINE)
    moved = re.sub(
        r"coefficients = \[([^,]+)", lambda found: f"coefficients = [{float(found[1]) * 1.0001!r}", block
    )
    path = place / "revision.toml"
    path.write_text(_REVISION + moved.replace("revision = 1", "revision = 2"), encoding="utf-8")
    return path


FILM = Benchmark(
    name="film-plan",
    description="a film's plan on a sweep of 5,000 points: all steps, uncertainties, lineage, sealed and in the index",
    subject="Archive.reduce",
    baseline="the same calls of the steps' functions alone, shifted inputs too",
    unit="calls",
    prepare=_film,
)

RENEWAL = Benchmark(
    name="re-reduction",
    description="films of 320 points reduced anew after a recalibration, with what they rest on; equal digests",
    subject="Archive.reduce_stale, a process for each core",
    baseline="the same, one process",
    unit="reductions",
    prepare=_renewal,
)

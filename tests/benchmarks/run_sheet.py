"""The run sheet of a long cooldown as PDF against its typesetting alone, from the text that was made before."""

from __future__ import annotations

import shutil
import tempfile
from pathlib import Path
from typing import Any
from unittest.mock import patch

import numpy as np
import typst

from archive import Archive
from archive.reports import run_sheet_pdf
from tests.benchmarks.film_cooldown import COOLDOWN, MOMENT, film_archive
from tests.benchmarks.harness import Benchmark, Size, Work

__all__ = ["BENCHMARK"]

_DEMO_SWEEPS = 12
"""Sweeps that the cooldown has without those added."""


def _prepare(size: Size) -> Work:
    place = Path(tempfile.mkdtemp(prefix="stillroom-sheet-"))
    more = {"small": 3, "default": 60 - _DEMO_SWEEPS, "full": 300 - _DEMO_SWEEPS}[size]
    root = film_archive(place, rows=80, more=more)
    with Archive.open(root, clock=MOMENT) as lab:
        for plan in ("empty-cell", "dose-run"):
            lab.reduce(COOLDOWN, plan=plan)
        given: list[tuple[Any, Any]] = []
        with patch.object(typst, "compile", lambda *words, **named: given.append((words, named)) or b""):
            run_sheet_pdf(lab.cooldown(COOLDOWN))
        count = len(lab.sweeps(COOLDOWN))
    ((words, named),) = given

    def subject() -> np.ndarray:
        with Archive.open(root, clock=MOMENT) as lab:
            return np.frombuffer(run_sheet_pdf(lab.cooldown(COOLDOWN)), dtype=np.uint8)

    def baseline() -> np.ndarray:
        return np.frombuffer(typst.compile(*words, **named), dtype=np.uint8)

    return Work(subject, baseline, count, lambda: shutil.rmtree(place))


BENCHMARK = Benchmark(
    name="run-sheet",
    description="the run sheet of a cooldown of 60 sweeps (in full: 300) as PDF, the archive opened and read for it",
    subject="Archive.cooldown and its run sheet",
    baseline="typst.compile alone, on the same text",
    unit="sweeps",
    prepare=_prepare,
)

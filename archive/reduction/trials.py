"""Trials carried out, here or in several processes; what they find does not depend on where."""

from __future__ import annotations

import multiprocessing
import pickle
from collections.abc import Callable, Iterator
from concurrent.futures import ProcessPoolExecutor
from contextlib import contextmanager
from functools import partial

import numpy as np

from archive.errors import BadRequest
from archive.reduction.drawing import Drawing, Trial, trial
from archive.reduction.estimate import FloatArray

__all__ = ["Failed", "Progress", "Run", "carried_out", "running"]

Progress = Callable[[int, int], None]
"""Called with trials done and trials in all."""

Run = Callable[[range], Iterator[Trial]]
"""Carries out trials by their numbers, in order."""

_drawing_here: list[Drawing] = []


def _receive(packed: bytes) -> None:
    """Take the drawing once in each worker."""
    _drawing_here[:] = [pickle.loads(packed)]  # noqa: S301 - from the parent process


def _there(index: int) -> Trial:
    return trial(_drawing_here[0], index)


@contextmanager
def running(drawing: Drawing, workers: int) -> Iterator[Run]:
    """Give what carries out trials, in order, here or in several processes."""
    if workers == 1:
        yield lambda indices: map(partial(trial, drawing), indices)
        return
    try:
        packed = pickle.dumps(drawing)
    except (pickle.PicklingError, AttributeError, TypeError) as error:
        raise BadRequest(
            f"a step of this plan cannot be sent to another process: {error}", remedy="use one process"
        ) from None
    # A fresh process each: a copy of one that already has threads may hang.
    context = multiprocessing.get_context("spawn")
    with ProcessPoolExecutor(workers, mp_context=context, initializer=_receive, initargs=(packed,)) as pool:
        yield lambda indices: pool.map(
            _there, indices, chunksize=max(1, min(100, len(indices) // (4 * workers)))
        )


Failed = list[tuple[str, str]]
"""Label of the step that failed first, and what it said, for each trial that failed."""


def carried_out(run: Run, count: int, progress: Progress, *, begin: int = 0) -> tuple[FloatArray, Failed]:
    """Return the results of some trials, one row each, and the failures."""
    rows, failed = [], []
    often = max(1, count // 200)
    for k, each in enumerate(run(range(begin, begin + count)), 1):
        rows.append(each.values)
        if each.failed is not None:
            failed.append((each.failed, each.reason))
        if k % often == 0 or k == count:
            progress(begin + k, begin + count)
    return np.array(rows), failed

"""Who computes: this process, several of this machine, or the workers of a cluster.

Rules: workers only read and compute; what they find comes back in the order in which it was asked for, so that whoever
seals and records does it in one order, whatever the number of workers; only so much is handed out as keeps them busy.
"""

from __future__ import annotations

import multiprocessing
import signal
import sys
import threading
import uuid
from collections import deque
from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool
from contextlib import contextmanager
from dataclasses import dataclass
from functools import partial
from itertools import islice
from multiprocessing.context import BaseContext
from pathlib import Path
from typing import Any, Protocol, TypeVar

from archive.errors import ArchiveError, BadRequest
from archive.index import Index
from archive.intake.settings import read_settings
from archive.lab.cluster import at_cluster
from archive.lab.effective import EffectiveSource
from archive.lab.revisions import Revisions
from archive.lab.source import LabSource
from archive.store.local import open_store

__all__ = ["Crew", "Hands"]

_Task = TypeVar("_Task")
_Result = TypeVar("_Result")

_AHEAD = 4
"""Tasks handed out for each worker: while one result is sealed, nobody waits."""


class Hands(Protocol):
    """What carries out work on an archive.

    Attributes
    ----------
    here : bool
        Whether this process does it, each task when its result is asked for.
    """

    @property
    def here(self) -> bool: ...  # noqa: D102 - an attribute

    def each(
        self, work: Callable[[EffectiveSource, _Task], _Result], tasks: Iterable[_Task]
    ) -> Iterator[_Result]:
        """Yield the result for each task, in the order of the tasks."""
        ...


@dataclass(frozen=True)
class Crew:
    """How many compute, and where the archive is that they read.

    Attributes
    ----------
    root : Path
        Folder of the archive.
    jobs : int
        Processes; 1 is this one.
    executor : str, optional
        Address of a cluster whose workers compute instead; see `archive.lab.cluster`.
    """

    root: Path
    jobs: int = 1
    executor: str | None = None

    @contextmanager
    def at_work(self, reading: EffectiveSource) -> Iterator[Hands]:
        """Give the hands; they read the archive as `reading` does, with the same revisions.

        Raises
        ------
        BadRequest
            If there are no jobs, or several besides a cluster, or no cluster.
        """
        if self.executor is not None and self.jobs != 1:
            raise BadRequest(
                "jobs and an executor exclude each other", remedy="a cluster has as many as its workers"
            )
        if self.jobs < 1:
            raise BadRequest("nothing can be done by no process", found=str(self.jobs), expected="at least 1")
        if self.jobs == 1 and self.executor is None:
            yield _Here(reading)
            return
        order = _Order(uuid.uuid4().hex, self.root, reading.revisions)
        if self.executor is not None:
            with at_cluster(self.executor) as (submit, threads, lost):
                # With each task (revisions that are tried out, and little else), since a worker may come late or come again.
                yield _There(submit, partial(_by_order, order), threads * _AHEAD, lost)
            return
        with _processes(self.jobs, order) as pool:
            yield _There(pool.submit, _in_process, self.jobs * _AHEAD, (BrokenProcessPool,))


@dataclass(frozen=True)
class _Here:
    """Work carried out in this process, each task when its turn comes."""

    reading: EffectiveSource
    here: bool = True

    def each(
        self, work: Callable[[EffectiveSource, _Task], _Result], tasks: Iterable[_Task]
    ) -> Iterator[_Result]:
        return (work(self.reading, task) for task in tasks)


@dataclass(frozen=True)
class _There:
    """Work handed to others."""

    submit: Callable[..., Any]
    entrance: Callable[..., Any]
    ahead: int
    lost: tuple[type[BaseException], ...]
    here: bool = False

    def each(
        self, work: Callable[[EffectiveSource, _Task], _Result], tasks: Iterable[_Task]
    ) -> Iterator[_Result]:
        left = iter(tasks)
        return self._results(
            work, deque(self.submit(self.entrance, work, task) for task in islice(left, self.ahead)), left
        )

    def _results(
        self, work: Callable[..., _Result], waiting: deque[Any], left: Iterator[Any]
    ) -> Iterator[_Result]:
        while waiting:
            try:
                result: _Result = waiting.popleft().result()
            except self.lost:
                raise ArchiveError(
                    "a process that computed ended by itself, perhaps for want of memory",
                    remedy="what was sealed is sealed; do it again, with fewer --jobs or other workers",
                ) from None
            waiting.extend(self.submit(self.entrance, work, task) for task in islice(left, 1))
            yield result


@contextmanager
def _processes(count: int, order: _Order) -> Iterator[ProcessPoolExecutor]:
    context = _context()
    others = {each.pid for each in multiprocessing.active_children()}
    pool = ProcessPoolExecutor(count, mp_context=context, initializer=_begin, initargs=(order,))
    try:
        yield pool
    except BaseException:
        # Nobody waits for what nobody will seal: a reduction with trials may take an hour.
        for each in multiprocessing.active_children():
            if each.pid not in others:
                each.terminate()
        raise
    finally:
        pool.shutdown(cancel_futures=True)


def _context() -> BaseContext:
    """Return how processes begin: never as a copy of this one, whose threads they would not have and might wait for."""
    if sys.platform != "linux":
        return multiprocessing.get_context("spawn")
    # One process loads the program, which takes over a second, and all workers begin as copies of that one.
    context = multiprocessing.get_context("forkserver")
    context.set_forkserver_preload([__name__])
    return context


@dataclass(frozen=True)
class _Order:
    """What a worker has to know before its first task."""

    token: str
    root: Path
    revisions: Revisions


_order_here: list[_Order] = []
_opened: dict[str, tuple[Index, EffectiveSource]] = {}
_one_at_a_time = threading.Lock()


def _begin(order: _Order) -> None:
    """Take the order once in each process, and end without words when the person stops the command."""
    signal.signal(signal.SIGINT, signal.SIG_DFL)
    _order_here[:] = [order]


def _in_process(work: Callable[[EffectiveSource, _Task], _Result], task: _Task) -> _Result:
    return _by_order(_order_here[0], work, task)


def _by_order(order: _Order, work: Callable[[EffectiveSource, _Task], _Result], task: _Task) -> _Result:
    """Carry out a task on the archive that an order names, which stays open until another order comes."""
    # Libraries of fits and HDF5 are not asked to serve two threads.
    with _one_at_a_time:
        if order.token not in _opened:
            for index, _ in _opened.values():
                index.close()
            _opened.clear()
            index = Index.open(read_settings(order.root).index_address(order.root), read_only=True)
            source = LabSource(open_store(order.root), index)
            _opened[order.token] = (index, EffectiveSource(source, revisions=order.revisions))
        return work(_opened[order.token][1], task)

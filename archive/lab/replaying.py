"""Every reduction of an archive computed again, one after the other, with what cannot be computed told and passed over."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from datetime import datetime

from archive.errors import ArchiveError
from archive.lab.outcomes import ReplayReport
from archive.lab.reducing import replay
from archive.lab.source import LabSource

__all__ = ["replay_all"]


def replay_all(
    source: LabSource,
    *,
    clock: Callable[[], datetime],
    progress: Callable[[int, int, str], None] | None = None,
) -> Iterator[tuple[str, ReplayReport | ArchiveError]]:
    """Yield each reduction's address with its replay, or with what kept it from being computed again.

    Parameters
    ----------
    source : LabSource
    clock : callable
    progress : callable, optional
        Called with number, count and address before each.
    """
    rows = source.index.reductions()
    for number, row in enumerate(rows):
        if progress is not None:
            progress(number, len(rows), row.address)
        try:
            yield row.address, replay(source, row.address, clock=clock)
        except ArchiveError as problem:
            yield row.address, problem
    if progress is not None:
        progress(len(rows), len(rows), "")

"""Every reduction of an archive computed again, in the order of the index, with what cannot be computed told and passed over."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from datetime import datetime
from functools import partial

from archive.errors import ArchiveError, Stopped
from archive.lab.crew import Crew
from archive.lab.effective import EffectiveSource
from archive.lab.outcomes import ReplayReport
from archive.lab.reducing import replay
from archive.lab.source import LabSource

__all__ = ["replay_all"]


def replay_all(
    source: LabSource,
    *,
    clock: Callable[[], datetime],
    crew: Crew,
    progress: Callable[[int, int, str], None] | None = None,
) -> Iterator[tuple[str, ReplayReport | ArchiveError]]:
    """Yield each reduction's address with its replay, or with what kept it from being computed again.

    Parameters
    ----------
    source : LabSource
    clock : callable
    crew : Crew
        Who computes.
    progress : callable, optional
        Called with number, count and address before each.
    """
    addresses = [row.address for row in source.index.reductions()]
    number = 0
    try:
        with crew.at_work(EffectiveSource(source)) as hands:
            outcomes = hands.each(partial(_again, clock), addresses)
            for number, address in enumerate(addresses):
                if progress is not None:
                    progress(number, len(addresses), address)
                yield address, next(outcomes)
    except KeyboardInterrupt:
        raise Stopped(f"{number} of {len(addresses)} reductions were computed again") from None
    if progress is not None:
        progress(len(addresses), len(addresses), "")


def _again(
    clock: Callable[[], datetime], reading: EffectiveSource, address: str
) -> ReplayReport | ArchiveError:
    try:
        return replay(reading.lab, address, clock=clock)
    except ArchiveError as problem:
        return problem

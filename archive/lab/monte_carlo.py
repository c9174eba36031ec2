"""Monte Carlo runs beside a reduction: when one is needed, carrying it out, and doing a recorded one again.

The archive's lock is not held while trials run: they may take an hour, and they write nothing.
"""

from __future__ import annotations

from collections.abc import Callable
from datetime import datetime

from archive.reduction.monte_carlo import Request, monte_carlo
from archive.reduction.runner import ReductionOutcome
from schemas.lineage import ReductionDocument
from schemas.monte_carlo import MonteCarlo

__all__ = ["answers", "repeated", "with_monte_carlo"]


def answers(document: ReductionDocument, request: Request | None) -> bool:
    """Whether a reduction already has the Monte Carlo run that is asked for, or none is asked for."""
    if request is None:
        return True
    held = document.monte_carlo
    if held is None or (held.seed, held.digits) != (request.seed, request.digits):
        return False
    return held.adaptive if request.trials is None else not held.adaptive and held.trials == request.trials


def with_monte_carlo(
    made: ReductionOutcome,
    request: Request | None,
    *,
    clock: Callable[[], datetime],
    progress: Callable[[str], None],
) -> ReductionDocument:
    """Document of a reduction with the Monte Carlo run that is asked for."""
    if request is None:
        return made.document
    address = made.document.address

    def told(done: int, of: int) -> None:
        progress(f"{address}: trial {done} of {of}" + (" and more" if request.trials is None else ""))

    found = monte_carlo(made, request, progress=told)
    return made.document.model_copy(update={"monte_carlo": found, "end": clock()})


def repeated(made: ReductionOutcome, held: MonteCarlo) -> MonteCarlo:
    """A recorded Monte Carlo run done again on a reduction done again: same trials, same seed."""
    again = monte_carlo(made, Request(trials=held.trials, seed=held.seed, digits=held.digits))
    # How the number of trials was found is no part of what they say.
    return again.model_copy(update={"adaptive": held.adaptive})

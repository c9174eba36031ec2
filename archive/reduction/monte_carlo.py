"""A reduction repeated many times with drawn inputs, and first-order propagation held against it.

References
----------
JCGM 101:2008, Supplement 1 to the "Guide to the expression of uncertainty in measurement": propagation of distributions
using a Monte Carlo method; 7 (the method, 7.9 the adaptive one), 8 (comparison with first order). Clauses from memory.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass

import numpy as np

from archive.errors import BadRequest
from archive.physics.coverage_interval import (
    comparison,
    numerical_tolerance,
    shortest_interval,
    symmetric_interval,
)
from archive.reduction.drawing import Drawing, DrawnInput, DrawnStep
from archive.reduction.estimate import FloatArray
from archive.reduction.own_scatter import own_parts
from archive.reduction.repeatable import Repeated
from archive.reduction.runner import ReductionOutcome
from archive.reduction.trials import Failed, Progress, Run, carried_out, running
from schemas.lineage import OutputEntry
from schemas.monte_carlo import MonteCarlo, MonteCarloResult

__all__ = ["Request", "monte_carlo"]

PROBABILITY = 0.95
BLOCK = 10_000
"""Trials of one sequence of the adaptive procedure: JCGM 101:2008, 7.9.4."""
REPETITIONS = (200, 1000)
"""Least and most repetitions with noise alone: their variance is known to 10 and to 4.5 per cent (common practice, no source)."""
MOST = 1_000_000
"""Trials after which the adaptive procedure gives up, and that may be asked for: their results fit in memory (common practice, no
source)."""
GENERATOR = "numpy PCG64, trial k from SeedSequence(seed, spawn_key=(k,))"


@dataclass(frozen=True)
class Request:
    """What is asked for.

    Attributes
    ----------
    trials : int or None
        Number of trials, at least 2; None: as many as the adaptive procedure finds necessary.
    seed : int
    digits : int
        Significant digits of the uncertainty to which first order is held, 1 or 2.
    workers : int
        Processes; the numbers do not depend on it.
    """

    trials: int | None
    seed: int = 1
    digits: int = 1
    workers: int = 1

    def __post_init__(self) -> None:
        """Refuse what cannot be done."""
        for name, value, low, high in (
            ("trials", 2 if self.trials is None else self.trials, 2, MOST), ("seed", self.seed, 0, 2**63 - 1),
            ("digits", self.digits, 1, 2), ("workers", self.workers, 1, 1024),
        ):  # fmt: skip
            if not low <= value <= high:
                raise BadRequest(
                    f"a Monte Carlo run cannot have this number of {name}"
                    if name != "seed"
                    else "this is no seed",
                    found=str(value),
                    expected=f"{low} to {high}",
                )


def _nobody(_: int, __: int) -> None:
    """Tell nobody."""


def monte_carlo(outcome: ReductionOutcome, request: Request, *, progress: Progress = _nobody) -> MonteCarlo:
    """Return what repeating a reduction with drawn inputs finds of its scalar results.

    Parameters
    ----------
    outcome : ReductionOutcome
        Just carried out: what is repeated are its own steps on its own inputs.
    request : Request
    progress : callable

    Raises
    ------
    BadRequest
        The reduction has no scalar result, or several processes are asked for and a step cannot be sent
        to them.

    Notes
    -----
    A result that no draw moves is exact and left out; one without a first-order uncertainty has no verdict.

    Sources are drawn from the distribution that their records state, normal where none is stated. Choices that steps hold
    are not made again. What a step states of its own, apart from the noise of its rows, is drawn as it is stated: to first
    order inside the step. Drawn noise comes on top of the noise that the data have already, so results that measure scatter
    itself (chi-squared, an Allan deviation, a largest departure) come out larger than they are.
    """
    entries = [
        each
        for each in outcome.document.outputs
        if each.rows is None and each.verdict is None and each.value is not None
    ]
    if not entries:
        raise BadRequest(
            f"{outcome.document.address} has no result that is one number, to draw again",
            remedy="leave out the Monte Carlo run",
        )
    first = BLOCK if request.trials is None else request.trials
    drawing, beyond = _drawing(
        outcome.repeated, outcome.document.address, entries, seed=request.seed, repetitions=min(max(first // 10, REPETITIONS[0]), REPETITIONS[1])
    )  # fmt: skip
    with running(drawing, request.workers) as run:
        values, failed = (
            carried_out(run, first, progress)
            if request.trials
            else _adaptive(run, entries, request.digits, progress)
        )
    told = [_result(entry, values[:, k], request.digits) for k, entry in enumerate(entries)]
    counts = Counter(label for label, _ in failed)
    reasons = dict(reversed(failed))
    return MonteCarlo(
        trials=values.shape[0], seed=request.seed, generator=GENERATOR, adaptive=request.trials is None, probability=PROBABILITY,
        digits=request.digits, failed=len(failed), failures=dict(sorted(counts.items())), reasons=dict(sorted(reasons.items())),
        beyond_noise=beyond, results=tuple(found for found in told if found.uncertainty != 0),
    )  # fmt: skip


def _drawing(
    repeated: Repeated, address: str, entries: list[OutputEntry], *, seed: int, repetitions: int
) -> tuple[Drawing, dict[str, float]]:
    """Return what a trial needs, and the steps that state more than their noise."""
    # Trials have spawn keys of one number, so no trial shares random numbers with this.
    rng = np.random.Generator(np.random.PCG64(np.random.SeedSequence(seed, spawn_key=(0, 0))))
    steps, beyond = [], {}
    same = {key for key, each in repeated.inputs.items() if not each.shared and not np.any(each.points > 0)}
    with np.errstate(all="ignore"):
        scatter = own_parts(repeated, rng=rng, count=repetitions)
    for each, own in zip(repeated.evaluations, scatter, strict=True):
        known = each.outcome if same.issuperset(each.takes.values()) else None
        if known is not None and not own.axes and not own.points:
            same |= {key for output, key in each.gives.items() if not known.shared.get(output)}
        steps.append(
            DrawnStep(
                label=each.label, call=each.call, takes=each.takes, gives=each.gives, held=dict(each.outcome.held),
                renamed=each.renamed, own=own, known=known,
                stated={
                    output: {name: np.asarray(part, dtype=np.float64) for name, part in parts.items()}
                    for output, parts in each.outcome.shared.items()
                },
            )
        )  # fmt: skip
        if own.share:
            beyond[each.label] = own.share
    inputs = tuple(
        DrawnInput(key, each.value, each.points if np.any(each.points > 0) else None, dict(each.shared))
        for key, each in repeated.inputs.items()
    )
    names = {name for each in inputs for name in each.shared}
    for each in repeated.evaluations:
        names |= {each.renamed.get(name, name) for parts in each.outcome.shared.values() for name in parts}
    sources = tuple(
        (name, name in repeated.sources and repeated.sources[name].distribution == "rectangular")
        for name in sorted(names)
    )
    return Drawing(
        seed, inputs, tuple(steps), sources, tuple(f"{address}#{each.name}" for each in entries)
    ), beyond


def _adaptive(
    run: Run, entries: list[OutputEntry], digits: int, progress: Progress
) -> tuple[FloatArray, Failed]:
    """Return as many trials as the averages over sequences need to be known to the tolerance.

    References
    ----------
    JCGM 101:2008, 7.9.4: sequences of M = max(J, 10^4) trials, J at least 100/(1 - p), until twice the standard deviation of the
    average is below the tolerance for estimate, standard uncertainty and both ends of the interval.
    """
    rows: list[FloatArray] = []
    failed: Failed = []
    told: list[list[tuple[float, ...]]] = []
    while len(rows) * BLOCK < MOST:
        values, more = carried_out(run, BLOCK, progress, begin=len(rows) * BLOCK)
        rows.append(values)
        failed += more
        told.append([_sequence(values[:, k]) for k in range(len(entries))])
        if len(rows) > 1:
            spread = np.std(np.array(told), axis=0, ddof=1) / np.sqrt(len(rows))
            # Without a first order there is nothing to hold it to, and a result that is lost in most trials can never be
            # known; neither keeps the others waiting.
            allowed = [
                numerical_tolerance(entry.uncertainty, digits=digits) if entry.uncertainty else np.inf
                for entry in entries
            ]
            if all(
                np.isnan(s).any() or 2 * float(s.max()) < delta
                for s, delta in zip(spread, allowed, strict=True)
            ):
                break
    return np.concatenate(rows), failed


def _sequence(values: FloatArray) -> tuple[float, ...]:
    finite = np.sort(values[np.isfinite(values)])
    if finite.size < BLOCK // 10:
        return (np.nan,) * 4
    return (
        float(np.mean(finite)),
        float(np.std(finite, ddof=1)),
        *symmetric_interval(finite, probability=PROBABILITY),
    )


def _result(entry: OutputEntry, values: FloatArray, digits: int) -> MonteCarloResult:
    finite = np.sort(values[np.isfinite(values)])
    if finite.size < 2:
        return MonteCarloResult(name=entry.name, values=int(finite.size))
    mean, spread = float(np.mean(finite)), float(np.std(finite, ddof=1))
    try:
        symmetric = symmetric_interval(finite, probability=PROBABILITY)
        shortest = shortest_interval(finite, probability=PROBABILITY)
    except ValueError:
        return MonteCarloResult(name=entry.name, values=int(finite.size), mean=mean, uncertainty=spread)
    drawn = MonteCarloResult(
        name=entry.name, values=int(finite.size), mean=mean, uncertainty=spread, symmetric=symmetric, shortest=shortest
    )  # fmt: skip
    if not entry.uncertainty or entry.value is None:
        return drawn
    held = comparison(
        finite, symmetric, value=entry.value, standard_uncertainty=entry.uncertainty, digits=digits, probability=PROBABILITY
    )  # fmt: skip
    return MonteCarloResult(
        name=entry.name, values=int(finite.size), mean=mean, uncertainty=spread, symmetric=symmetric, shortest=shortest,
        first_order=(held.low, held.high), tolerance=held.tolerance, difference=held.difference,
        numerical_uncertainty=held.numerical_uncertainty if np.isfinite(held.numerical_uncertainty) else None,
        agreement=held.agreement,
    )  # fmt: skip

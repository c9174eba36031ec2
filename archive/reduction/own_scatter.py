"""What a step states as its own uncertainty beyond what the noise of its inputs makes.

In a trial the noise is drawn and a fit is done again, so its covariance must not be drawn a second time. But many steps state
more: the scatter of rows whose noise is not stated, or is larger than stated, the reproducibility of a run, half a step of a
grid. So the reduction is first repeated with the stated noise of its rows alone, each step seeing everything else unmoved; the
share of a step's own variance that this does not explain is drawn besides. A share within twice its statistical uncertainty of
nothing counts as nothing.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from archive.reduction.estimate import FloatArray
from archive.reduction.propagation import fit_contributions
from archive.reduction.repeatable import Evaluation, Repeated
from archive.reduction.step import Outcome

__all__ = ["OwnParts", "own_parts"]

LEAST = 20
"""Repetitions that must give a number before anything is concluded from their scatter (common practice, no source)."""

Moves = dict[str, list[float]]
"""Deviation of each output, and of each source that a step calls its own, in every repetition."""


@dataclass(frozen=True)
class OwnParts:
    """What is drawn of a step's own uncertainty.

    Attributes
    ----------
    axes : tuple of dict
        Independent contributions to outputs (``name`` or ``name[3]``), each times one normal number.
    points : dict of str to ndarray
        Standard uncertainty of outputs, each element times a normal number of its own.
    sources : dict of str to float
        Factor on the contributions of each source that the step calls its own.
    share : float
        Largest share of a stated variance that is drawn although the noise is drawn, too; 0 if none.
    """

    axes: tuple[dict[str, float], ...] = ()
    points: dict[str, FloatArray] = field(default_factory=dict)
    sources: dict[str, float] = field(default_factory=dict)
    share: float = 0.0


def own_parts(repeated: Repeated, *, rng: np.random.Generator, count: int) -> list[OwnParts]:
    """Return what is to be drawn of the own uncertainty of each step.

    Parameters
    ----------
    repeated : Repeated
    rng : numpy.random.Generator
    count : int
        Repetitions with noise alone.
    """
    noisy = _noisy(repeated)
    asked = [
        each.call.step.spread == "refit"
        and not noisy.isdisjoint(each.takes.values())
        and bool(each.outcome.covariance or each.renamed or _stated(each.outcome, arrays=False))
        for each in repeated.evaluations
    ]
    moves: list[Moves] = [{} for _ in asked]
    for _ in range(count if any(asked) else 0):
        _repeat(repeated, noisy, asked, moves, rng)
    found = []
    for each, ask, moved in zip(repeated.evaluations, asked, moves, strict=True):
        if ask:
            found.append(_remaining(each, moved))
        elif each.call.step.spread == "refit" and not noisy.isdisjoint(each.takes.values()):
            found.append(OwnParts())
        else:
            axes = (
                () if each.outcome.covariance is None else tuple(fit_contributions(each.outcome.covariance))
            )
            found.append(OwnParts(axes, _stated(each.outcome, arrays=True), dict.fromkeys(each.renamed, 1.0)))
    return found


def _fitted(outcome: Outcome) -> set[str]:
    """Return the outputs that a covariance describes, whole columns too."""
    return (
        set() if outcome.covariance is None else {name.partition("[")[0] for name in outcome.covariance.names}
    )


def _noisy(repeated: Repeated) -> set[str]:
    """Return the columns that noise of rows reaches without passing through a fit."""
    found = {key for key, each in repeated.inputs.items() if not each.scalar and np.any(each.points > 0)}
    for each in repeated.evaluations:
        if not found.isdisjoint(each.takes.values()):
            fitted = _fitted(each.outcome)
            found |= {
                key
                for output, key in each.gives.items()
                if output not in fitted and each.outcome.array(output).ndim
            }
    return found


def _repeat(
    repeated: Repeated, noisy: set[str], asked: list[bool], moves: list[Moves], rng: np.random.Generator
) -> None:
    """Carry out the steps once with drawn noise, and note by how much it moves what they fit."""
    columns = {
        key: repeated.inputs[key].value
        + repeated.inputs[key].points * rng.standard_normal(repeated.inputs[key].value.shape)
        for key in repeated.inputs
        if key in noisy
    }
    for each, ask, moved in zip(repeated.evaluations, asked, moves, strict=True):
        gives_noisy = not noisy.isdisjoint(each.gives.values())
        if not ask and not gives_noisy:
            continue
        values = {port: columns.get(key, each.estimates[port].value) for port, key in each.takes.items()}
        try:
            outcome = each.call(values, each.outcome.held)
        except (ValueError, ArithmeticError):
            continue
        common = {name: _projected(each.outcome, outcome, name) for name in each.renamed}
        if ask:
            for name, (_, size) in common.items():
                moved.setdefault(name, []).append(size)
            for name in _targets(each.outcome):
                moved.setdefault(name, []).append(_element(outcome, name) - _element(each.outcome, name))
        for output, key in each.gives.items():
            if key in noisy:
                # What moves all rows together is the step's own source, and no noise of the rows.
                columns[key] = outcome.array(output) - sum(
                    (size * np.asarray(each.outcome.shared[output][name]) for name, (_, size) in common.items() if name in each.outcome.shared.get(output, {})),
                    start=np.zeros(()),
                )  # fmt: skip


def _element(outcome: Outcome, name: str) -> float:
    output, _, index = name.partition("[")
    found: Any = outcome.array(output)
    return float(found[int(index.rstrip("]"))] if index else found)


def _targets(outcome: Outcome) -> list[str]:
    """Return the scalars and fitted elements whose uncertainty a step states."""
    names = [] if outcome.covariance is None else list(outcome.covariance.names)
    names = [name for name in names if "[" in name or outcome.array(name).ndim == 0]
    return [*names, *(name for name in _stated(outcome, arrays=False) if name not in names)]


def _projected(centre: Outcome, moved: Outcome, source: str) -> tuple[str, float]:
    """Return an output that an own source moves, a scalar if there is one, and by how many uncertainties it has moved."""
    parts = {name: np.asarray(each[source]) for name, each in centre.shared.items() if source in each}
    for name, part in sorted(parts.items(), key=lambda item: (item[1].ndim, item[0])):
        size = float(np.sum(np.square(part)))
        if size > 0:
            return name, float(np.nansum(part * (moved.array(name) - centre.array(name)))) / size
    return "", 0.0


def _remaining(evaluation: Evaluation, moves: Moves) -> OwnParts:
    outcome = evaluation.outcome
    points = _stated(outcome, arrays=False)
    variance = {name: float(part) ** 2 for name, part in points.items()}
    fitted = 0.0
    axes: tuple[dict[str, float], ...] = ()
    if outcome.covariance is not None:
        own = dict(zip(outcome.covariance.names, np.diag(outcome.covariance.matrix), strict=True))
        fitted = _unexplained(moves, {name: float(each) for name, each in own.items() if each > 0})
        if fitted:
            axes = tuple(
                {name: part * math.sqrt(fitted) for name, part in axis.items()}
                for axis in fit_contributions(outcome.covariance)
            )
        variance |= {name: variance.get(name, 0.0) + float(each) for name, each in own.items()}
    shares = {name: _unexplained(moves, {name: float(part) ** 2}) for name, part in points.items()}
    factors = {}
    for name in evaluation.renamed:
        at, _ = _projected(outcome, outcome, name)
        part = np.asarray(outcome.shared.get(at, {}).get(name, 0.0))
        explained = variance.get(at, 0.0) / float(part) ** 2 if part.ndim == 0 and part else 0.0
        factors[name] = _unexplained(moves, {name: 1.0}, explained=explained)
    return OwnParts(
        axes,
        {name: part * math.sqrt(shares[name]) for name, part in points.items() if shares[name]},
        {name: math.sqrt(share) for name, share in factors.items()},
        max((fitted, *shares.values(), *factors.values())),
    )


def _unexplained(moves: Moves, stated: dict[str, float], *, explained: float = 0.0) -> float:
    """Return the share of stated variances, on the average, that the noise does not explain."""
    ratios, size = [], math.inf
    for name, variance in stated.items():
        found = np.array(moves.get(name, []))
        found = found[np.isfinite(found)]
        if found.size >= LEAST:
            ratios.append(float(np.var(found, ddof=1)) / variance)
            size = min(size, found.size)
    ratio = max(float(np.mean(ratios)) - explained, 0.0) if ratios else 1.0
    # The variance of n normal numbers is known to a relative standard uncertainty of sqrt(2/(n - 1)): JCGM 100:2008, E.4.3.
    return 1 - ratio if ratio < 1 - 2 * math.sqrt(2 / size) else 0.0


def _stated(outcome: Outcome, *, arrays: bool) -> dict[str, FloatArray]:
    """Return the point uncertainties that a step states for its outputs, where there are any."""
    found = {}
    for name, part in outcome.point.items():
        value = outcome.array(name)
        if value.ndim and not arrays:
            continue
        spread = np.broadcast_to(np.asarray(part, dtype=np.float64), value.shape)
        if np.any(spread > 0):
            found[name] = np.array(spread)
    return found

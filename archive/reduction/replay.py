"""Doing a recorded reduction again, from the inputs it names, and saying how far the numbers are apart."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from datetime import datetime

import numpy as np

from archive.errors import BadRequest
from archive.reduction.estimate import Estimate, FloatArray
from archive.reduction.runner import ReductionOutcome, run
from archive.reduction.source import Source
from schemas.address import parse_address
from schemas.lineage import OutputEntry, ReductionDocument

__all__ = ["OutputDifference", "Replay", "replay"]


@dataclass(frozen=True)
class OutputDifference:
    """How one output differs.

    Attributes
    ----------
    name : str
    equal : bool
        Bit for bit.
    relative : float
        Largest difference over the largest value of the output; NaN where one of both is missing.
    in_uncertainties : float or None
        Shift of a result in units of its standard uncertainty.
    """

    name: str
    equal: bool
    relative: float
    in_uncertainties: float | None = None


@dataclass(frozen=True)
class Replay:
    """Outcome of a replay.

    Attributes
    ----------
    outcome : ReductionOutcome
        What came out this time.
    differences : tuple of OutputDifference
        One for each output, in the recorded order; outputs found on one side only are not equal.
    changed_inputs : tuple of str
        Inputs whose digest is not the recorded one.
    changed_software : dict
        Name to (recorded, now), where versions differ.
    """

    outcome: ReductionOutcome
    differences: tuple[OutputDifference, ...]
    changed_inputs: tuple[str, ...]
    changed_software: dict[str, tuple[str, str]]

    @property
    def equal(self) -> bool:
        """Whether every output is equal bit for bit."""
        return all(each.equal for each in self.differences)


def replay(document: ReductionDocument, source: Source, *, clock: Callable[[], datetime]) -> Replay:
    """Return a recorded reduction done again.

    Parameters
    ----------
    document : ReductionDocument
    source : Source
        Must still hold the inputs.
    clock : callable
        Times are no part of the comparison.

    Notes
    -----
    The plan is the recorded one, and the needs are the recorded reductions even if newer ones exist. On the platform that
    made it the arrays are bit-identical; elsewhere the differences say how far off it is.
    """
    outcome = run(
        document.plan, document.sweep, source, number=document.number, clock=clock, supersedes=document.supersedes,
        needs=recorded_needs(document, source),
    )  # fmt: skip
    fresh = {entry.name: entry for entry in outcome.document.outputs}
    recorded = {entry.name: entry for entry in document.outputs}

    def before(name: str) -> Estimate:
        return source.output(document.address, name)

    names = [*recorded, *(name for name in fresh if name not in recorded)]
    differences = tuple(
        _difference(name, recorded.get(name), fresh.get(name), before, outcome) for name in names
    )
    # One address may have been taken in several roles: an accession read, and the gas book of its sheet.
    digests = {(entry.address, entry.role): entry.digest for entry in outcome.document.inputs}
    changed = tuple(
        dict.fromkeys(
            entry.address
            for entry in document.inputs
            if digests.get((entry.address, entry.role)) != entry.digest
        )
    )
    return Replay(outcome, differences, changed, _software(document, outcome.document))


def recorded_needs(document: ReductionDocument, source: Source) -> dict[str, str | list[str]]:
    """Return which reduction served which need, and which ones a need of many, from the recorded inputs."""
    found: dict[str, str | list[str]] = {}
    used = dict.fromkeys(
        address
        for entry in document.inputs
        if (address := parse_address(entry.address).reduction) is not None
    )
    for address in used:
        plan = source.reduction(address).plan.name
        for name, need in document.plan.needs.items():
            if need.plan == plan:
                found[name] = [*found.get(name, []), address] if need.many else address
    missing = [name for name, need in document.plan.needs.items() if name not in found and not need.optional]
    if missing:
        raise BadRequest(
            f"{document.address} does not say which reduction served as {', '.join(missing)}",
            remedy="reduce the sweep anew instead",
        )
    return found


def _difference(
    name: str,
    old: OutputEntry | None,
    new: OutputEntry | None,
    before: Callable[[str], Estimate],
    outcome: ReductionOutcome,
) -> OutputDifference:
    if old is None or new is None:
        return OutputDifference(name, equal=False, relative=math.nan)
    if old.rows is None or new.rows is None:
        return _scalar_difference(name, old, new)
    recorded = before(name)
    path = f"arrays/{name}"
    pairs = [
        (recorded.value, outcome.arrays[path][0]),
        (recorded.uncertainty, outcome.arrays[f"{path}.uncertainty"][0]),
    ]
    if any(a.shape != b.shape for a, b in pairs):
        return OutputDifference(name, equal=False, relative=math.nan)
    equal = old.digest == new.digest and all(_same_bits(a, b) for a, b in pairs)
    return OutputDifference(name, equal, max(_relative(a, b) for a, b in pairs))


def _scalar_difference(name: str, old: OutputEntry, new: OutputEntry) -> OutputDifference:
    # The contributions too: one that changed its sign leaves the uncertainty, and spoils what is made from two results.
    equal = (
        (old.digest, old.uncertainty, old.verdict) == (new.digest, new.uncertainty, new.verdict)
        and old.point == new.point
        and old.shared == new.shared
    )
    if old.value is None or new.value is None:
        return OutputDifference(name, equal, 0.0 if equal else math.nan)
    shift = new.value - old.value
    relative = abs(shift) / max(abs(old.value), abs(new.value), 5e-324)
    sigmas = shift / old.uncertainty if old.uncertainty else None
    return OutputDifference(name, equal, relative, sigmas)


def _same_bits(a: FloatArray, b: FloatArray) -> bool:
    return np.ascontiguousarray(a).tobytes() == np.ascontiguousarray(b).tobytes()


def _relative(a: FloatArray, b: FloatArray) -> float:
    if bool((np.isnan(a) != np.isnan(b)).any()):
        return math.nan
    size = float(np.nanmax(np.abs(a), initial=0.0))
    return float(np.nanmax(np.abs(a - b), initial=0.0)) / size if size else 0.0


def _software(old: ReductionDocument, new: ReductionDocument) -> dict[str, tuple[str, str]]:
    def flat(document: ReductionDocument) -> dict[str, str]:
        wrote = document.software
        return {
            "stillroom": wrote.stillroom,
            "python": wrote.python,
            "platform": wrote.platform,
            **wrote.packages,
        }

    before, now = flat(old), flat(new)
    return {
        name: (before.get(name, "none"), now.get(name, "none"))
        for name in {**before, **now}
        if before.get(name) != now.get(name)
    }

"""Whether a newer reduction gave to the bit what an older one had given."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from archive.errors import ArchiveError
from archive.lab.source import LabSource
from archive.reduction.estimate import Estimate
from schemas.address import parse_address
from schemas.lineage import InputEntry

__all__ = ["repeats", "same_inputs"]


def repeats(source: LabSource, old: str, now: str, output: str) -> bool:
    """Whether an output of two reductions is the same to the bit, uncertainties and what they share too.

    Parameters
    ----------
    source : LabSource
    old, now : str
        Addresses of the reductions.
    output : str
        Its name.
    """
    try:
        one, other = (source.output(each, output) for each in (old, now))
    except ArchiveError:
        return False
    # Parameters of a fit are sources of uncertainty under the name of the reduction that fitted them.
    named = {name.replace(f"{old} ", f"{now} "): part for name, part in one.shared.items()}
    return _equal(replace(one, shared=named), other)


def _equal(one: Estimate, other: Estimate) -> bool:
    if (one.quantity, one.scale, one.shared.keys()) != (other.quantity, other.scale, other.shared.keys()):
        return False
    pairs = [(one.value, other.value), (one.points, other.points)]
    pairs += [(one.shared[name], other.shared[name]) for name in one.shared]
    return all(np.array_equal(left, right, equal_nan=True) for left, right in pairs)


def same_inputs(source: LabSource, old: tuple[InputEntry, ...], new: tuple[InputEntry, ...]) -> bool:
    """Whether two reductions took the same; a newer number of what one rests on is the same if it repeats what was taken.

    Parameters
    ----------
    source : LabSource
    old, new : tuple of InputEntry
    """
    if [each.digest for each in old] != [each.digest for each in new]:
        return False
    pairs = [(one.address, other.address) for one, other in zip(old, new, strict=True)]
    changed = [pair for pair in pairs if pair[0] != pair[1]]
    if not changed:
        return True
    withdrawn = {row.target for row in source.index.withdrawals()}
    for one, other in changed:
        before, after = parse_address(one), parse_address(other)
        taken = (before.sweep, before.plan, before.part) == (after.sweep, after.plan, after.part)
        if not taken or before.reduction is None or after.reduction is None or before.part is None:
            return False
        # What rests on something withdrawn is to be made anew, though the numbers are the same.
        if before.reduction in withdrawn or not repeats(
            source, before.reduction, after.reduction, before.part
        ):
            return False
    return True

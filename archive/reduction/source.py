"""What a reduction needs to know of the archive: one small protocol.

The laboratory's door implements it over store and index; tests implement it in memory.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, Protocol

import numpy.typing as npt

from archive.reduction.estimate import Estimate
from schemas.lineage import AccessionDocument, AnyRecord, InputEntry, ReductionDocument

__all__ = ["ArrayReader", "Source"]


class ArrayReader(Protocol):
    """Reads one array of a reduction by its path, e.g. ``arrays/temperature``."""

    def __call__(self, path: str) -> npt.NDArray[Any]:
        """Return the array."""
        ...


class Source(Protocol):
    """Where a reduction reads from. Everything unknown raises UnknownAddress."""

    def cooldowns(self) -> list[str]:
        """Return the names of all cooldowns, oldest first."""
        ...

    def accessions(self, cooldown: str) -> list[AccessionDocument]:
        """Return the accessions of a cooldown, oldest first; withdrawn ones are left out."""
        ...

    def column(self, accession_address: str, sweep_name: str, channel: str) -> npt.NDArray[Any]:
        """Return a channel as stored, in the unit of the file."""
        ...

    def record(self, address: str) -> AnyRecord:
        """Return a record by address with revision, e.g. ``TO-4.r2``."""
        ...

    def reductions(self, plan: str, sweep_address: str) -> list[ReductionDocument]:
        """Return the reductions of a plan (any revision) on a sweep, oldest first; withdrawn ones are left out."""
        ...

    def output(self, reduction_address: str, name: str) -> Estimate:
        """Return an output of a reduction; see `archive.reduction.outputs.estimate_from`."""
        ...

    def reduction(self, address: str) -> ReductionDocument:
        """Return one reduction's document."""
        ...

    def grounds(self, sweep_address: str) -> Mapping[str, InputEntry]:
        """Return what a sweep is reduced by that its sheet does not say, by address.

        These are the accession read, the amendments that bear on the sweep, and the records taken in the place of those
        that the sheet names, each with the reason.
        """
        ...

    def digest(self, address: str) -> str:
        """Return the SHA-256 of what an address stands for: a record's JSON, or a sealed file."""
        ...


Needs = Mapping[str, str]
"""Which reduction serves which need, by the plan's own name for it."""

"""Looking things up in a view: records as typed objects, sweeps with their sheet, current reductions and their results."""

from __future__ import annotations

import json
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property
from typing import Any, TypeVar

import numpy as np
from numpy.typing import NDArray
from pydantic import TypeAdapter

from archive.errors import ArchiveError
from archive.reports.view import CooldownView
from schemas.base import NamedRecord
from schemas.cell import Cell, Cryostat
from schemas.cooldown import CooldownSheet
from schemas.lineage import OutputEntry, RecordEntry, ReductionDocument, SweepEntry
from schemas.substrate import Sample, Substrate
from schemas.sweep import Sweep
from schemas.thermometer import Calibration, Thermometer

__all__ = ["Holdings", "Taken"]

_T = TypeVar("_T", bound=NamedRecord)

_READERS: dict[str, TypeAdapter[Any]] = {
    "cell": TypeAdapter(Cell),
    "cryostat": TypeAdapter(Cryostat),
    "substrate": TypeAdapter(Substrate),
    "sample": TypeAdapter(Sample),
    "thermometer": TypeAdapter(Thermometer),
    "calibration": TypeAdapter(Calibration),
}


@dataclass(frozen=True)
class Taken:
    """One sweep: what the sheet says, what was stored, and the accession that holds it."""

    number: int
    sheet: Sweep
    entry: SweepEntry | None
    accession: str


class Holdings:
    """What a view holds, by address.

    Parameters
    ----------
    view : CooldownView
    """

    def __init__(self, view: CooldownView) -> None:
        self.view = view

    @property
    def sheet(self) -> CooldownSheet:
        """The sheet that counts."""
        return self.view.newest.sheet

    @cached_property
    def entries(self) -> dict[str, RecordEntry]:
        """Every record by address; the newest accession's content counts."""
        return {entry.address: entry for accession in self.view.accessions for entry in accession.records}

    @cached_property
    def records(self) -> dict[str, NamedRecord]:
        """Every record by address, typed."""
        return {
            address: _READERS[entry.kind].validate_json(json.dumps(entry.content))
            for address, entry in self.entries.items()
        }

    def named(self, reference: str | None) -> NamedRecord | None:
        """Return the record of a reference; the newest revision where none is named."""
        if reference is None:
            return None
        found = [each for each in self.records.values() if reference in (each.address, each.name)]
        return max(found, key=lambda each: each.revision, default=None)

    def of_type(self, kind: type[_T]) -> list[_T]:
        """Return all records of one class, by address."""
        return [each for _, each in sorted(self.records.items()) if isinstance(each, kind)]

    @cached_property
    def sweeps(self) -> tuple[Taken, ...]:
        """Every sweep of the sheet that counts, in its order, then those that only older sheets have; none is left out."""
        stored: dict[str, tuple[SweepEntry, str]] = {}
        described: dict[str, tuple[Sweep, str]] = {
            each.name: (each, self.view.newest.address) for each in self.sheet.sweep
        }
        for accession in self.view.accessions:
            for entry in accession.sweeps:
                stored[entry.name] = (entry, accession.address)
            for sweep in accession.sheet.sweep:
                described.setdefault(sweep.name, (sweep, accession.address))
        return tuple(
            Taken(number, sweep, *stored.get(name, (None, address)))
            for number, (name, (sweep, address)) in enumerate(described.items(), 1)
        )

    def reductions_of(self, sweep: str) -> list[ReductionDocument]:
        """Return the current reductions of a sweep, those that rest on others first."""
        address = f"{self.view.newest.cooldown}/{sweep}"
        found = [each for each in self.view.current if each.sweep == address]
        return sorted(found, key=lambda each: (-len(each.plan.needs), each.plan.name))

    def headline(self, reduction: ReductionDocument) -> Iterator[OutputEntry]:
        """Yield the results that a plan shows first; all its scalars where it names none."""
        outputs = {each.name: each for each in reduction.outputs if each.rows is None}
        names = reduction.plan.headline or tuple(outputs)
        yield from (outputs[name] for name in names if name in outputs)

    def result(self, sweep: str, quantity: str) -> OutputEntry | None:
        """Return the first scalar of a quantity kind among the current reductions of a sweep."""
        for reduction in self.reductions_of(sweep):
            for each in reduction.outputs:
                if each.rows is None and each.quantity == quantity and each.value is not None:
                    return each
        return None

    def column(self, address: str, name: str) -> NDArray[np.float64] | None:
        """Return the values of a channel or output; None where the archive holds none."""
        try:
            return np.asarray(self.view.values(address, name), dtype=np.float64)
        except ArchiveError:
            return None

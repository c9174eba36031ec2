"""Columns that can be drawn: the channels of a sweep, the arrays of a reduction, the number of the row.

A column knows what its numbers mean and where they lie; nothing is read before it is drawn.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from archive.errors import UnknownAddress
from archive.lab.effective import EffectiveSource
from archive.lab.source import LabSource, key_of
from archive.reduction.channels import stated_convention, stated_uncertainty
from archive.reduction.facts import SweepFacts, sweep_facts
from schemas.lineage import ChannelEntry, ReductionDocument

__all__ = ["ROW", "DrawnColumn", "columns_of_reduction", "columns_of_sweep", "facts_of"]

FloatArray = NDArray[np.float64]

ROW = "row"
"""Name of the column that only counts."""


@dataclass(frozen=True)
class DrawnColumn:
    """One column.

    Attributes
    ----------
    owner : str
        Address of its sweep or reduction.
    name, kind, unit, description : str
        `kind` is ``instant`` for POSIX seconds.
    rows : int
    digest : str
        SHA-256 of the values.
    scale, convention : str or None
        Temperature scale; ``rms``, ``peak``, ``gauge``, ... where that is stated.
    thermometer : bool
        Whether it is the reading of a thermometer.
    low, high : float or None
        Smallest and largest value, where they are recorded.
    missing : int or None
        Rows without a value, where that is recorded.
    why_not : str
        Why nothing is reduced with it, where that is so.
    source : str
        Instrument, or step of a plan.
    """

    owner: str
    name: str
    kind: str
    unit: str
    description: str
    rows: int
    digest: str
    scale: str | None = None
    convention: str | None = None
    thermometer: bool = False
    low: float | None = None
    high: float | None = None
    missing: int | None = None
    why_not: str = ""
    source: str = ""
    _read: Callable[[int, int], FloatArray] = field(
        repr=False, compare=False, default=lambda a, b: np.empty(b - a)
    )
    _spread: Callable[[int, int, FloatArray], FloatArray | None] = field(
        repr=False, compare=False, default=lambda _a, _b, _values: None
    )

    @property
    def address(self) -> str:
        """What to cite."""
        return self.owner if self.counts else f"{self.owner}#{self.name}"

    @property
    def counts(self) -> bool:
        """Whether it is no column of the archive but the number of the row."""
        return not self.digest

    @property
    def words(self) -> str:
        """The name for people, such as `superfluid density`."""
        return self.description if self.counts else self.name.replace("_", " ")

    def read(self, start: int, stop: int) -> FloatArray:
        """Values of the rows from `start` to before `stop`, as stored."""
        return self._read(start, stop)

    def spread(self, start: int, stop: int, values: FloatArray) -> FloatArray | None:
        """Standard uncertainties of values that were read there, in the same unit; None where none is known."""
        return self._spread(start, stop, values)


def facts_of(source: LabSource, sweep: str) -> SweepFacts:
    """A sweep as it is to be read: amended, and shown even if it is withdrawn.

    Raises
    ------
    UnknownAddress
        If there is no such sweep.
    """
    return sweep_facts(EffectiveSource(source, withdrawn_too=True), sweep)


def columns_of_sweep(source: LabSource, facts: SweepFacts) -> dict[str, DrawnColumn]:
    """Channels of a sweep, then the number of the row.

    Parameters
    ----------
    source : LabSource
    facts : SweepFacts
    """
    columns = {each.name: _channel(source, facts, each) for each in facts.entry.channels}
    columns.setdefault(ROW, _counted(facts.address, ROW, facts.entry.rows))
    return columns


def _channel(source: LabSource, facts: SweepFacts, entry: ChannelEntry) -> DrawnColumn:
    key, path = key_of(facts.accession.address), f"sweeps/{facts.entry.name}/{entry.name}"
    written = facts.channels.get(entry.name)

    def read(start: int, stop: int) -> FloatArray:
        return np.asarray(source.store.column(key, path, start, stop), dtype=np.float64)

    def spread(_start: int, _stop: int, values: FloatArray) -> FloatArray | None:
        known = written is not None and written.uncertainty is not None
        return stated_uncertainty(facts, entry.name, values) if known else None

    return DrawnColumn(
        owner=facts.address,
        name=entry.name,
        kind=entry.quantity,
        unit=entry.unit,
        description=entry.description,
        rows=facts.entry.rows,
        digest=entry.digest,
        scale=entry.scale,
        convention=None if written is None else stated_convention(facts, written),
        thermometer=entry.thermometer is not None or entry.calibration is not None,
        low=entry.low,
        high=entry.high,
        missing=entry.missing,
        why_not="" if entry.use else (written and written.why_not) or "the sheet says not to use it",
        source=(written and written.instrument) or "",
        _read=read,
        _spread=spread,
    )


def _counted(owner: str, name: str, rows: int) -> DrawnColumn:
    return DrawnColumn(
        owner, name, "number", "1", "number of the row", rows, digest="",
        low=1.0 if rows else None, high=float(rows) if rows else None, missing=0,
        _read=lambda start, stop: np.arange(start + 1, stop + 1, dtype=np.float64),
    )  # fmt: skip


def columns_of_reduction(source: LabSource, document: ReductionDocument) -> dict[str, DrawnColumn]:
    """Arrays of a reduction, by name, then the number of the row, once for each length that they have.

    Parameters
    ----------
    source : LabSource
    document : ReductionDocument
    """
    columns = {
        each.name: _array(source, document, each.name) for each in document.outputs if each.rows is not None
    }
    lengths = Counter(each.rows for each in columns.values() if each.rows > 1)
    for place, (rows, _) in enumerate(lengths.most_common()):
        name = f"{ROW}-{rows}" if place else ROW
        columns.setdefault(name, _counted(document.address, name, rows))
    return columns


def _array(source: LabSource, document: ReductionDocument, name: str) -> DrawnColumn:
    entry = next(each for each in document.outputs if each.name == name)
    key = key_of(document.address)

    def read(start: int, stop: int) -> FloatArray:
        return np.asarray(source.store.column(key, f"arrays/{name}", start, stop), dtype=np.float64)

    def spread(start: int, stop: int, _values: FloatArray) -> FloatArray | None:
        try:
            found = source.store.column(key, f"arrays/{name}.uncertainty", start, stop)
        except UnknownAddress:
            return None
        return np.asarray(found, dtype=np.float64)

    return DrawnColumn(
        owner=document.address,
        name=name,
        kind=entry.quantity,
        unit=entry.unit,
        description=entry.description,
        rows=entry.rows or 0,
        digest=entry.digest,
        scale=entry.scale,
        source=f"step {entry.step}, {document.steps[entry.step - 1].name}",
        _read=read,
        _spread=spread,
    )

"""Records as the entries that documents carry."""

from __future__ import annotations

from archive.reduction.digest import record_digest
from schemas.cell import Cryostat
from schemas.lineage import AnyRecord, RecordEntry, RecordKind
from schemas.substrate import Sample, Substrate
from schemas.thermometer import Calibration, Thermometer

__all__ = ["record_entry", "record_kind"]


def record_kind(record: AnyRecord) -> RecordKind:
    """Kind of a record, as the index names it."""
    kinds: tuple[tuple[type, RecordKind], ...] = (
        (Cryostat, "cryostat"),
        (Substrate, "substrate"),
        (Sample, "sample"),
        (Thermometer, "thermometer"),
        (Calibration, "calibration"),
    )
    return next((kind for each, kind in kinds if isinstance(record, each)), "cell")


def record_entry(record: AnyRecord) -> RecordEntry:
    """Entry of a record with its digest and content."""
    return RecordEntry(
        kind=record_kind(record),
        address=record.address,
        digest=record_digest(record),
        content=record.model_dump(mode="json"),
    )

"""The relational index of the sealed files: recorded, rebuilt, searched. Knows no HDF5."""

from archive.index.answers import (
    AccessionRow,
    CooldownRow,
    DoseRow,
    FindingRow,
    RawFileRow,
    RecordRow,
    ReductionRow,
    ResultCondition,
    ResultRow,
    SearchQuery,
    SweepResult,
    SweepRow,
)
from archive.index.index import Entry, Index

__all__ = [
    "AccessionRow",
    "CooldownRow",
    "DoseRow",
    "Entry",
    "FindingRow",
    "Index",
    "RawFileRow",
    "RecordRow",
    "ReductionRow",
    "ResultCondition",
    "ResultRow",
    "SearchQuery",
    "SweepResult",
    "SweepRow",
]

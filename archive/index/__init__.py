"""The relational index of the sealed files: recorded, rebuilt, searched. Knows no HDF5."""

from archive.index.act_answers import AmendmentRow, InputRow, RevisionRow, WithdrawalRow
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
from archive.index.index import Document, Entry, Index

__all__ = [
    "AccessionRow",
    "AmendmentRow",
    "CooldownRow",
    "Document",
    "DoseRow",
    "Entry",
    "FindingRow",
    "Index",
    "InputRow",
    "RawFileRow",
    "RecordRow",
    "ReductionRow",
    "ResultCondition",
    "ResultRow",
    "RevisionRow",
    "SearchQuery",
    "SweepResult",
    "SweepRow",
    "WithdrawalRow",
]

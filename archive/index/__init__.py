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
from archive.index.life_answers import LifeResult, Resting, Use
from archive.index.plane_answers import CellUse, PlaneResult, PlaneSweep, Span

__all__ = [
    "AccessionRow",
    "AmendmentRow",
    "CellUse",
    "CooldownRow",
    "Document",
    "DoseRow",
    "Entry",
    "FindingRow",
    "Index",
    "InputRow",
    "LifeResult",
    "PlaneResult",
    "PlaneSweep",
    "RawFileRow",
    "RecordRow",
    "ReductionRow",
    "Resting",
    "ResultCondition",
    "ResultRow",
    "RevisionRow",
    "SearchQuery",
    "Span",
    "SweepResult",
    "SweepRow",
    "Use",
    "WithdrawalRow",
]

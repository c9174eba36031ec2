"""What the index answers about revisions, amendments and withdrawals: plain frozen records."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime

__all__ = ["AmendmentRow", "InputRow", "RevisionRow", "WithdrawalRow"]


@dataclass(frozen=True)
class RevisionRow:
    """A revision of a record or plan that came in outside a cooldown; `counts` unless it is withdrawn."""

    address: str
    key: str
    kind: str
    name: str
    revision: int
    digest: str
    supersedes: str | None
    because: str
    by: str
    made: datetime
    counts: bool


@dataclass(frozen=True)
class AmendmentRow:
    """An amendment of a cooldown; `counts` unless it is withdrawn."""

    address: str
    key: str
    cooldown: str
    number: int
    because: str
    by: str
    made: datetime
    counts: bool


@dataclass(frozen=True)
class WithdrawalRow:
    """A withdrawal; `counts` unless it was itself withdrawn."""

    address: str
    key: str
    target: str
    cooldown: str | None
    number: int
    why: str
    by: str
    made: datetime
    counts: bool

    def sentence(self) -> str:
        """Why, by whom, when and where it is written."""
        return f"{self.why} ({self.by}, {self.made.date().isoformat()}, {self.address})"


@dataclass(frozen=True)
class InputRow:
    """Something that a current reduction took from outside itself."""

    reduction: str
    address: str
    role: str
    digest: str | None

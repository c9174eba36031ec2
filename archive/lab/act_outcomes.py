"""What the door answers about revisions, amendments and withdrawals."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

from archive.index.acts import ActDocument
from archive.lab.stale import Stale
from schemas.acts import Difference
from schemas.finding import Finding

__all__ = ["ActOutcome", "WithdrawOutcome"]


@dataclass(frozen=True)
class ActOutcome:
    """What a revision or an amendment did, or would do.

    Attributes
    ----------
    state : str
        `sealed`; `shown` when nothing was to be written; `refused` when a finding is an error, and then nothing was.
    address : str or None
        The revision or amendment.
    findings : tuple of Finding
    previous : str or None
        The revision before, that the differences refer to.
    differences : tuple of Difference
        Field by field.
    sweeps : tuple of str
        Sweeps that an amendment bears on.
    stale : tuple of Stale
        Reductions that it makes stale.
    document : RevisionDocument or AmendmentDocument, optional
    raised : dict of str to tuple of Finding
        What the checks, run again, found that they had not found before, by cooldown.
    """

    state: Literal["sealed", "shown", "refused"]
    address: str | None = None
    findings: tuple[Finding, ...] = ()
    previous: str | None = None
    differences: tuple[Difference, ...] = ()
    sweeps: tuple[str, ...] = ()
    stale: tuple[Stale, ...] = ()
    document: ActDocument | None = None
    raised: dict[str, tuple[Finding, ...]] = field(default_factory=dict)


@dataclass(frozen=True)
class WithdrawOutcome:
    """What a withdrawal marked.

    Attributes
    ----------
    address, target : str
        The withdrawal, and what it withdraws.
    resting : tuple of str
        Reductions that rest on it, however far down, and are flagged from now on.
    restored : str or None
        What counts again, where a withdrawal was withdrawn.
    """

    address: str
    target: str
    resting: tuple[str, ...] = ()
    restored: str | None = None

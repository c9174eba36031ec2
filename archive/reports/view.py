"""What the two reports may tell: everything that the archive holds of one cooldown, and nothing else."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from schemas.acts import AmendmentDocument, RevisionDocument
from schemas.lineage import AccessionDocument, ReductionDocument

__all__ = ["CooldownView"]


@dataclass(frozen=True)
class CooldownView:
    """Everything that reports may tell of one cooldown.

    Parameters
    ----------
    archive_name : str
        Name of the laboratory's archive.
    accessions : tuple of AccessionDocument
        Oldest first; the newest sheet counts. As they are to be read: amended, with the records that hold.
    sealed : mapping
        Key of a sealed file (``2026-03/2026-03.a1``, ``2026-03/s017@film-transition.2``): SHA-256 and size in bytes.
    reductions : tuple of ReductionDocument
        All, in any order; the highest number of each sweep and plan is current.
    values : callable
        Values of a channel (``"2026-03/s017", "period"``) or of an output (reduction address, output name or
        ``"<name>.uncertainty"``) in the unit stored; raises ArchiveError where there are none.
    check_titles : mapping
        Code of a check: what it tests, in one line.
    amendments : tuple of AmendmentDocument
        Those that count.
    revisions : tuple of RevisionDocument
        Of records: those with which the checks of the cooldown found something new.
    withdrawn : mapping
        Why each withdrawn thing of the cooldown, and each withdrawn record it uses, is withdrawn, by address.
    resting : mapping
        Reductions that rest on something withdrawn, and on what.
    """

    archive_name: str
    accessions: tuple[AccessionDocument, ...]
    sealed: Mapping[str, tuple[str, int]]
    reductions: tuple[ReductionDocument, ...]
    values: Callable[[str, str], NDArray[np.float64]]
    check_titles: Mapping[str, str]
    amendments: tuple[AmendmentDocument, ...] = ()
    revisions: tuple[RevisionDocument, ...] = ()
    withdrawn: Mapping[str, str] = field(default_factory=dict)
    resting: Mapping[str, tuple[str, ...]] = field(default_factory=dict)

    def __post_init__(self) -> None:
        """Refuse a view of nothing."""
        if not self.accessions:
            raise ValueError("accessions: expected at least one accession")

    @property
    def newest(self) -> AccessionDocument:
        """The accession whose sheet counts."""
        return self.accessions[-1]

    @property
    def current(self) -> tuple[ReductionDocument, ...]:
        """The highest number of each sweep and plan that is not withdrawn, in the order of the sheet's sweeps, then of plans."""
        best: dict[tuple[str, str], ReductionDocument] = {}
        for each in self.reductions:
            if each.address in self.withdrawn:
                continue
            key = (each.sweep, each.plan.name)
            if key not in best or best[key].number < each.number:
                best[key] = each
        order = {
            f"{self.newest.cooldown}/{sweep.name}": place
            for place, sweep in enumerate(self.newest.sheet.sweep)
        }
        return tuple(
            sorted(
                best.values(),
                key=lambda each: (order.get(each.sweep, len(order)), each.sweep, each.plan.name),
            )
        )

"""An archive as reductions and reports are to read it: amended, with the revisions that hold, without what is withdrawn."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from archive.errors import BadRequest
from archive.lab.revisions import Holding, Revisions
from archive.lab.source import LabSource
from archive.reduction.amending import amended_accession
from archive.reduction.estimate import Estimate
from archive.reduction.record_kinds import record_kind
from schemas.acts import AmendmentDocument, RevisionDocument
from schemas.address import parse_address
from schemas.lineage import AccessionDocument, AnyRecord, InputEntry, ReductionDocument, SweepEntry

__all__ = ["EffectiveSource"]


class EffectiveSource:
    """What `archive.reduction.source.Source` asks for, as it stands at one moment.

    Parameters
    ----------
    lab : LabSource
        The archive as sealed.
    newest : bool
        Whether records are taken in their newest revision; see `archive.lab.revisions`.
    recorded : ReductionDocument, optional
        A reduction whose own accession, amendments and revisions are to be read again, whatever came later.
    extra : AmendmentDocument or RevisionDocument, optional
        An act that does not count yet, to see what it would do; the record of a revision must be known to `lab`.
    passed_over : frozenset of str
        Addresses of amendments that are not to count, to see what that would do.
    withdrawn_too : bool
        Whether what is withdrawn is read, too, to be shown with its mark.
    revisions : Revisions, optional
        Those that hold, where another process has worked them out.
    """

    def __init__(
        self,
        lab: LabSource,
        *,
        newest: bool = False,
        recorded: ReductionDocument | None = None,
        extra: AmendmentDocument | RevisionDocument | None = None,
        passed_over: frozenset[str] = frozenset(),
        withdrawn_too: bool = False,
        revisions: Revisions | None = None,
    ) -> None:
        self.lab = lab
        self._withdrawn_too = withdrawn_too or recorded is not None
        self._passed_over = passed_over
        self._recorded = recorded
        self._extra = extra if isinstance(extra, AmendmentDocument) else None
        pinned = None
        if recorded is not None:
            pinned = {
                entry.address.partition(".r")[0]: Holding(entry.address, entry.because)
                for entry in recorded.inputs
                if entry.instead_of is not None
            }
        revision = extra if isinstance(extra, RevisionDocument) else None
        self.revisions = revisions or Revisions(lab, newest=newest, pinned=pinned, extra=revision)
        self._read: dict[str, list[AccessionDocument]] = {}

    @property
    def withdrawn(self) -> Mapping[str, str]:
        """Why each withdrawn thing is withdrawn, by its address."""
        return self.revisions.withdrawn

    def cooldowns(self) -> list[str]:
        """Return the names of the cooldowns that are not withdrawn, oldest first."""
        return [name for name in self.lab.cooldowns() if name not in self.withdrawn]

    def accessions(self, cooldown: str) -> list[AccessionDocument]:
        """Return the accessions of a cooldown as they are to be read, oldest first."""
        if cooldown not in self._read:
            amendments = self.amendments(cooldown)
            self._read[cooldown] = [
                amended_accession(
                    self._without_withdrawn(each),
                    amendments,
                    replace=lambda address: self.revisions.holding(cooldown, address).address,
                    find=self.lab.find_record,
                )
                for each in self._sealed(cooldown)
            ]
        return self._read[cooldown]

    def _sealed(self, cooldown: str) -> list[AccessionDocument]:
        documents = self.lab.accessions(cooldown)
        if self._recorded is not None:
            read = [parse_address(e.address) for e in self._recorded.inputs if e.role == "accession"]
            last = {each.head: each.number or 0 for each in read}.get(cooldown)
            return [each for each in documents if last is None or each.number <= last]
        if self._withdrawn_too:
            return documents
        if cooldown in self.withdrawn:
            return []
        return [each for each in documents if each.address not in self.withdrawn]

    def _without_withdrawn(self, document: AccessionDocument) -> AccessionDocument:
        gone = {each.name for each in document.sweeps if f"{document.cooldown}/{each.name}" in self.withdrawn}
        if not gone or self._withdrawn_too:
            return document
        kept = tuple(each for each in document.sweeps if each.name not in gone)
        return document.model_copy(update={"sweeps": kept})

    def amendments(self, cooldown: str) -> list[AmendmentDocument]:
        """Amendments of a cooldown that count, by number."""
        if self._recorded is not None:
            known = {each.address for each in self._recorded.inputs if each.role == "amendment"}
            every = self.lab.amendments(cooldown, withdrawn_too=True)
            return [each for each in every if each.address in known]
        extra = self._extra
        more = [extra] if extra is not None and extra.cooldown == cooldown else []
        counting = [each for each in self.lab.amendments(cooldown) if each.address not in self._passed_over]
        return sorted([*counting, *more], key=lambda each: each.number)

    def column(self, accession_address: str, sweep_name: str, channel: str) -> NDArray[Any]:
        """Return a channel as stored, in the unit of the file."""
        return self.lab.column(accession_address, sweep_name, channel)

    def record(self, address: str) -> AnyRecord:
        """Return a record by address.

        Raises
        ------
        BadRequest
            If it is withdrawn, and is not read again for a recorded reduction.
        """
        if address in self.withdrawn and not self._withdrawn_too:
            raise BadRequest(
                f"{address} is withdrawn: {self.withdrawn[address]}",
                remedy="say what holds instead: stillroom amend with [[use]] or [[calibration]], "
                f'or stillroom revise a revision with supersedes = "{address}"',
            )
        return self.lab.record(address)

    def find_record(self, reference: str) -> AnyRecord | None:
        """Return a record by address, or the newest revision of a name; None if there is none."""
        return self.lab.find_record(reference)

    def reductions(self, plan: str, sweep_address: str) -> list[ReductionDocument]:
        """Return the reductions of a plan on a sweep that are not withdrawn, oldest first."""
        if self.why_withdrawn(sweep_address) is not None:
            return []
        found = self.lab.reductions(plan, sweep_address)
        return [each for each in found if each.address not in self.withdrawn]

    def why_withdrawn(self, address: str) -> str | None:
        """Why a thing, or what it belongs to, is withdrawn; None if it is not."""
        parsed = parse_address(address)
        for each in (address, parsed.reduction, parsed.sweep, parsed.head):
            if each is not None and each in self.withdrawn:
                return self.withdrawn[each]
        return None

    def output(self, reduction_address: str, name: str) -> Estimate:
        """Return an output of a reduction with its uncertainty."""
        return self.lab.output(reduction_address, name)

    def reduction(self, address: str) -> ReductionDocument:
        """Return one reduction's document."""
        return self.lab.reduction(address)

    def digest(self, address: str) -> str:
        """Return the SHA-256 of a record's content, or of a sealed file."""
        return self.lab.digest(address)

    def values(self, address: str, name: str) -> NDArray[np.float64]:
        """Return a channel of a sweep or an array of a reduction, in the stored unit."""
        return self.lab.values(address, name)

    def holding(self, cooldown: str, sweep: str) -> AccessionDocument:
        """Return the newest accession that holds a sweep, as it is to be read."""
        for document in reversed(self.accessions(cooldown)):
            if any(entry.name == sweep for entry in document.sweeps):
                return document
        why = self.why_withdrawn(f"{cooldown}/{sweep}")
        if why is not None:
            raise BadRequest(f"{cooldown}/{sweep} is withdrawn: {why}")
        return self.lab.holding(cooldown, sweep)

    def grounds(self, sweep_address: str) -> Mapping[str, InputEntry]:
        """Return what a sweep is reduced by that its sheet does not say; see `archive.reduction.source`."""
        parsed = parse_address(sweep_address)
        document = self.holding(parsed.head, parsed.item or "")
        found = {each.address: each for each in self._replacements(document, parsed.item or "")}
        found[document.address] = InputEntry(
            address=document.address, role="accession", digest=self.lab.digest(document.address)
        )
        for amendment in self.amendments(parsed.head):
            if sweep_address in amendment.sweeps:
                found[amendment.address] = InputEntry(
                    address=amendment.address,
                    role="amendment",
                    digest=self.lab.digest(amendment.address),
                    because=amendment.because,
                )
        return found

    def _replacements(self, document: AccessionDocument, sweep: str) -> list[InputEntry]:
        sealed = next(each for each in self.lab.accession(document.address).sweeps if each.name == sweep)
        read = next(each for each in document.sweeps if each.name == sweep)
        return [
            InputEntry(
                address=new,
                role=record_kind(self.lab.record(new)),
                instead_of=old,
                because=self._why(document.cooldown, sweep, old, new),
            )
            for old, new in _pairs(sealed, read)
            if old is not None and new is not None and old != new
        ]

    def _why(self, cooldown: str, sweep: str, old: str, new: str) -> str:
        for named in (old, *self._named_by_amendments(cooldown, sweep)):
            holding = self.revisions.holding(cooldown, named)
            if holding.address == new and holding.because is not None:
                return holding.because
        address = f"{cooldown}/{sweep}"
        acts = [each for each in self.amendments(cooldown) if address in each.sweeps]
        return "; ".join(f"amendment {each.address}: {each.because}" for each in acts) or "as recorded"

    def _named_by_amendments(self, cooldown: str, sweep: str) -> list[str]:
        acts = [each for each in self.amendments(cooldown) if f"{cooldown}/{sweep}" in each.sweeps]
        uses = [said.use for each in acts for said in each.use]
        return [*uses, *(said.use for each in acts for said in each.calibration)]


def _pairs(sealed: SweepEntry, read: SweepEntry) -> list[tuple[str | None, str | None]]:
    """Records as the sheet names them, and as they hold."""
    pairs = [(getattr(sealed, kind), getattr(read, kind)) for kind in ("cell", "substrate", "sample")]
    channels = {each.name: each for each in read.channels}
    for each in sealed.channels:
        now = channels[each.name]
        pairs += [(each.thermometer, now.thermometer), (each.calibration, now.calibration)]
    return list(dict.fromkeys(pairs))

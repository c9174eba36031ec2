"""What reductions, traces and reports read: documents and arrays of one archive, by address.

Sealed files never change, so what was read once is kept.
"""

from __future__ import annotations

import json
from datetime import UTC, datetime
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pydantic import TypeAdapter, ValidationError

from archive.errors import DamagedFile, UnknownAddress
from archive.index import Document, Index, SearchQuery, SweepRow
from archive.reduction.digest import record_digest
from archive.reduction.estimate import Estimate
from archive.reduction.outputs import estimate_from
from archive.store.interface import Store
from schemas.acts import AmendmentDocument, RevisionDocument, WithdrawalDocument
from schemas.address import parse_address
from schemas.lineage import AccessionDocument, AnyRecord, InputEntry, ReductionDocument
from schemas.plan import Plan

__all__ = ["LabSource", "document_of", "key_of"]

_LONG_AGO = datetime.min.replace(tzinfo=UTC)
_RECORD: TypeAdapter[AnyRecord] = TypeAdapter(AnyRecord)


# No cooldown can have a name with a dot, so nothing of a cooldown ever lies in this folder.
_RECORDS = "lab.records"


def key_of(address: str) -> str:
    """Key of the sealed file that an address names.

    Examples
    --------
    >>> key_of("2026-03.a1"), key_of("2026-03/s017@film-transition.2"), key_of("2026-03.m1")
    ('2026-03/2026-03.a1', '2026-03/s017@film-transition.2', '2026-03/2026-03.m1')
    >>> key_of("RX-2-cal.r2"), key_of("RX-2-cal.r2.w1")
    ('lab.records/RX-2-cal.r2', 'lab.records/RX-2-cal.r2.w1')
    """
    parsed = parse_address(address)
    if parsed.kind == "record" or parsed.revision is not None:
        return f"{_RECORDS}/{address}"
    inside = parsed.kind in ("accession", "amendment", "withdrawal")
    return f"{parsed.head}/{address}" if inside else address


def _model_of(key: str) -> type[Document]:
    if "@" in key:
        return ReductionDocument
    try:
        kind = parse_address(key.rpartition("/")[2]).kind
    except ValueError:
        kind = "accession"
    return {
        "record": RevisionDocument,
        "amendment": AmendmentDocument,
        "withdrawal": WithdrawalDocument,
    }.get(kind, AccessionDocument)  # type: ignore[return-value]


def document_of(key: str, text: str) -> Document:
    """Document that a sealed file carries about itself.

    Raises
    ------
    DamagedFile
        If the text is not such a document.
    """
    model = _model_of(key)
    try:
        return model.model_validate_json(text)
    except ValidationError as error:
        first = error.errors(include_url=False)[0]
        place = ".".join(map(str, first["loc"]))
        raise DamagedFile(
            "the document inside this sealed file cannot be read",
            file=key,
            field=place,
            found=str(first["msg"]),
            remedy="run: stillroom fixity; if the file is whole, it was written by another version of Stillroom",
        ) from None


class LabSource:
    """Documents and arrays of one archive, as reductions ask for them."""

    def __init__(self, store: Store, index: Index) -> None:
        self.store = store
        self.index = index
        self._documents: dict[str, Document] = {}
        self._records: dict[str, AnyRecord] = {}

    def document(self, key: str) -> Document:
        """Document of a sealed file."""
        if key not in self._documents:
            self._documents[key] = document_of(key, self.store.document(key))
        return self._documents[key]

    def remember(self, key: str, document: Document) -> None:
        """Keep a document that was just sealed."""
        self._documents[key] = document

    def cooldowns(self) -> list[str]:
        """Names of all cooldowns, oldest first."""
        return [
            row.name
            for row in sorted(self.index.cooldowns(), key=lambda row: (row.begin or _LONG_AGO, row.name))
        ]

    def accessions(self, cooldown: str) -> list[AccessionDocument]:
        """Accessions of a cooldown, oldest first."""
        rows = sorted(self.index.accessions(cooldown), key=lambda row: row.number)
        documents = [self.document(row.key) for row in rows]
        return [document for document in documents if isinstance(document, AccessionDocument)]

    def accession(self, address: str) -> AccessionDocument:
        """One accession's document."""
        document = self.document(key_of(address))
        if not isinstance(document, AccessionDocument):
            raise UnknownAddress(f"{address} is no accession")
        return document

    def holding(self, cooldown: str, sweep: str) -> AccessionDocument:
        """Newest accession that holds a sweep."""
        for document in reversed(self.accessions(cooldown)):
            if any(entry.name == sweep for entry in document.sweeps):
                return document
        raise UnknownAddress(
            f"there is no sweep {cooldown}/{sweep} in this archive", remedy="list them with: stillroom search"
        )

    def newest_sweeps(self, cell: str, *, kind: str) -> list[SweepRow]:
        """Sweeps of one kind in a cell, the newest first."""
        return self.index.search(SearchQuery(cell=cell, kind=kind, descending=True))

    def column(self, accession_address: str, sweep_name: str, channel: str) -> NDArray[Any]:
        """Channel as stored, in the unit of the file."""
        return self.store.column(key_of(accession_address), f"sweeps/{sweep_name}/{channel}")

    def record(self, address: str) -> AnyRecord:
        """Record by address."""
        found = self.find_record(address)
        if found is None:
            raise UnknownAddress(f"there is no record {address} in this archive")
        return found

    def find_record(self, reference: str) -> AnyRecord | None:
        """Record by address, or the newest revision of a name that is not withdrawn; None if there is none."""
        if reference in self._records:
            return self._records[reference]
        name, _, revision = reference.partition(".r")
        rows = self.index.records(name=name)
        if revision:
            rows = [row for row in rows if row.revision == int(revision)]
        else:
            withdrawn = {row.target for row in self.index.withdrawals()}
            rows = [row for row in rows if row.address not in withdrawn]
        if not rows:
            return None
        newest = max(rows, key=lambda row: row.revision)
        found = _RECORD.validate_json(json.dumps(newest.content))
        self._records[found.address] = found
        return found

    def with_record(self, record: AnyRecord) -> LabSource:
        """The same archive, knowing a record that is not sealed yet by its address."""
        found = LabSource(self.store, self.index)
        found._documents = self._documents
        found._records = {**self._records, record.address: record}
        return found

    def revision(self, address: str) -> RevisionDocument | None:
        """Document of a revision that came in outside a cooldown; None if that is not how it came in."""
        known = {row.address: row.key for row in self.index.revisions(name=address.partition(".r")[0])}
        document = self.document(known[address]) if address in known else None
        return document if isinstance(document, RevisionDocument) else None

    def own_plans(self, *, withdrawn_too: bool = False) -> list[Plan]:
        """Plans that came in as revisions and are not withdrawn, by name and revision."""
        every = [row for row in self.index.revisions() if row.kind == "plan"]
        rows = [row for row in every if row.counts or withdrawn_too]
        documents = [self.document(row.key) for row in rows]
        return [
            Plan.model_validate_json(json.dumps(each.content))
            for each in documents
            if isinstance(each, RevisionDocument)
        ]

    def own_revisions(self) -> list[RevisionDocument]:
        """Revisions of records that came in outside a cooldown and are not withdrawn."""
        rows = [row for row in self.index.revisions() if row.kind != "plan" and row.counts]
        documents = [self.document(row.key) for row in rows]
        return [each for each in documents if isinstance(each, RevisionDocument)]

    def amendments(self, cooldown: str, *, withdrawn_too: bool = False) -> list[AmendmentDocument]:
        """Amendments of a cooldown that count, by number."""
        rows = [row for row in self.index.amendments(cooldown) if row.counts or withdrawn_too]
        documents = [self.document(row.key) for row in rows]
        return [each for each in documents if isinstance(each, AmendmentDocument)]

    def reductions(self, plan: str, sweep_address: str) -> list[ReductionDocument]:
        """Reductions of a plan on a sweep, oldest first."""
        rows = sorted(self.index.reductions(sweep=sweep_address, plan=plan), key=lambda row: row.number)
        return [self.reduction(row.address) for row in rows]

    def reduction(self, address: str) -> ReductionDocument:
        """One reduction's document."""
        if parse_address(address).kind != "reduction":
            raise UnknownAddress(
                f"{address} is no reduction", expected="an address such as 2026-03/s017@film-transition.2"
            )
        key = key_of(address)
        if not self.store.contains(key):
            raise UnknownAddress(f"there is no reduction {address} in this archive")
        document = self.document(key)
        if not isinstance(document, ReductionDocument):
            raise UnknownAddress(f"{address} is no reduction")
        return document

    def output(self, reduction_address: str, name: str) -> Estimate:
        """Output of a reduction with its uncertainty."""
        key = key_of(reduction_address)
        return estimate_from(
            self.reduction(reduction_address), lambda path: self.store.column(key, path), name
        )

    def grounds(self, sweep_address: str) -> dict[str, InputEntry]:
        """Nothing: as sealed, a sweep is what its sheet says. See `archive.lab.effective`."""
        return {}

    def digest(self, address: str) -> str:
        """SHA-256 of a record's content, or of a sealed file."""
        parsed = parse_address(address)
        if parsed.kind in ("record", "name"):
            return record_digest(self.record(address))
        files = self.index.sealed_files()
        key = key_of(parsed.reduction or address)
        if key not in files:
            raise UnknownAddress(f"there is nothing at {address} in this archive")
        return files[key][0]

    def values(self, address: str, name: str) -> NDArray[np.float64]:
        """Channel of a sweep or array of a reduction, in the stored unit."""
        parsed = parse_address(address)
        if parsed.kind == "reduction":
            return np.asarray(self.store.column(key_of(address), f"arrays/{name}"), dtype=np.float64)
        document = self.holding(parsed.head, parsed.item or "")
        return np.asarray(self.column(document.address, parsed.item or "", name), dtype=np.float64)

"""Rows of what was done after the fact: revisions, amendments, withdrawals."""

from __future__ import annotations

from typing import Any

from sqlalchemy import Connection

from archive.index import queries, tables
from archive.index.act_tables import (
    AmendedSweep,
    Amendment,
    AmendmentSweep,
    ReplacedRecord,
    Revision,
    Withdrawal,
)
from archive.index.rows import add_rows, seal_row, si_value
from schemas.acts import AmendmentDocument, RevisionDocument, WithdrawalDocument
from schemas.address import parse_address
from schemas.lineage import ReductionDocument, SweepEntry

__all__ = ["ActDocument", "add_act", "add_replaced_records"]

ActDocument = RevisionDocument | AmendmentDocument | WithdrawalDocument

_FOUND = {"cell", "substrate", "sample", "empty_cell", "after_dose", "direction"}


def add_act(connection: Connection, document: ActDocument, *, key: str, sha256: str, size: int) -> None:
    """Add the rows of an act; nothing when they are there already.

    Parameters
    ----------
    connection : Connection
        In a writing transaction.
    document : RevisionDocument, AmendmentDocument or WithdrawalDocument
        What the sealed file says about itself.
    key, sha256 : str
        Name and digest of the sealed file.
    size : int
        Its bytes.

    Raises
    ------
    DamagedFile
        If the index holds this file with another digest or size.

    Notes
    -----
    What an act is about need not be recorded: it may be damaged, or come later.
    """
    kind = document.format.removeprefix("stillroom-").partition("/")[0]
    if not seal_row(connection, document.address, kind, key=key, sha256=sha256, size=size):
        return
    held = {
        "address": document.address,
        "key": key,
        "by": document.by,
        "made": document.made,
        "stillroom": document.software.stillroom,
    }
    if isinstance(document, RevisionDocument):
        _add_revision(connection, document, held)
    elif isinstance(document, AmendmentDocument):
        _add_amendment(connection, document, held)
    else:
        said = {
            "target": document.target,
            "cooldown": document.cooldown,
            "number": document.number,
            "why": document.why,
        }
        add_rows(connection, Withdrawal, [{**held, **said}])
        _add_entries(connection, document)


def _add_revision(connection: Connection, document: RevisionDocument, held: dict[str, Any]) -> None:
    address = parse_address(document.address)
    said = {
        "kind": document.kind,
        "name": address.head,
        "revision": address.number,
        "digest": document.digest,
        "content": document.content,
        "supersedes": document.supersedes,
        "because": document.because,
    }
    add_rows(connection, Revision, [{**held, **said}])


def _add_amendment(connection: Connection, document: AmendmentDocument, held: dict[str, Any]) -> None:
    if connection.execute(queries.cooldown_newest(document.cooldown)).first() is None:
        add_rows(connection, tables.Cooldown, [{"name": document.cooldown}])
    said = {
        "cooldown": document.cooldown,
        "number": document.number,
        "because": document.because,
        "differences": [each.model_dump(mode="json", exclude_defaults=True) for each in document.differences],
    }
    add_rows(connection, Amendment, [{**held, **said}])
    borne = ({"amendment": document.address, "sweep": sweep} for sweep in document.sweeps)
    add_rows(connection, AmendmentSweep, borne)
    _add_entries(connection, document)


def _add_entries(connection: Connection, document: AmendmentDocument | WithdrawalDocument) -> None:
    if document.cooldown is not None and document.rests_on is not None:
        number = parse_address(document.rests_on).number
        held = {"act": document.address, "sequence": document.sequence, "number": number}
        add_rows(
            connection,
            AmendedSweep,
            ({**held, **_found(document.cooldown, entry)} for entry in document.entries),
        )


def _found(cooldown: str, entry: SweepEntry) -> dict[str, Any]:
    coverage, uncertainty = si_value(entry.coverage, "coverage")
    return {
        "sweep": f"{cooldown}/{entry.name}",
        "coverage_mol_per_m2": coverage,
        "coverage_uncertainty_mol_per_m2": uncertainty,
        "temperature_low_K": si_value(entry.temperature_low, "temperature")[0],
        "temperature_high_K": si_value(entry.temperature_high, "temperature")[0],
        **entry.model_dump(include=_FOUND),
    }


def add_replaced_records(connection: Connection, document: ReductionDocument) -> None:
    """Add which records a reduction took in place of those that the sheet names."""
    taken: dict[str, dict[str, Any]] = {
        entry.instead_of: {
            "reduction": document.address,
            "instead_of": entry.instead_of,
            "address": entry.address,
            "because": entry.because or "",
        }
        for entry in document.inputs
        if entry.instead_of is not None
    }
    add_rows(connection, ReplacedRecord, (taken[name] for name in sorted(taken)))

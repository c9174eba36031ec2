"""What records and plans of a package mean: each is what its entry says, and one name and revision means one thing."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping
from typing import Final

from pydantic import TypeAdapter, ValidationError

from archive.exchange.closure import address_of_key
from archive.exchange.contents import sealed_path
from archive.exchange.unpacking import fault
from archive.reduction.digest import record_digest
from schemas.acts import RevisionDocument
from schemas.base import Record
from schemas.finding import Finding
from schemas.lineage import AccessionDocument, AnyRecord, RecordEntry, ReductionDocument
from schemas.plan import Plan

__all__ = ["content_faults", "plan_faults", "record_faults"]

_RECORD: Final[TypeAdapter[AnyRecord]] = TypeAdapter(AnyRecord)


def record_faults(documents: Mapping[str, Record], known: Callable[[str], str | None]) -> list[Finding]:
    """Return records that mean one thing in the package and another in it, or in the archive, under one revision.

    Parameters
    ----------
    documents : mapping of str to Record
        Documents by key.
    known : callable
        Digest of a record of the archive by address; None if the archive has none.
    """
    found: list[Finding] = []
    seen: dict[str, tuple[str, str]] = {}
    for key, document in documents.items():
        for address, digest in _records(document):
            held = seen.setdefault(
                address, (known(address) or digest, "the archive" if known(address) else address_of_key(key))
            )
            if held[0] != digest:
                found.append(
                    fault(
                        "package-record",
                        f"this revision has another content in {held[1]}",
                        f"data/{sealed_path(key)}",
                        place=address,
                        expected=f"sha256 {held[0]}",
                        found=f"sha256 {digest}",
                        remedy="two laboratories, or two copies of one, have given one name to two things; they cannot be in one archive",
                    )
                )
    return found


def _records(document: Record) -> list[tuple[str, str]]:
    if isinstance(document, AccessionDocument):
        return [(each.address, each.digest) for each in document.records]
    kind, digest = getattr(document, "kind", None), getattr(document, "digest", None)
    if kind is not None and digest is not None and kind != "plan":
        return [(str(getattr(document, "address", "")), str(digest))]
    return []


def plan_faults(documents: Mapping[str, Record], known: Mapping[str, Plan]) -> list[Finding]:
    """Return plans that mean one thing in the package and another in it, or in the archive, under one name and revision.

    Parameters
    ----------
    documents : mapping of str to Record
        Documents by key.
    known : mapping of str to Plan
        Plans of the archive, and those that are shipped, by address.

    Notes
    -----
    Plans are compared by content: their digest may be another one under a version that knows more fields of a plan.
    """
    found: list[Finding] = []
    seen = {address: (plan, "the archive") for address, plan in known.items()}
    for key, document in documents.items():
        plan = _plan(document)
        if plan is None:
            continue
        held, where = seen.setdefault(plan.address, (plan, address_of_key(key)))
        if held != plan:
            differing = sorted(
                name for name in type(plan).model_fields if getattr(plan, name) != getattr(held, name)
            )
            found.append(
                fault(
                    "package-plan",
                    f"plan {plan.address} is another one in {where}",
                    f"data/{sealed_path(key)}",
                    place=plan.address,
                    expected="one content for one name and revision",
                    found=f"they differ in {', '.join(differing)}",
                    remedy="a plan never changes under its revision: find out which of both was published first; "
                    "the other gets another name or revision where it was made, and its reductions are made anew there",
                )
            )
    return found


def _plan(document: Record) -> Plan | None:
    if isinstance(document, ReductionDocument):
        return document.plan
    if isinstance(document, RevisionDocument) and document.kind == "plan":
        return Plan.model_validate_json(json.dumps(document.content))
    return None


def content_faults(documents: Mapping[str, Record]) -> list[Finding]:
    """Return records and plans in documents that are none, or not those of the digest beside them.

    Parameters
    ----------
    documents : mapping of str to Record
        Documents by key.
    """
    told = [
        (key, each)
        for key, document in documents.items()
        for each in (document.records if isinstance(document, AccessionDocument) else [document])
        if isinstance(each, RecordEntry | RevisionDocument)
    ]
    return [
        fault(
            "package-document", f"{each.kind} {each.address} is not what it should be",
            f"data/{sealed_path(key)}", place=each.address, found=why,
            remedy="it was written by another version of Stillroom, or by none; nothing is taken in",
        )
        for key, each in told
        if (why := _unread(each)) is not None
    ]  # fmt: skip


def _unread(entry: RecordEntry | RevisionDocument) -> str | None:
    """Why the content of an entry cannot be the record that it names."""
    text = json.dumps(entry.content)
    try:
        read = Plan.model_validate_json(text) if entry.kind == "plan" else _RECORD.validate_json(text)
    except ValidationError as error:
        first = error.errors(include_url=False)[0]
        return f"{'.'.join(map(str, first['loc']))}: {first['msg']}"
    if read.address != entry.address:
        return f"the content is that of {read.address}"
    return None if record_digest(read) == entry.digest else f"the content has sha256 {record_digest(read)}"

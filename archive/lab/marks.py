"""What was said of a thing after it was sealed: withdrawn, amended, superseded, resting on something withdrawn.

Every answer about one thing carries these marks, so that nobody reads a withdrawn number without being told.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import replace
from typing import Any

from archive.errors import ArchiveError
from archive.lab.source import LabSource
from archive.reduction.trace import TraceNode
from schemas.address import Address, parse_address
from schemas.lineage import ReductionDocument

__all__ = ["marked", "marks_of"]


def marks_of(source: LabSource, address: Address) -> dict[str, Any]:
    """Marks of what an address names; none where nothing was said.

    Parameters
    ----------
    source : LabSource
    address : Address
    """
    marks: dict[str, Any] = {}
    withdrawn = {row.target: row.sentence() for row in source.index.withdrawals()}
    if why := _why(address, withdrawn):
        marks["withdrawn"] = why
    if address.reduction is not None:
        marks |= _of_reduction(source, address.reduction)
    elif address.kind in ("item", "channel", "name"):
        said = dict(_amendments(source, address))
        if said:
            marks["amended"] = [f"{act}: {because}" for act, because in said.items()]
    elif address.kind == "record":
        marks |= _of_revision(source, address)
    return marks


def _why(address: Address, withdrawn: Mapping[str, str]) -> str | None:
    if not withdrawn:
        return None
    accession = address.text.partition(":")[0] if address.kind == "raw" else None
    inside = address.kind not in ("record", "withdrawal", "name")
    holders = [address.text, accession, address.reduction, address.sweep, address.head if inside else None]
    return next((withdrawn[each] for each in holders if each is not None and each in withdrawn), None)


def _of_reduction(source: LabSource, reduction: str) -> dict[str, Any]:
    marks: dict[str, Any] = {}
    resting = source.index.flagged().get(reduction, ())
    if resting:
        withdrawn = {row.target: row.sentence() for row in source.index.withdrawals()}
        marks["rests_on_withdrawn"] = [f"{each}: {withdrawn[each]}" for each in resting]
    parsed = parse_address(reduction)
    rows = source.index.reductions(sweep=parsed.sweep, plan=parsed.plan)
    newer = [row.address for row in rows if row.newest and row.number > (parsed.number or 0)]
    if newer:
        marks["superseded_by"] = newer[-1]
    return marks


def _amendments(source: LabSource, address: Address) -> Iterator[tuple[str, str]]:
    """Amendments that count and bear on a sweep, speak of a dose, or, for a cooldown, all of them."""
    for document in source.amendments(address.head):
        named = {change.address.partition("#")[0] for change in document.change}
        if address.item is None or address.sweep in document.sweeps or address.sweep in named:
            yield document.address, document.because


def _of_revision(source: LabSource, address: Address) -> dict[str, Any]:
    rows = source.index.revisions(name=address.head)
    marks: dict[str, Any] = {}
    for row in rows:
        if row.address == address.text:
            marks["revised"] = f"{row.because} ({row.by}, {row.made.date().isoformat()})"
            marks |= {"supersedes": row.supersedes} if row.supersedes else {}
        if row.supersedes == address.text and row.counts:
            marks["superseded_by"] = row.address
    return marks


def marked(source: LabSource, node: TraceNode) -> TraceNode:
    """Return a lineage tree in which every withdrawn thing says so, and amendments stand below what they bear on.

    Parameters
    ----------
    source : LabSource
    node : TraceNode
    """
    withdrawn = {row.target: row.sentence() for row in source.index.withdrawals()}
    said = node
    try:
        parsed = parse_address(node.address)
    except ValueError:
        parsed = None
    if parsed is not None and parsed.reduction is not None:
        said = _with_amendments(source, node, parsed.reduction)
    return _told(said, withdrawn) if withdrawn else said


def _with_amendments(source: LabSource, node: TraceNode, reduction: str) -> TraceNode:
    try:
        document: ReductionDocument = source.reduction(reduction)
    except ArchiveError:
        return node
    acts = tuple(
        TraceNode(entry.address, "amendment", f"{entry.address}, amendment: {entry.because}")
        for entry in document.inputs
        if entry.role == "amendment"
    )
    return replace(node, children=(*node.children, *acts)) if acts else node


def _told(node: TraceNode, withdrawn: Mapping[str, str]) -> TraceNode:
    children = tuple(_told(child, withdrawn) for child in node.children)
    try:
        why = _why(parse_address(node.address), withdrawn)
    except ValueError:
        why = None
    if why is None:
        return replace(node, children=children)
    facts = {**node.facts, "withdrawn": why}
    return replace(node, label=f"{node.label}; WITHDRAWN: {why}", facts=facts, children=children)

"""Lineage as a picture: the graph behind one number, and the graph of a whole cooldown for its run sheet."""

from __future__ import annotations

from collections.abc import Callable, Sequence

from archive.reduction.trace import TraceNode
from archive.reports.layered_graph import Box, drawn
from archive.reports.numbers import shown_output, shown_value
from schemas.address import parse_address
from schemas.lineage import ReductionDocument, SweepEntry, Value

__all__ = ["cooldown_graph", "trace_graph"]

_LONGEST = 42
_MOST = 40
"""More sweeps than this are drawn as one box for each kind, and their reductions as one for each plan."""

_KINDS = {
    "raw-file": "raw",
    "channel": "data",
    "sweep": "data",
    "array": "data",
    "dose": "data",
    "record": "record",
    "plan": "record",
    "step": "act",
    "reduction": "act",
    "result": "data",
}


def trace_graph(
    root: TraceNode, *, forwards: bool = False, link: Callable[[str], str | None] | None = None
) -> str:
    """Return the picture of a lineage tree, every thing once, raw files above and results below.

    Parameters
    ----------
    root : TraceNode
    forwards : bool
        Whether children rest on their parents (a tree read forwards) instead of the other way round.
    link : callable, optional
        Page of an address, for pages that have one.
    """
    boxes: dict[str, Box] = {}
    edges: set[tuple[str, str]] = set()

    def visit(node: TraceNode, parent: str | None) -> None:
        key = node.address or "cited"
        if node.kind == "raw-file":
            # One box a file, whatever line is meant.
            lines: tuple[str, ...] = tuple(map(_short, node.address.split(":", 1)))
        elif node.kind == "step":
            words = node.label.split()
            lines = (_short(words[2].rstrip(":")), f"step {words[1]}")
        elif node.kind == "value":
            lines = (_short(node.label.partition(":")[2].strip() or node.label),)
        elif "#" in node.address:
            owner, name = node.address.split("#", 1)
            told = _number(node)
            lines = (
                (name, _short(owner), _short(told.removesuffix(" (see above)")))
                if told
                else (name, _short(owner))
            )
        else:
            lines = (_short(node.address or node.label),)
        kind = "result" if parent is None else _KINDS.get(node.kind, "data")
        boxes.setdefault(key, Box(key, tuple(line for line in lines if line), kind))
        if parent is not None and parent != key:
            edges.add((parent, key) if forwards else (key, parent))
        for child in node.children:
            visit(child, key)

    visit(root, None)
    title = f"{'What rests on' if forwards else 'Lineage of'} {root.address or root.label}"
    # A tree read forwards fans out: it is drawn to the right.
    return drawn(boxes.values(), edges, title=title, downward=not forwards, link=link)


def _number(node: TraceNode) -> str:
    if node.kind != "result" or node.facts.get("value") is None:
        return ""
    value = Value.model_validate(
        {each: node.facts.get(each) for each in ("value", "uncertainty", "unit", "scale")}
    )
    return shown_value(value, str(node.facts.get("quantity", ""))).text


def cooldown_graph(
    cooldown: str,
    sweeps: Sequence[SweepEntry],
    reductions: Sequence[ReductionDocument],
    *,
    link: Callable[[str], str | None] | None = None,
) -> str | None:
    """Return the picture of a cooldown: sweeps and records on the left, reductions and their first results on the right.

    Parameters
    ----------
    cooldown : str
    sweeps : sequence of SweepEntry
        Those of the cooldown; what reductions took from elsewhere is drawn by its address.
    reductions : sequence of ReductionDocument
    link : callable, optional

    Returns
    -------
    str or None
        None where nothing is reduced.
    """
    if not reductions:
        return None
    many = len(sweeps) > _MOST
    kinds = {f"{cooldown}/{each.name}": each for each in sweeps}
    boxes: dict[str, Box] = {}
    edges: set[tuple[str, str]] = set()

    def group(address: str) -> str:
        parsed = parse_address(address)
        if parsed.reduction is not None:
            return f"{cooldown} by {parsed.plan}" if many and parsed.head == cooldown else parsed.reduction
        if parsed.sweep is not None:
            kind = kinds.get(parsed.sweep)
            return f"{cooldown} {kind.kind}" if many and kind is not None else parsed.sweep
        return address

    counts: dict[str, set[str]] = {}
    for address, entry in kinds.items():
        counts.setdefault(group(address), set()).add(address)
        lines = (_short(entry.name), entry.kind) if not many else (entry.kind,)
        boxes[group(address)] = Box(group(address), lines, "data")
    for document in reductions:
        own = group(document.address)
        counts.setdefault(own, set()).add(document.address)
        boxes[own] = Box(own, _told(document, many=many), "act")
        edges.add((group(document.sweep), own))
    for document in reductions:
        own = group(document.address)
        for taken_from in document.inputs:
            kind = parse_address(taken_from.address).kind
            if kind == "accession":
                continue  # Facts of the sheet are behind everything; a line to each would tell nothing.
            taken = group(taken_from.address)
            boxes.setdefault(taken, Box(taken, (_short(taken),), "record" if kind == "record" else "data"))
            if taken != own:
                edges.add((taken, own))
    if many:
        boxes = {
            key: Box(key, (*box.lines, f"{len(counts[key])} of them"), box.kind) if key in counts else box
            for key, box in boxes.items()
        }
    used = {end for edge in edges for end in edge}
    return drawn(
        (box for key, box in boxes.items() if key in used), edges,
        title=f"Lineage in {cooldown}: what each reduction took", downward=False, link=link,
    )  # fmt: skip


def _told(document: ReductionDocument, *, many: bool) -> tuple[str, ...]:
    if many:
        return (document.plan.name,)
    name = f"{document.plan.name}.{document.number}"
    scalars = {entry.name: entry for entry in document.outputs if entry.rows is None}
    shown = next((scalars[each] for each in document.plan.headline if each in scalars), None)
    return (name,) if shown is None else (name, _short(f"{shown.name} = {shown_output(shown)}"))


def _short(text: str) -> str:
    return text if len(text) <= _LONGEST else text[: _LONGEST - 1] + "\u2026"

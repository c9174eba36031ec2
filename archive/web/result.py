"""The page of a result: value, uncertainty and what it is made of, where it came from, where it is used, how it stands today."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field

from starlette.requests import Request
from starlette.responses import Response

from archive.lab import Archive
from archive.reduction.trace import TraceNode
from archive.reports.budget import budget_block, budget_rows, monte_carlo_sentence
from archive.reports.numbers import Shown, shown_value
from archive.web.correlations import correlations
from archive.web.links import path_of
from archive.web.page import page
from archive.web.site import lab_of
from schemas.address import Address
from schemas.lineage import OutputEntry, ReductionDocument, Value

__all__ = ["result"]

# More than this is read on the page of the lineage.
_MOST = 200
# Below this a share is read more easily as a power of ten.
_LEAST_PER_CENT = 1e-5


@dataclass
class _Using:
    """A reduction that rests on the result, and its results that do."""

    address: str
    results: dict[str, Shown | str] = field(default_factory=dict)


def result(request: Request, address: Address) -> Response:
    """Answer with the page of a scalar result.

    Parameters
    ----------
    request : Request
    address : Address
        Of an output without rows.
    """
    lab = lab_of(request)
    own = address.reduction or ""
    document = lab.reduction_document(own)
    output = next(each for each in document.outputs if each.name == address.part)
    using = list(_using(lab.trace(address.text, forward=True), own))
    stale = next((each.reasons for each in lab.stale(document.cooldown) if each.reduction == own), ())
    return page(
        request,
        "result.html.j2",
        address=address.text,
        own=own,
        document=document,
        output=output,
        step=document.steps[output.step - 1],
        zone=lab.sweep_facts(document.sweep).accession.sheet.time_zone,
        marks=_marks(lab, address, document),
        stale=[each.text for each in stale],
        relative=_relative(output),
        budget=list(_budget(document, output)),
        monte_carlo=monte_carlo_sentence(document, output),
        fitted=list(_fitted(document, output)),
        lineage=lab.lineage_picture(address.text, link=path_of),
        using=using[:_MOST],
        more=len(using) - _MOST,
        others=list(_others(lab, document, output)),
    )


def _marks(lab: Archive, address: Address, document: ReductionDocument) -> dict[str, object]:
    """What was said later of the result, and of the sweep that it was found from."""
    amended = lab.marks(document.sweep).get("amended")
    return {**lab.marks(address.text), **({"amended": amended} if amended else {})}


def _relative(output: OutputEntry) -> str:
    if not output.value or not output.uncertainty:
        return ""
    share = output.uncertainty / abs(output.value)
    return f"{100 * share:.2g}\u00a0%" if share >= _LEAST_PER_CENT else f"{share:.1e}"


def _budget(document: ReductionDocument, output: OutputEntry) -> Iterator[tuple[dict[str, object], float]]:
    """Lines of the budget and the share of each in the variance; the last is the whole."""
    shares = [share for _, _, share, _ in budget_rows(document, output)]
    lines = budget_block(document, output)
    for line, share in zip(lines, [*shares, 1.0], strict=False):
        yield {**line}, min(max(share, 0.0), 1.0)


def _fitted(document: ReductionDocument, output: OutputEntry) -> Iterator[tuple[str, str]]:
    """What was fitted together with it, with the correlation."""
    for _, names, rows in correlations(document):
        if output.name in names:
            row = rows[names.index(output.name)]
            yield from ((name, each) for name, each in zip(names, row, strict=True) if name != output.name)


def _using(node: TraceNode, own: str) -> Iterator[_Using]:
    """What rests on a node, by reduction, in the order of the trace."""
    found: dict[str, _Using] = {}
    waiting = list(node.children)
    while waiting:
        each = waiting.pop(0)
        reduction, _, name = each.address.partition("#")
        if each.kind == "reduction" or (each.kind == "result" and name):
            using = found.setdefault(reduction, _Using(reduction))
            if each.kind == "result":
                using.results.setdefault(name, _shown(each))
        elif each.kind == "record":
            found.setdefault(each.address, _Using(each.address))
        waiting += each.children
    yield from sorted(found.values(), key=lambda using: using.address != own)


def _shown(node: TraceNode) -> Shown | str:
    value, u, kind = (node.facts.get(name) for name in ("value", "uncertainty", "quantity"))
    if not isinstance(value, int | float):
        # The label says why there is no number.
        return node.label.partition(": ")[2] or "no value"
    found = Value.model_validate(
        {"value": value, "uncertainty": u, "unit": node.facts.get("unit"), "scale": node.facts.get("scale")}
    )
    return shown_value(found, str(kind))


def _others(
    lab: Archive, document: ReductionDocument, output: OutputEntry
) -> Iterator[tuple[ReductionDocument, OutputEntry | None, str]]:
    """Every reduction of the same plan on the same sweep, oldest first, with its result of this name and how it stands."""
    rows = [row for row in lab.reductions(sweep=document.sweep) if row.plan == document.plan.name]
    if len(rows) < 2:
        return
    for row in rows:
        other = lab.reduction_document(row.address)
        same = next((each for each in other.outputs if each.name == output.name), None)
        state = "withdrawn" if row.withdrawn else "current" if row.newest else "superseded"
        yield other, same, state

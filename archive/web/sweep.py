"""The page of a sweep: what was recorded and what was made of it, drawn one below the other, and all that is known of it."""

from __future__ import annotations

from collections import defaultdict

import numpy as np
from starlette.requests import Request
from starlette.responses import Response

from archive.errors import UnknownAddress
from archive.index import ResultRow
from archive.reports.axis_units import in_unit, unit_text
from archive.web.charting import charting
from archive.web.links import path_of
from archive.web.page import page
from archive.web.site import lab_of
from archive.web.thing import thing
from schemas.address import Address
from schemas.lineage import Value
from schemas.quantity import Quantity, unit_factor
from schemas.uncertain_text import in_preferred_unit

__all__ = ["sweep"]


def sweep(request: Request, address: Address) -> Response:
    """Answer with the page of a sweep or of one of its channels; a dose is shown as the thing that it is.

    Parameters
    ----------
    request : Request
    address : Address
    """
    lab = lab_of(request)
    own = address.sweep or ""
    try:
        facts = lab.sweep_facts(own)
    except UnknownAddress:
        # A dose has an address of the same form.
        return thing(request, Address(own, "item", address.head, address.item))
    rows = lab.reductions(sweep=own)
    drawn = charting(request)
    results: dict[str, list[ResultRow]] = defaultdict(list)
    for row in lab.results(sweep=own):
        if row.headline:
            results[row.reduction].append(row)
    return page(
        request,
        "sweep.html.j2",
        address=own,
        facts=facts,
        temperatures=_temperatures(facts.entry.temperature_low, facts.entry.temperature_high),
        marks=lab.marks(own),
        drawn=drawn,
        alike=_alike(facts.entry.coverage),
        columns=[
            each
            for each in drawn.outline.members[0].leaf.columns.values()
            if each.owner == own and each.digest
        ],
        reductions=sorted(rows, key=lambda row: (not row.newest, row.plan, -row.number)),
        results=results,
        findings=[
            each for each in facts.accession.findings if (each.place or "").split("#")[0] == address.item
        ],
        number=_number,
        unit_text=unit_text,
        lineage=lab.sweep_picture(facts, link=path_of),
    )


def _temperatures(low: Value | None, high: Value | None) -> str:
    """Ends of a sweep, rounded as ends are: they are what was reached, not what was measured."""
    if low is None or low.value is None:
        return ""
    ends = [low.value, *([high.value] if high is not None and high.value is not None else [])]
    unit = in_unit(np.array(ends), "K", "temperature")[1]
    texts = list(dict.fromkeys(f"{each / unit_factor(unit, 'temperature'):.4g}" for each in ends))
    return " to ".join(texts) + f"\u00a0{unit_text(unit)}" + (f" on {low.scale}" if low.scale else "")


def _alike(coverage: Value | None) -> str:
    """Return coverages within a tenth of this one, as a search asks for them; "" where there is nothing to compare with."""
    if coverage is None or coverage.value is None or not coverage.value > 0:
        return ""
    shown = in_preferred_unit(Quantity(value=coverage.value, unit=coverage.unit, kind="coverage"))
    return f"{0.9 * shown.value:.4g}:{1.1 * shown.value:.4g} {shown.unit}"


def _number(value: float | None) -> str:
    """An end of a column, which has an uncertainty of its own elsewhere in the row."""
    return "[nr]" if value is None else f"{value:.7g}".replace("-", "\u2212")

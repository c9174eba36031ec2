"""The page of a reduction: steps in sentences, what they took and gave, the figure of its plan, and how it stands today."""

from __future__ import annotations

from collections.abc import Iterator

from starlette.requests import Request
from starlette.responses import Response

from archive.lab.stale import StaleReason
from archive.web.charting import Charting, charting
from archive.web.correlations import correlations
from archive.web.links import path_of
from archive.web.page import page
from archive.web.result import result
from archive.web.site import lab_of
from archive.web.thing import thing
from schemas.address import Address
from schemas.lineage import ReductionDocument, StepRecord

__all__ = ["reduction"]


def reduction(request: Request, address: Address) -> Response:
    """Answer with the page of a reduction or of one of its arrays; a scalar result has one of its own.

    Parameters
    ----------
    request : Request
    address : Address
    """
    lab = lab_of(request)
    own = address.reduction or ""
    document = lab.reduction_document(own)
    arrays = {each.name for each in document.outputs if each.rows is not None}
    if address.part is not None and address.part not in arrays:
        # What is no output at all is refused there, with a word on what there is.
        scalar = any(each.name == address.part for each in document.outputs)
        return (result if scalar else thing)(request, address)
    stale = next((each.reasons for each in lab.stale(document.cooldown) if each.reduction == own), ())
    return page(
        request,
        "reduction.html.j2",
        address=own,
        document=document,
        zone=lab.sweep_facts(document.sweep).accession.sheet.time_zone,
        marks=lab.marks(own),
        stale=_told(stale),
        drawn=_drawn(request, document),
        steps=[(step, list(_parameters(step))) for step in document.steps],
        results=[each for each in document.outputs if each.rows is None],
        covariances=list(correlations(document)),
        lineage=lab.lineage_picture(own, link=path_of),
    )


def _drawn(request: Request, document: ReductionDocument) -> Charting | None:
    return charting(request) if any((each.rows or 0) > 1 for each in document.outputs) else None


def _told(reasons: tuple[StaleReason, ...]) -> list[str]:
    return [each.text for each in reasons]


def _parameters(step: StepRecord) -> Iterator[tuple[str, str]]:
    for name, value in step.parameters.items():
        if value is None or value in ([], {}):
            continue
        yield name.replace("_", " "), _text(value)


def _text(value: object) -> str:
    if isinstance(value, list):
        return ", ".join(map(_text, value))
    if isinstance(value, dict):
        # A quantity is a table with its own words.
        return (
            str(value["text"])
            if "text" in value
            else "; ".join(f"{key} {_text(each)}" for key, each in value.items())
        )
    return f"{value:.12g}" if isinstance(value, float) else str(value)

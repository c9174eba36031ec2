"""The search: the fields of the command as a form, the answer as rows with a small picture of each sweep."""

from __future__ import annotations

from typing import Any, Literal
from urllib.parse import urlencode

from pydantic import BaseModel, ConfigDict, create_model
from starlette.requests import Request
from starlette.responses import Response

from archive.errors import ArchiveError
from archive.index import SweepRow
from archive.lab import Archive
from archive.lab.asking import search_query
from archive.web.page import page
from archive.web.query import asked
from archive.web.site import lab_of
from archive.web.thumb import thumb_path
from schemas.search_fields import SEARCH_FIELDS, SearchField

__all__ = ["ROWS", "SearchAsked", "search"]

ROWS = 50
"""Sweeps on one page."""

_RECORDS = ("cell", "substrate", "sample", "thermometer")
_MOST_SUGGESTED = 200


def _kept(field: SearchField) -> Any:
    """Return type and default of a field in the query."""
    if field.several:
        return (tuple[str, ...], ())
    if field.form == "flag":
        return (bool, False)
    if field.form == "either":
        return (Literal[field.choices] | None, None)
    if field.form == "choice" and field.default:
        return (Literal[field.choices], field.default)
    return (Literal[field.choices] | None if field.form == "choice" else str | None, None)


SearchAsked: type[BaseModel] = create_model(
    "SearchAsked",
    __config__=ConfigDict(extra="forbid"),
    **{field.name: _kept(field) for field in SEARCH_FIELDS},
    after=(str | None, None),
)
"""The query of the page: the fields of `SEARCH_FIELDS`, and `after`, the last sweep of the page before."""


def search(request: Request) -> Response:
    """Answer with the form and what it finds; a field that cannot be read is told above the form, which keeps what was written."""
    lab = lab_of(request)
    problem: ArchiveError | None = None
    rows: list[SweepRow] = []
    given: dict[str, Any] = {}
    try:
        given = asked(request, SearchAsked).model_dump()
        query = search_query(lab, _meant(given), limit=ROWS + 1, after=given["after"])
        rows = list(lab.search(query))
    except ArchiveError as fault:
        if fault.code not in ("bad-request", "unknown-address"):
            raise
        problem = fault
    return page(
        request,
        "search.html.j2",
        status=200 if problem is None else 400,
        fields=SEARCH_FIELDS,
        given=given or _as_written(request),
        problem=problem,
        rows=rows[:ROWS],
        following=_following(request, rows),
        begun=request.query_params.get("after") is not None,
        from_first=_without_after(request),
        suggested=_suggested(lab),
        thumb_path=thumb_path,
        empty=not rows and problem is None and not lab.cooldown_names(),
    )


def _meant(given: dict[str, Any]) -> dict[str, Any]:
    """Return the fields as `search_query` takes them: of two words, the first is yes."""
    meant = {name: value for name, value in given.items() if name != "after"}
    for field in SEARCH_FIELDS:
        if field.form == "either" and meant[field.name] is not None:
            meant[field.name] = meant[field.name] == field.choices[0]
    return meant


def _as_written(request: Request) -> dict[str, Any]:
    """Return what stands in the address, for a form that could not be read."""
    written: dict[str, Any] = {}
    for field in SEARCH_FIELDS:
        found = request.query_params.getlist(field.name)
        written[field.name] = tuple(found) if field.several else (found[0] if found else "")
    return written


def _following(request: Request, rows: list[SweepRow]) -> str | None:
    """Return the address of the next page, if there is one."""
    if len(rows) <= ROWS:
        return None
    kept = [(name, value) for name, value in request.query_params.multi_items() if name != "after" and value]
    return "/search?" + urlencode([*kept, ("after", rows[ROWS - 1].address)])


def _without_after(request: Request) -> str:
    kept = [(name, value) for name, value in request.query_params.multi_items() if name != "after" and value]
    return "/search" + (f"?{urlencode(kept)}" if kept else "")


def _suggested(lab: Archive) -> dict[str, list[str]]:
    """Return names that a field may hold, for fields of records."""
    found: dict[str, dict[str, None]] = {kind: {} for kind in _RECORDS}
    for row in lab.records():
        if row.kind in found and len(found[row.kind]) < _MOST_SUGGESTED:
            found[row.kind][row.name] = None
    return {kind: list(names) for kind, names in found.items()}

"""All cooldowns, the latest first."""

from __future__ import annotations

from datetime import UTC, datetime
from urllib.parse import urlencode

from pydantic import BaseModel, ConfigDict
from starlette.requests import Request
from starlette.responses import Response

from archive.errors import BadRequest
from archive.web.page import page
from archive.web.query import asked
from archive.web.site import lab_of

__all__ = ["ROWS", "cooldowns"]

_LONG_AGO = datetime.min.replace(tzinfo=UTC)

ROWS = 200
"""Cooldowns on one page."""


class _Asked(BaseModel):
    """The query of the page: the last cooldown of the page before."""

    model_config = ConfigDict(extra="forbid")
    after: str | None = None


def cooldowns(request: Request) -> Response:
    """Answer with the list of cooldowns."""
    after = asked(request, _Asked).after
    rows = sorted(
        lab_of(request).cooldowns(), key=lambda row: (row.begin or _LONG_AGO, row.name), reverse=True
    )
    begin = 0
    if after is not None:
        begin = next((place for place, row in enumerate(rows, 1) if row.name == after), 0)
        if begin == 0:
            raise BadRequest(
                "the list cannot go on behind a cooldown that is not there",
                field="after",
                found=repr(after[:80]),
                remedy="begin the list anew",
            )
    shown = rows[begin : begin + ROWS]
    return page(
        request,
        "cooldowns.html.j2",
        rows=shown,
        total=len(rows),
        begun=begin > 0,
        following=f"/cooldowns?{urlencode({'after': shown[-1].name})}" if begin + ROWS < len(rows) else None,
    )

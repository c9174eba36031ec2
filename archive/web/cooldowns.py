"""All cooldowns, the latest first."""

from __future__ import annotations

from datetime import UTC, datetime

from starlette.requests import Request
from starlette.responses import Response

from archive.web.page import page
from archive.web.site import lab_of

__all__ = ["cooldowns"]

_LONG_AGO = datetime.min.replace(tzinfo=UTC)


def cooldowns(request: Request) -> Response:
    """Answer with the list of cooldowns."""
    rows = sorted(
        lab_of(request).cooldowns(), key=lambda row: (row.begin or _LONG_AGO, row.name), reverse=True
    )
    return page(request, "cooldowns.html.j2", rows=rows)

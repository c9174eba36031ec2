"""`/to?address=...`: what the address field of every page asks for."""

from __future__ import annotations

from starlette.requests import Request
from starlette.responses import RedirectResponse, Response

from archive.errors import BadRequest
from archive.web.links import path_of

__all__ = ["to"]

_LONGEST = 800


def to(request: Request) -> Response:
    """Answer with the way to the page of an address."""
    address = request.query_params.get("address", "").strip()
    if not address or len(address) > _LONGEST:
        raise BadRequest(
            "no address was given", field="address", expected="such as 2026-03, 2026-03/s017, TO-4.r2"
        )
    return RedirectResponse(path_of(address), 303)

"""The page of anything that has no page of its own: all that the archive knows of it, in order."""

from __future__ import annotations

from starlette.requests import Request
from starlette.responses import Response

from archive.web.page import page
from archive.web.site import lab_of
from schemas.address import Address

__all__ = ["thing"]


def thing(request: Request, address: Address) -> Response:
    """Answer with what the archive knows of an address."""
    shown = lab_of(request).show(address.text)
    return page(request, "thing.html.j2", address=address.text, what=shown["what"], content=shown)

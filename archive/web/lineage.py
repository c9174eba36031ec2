"""The lineage of anything that has an address, as a page of its own: down to raw files, or forward to all that rests on it."""

from __future__ import annotations

from typing import Literal

from pydantic import BaseModel, ConfigDict
from starlette.requests import Request
from starlette.responses import Response

from archive.web.links import address_at, path_of
from archive.web.page import page
from archive.web.query import asked
from archive.web.site import lab_of

__all__ = ["lineage"]


class _Way(BaseModel):
    model_config = ConfigDict(extra="forbid", frozen=True)

    way: Literal["back", "forward"] = "back"


def lineage(request: Request) -> Response:
    """Answer with the graph behind an address, or with that of what rests on it."""
    address = address_at(request.path_params["address"])
    forward = asked(request, _Way).way == "forward"
    drawn = lab_of(request).lineage_picture(address, forward=forward, link=path_of)
    return page(
        request,
        "lineage.html.j2",
        address=address,
        forward=forward,
        path=path_of(address).removeprefix("/at"),
        drawn=drawn,
    )

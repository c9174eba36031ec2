"""`/over`: sweeps that were ticked in a list, laid over one another on the page of the first."""

from __future__ import annotations

from pydantic import BaseModel, ConfigDict, Field
from starlette.requests import Request
from starlette.responses import RedirectResponse, Response

from archive.errors import BadRequest
from archive.web.links import path_of
from archive.web.query import asked
from archive.web.shown import Shown, question

__all__ = ["over"]


class _Ticked(BaseModel):
    model_config = ConfigDict(extra="forbid", frozen=True)

    over: tuple[str, ...] = Field(default=(), alias="with")


def over(request: Request) -> Response:
    """Lead to the page of the first sweep, with the others laid over.

    Raises
    ------
    BadRequest
        If none is ticked.
    """
    first, *others = asked(request, _Ticked).over or ("",)
    if not first:
        raise BadRequest(
            "no sweep is ticked",
            expected="one or several",
            remedy="go back, tick the sweeps to lay over one another",
        )
    # The page is told in full, so that what is typed in an address leads nowhere else.
    return RedirectResponse(path_of(first) + question(Shown(), over=tuple(others)), 303)

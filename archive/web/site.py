"""What all pages of one server share, and how a page reaches it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import cast

from starlette.requests import Request

from archive.lab import Archive
from archive.web.lending import Lending
from archive.web.page import Pages

__all__ = ["Site", "lab_of", "site_of"]


@dataclass(frozen=True)
class Site:
    """Name of the laboratory's archive, the templates, and the open archives that are lent to workers."""

    name: str
    pages: Pages
    lending: Lending


def site_of(request: Request) -> Site:
    """Return what all pages share."""
    return cast("Site", request.app.state.site)


def lab_of(request: Request) -> Archive:
    """Return the archive that was lent to the worker of this request."""
    return cast("Archive", request.state.lab)

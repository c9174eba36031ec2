"""The application: routes behind the guard, workers that are counted, and a page for every fault."""

from __future__ import annotations

from collections.abc import AsyncIterator, Collection
from contextlib import asynccontextmanager
from pathlib import Path

import anyio
from starlette.applications import Starlette
from starlette.exceptions import HTTPException
from starlette.requests import Request
from starlette.responses import Response
from starlette.types import ASGIApp

from archive.errors import UnknownAddress
from archive.intake.settings import read_settings
from archive.web.faults import fault_page
from archive.web.guard import Guard
from archive.web.lending import Lending
from archive.web.page import Pages
from archive.web.routes import ROUTES
from archive.web.site import Site

__all__ = ["LOOPBACK_NAMES", "WORKERS", "application"]

WORKERS = 8
"""Pages made at once; more wait (common practice, no source)."""

LOOPBACK_NAMES = frozenset({"127.0.0.1", "localhost", "[::1]"})
"""Names under which a browser on the same machine asks."""


def application(
    root: Path, *, hosts: Collection[str] = LOOPBACK_NAMES, token: str | None = None, workers: int = WORKERS
) -> ASGIApp:
    """Return the pages of the archive in a folder, as an ASGI application.

    Parameters
    ----------
    root : Path
        Folder of the archive; it is opened for reading only.
    hosts : collection of str
        Names, without port, that a request may give in its Host header.
    token : str, optional
        What a browser must know; None asks for none.
    workers : int
        Pages made at once.

    Raises
    ------
    NotAnArchive
        If there is none.
    """
    site = Site(name=read_settings(root).name, pages=Pages(), lending=Lending(root))

    @asynccontextmanager
    async def lifespan(app: Starlette) -> AsyncIterator[None]:
        app.state.workers = anyio.CapacityLimiter(workers)
        try:
            yield
        finally:
            site.lending.close()

    app = Starlette(routes=ROUTES, exception_handlers={HTTPException: _nothing_there}, lifespan=lifespan)
    app.state.site = site
    return Guard(app, hosts=frozenset(hosts), token=token)


async def _nothing_there(request: Request, fault: Exception) -> Response:
    """Answer a path that no page has."""
    return fault_page(
        request,
        UnknownAddress(f"there is no page {request.url.path[:200]}", remedy="choose one from the line above"),
    )

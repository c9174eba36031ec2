"""A page as an endpoint: made in a worker thread with an archive of its own, every fault told as a page."""

from __future__ import annotations

import logging
from collections.abc import Callable

import anyio
from anyio import to_thread
from starlette.requests import Request
from starlette.responses import Response
from starlette.types import Receive, Scope, Send

from archive.errors import ArchiveBusy, ArchiveError, kept_traceback
from archive.lab import Archive
from archive.web.faults import fault_page
from archive.web.site import site_of

__all__ = ["Endpoint", "Page"]

Page = Callable[[Request], Response]
"""A page: from a request to its answer; `site.lab_of` gives it the archive."""

_LONGEST_WAIT_S = 20.0

_log = logging.getLogger("archive.web")


class Endpoint:
    """ASGI endpoint of a page; the archive stays lent until the answer, which may be a stream, has been sent."""

    def __init__(self, page: Page) -> None:
        self.page = page

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Answer one request."""
        request = Request(scope, receive, send)
        workers: anyio.CapacityLimiter = request.app.state.workers
        borrower = object()
        waited = False
        with anyio.move_on_after(_LONGEST_WAIT_S):
            await workers.acquire_on_behalf_of(borrower)
            waited = True
        if not waited:
            busy = ArchiveBusy(
                "more is asked of this server than it can answer", remedy="try again in a moment"
            )
            await fault_page(request, busy)(scope, receive, send)
            return
        loan = _Loan(request)
        try:
            response = await to_thread.run_sync(loan.answer, self.page)
            await response(scope, receive, send)
        finally:
            loan.end()
            workers.release_on_behalf_of(borrower)


class _Loan:
    """An archive lent for one request."""

    def __init__(self, request: Request) -> None:
        self.request = request
        self.lab: Archive | None = None
        self.sound = False

    def answer(self, page: Page) -> Response:
        """Return what a page makes of the request, or the page of what stopped it."""
        lending = site_of(self.request).lending
        try:
            self.lab = self.request.state.lab = lending.take()
            response = page(self.request)
        except ArchiveError as fault:
            return fault_page(self.request, fault)
        except Exception as fault:  # noqa: BLE001 - nobody is shown a traceback
            _log.error(
                "%s: a fault of Stillroom; the details are in %s",
                self.request.url.path,
                kept_traceback(fault),
            )
            return fault_page(self.request, fault)
        self.sound = True
        return response

    def end(self) -> None:
        """Give the archive back."""
        if self.lab is not None:
            site_of(self.request).lending.give_back(self.lab, sound=self.sound)

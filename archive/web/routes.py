"""Every page, as one list."""

from __future__ import annotations

from starlette.routing import Route

from archive.web.at import at
from archive.web.cooldowns import cooldowns
from archive.web.endpoint import Endpoint
from archive.web.static import static_file
from archive.web.to import to

__all__ = ["ROUTES"]

ROUTES = [
    Route("/", Endpoint(cooldowns)),
    Route("/cooldowns", Endpoint(cooldowns)),
    Route("/to", Endpoint(to)),
    Route("/at/{address:path}", Endpoint(at)),
    Route("/style/{version}/{name:path}", static_file),
    Route("/scripts/{version}/{name:path}", static_file),
    Route("/vendor/{version}/{name:path}", static_file),
]

"""Every page, as one list."""

from __future__ import annotations

from starlette.routing import Route

from archive.web.at import at
from archive.web.cooldowns import cooldowns
from archive.web.endpoint import Endpoint
from archive.web.plane import plane, plane_part, plane_pdf, plane_svg
from archive.web.static import static_file
from archive.web.to import to

__all__ = ["ROUTES"]

ROUTES = [
    Route("/", Endpoint(plane)),
    Route("/plane/part", Endpoint(plane_part)),
    Route("/plane.svg", Endpoint(plane_svg)),
    Route("/plane.pdf", Endpoint(plane_pdf)),
    Route("/cooldowns", Endpoint(cooldowns)),
    Route("/to", Endpoint(to)),
    Route("/at/{address:path}", Endpoint(at)),
    Route("/style/{version}/{name:path}", static_file),
    Route("/scripts/{version}/{name:path}", static_file),
    Route("/vendor/{version}/{name:path}", static_file),
]

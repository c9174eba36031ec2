"""Every page, as one list."""

from __future__ import annotations

from starlette.routing import Route

from archive.web.at import at
from archive.web.cooldowns import cooldowns
from archive.web.drawings import download, plan_figure, points, svg
from archive.web.endpoint import Endpoint
from archive.web.lineage import lineage
from archive.web.over import over
from archive.web.plane import plane, plane_part, plane_pdf, plane_svg
from archive.web.records import cells, thermometers
from archive.web.run_sheet import run_sheet
from archive.web.search import search
from archive.web.state import state
from archive.web.static import static_file
from archive.web.thumb import thumb
from archive.web.to import to

__all__ = ["ROUTES"]

ROUTES = [
    Route("/", Endpoint(plane)),
    Route("/plane/part", Endpoint(plane_part)),
    Route("/plane.svg", Endpoint(plane_svg)),
    Route("/plane.pdf", Endpoint(plane_pdf)),
    Route("/search", Endpoint(search)),
    Route("/cooldowns", Endpoint(cooldowns)),
    Route("/cells", Endpoint(cells)),
    Route("/thermometers", Endpoint(thermometers)),
    Route("/state", Endpoint(state)),
    Route("/run-sheet/{file}", Endpoint(run_sheet)),
    Route("/to", Endpoint(to)),
    Route("/at/{address:path}", Endpoint(at)),
    Route("/thumb/{address:path}", Endpoint(thumb)),
    Route("/lineage/{address:path}", Endpoint(lineage)),
    Route("/over", Endpoint(over)),
    Route("/points/{address:path}", Endpoint(points)),
    Route("/picture/{address:path}", Endpoint(svg)),
    Route("/figure/{address:path}", Endpoint(plan_figure)),
    Route("/download/{address:path}", Endpoint(download)),
    Route("/style/{version}/{name:path}", static_file),
    Route("/scripts/{version}/{name:path}", static_file),
    Route("/vendor/{version}/{name:path}", static_file),
]

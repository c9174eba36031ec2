"""`/run-sheet/2026-03.pdf`, `.html`, `.json`: the run sheet of a cooldown, made when it is asked for."""

from __future__ import annotations

from starlette.requests import Request
from starlette.responses import Response

from archive.errors import UnknownAddress
from archive.web.site import lab_of

__all__ = ["run_sheet"]

_TYPES = {"pdf": "application/pdf", "html": "text/html; charset=utf-8", "json": "application/json"}


def run_sheet(request: Request) -> Response:
    """Answer with the run sheet in one of its forms.

    The page has its style inside, which these pages do not allow themselves: it is handed over as a file.
    """
    name, _, form = request.path_params["file"].rpartition(".")
    if form not in _TYPES:
        raise UnknownAddress(f"a run sheet has no form {form[:40]!r}", expected="pdf, html or json")
    content = lab_of(request).run_sheet(name)[f"run-sheet-{name}.{form}"]
    how = "inline" if form == "pdf" else "attachment"
    return Response(
        content,
        media_type=_TYPES[form],
        headers={"Content-Disposition": f'{how}; filename="run-sheet-{name}.{form}"'},
    )

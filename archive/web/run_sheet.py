"""`/run-sheet/2026-03.pdf`, `.html`, `.json`: the run sheet of a cooldown, made when it is asked for."""

from __future__ import annotations

import base64
import hashlib
import re

from starlette.requests import Request
from starlette.responses import Response

from archive.errors import UnknownAddress
from archive.web.site import lab_of

__all__ = ["run_sheet"]

_TYPES = {"pdf": "application/pdf", "html": "text/html; charset=utf-8", "json": "application/json"}


def run_sheet(request: Request) -> Response:
    """Answer with the run sheet in one of its forms.

    The page is a file that stands alone, with its style inside. Its policy allows that style by its digest and nothing else.
    """
    name, _, form = request.path_params["file"].rpartition(".")
    if form not in _TYPES:
        raise UnknownAddress(f"a run sheet has no form {form[:40]!r}", expected="pdf, html or json")
    content = lab_of(request).run_sheet(name)[f"run-sheet-{name}.{form}"]
    how = "attachment" if form == "json" else "inline"
    headers = {"Content-Disposition": f'{how}; filename="run-sheet-{name}.{form}"'}
    if form == "html":
        headers["Content-Security-Policy"] = _policy(content)
    return Response(content, media_type=_TYPES[form], headers=headers)


def _policy(content: bytes) -> str:
    """Return the policy of a run sheet: the style of its head, pictures inside of it, and no way to anywhere."""
    found = re.search(rb"<style>(.*?)</style>", content, re.DOTALL)
    digest = base64.b64encode(hashlib.sha256(found[1]).digest()).decode() if found else ""
    style = f"'sha256-{digest}'" if digest else "'none'"
    return (
        f"default-src 'none'; style-src {style}; img-src data:; base-uri 'none'; form-action 'none'; "
        "frame-ancestors 'none'"
    )

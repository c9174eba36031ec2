"""A small picture of a sweep, for lists: what its own page draws first, without axes.

It is drawn in black on nothing; the style sheet turns it light on dark paper. What an accession holds never changes, so a
picture is kept under the address of the accession: in the browser, and here, as long as there is room.
"""

from __future__ import annotations

from collections import OrderedDict
from threading import Lock
from urllib.parse import quote

import numpy as np
from starlette.requests import Request
from starlette.responses import Response

from archive.errors import BadRequest
from archive.lab import Archive
from archive.lab.curves.chart import Asked, Curve
from archive.web.links import address_at
from archive.web.site import lab_of

__all__ = ["HEIGHT", "WIDTH", "thumb", "thumb_path", "thumb_svg"]

WIDTH, HEIGHT = 132, 40
_EDGE = 2.0
_POINTS = 280
_KEPT = 4000

_lock = Lock()
_drawn: OrderedDict[tuple[str, str, str], str] = OrderedDict()


def thumb_path(address: str, accession: str) -> str:
    """Return the path of the picture of a sweep as an accession holds it."""
    return f"/thumb/{quote(address, safe='/')}?of={quote(accession, safe='')}"


def thumb(request: Request) -> Response:
    """Answer with the picture of a sweep."""
    address = address_at(request.path_params["address"])
    lab = lab_of(request)
    row = lab.sweep_row(address)
    text = _kept((str(lab.root), address, row.accession), lab)
    # Named by another accession than the newest, the picture is of the newest all the same, and is not to be kept.
    lasting = request.query_params.get("of") == row.accession
    return Response(
        text,
        media_type="image/svg+xml",
        headers={"Cache-Control": "private, max-age=31536000, immutable" if lasting else "no-cache"},
    )


def _kept(key: tuple[str, str, str], lab: Archive) -> str:
    with _lock:
        if key in _drawn:
            _drawn.move_to_end(key)
            return _drawn[key]
    text = thumb_svg(_curves(lab, key[1]))
    with _lock:
        _drawn[key] = text
        while len(_drawn) > _KEPT:
            _drawn.popitem(last=False)
    return text


def _curves(lab: Archive, address: str) -> tuple[Curve, ...]:
    try:
        panels = lab.chart(Asked(address, most=_POINTS)).panels
    except BadRequest:
        # A sweep of one column, or of none that can be drawn against another.
        return ()
    return panels[0].curves[:1] if panels else ()


def thumb_svg(curves: tuple[Curve, ...]) -> str:
    """Return the drawing of the first curves of a sweep; empty where there is nothing to draw."""
    parts = [f'<path d="M.5 0V{HEIGHT - 0.5}H{WIDTH}" fill="none" stroke="#000" stroke-opacity=".35"/>']
    for curve in curves:
        known = np.isfinite(curve.x) & np.isfinite(curve.y)
        if not known.any():
            continue
        X = _EDGE + 2 + _share(curve.x, known) * (WIDTH - 2 * _EDGE - 2)
        Y = HEIGHT - _EDGE - 2 - _share(curve.y, known) * (HEIGHT - 2 * _EDGE - 2)
        if curve.line:
            parts.append(f'<path d="{_line(X, Y, known)}" fill="none" stroke="#000" stroke-width="1.2"/>')
        else:
            dots = "".join(f"M{x:.1f} {y:.1f}h0" for x, y in zip(X[known], Y[known], strict=True))
            parts.append(
                f'<path d="{dots}" fill="none" stroke="#000" stroke-width="2" stroke-linecap="round"/>'
            )
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {WIDTH} {HEIGHT}" width="{WIDTH}" height="{HEIGHT}">'
        f"{''.join(parts)}</svg>"
    )


def _share(values: np.ndarray, known: np.ndarray) -> np.ndarray:
    low, high = float(values[known].min()), float(values[known].max())
    return (values - low) / (high - low) if high > low else np.full(values.shape, 0.5)


def _line(X: np.ndarray, Y: np.ndarray, known: np.ndarray) -> str:
    where = np.flatnonzero(known)
    runs = np.split(where, np.flatnonzero(np.diff(where) > 1) + 1)
    return "".join("M" + "L".join(f"{X[k]:.1f} {Y[k]:.1f}" for k in run) for run in runs if run.size)

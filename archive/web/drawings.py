"""What the page of a chart loads: its points, its picture, the rows that it shows, and the figure of a plan."""

from __future__ import annotations

import json
import math
import tempfile
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray
from starlette.requests import Request
from starlette.responses import Response, StreamingResponse

from archive.errors import UnknownAddress
from archive.lab.curves.chart import Chart, Curve, Panel
from archive.lab.curves.picture import across_name, picture, picture_pdf
from archive.web.links import address_at
from archive.web.query import asked
from archive.web.shown import Download, Pictured, asked_for
from archive.web.site import lab_of

__all__ = ["download", "plan_figure", "points", "svg"]

FloatArray = NDArray[np.float64]

_SVG = "image/svg+xml"
# Seven points for each column of pixels hold first, last, extremes and gap of it.
_POINTS_PER_PIXEL = 7
# More digits than a screen of any size can show at any magnification that is left after the view itself was cut out.
_DIGITS = 12
_PIECE = 1 << 16


def points(request: Request) -> Response:
    """Answer with the points of a chart as JSON, values as its axes are written; null where there is none."""
    shown = asked(request, Pictured)
    chart = lab_of(request).chart(asked_for(request, shown, most=_POINTS_PER_PIXEL * shown.width))
    content = {
        "address": chart.address,
        "across": across_name(chart),
        "unit": chart.across.unit,
        "low": _number(chart.low),
        "high": _number(chart.high),
        "panels": [_panel(panel) for panel in chart.panels],
    }
    return Response(
        json.dumps(content, allow_nan=False, separators=(",", ":")),
        media_type="application/json",
        headers={"Cache-Control": "no-cache"},
    )


def _panel(panel: Panel) -> dict[str, Any]:
    return {
        "name": panel.name,
        "words": panel.words,
        "axis": panel.axis.name + (f" ({panel.scale})" if panel.scale else ""),
        "log": panel.log,
        "curves": [_curve(curve) for curve in panel.curves],
    }


def _curve(curve: Curve) -> dict[str, Any]:
    x, placed = _carried(curve.x)
    return {
        "owner": curve.owner,
        "look": curve.look,
        "line": curve.line,
        "thinned": curve.thinned,
        "x": _numbers(x),
        "y": _numbers(np.where(np.isfinite(curve.x), curve.y, np.nan)[placed]),
        "u": None if curve.u is None else _numbers(curve.u[placed]),
    }


def _carried(x: FloatArray) -> tuple[FloatArray, NDArray[np.int64]]:
    """Abscissae in which a row without one has that of the row before, and the rows: a gap stays a gap where it was."""
    known = np.flatnonzero(np.isfinite(x))
    if not known.size:
        return np.empty(0), known
    rows = np.arange(known[0], x.size)
    return x[known[np.searchsorted(known, rows, side="right") - 1]], rows


def _numbers(values: FloatArray) -> list[float | None]:
    return [_number(each) for each in values.tolist()]


def _number(value: float) -> float | None:
    return float(f"{value:.{_DIGITS}g}") if math.isfinite(value) else None


def svg(request: Request) -> Response:
    """Answer with a chart as a picture."""
    shown = asked(request, Pictured)
    chart = lab_of(request).chart(asked_for(request, shown, most=4 * shown.width))
    return Response(
        picture(chart, ink=shown.ink, width=shown.width),
        media_type=_SVG,
        headers={"Cache-Control": "no-cache"},
    )


def download(request: Request) -> Response:
    """Answer with what a chart shows, as a file to keep."""
    shown = asked(request, Download)
    wanted = asked_for(request, shown)
    lab = lab_of(request)
    if shown.form == "csv":
        pieces = lab.shown_csv(wanted)
        # What is wrong with the question is told before the answer begins.
        first = next(pieces)
        return _file(_after(first, pieces), wanted.address, "csv", "text/csv; charset=utf-8")
    if shown.form == "hdf5":
        folder = tempfile.TemporaryDirectory(prefix="stillroom-shown-", ignore_cleanup_errors=True)
        try:
            path = Path(folder.name) / "shown.h5"
            lab.shown_hdf5(wanted, path)
        except BaseException:
            folder.cleanup()
            raise
        return _file(_read(path, folder), wanted.address, "h5", "application/x-hdf5")
    chart: Chart = lab.chart(wanted)
    if shown.form == "svg":
        return _file(iter([picture(chart).encode()]), wanted.address, "svg", _SVG)
    return _file(iter([picture_pdf(chart)]), wanted.address, "pdf", "application/pdf")


def _after(first: str, rest: Iterator[str]) -> Iterator[bytes]:
    yield first.encode()
    for piece in rest:
        yield piece.encode()


def _read(path: Path, folder: tempfile.TemporaryDirectory[str]) -> Iterator[bytes]:
    with folder, path.open("rb") as file:
        while block := file.read(_PIECE):
            yield block


def _file(content: Iterator[bytes], address: str, suffix: str, media_type: str) -> Response:
    # Addresses hold nothing but letters, digits and / . _ - @ #; the name of a file is made of them.
    name = address.replace("/", "-").replace("#", "-")
    return StreamingResponse(
        content,
        media_type=media_type,
        headers={
            "Content-Disposition": f'attachment; filename="{name}.{suffix}"',
            "Cache-Control": "no-cache",
        },
    )


def plan_figure(request: Request) -> Response:
    """Answer with the figure that the plan of a reduction has, as SVG.

    Raises
    ------
    UnknownAddress
        If there is none; the message says why.
    """
    found = lab_of(request).plan_figure(address_at(request.path_params["address"]))
    if found.content is None:
        raise UnknownAddress(found.caption)
    # It takes a second to draw, and what it shows is sealed.
    return Response(found.content, media_type=_SVG, headers={"Cache-Control": "private, max-age=600"})

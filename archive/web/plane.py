"""The plane, the front page: every sweep a bar, every transition a point; as a picture, a part of it, a table, a figure."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from typing import Any

from starlette.requests import Request
from starlette.responses import HTMLResponse, Response

from archive.lab.plane import PlaneState
from archive.lab.plane_lines import NO_CELL, cell_name
from archive.reports.plane_layout import height_unit, logarithmic, mark_and_shade
from archive.reports.plane_remarks import TITLES, jump_words, pore_words, remarks
from archive.reports.plane_values import height_words, span_words
from archive.reports.plane_view import Bar, PlaneAxis, PlaneView, Window
from archive.reports.plane_words import line_words, point_words
from archive.web.page import page
from archive.web.plane_drawing import MARKS, drawing
from archive.web.plane_query import SORTS, PlaneRequest, Sort
from archive.web.query import asked
from archive.web.site import lab_of, site_of
from schemas.search_fields import SWEEP_KINDS

__all__ = ["plane", "plane_part", "plane_pdf", "plane_svg"]

_PER_PAGE = 250
_ALL = 2**31
_AXES: tuple[PlaneAxis, ...] = ("coverage", "pressure", "cell")
_STATES: tuple[PlaneState, ...] = ("any", "reduced", "not reduced", "stale", "withdrawn")


def plane(request: Request) -> Response:
    """Answer with the plane, as a picture or as a table."""
    wanted = asked(request, PlaneRequest)
    return page(request, "plane.html.j2", **_content(request, wanted))


def plane_part(request: Request) -> Response:
    """Answer with the picture alone, for a script that has moved its window."""
    wanted = asked(request, PlaneRequest)
    content = _content(request, wanted)
    return HTMLResponse(site_of(request).pages.text("plane_part.html.j2", content))


def plane_svg(request: Request) -> Response:
    """Answer with the plane as a figure, SVG."""
    return _figure(request, "svg", "image/svg+xml")


def plane_pdf(request: Request) -> Response:
    """Answer with the plane as a figure, PDF."""
    return _figure(request, "pdf", "application/pdf")


def _figure(request: Request, kind: str, media_type: str) -> Response:
    wanted = asked(request, PlaneRequest)
    content = lab_of(request).plane_figure(_view(request, wanted), kind=kind)
    headers = {"Content-Disposition": f'attachment; filename="plane.{kind}"'}
    return Response(content, media_type=media_type, headers=headers)


def _view(request: Request, wanted: PlaneRequest, **more: Any) -> PlaneView:
    lab = lab_of(request)
    return lab.plane(wanted.search(lab), axis=wanted.axis, state=wanted.state, window=wanted.window(), **more)


def _content(request: Request, wanted: PlaneRequest) -> dict[str, Any]:
    table = wanted.view == "table"
    view = _view(request, wanted, most=_ALL) if table else _view(request, wanted)
    shared = {
        "wanted": wanted,
        "view": view,
        "title": TITLES[wanted.axis],
        "remarks": list(remarks(view)),
        "line_words": line_words,
        "jump_words": jump_words,
        "pore_words": pore_words,
        "unit": height_unit(wanted.axis),
        "choices": _choices(request),
        "empty": not lab_of(request).cells_and_substrates(),
    }
    if table:
        return {**shared, **_table(view, wanted)}
    return {
        **shared,
        "drawing": drawing(view, lambda window: "/" + wanted.at(window)),
        "legend": _legend(view),
        "manners": _manners(view),
        "log": logarithmic(wanted.axis),
        "steps": _steps(view, wanted),
    }


def _choices(request: Request) -> dict[str, Sequence[str]]:
    """Return what each field of the form can be."""
    used = lab_of(request).cells_and_substrates()
    return {
        "cell": sorted({cell_name(each.cell) for each in used} - {NO_CELL}),
        "substrate": sorted({cell_name(each.substrate) for each in used} - {NO_CELL}),
        "kind": SWEEP_KINDS,
        "state": _STATES,
        "axis": _AXES,
    }


def _legend(view: PlaneView) -> list[tuple[str, int, str, bool]]:
    """Return name, shade, outline of its mark, and whether that is open, of each cell in the picture."""
    shown = {bar.look for bar in view.bars} | {strip.look for strip in view.strips}
    found = []
    for name, look in view.cells:
        mark, shade = mark_and_shade(look)
        if look in shown:
            found.append((name, shade, MARKS[mark], mark not in "x+"))
    return found


def _manners(view: PlaneView) -> list[tuple[str, str]]:
    """Return how bars are drawn that are not whole lines, and what that means, as far as there are any."""
    marks = {mark for bar in view.bars for mark in bar.marks}
    doubted = [mark for mark in ("withdrawn", "stale") if mark in marks]
    found = [("doubted", " or ".join(doubted))] if doubted else []
    return [*found, ("raw", "not reduced")] if "not reduced" in marks else found


def _steps(view: PlaneView, wanted: PlaneRequest) -> list[tuple[str, str]]:
    """Return words and ways to other windows, for who has no script."""
    window, log = view.window, logarithmic(view.axis)

    def about(factor: float) -> Window:
        return Window(
            *_scaled(window.cold, window.warm, factor, log=log[0]),
            *_scaled(window.bottom, window.top, factor, log=log[1]),
        )

    return [
        ("closer", "/" + wanted.at(about(0.5))),
        ("wider", "/" + wanted.at(about(2.0))),
        ("everything", "/" + wanted.at(None, everything=True)),
        ("as at first", "/" + wanted.at(None, everything=None)),
    ]


def _scaled(low: float, high: float, factor: float, *, log: bool) -> tuple[float, float]:
    if log:
        middle, half = (low * high) ** 0.5, (high / low) ** (factor / 2)
        return middle / half, middle * half
    middle, half = (low + high) / 2, (high - low) * factor / 2
    return middle - half, middle + half


def _table(view: PlaneView, wanted: PlaneRequest) -> dict[str, Any]:
    """Return one page of the table of the same sweeps."""
    rows = sorted(view.bars, key=lambda bar: _order(bar, wanted.sort), reverse=wanted.descending)
    pages = max(1, -(-len(rows) // _PER_PAGE))
    number = min(wanted.page, pages)
    transitions: dict[str, list[tuple[str, str]]] = defaultdict(list)
    for point in view.points:
        transitions[point.sweep].append((point.address, point_words(point, "cell").partition(": ")[2].rpartition(",")[0]))  # fmt: skip
    return {
        "rows": rows[(number - 1) * _PER_PAGE : number * _PER_PAGE],
        "transitions": transitions,
        "height_words": height_words,
        "span_words": span_words,
        "number": number,
        "pages": pages,
        "sorts": SORTS,
    }


def _order(bar: Bar, sort: Sort) -> tuple[Any, ...]:
    keys: dict[Sort, tuple[Any, ...]] = {
        "height": (bar.bottom, bar.top),
        "temperature": (bar.cold, bar.warm),
        "cell": (bar.cell, bar.bottom),
        "address": (),
        "begin": (bar.begin or "",),
    }
    return (*keys[sort], bar.address)

"""Pages from templates: every value escaped, and nothing in it that could steer the browser."""

from __future__ import annotations

from collections.abc import Mapping
from importlib.resources import files
from typing import Any

from jinja2 import DictLoader, Environment, StrictUndefined
from starlette.requests import Request
from starlette.responses import HTMLResponse, Response

from archive.reports.moments import full_time, span_text
from archive.reports.numbers import grouped, shown_number, shown_output, shown_value
from archive.reports.prose import prose, symbol_of
from archive.web.links import path_of
from archive.web.static import static_path
from archive.web.sweep_words import marks_of_row, shown_coverage, temperature_span
from schemas.visible_text import visible

__all__ = ["NAVIGATION", "Pages", "page"]

NAVIGATION = (
    ("/", "plane"),
    ("/search", "search"),
    ("/cooldowns", "cooldowns"),
    ("/cells", "cells"),
    ("/thermometers", "thermometers"),
    ("/state", "state"),
)
"""Path and word of each page in the head line."""


class Pages:
    """The templates of all pages, with what every one of them may call."""

    def __init__(self) -> None:
        folder = files("templates").joinpath("web")
        sources = {
            each.name: each.read_text(encoding="utf-8")
            for each in folder.iterdir()
            if each.name.endswith(".j2")
        }
        self._environment = Environment(
            loader=DictLoader(sources), autoescape=True, undefined=StrictUndefined, trim_blocks=True, lstrip_blocks=True,
        )  # fmt: skip
        self._environment.globals.update(
            navigation=NAVIGATION, path_of=path_of, static=static_path, full_time=full_time, span_text=span_text,
            grouped=grouped, shown_number=shown_number, shown_output=shown_output, shown_value=shown_value, prose=prose, symbol_of=symbol_of,
            marks_of_row=marks_of_row, shown_coverage=shown_coverage, temperature_span=temperature_span,
        )  # fmt: skip

    def text(self, template: str, content: Mapping[str, Any]) -> str:
        """Return a template with its content filled in."""
        return visible(self._environment.get_template(template).render(**content))


def page(
    request: Request,
    template: str,
    /,
    *,
    status: int = 200,
    headers: Mapping[str, str] | None = None,
    **content: Any,
) -> Response:
    """Return a page.

    Parameters
    ----------
    request : Request
    template : str
        Name in `templates/web`, such as `cooldown.html.j2`; it extends `frame.html.j2`.
    status : int
    headers : mapping, optional
    **content
        What the template names.
    """
    site = request.app.state.site
    text = site.pages.text(template, {"lab_name": site.name, "here": request.url.path, **content})
    return HTMLResponse(text, status, headers=headers)

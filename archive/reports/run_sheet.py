"""The run sheet: one finished cooldown, as a page, as paper and as JSON, all three from one account.

Rules
-----
* No text of a person reaches a template's language: the page escapes every value, the paper reads them as JSON.
* The time of making is that of the newest accession, so the same archive gives the same bytes.
"""

from __future__ import annotations

import json
from functools import cache
from importlib.resources import files
from typing import Any, Literal

import typst
from jinja2 import DictLoader, Environment, StrictUndefined

from archive.reports.front_page import front_page
from archive.reports.holdings import Holdings
from archive.reports.later_pages import later_pages
from archive.reports.numbers import Shown
from archive.reports.prose import Prose, breakable
from archive.reports.standing import standing
from archive.reports.view import CooldownView
from schemas.visible_text import json_escaped, visible

__all__ = ["run_sheet_html", "run_sheet_json", "run_sheet_pdf"]


def run_sheet_html(view: CooldownView) -> str:
    """Return the run sheet as one self-contained page: drawings and style inside, no script, no outside reference.

    Parameters
    ----------
    view : CooldownView
    """
    return visible(_environment().get_template("run_sheet.html.j2").render(**account(view)))


def run_sheet_pdf(view: CooldownView, *, paper: Literal["a4", "us-letter"] = "a4") -> bytes:
    """Return the run sheet as PDF.

    Parameters
    ----------
    view : CooldownView
    paper : str
        ``a4`` or ``us-letter``; the printed box is the same.
    """
    template = files("templates").joinpath("run_sheet.typ").read_bytes()
    told = json.dumps(_for_paper(account(view)), ensure_ascii=False, sort_keys=True)
    made = typst.compile(
        template,
        sys_inputs={"account": told, "paper": paper},
        ignore_system_fonts=True,
        timestamp=int(view.newest.accessioned.timestamp()),
    )
    if not isinstance(made, bytes):
        raise TypeError("expected one document")
    return made


def run_sheet_json(view: CooldownView) -> str:
    """Return the run sheet as JSON: as shown, and the documents behind it with full precision.

    Parameters
    ----------
    view : CooldownView
    """
    told = {
        "format": "stillroom-run-sheet/1",
        "shown": _plain(account(view)),
        "accessions": [each.model_dump(mode="json") for each in view.accessions],
        "reductions": [each.model_dump(mode="json") for each in view.current],
        "amendments": [each.model_dump(mode="json") for each in view.amendments],
        "withdrawn": dict(sorted(view.withdrawn.items())),
        "sealed": {key: {"sha256": row[0], "size": row[1]} for key, row in sorted(view.sealed.items())},
    }
    return json_escaped(json.dumps(told, indent=1, ensure_ascii=False, allow_nan=False)) + "\n"


def account(view: CooldownView) -> dict[str, Any]:
    """Return all that a run sheet says, in the order in which it is said."""
    held = Holdings(view)
    stands = standing(view)
    return {**front_page(held, stands), **later_pages(held, stands)}


@cache
def _environment() -> Environment:
    folder = files("templates")
    names = ("run_sheet.html.j2", "run_sheet.css")
    return Environment(
        loader=DictLoader({name: folder.joinpath(name).read_text(encoding="utf-8") for name in names}),
        autoescape=True, undefined=StrictUndefined, trim_blocks=True, lstrip_blocks=True,
    )  # fmt: skip


def _plain(told: Any) -> Any:
    """Return the account as plain JSON; drawings are left to page and paper."""
    if isinstance(told, Shown | Prose):
        return told.plain
    if isinstance(told, dict):
        return {name: _plain(each) for name, each in told.items() if name != "svg"}
    return [_plain(each) for each in told] if isinstance(told, list | tuple) else told


def _for_paper(told: Any, name: str = "") -> Any:
    if isinstance(told, Prose):
        return {"prose": [[breakable(visible(piece.text)), piece.style] for piece in told.pieces]}
    if isinstance(told, Shown):
        return breakable(told.text)
    if isinstance(told, dict):
        return {key: _for_paper(each, key) for key, each in told.items()}
    if isinstance(told, list | tuple):
        return [_for_paper(each) for each in told]
    if name == "no.":
        return breakable(told, 6, 6)
    return breakable(visible(told)) if isinstance(told, str) and name not in ("svg", "sha256") else told

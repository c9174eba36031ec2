"""The run sheet: one finished cooldown, as a page, as paper and as JSON."""

from __future__ import annotations

import json
from typing import Literal

import typst
from jinja2 import Environment, PackageLoader, StrictUndefined, select_autoescape

from archive.reports.view import CooldownView

__all__ = ["run_sheet_html", "run_sheet_json", "run_sheet_pdf"]


def run_sheet_json(view: CooldownView) -> str:
    """Return the run sheet as JSON, with full precision."""
    newest = view.newest
    told = {
        "format": "stillroom-run-sheet/1",
        "archive": view.archive_name,
        "cooldown": newest.cooldown,
        "accession": newest.address,
        "accessioned": newest.accessioned.isoformat(),
        "sealed": {key: {"sha256": row[0], "size": row[1]} for key, row in sorted(view.sealed.items())},
        "document": newest.model_dump(mode="json"),
        "reductions": [each.model_dump(mode="json") for each in view.current],
    }
    return json.dumps(told, indent=1, sort_keys=True, ensure_ascii=False) + "\n"


def run_sheet_html(view: CooldownView) -> str:
    """Return the run sheet as one self-contained page."""
    environment = Environment(
        loader=PackageLoader("templates", ""), autoescape=select_autoescape(default=True), undefined=StrictUndefined
    )
    return environment.from_string(
        "<!doctype html><html lang=en><meta charset=utf-8><title>{{ name }}</title><h1>{{ name }}</h1><p>{{ purpose }}</p></html>"
    ).render(name=view.newest.cooldown, purpose=view.newest.sheet.purpose)


def run_sheet_pdf(view: CooldownView, *, paper: Literal["a4", "us-letter"] = "a4") -> bytes:
    """Return the run sheet as PDF for one paper."""
    source = b"#set page(paper: sys.inputs.paper)\n= #sys.inputs.name\n#sys.inputs.purpose\n"
    inputs = {"paper": paper, "name": view.newest.cooldown, "purpose": view.newest.sheet.purpose}
    made = typst.compile(source, sys_inputs=inputs, ignore_system_fonts=True, timestamp=int(view.newest.accessioned.timestamp()))
    return bytes(made)

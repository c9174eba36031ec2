"""Lists of the laboratory's long-lived things: cells, thermometers and what goes with them."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from starlette.requests import Request
from starlette.responses import Response

from archive.index import RecordRow
from archive.web.page import page
from archive.web.site import lab_of

__all__ = ["cells", "thermometers"]

_SAID = ("kind", "material", "isotope", "place", "scale", "date", "gas_source")
"""Fields that tell one record from another at a glance, as far as a record has them."""


@dataclass(frozen=True)
class _Thing:
    """A thing with its newest revision, and how many there are."""

    name: str
    newest: RecordRow
    revisions: int

    @property
    def said(self) -> str:
        """What it is, in a few words of its own."""
        content = self.newest.content
        return ", ".join(str(content[field]).replace("-", " ") for field in _SAID if content.get(field))


def cells(request: Request) -> Response:
    """Answer with cells, then what they are made of and filled with."""
    return _lists(request, "Cells", ("cell", "substrate", "sample", "cryostat"))


def thermometers(request: Request) -> Response:
    """Answer with thermometers and their calibrations."""
    return _lists(request, "Thermometers", ("thermometer", "calibration"))


def _lists(request: Request, title: str, kinds: tuple[str, ...]) -> Response:
    lab = lab_of(request)
    found = {kind: _things(lab.records, kind) for kind in kinds}
    return page(request, "records.html.j2", title=title, found=found, empty=not any(found.values()))


def _things(records: Callable[..., list[RecordRow]], kind: str) -> list[_Thing]:
    rows: dict[str, list[RecordRow]] = {}
    for row in records(kind=kind):
        rows.setdefault(row.name, []).append(row)
    return [
        _Thing(name, max(some, key=lambda row: row.revision), len({row.revision for row in some}))
        for name, some in sorted(rows.items())
    ]

"""What is asked of the plane: the fields behind the question mark, and the way back from a window to them."""

from __future__ import annotations

from typing import Literal
from urllib.parse import urlencode

from pydantic import BaseModel, ConfigDict, Field

from archive.index import SearchQuery
from archive.lab import Archive
from archive.lab.asking import search_query
from archive.lab.plane import PlaneState
from archive.lab.plane_asking import HEIGHTS, plane_window, window_fields
from archive.reports.plane_view import PlaneAxis, Window

__all__ = ["SORTS", "PlaneRequest", "Sort"]

Sort = Literal["address", "cell", "begin", "height", "temperature"]

SORTS: dict[Sort, str] = {
    "address": "sweep",
    "cell": "cell",
    "begin": "begin",
    "height": "",
    "temperature": "temperature",
}
"""By what the table can be sorted, and the word of its column; that of the axis has the word of the axis."""

_FILTERS = ("cell", "substrate", "kind", "cooldown", "since", "until")
_WINDOW = frozenset({"temperature", *HEIGHTS.values()})


class PlaneRequest(BaseModel):
    """The fields of the plane's address; those of a search have the same names and forms."""

    model_config = ConfigDict(extra="forbid", frozen=True)

    axis: PlaneAxis = "coverage"
    cell: str | None = None
    substrate: str | None = None
    kind: str | None = None
    cooldown: str | None = None
    since: str | None = None
    until: str | None = None
    state: PlaneState = "any"
    temperature: str | None = None
    coverage: str | None = None
    pressure: str | None = None
    lanes: str | None = None
    everything: bool = False
    view: Literal["picture", "table"] = "picture"
    sort: Sort = "height"
    descending: bool = False
    page: int = Field(1, ge=1, le=1_000_000)

    def search(self, lab: Archive) -> SearchQuery:
        """Return the search that chooses the sweeps."""
        return search_query(lab, {name: getattr(self, name) for name in _FILTERS})

    def filtered(self) -> bool:
        """Whether anything is left out by a filter."""
        return self.state != "any" or any(getattr(self, name) for name in _FILTERS)

    def window(self) -> Window | None:
        """Return the part of the plane that is asked for; None if none is."""
        return plane_window(self.axis, temperature=self.temperature, height=getattr(self, HEIGHTS[self.axis]))

    def at(self, window: Window | None = None, **changes: object) -> str:
        """Return the address of the same plane with another window (None: the first one) and other fields."""
        fields = self.model_dump(exclude_defaults=True, exclude=set(_WINDOW))
        fields |= {} if window is None else {**window_fields(window, self.axis), "everything": None}
        return _query({**fields, **changes})

    def here(self, **changes: object) -> str:
        """Return the address of the same plane and window with other fields."""
        return _query({**self.model_dump(exclude_defaults=True), **changes})


def _query(fields: dict[str, object]) -> str:
    said = {name: "1" if value is True else str(value) for name, value in fields.items() if value}
    return f"?{urlencode(said)}" if said else ""

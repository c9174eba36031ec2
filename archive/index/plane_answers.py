"""What the plane is drawn from: slim rows, since a picture may need a hundred thousand of them."""

from __future__ import annotations

from datetime import datetime
from typing import NamedTuple

__all__ = ["CellUse", "PlaneResult", "PlaneSweep", "Span"]


class PlaneSweep(NamedTuple):
    """A sweep as the plane needs it: coverage in mol/m^2, temperatures in K."""

    address: str
    kind: str
    cell: str | None
    substrate: str | None
    begin: str | None
    """UTC as text that sorts; a hundred thousand are not made instants in vain."""
    empty_cell: int
    coverage: float | None
    coverage_uncertainty: float | None
    temperature_low: float | None
    temperature_high: float | None
    reduced: bool
    """Whether a reduction of it exists that is not withdrawn."""
    withdrawn: bool


class PlaneResult(NamedTuple):
    """A result of a current reduction in SI units, by the sweep that was reduced."""

    sweep: str
    reduction: str
    name: str
    quantity: str
    value: float
    uncertainty: float | None


class Span(NamedTuple):
    """What a sweep reaches over: a channel in its own unit, or the coverages of the doses taken during it."""

    sweep: str
    unit: str
    low: float
    high: float


class CellUse(NamedTuple):
    """A cell and a substrate that some sweep names together."""

    cell: str | None
    substrate: str | None
    since: datetime | None

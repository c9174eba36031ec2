"""What the plane shows: sweeps as bars, transitions as points, lines of the universal jump; all in SI, free of any drawing.

Rules
-----
* One look (mark and shade) a cell, by its name: revisions of a cell are one cell.
* What is not shown is counted, with the reason.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, NamedTuple

__all__ = ["Bar", "Line", "PlaneAxis", "PlaneView", "Point", "Strip", "Window"]

PlaneAxis = Literal["coverage", "pressure", "cell"]
"""What the plane is against temperature: coverage in mol/m^2, pressure in Pa, or a lane for each cell."""


@dataclass(frozen=True)
class Window:
    """A part of the plane: temperatures in K, and the axis in its SI unit (for cells: numbers of lanes)."""

    cold: float
    warm: float
    bottom: float
    top: float


class Bar(NamedTuple):
    """A sweep: its temperatures, and where it stands on the axis (a dose run spans from `bottom` to `top`)."""

    address: str
    kind: str
    cell: str
    look: int
    begin: str | None
    """UTC, as text that sorts."""
    cold: float
    warm: float
    bottom: float
    top: float
    uncertainty: float | None
    marks: tuple[str, ...] = ()
    """Such as `empty cell`, `not reduced`, `stale`, `withdrawn`."""
    results: tuple[str, ...] = ()
    """The first headline results, each as `name = value`."""


class Point(NamedTuple):
    """A transition that a current reduction found, with standard uncertainties where they are known."""

    address: str
    """Of the result, such as `2026-03/s017@film-transition.2#T_KT`."""
    sweep: str
    name: str
    cell: str
    look: int
    temperature: float
    temperature_uncertainty: float | None
    height: float
    height_uncertainty: float | None


@dataclass(frozen=True)
class Strip:
    """Bars of one cell that lie so close that they are drawn as one: their number, and exactly what they reach over."""

    cell: str
    look: int
    count: int
    cold: float
    warm: float
    bottom: float
    top: float


@dataclass(frozen=True)
class Line:
    """Coverage at which a film becomes superfluid by the universal jump alone, above the inert layer.

    `source` is the address of the result from which the inert layer was taken; without it the line begins at zero.
    """

    cell: str
    look: int | None
    inert: float
    inert_uncertainty: float | None
    source: str | None


@dataclass(frozen=True)
class PlaneView:
    """A window of the plane.

    Attributes
    ----------
    axis : PlaneAxis
    cells : tuple of (str, int)
        Names of all cells that the filters leave, with their looks.
    window : Window
        What is shown.
    bars, points, strips, lines : tuple
    sweeps : int
        Sweeps that the filters leave; of a part that was asked for, those in it.
    outside : int or None
        Those of them beyond the window; None where a part was asked for, and nobody counted.
    unplaced : tuple of (str, int)
        Those without a place on the plane, by what they lack.
    merged : int
        Bars that stand in strips.
    thinned : int
        Points left out because another stands at the same place.
    in_pores : tuple of str
        Cells that get no line, for their films are in pores.
    lanes : tuple of (str, int)
        Cells from the lowest lane up, with the look of each, where the axis is that of cells.
    """

    axis: PlaneAxis
    cells: tuple[tuple[str, int], ...]
    window: Window
    bars: tuple[Bar, ...] = ()
    points: tuple[Point, ...] = ()
    strips: tuple[Strip, ...] = ()
    lines: tuple[Line, ...] = ()
    sweeps: int = 0
    outside: int | None = 0
    unplaced: tuple[tuple[str, int], ...] = ()
    merged: int = 0
    thinned: int = 0
    in_pores: tuple[str, ...] = ()
    lanes: tuple[tuple[str, int], ...] = ()

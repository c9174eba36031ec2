"""One curve of a reduction that has no figure of its own kind: a laboratory's own plans."""

from __future__ import annotations

import numpy as np

from archive.reports.axis_units import in_unit, symbol
from archive.reports.figure_plots import points, stacked
from archive.reports.figure_style import HEIGHTS, Column, Drawn, NoFigure, name_of, saved
from archive.reports.figure_values import column_of, spread_of
from archive.reports.scope import Scope
from archive.reports.small_reductions import shown_arrays
from schemas.lineage import OutputEntry, ReductionDocument
from schemas.units import parse_unit

__all__ = ["curve"]


def curve(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return the curve of a reduction whose plan has no figure of its own.

    Raises
    ------
    NoFigure
        No two arrays have one length, or nothing in them is a number.
    """
    found = shown_arrays(reduction)
    if found is None:
        raise NoFigure("its outputs are no two arrays of one length")
    along, shown = found
    x, y = column_of(scope, reduction, along.name), column_of(scope, reduction, shown.name)
    if x is None or y is None or x.shape != y.shape or not np.isfinite(x * y).any():
        raise NoFigure(f"the archive holds no values of {shown.name} along {along.name}")
    return _drawn(scope, reduction, along, shown, x, y)


def _drawn(
    scope: Scope, reduction: ReductionDocument, along: OutputEntry, shown: OutputEntry, x: Column, y: Column
) -> Drawn:
    xs, x_unit = in_unit(x, along.unit, along.quantity)
    ys, y_unit = in_unit(y, shown.unit, shown.quantity)
    figure, (axes,) = stacked([1], height=HEIGHTS[0] + 0.4)
    spread, common = spread_of(scope, reduction, shown.name)
    size = float(np.nanmax(np.abs(y)))
    factor = float(np.nanmax(np.abs(ys))) / size if size > 0 else 1.0
    points(axes, xs, ys, None if spread is None or spread.shape != y.shape else spread * factor)
    if along.quantity == "time" and bool((xs[np.isfinite(xs)] > 0).all() and (ys[np.isfinite(ys)] > 0).all()):
        axes.set(xscale="log", yscale="log")
    axes.set(xlabel=_label(along, x_unit), ylabel=_label(shown, y_unit))
    shared = f"; all points share {100 * common:.2g} per cent" if common > 0 else ""
    caption = (
        f"{shown.description[:1].upper()}{shown.description[1:]} against {along.description}, {reduction.sweep} by plan {reduction.plan.address}. "
        f"Error bars: standard uncertainty of each point alone{shared}."
    )
    return Drawn(name_of(reduction.plan.name, reduction), saved(figure), caption, (reduction.address,))


def _label(output: OutputEntry, unit: str) -> str:
    name = symbol(output.quantity)
    return name if unit == "1" else f"{name} / {parse_unit(unit).typographic}"

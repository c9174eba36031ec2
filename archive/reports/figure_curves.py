"""One curve of a reduction that has no figure of its own kind: heat capacity, bulk density, stability, a laboratory's own plans."""

from __future__ import annotations

import numpy as np
from matplotlib.figure import Figure

from archive.reports.figure_style import WIDTH, Column, Drawn, column_of, name_of, saved
from archive.reports.scope import Scope
from archive.reports.small_plots import in_unit, symbol
from schemas.lineage import OutputEntry, ReductionDocument
from schemas.units import parse_unit

__all__ = ["curve"]

# Along which output, and which one is shown, in order of liking.
_ALONG = ("middle_temperature", "temperature", "averaging_time", "amount")
_SHOWN = ("molar_heat_capacity", "heat_capacity", "superfluid_fraction", "allan_deviation", "dissipation")


def curve(scope: Scope, reduction: ReductionDocument) -> Drawn | None:
    """Return the curve of a reduction, or None where it has no two arrays of one length.

    Notes
    -----
    Films are left to the figure that all films of a cell share. The band is the combined standard uncertainty.
    """
    arrays = {each.name: each for each in reduction.outputs if each.rows}
    if "superfluid_density" in arrays and arrays["superfluid_density"].quantity == "areal_mass_density":
        return None
    along = next((arrays[name] for name in _ALONG if name in arrays), None)
    if along is None:
        return None
    alike = [each for each in arrays.values() if each.rows == along.rows and each.name not in _ALONG]
    shown = next((arrays[name] for name in _SHOWN if arrays.get(name) in alike), alike[-1] if alike else None)
    x = column_of(scope, reduction, along.name)
    y = None if shown is None else column_of(scope, reduction, shown.name)
    if shown is None or x is None or y is None or x.shape != y.shape or not np.isfinite(x * y).any():
        return None
    return _drawn(scope, reduction, along, shown, x, y)


def _drawn(
    scope: Scope, reduction: ReductionDocument, along: OutputEntry, shown: OutputEntry, x: Column, y: Column
) -> Drawn:
    xs, x_unit = in_unit(x, along.unit, along.quantity)
    ys, y_unit = in_unit(y, shown.unit, shown.quantity)
    figure = Figure(figsize=(WIDTH, 2.6), layout="constrained")
    axes = figure.subplots()
    order = np.argsort(xs)
    axes.plot(xs[order], ys[order], "o", color="black", markerfacecolor="none", markeredgewidth=0.5)
    spread = column_of(scope, reduction, f"{shown.name}.uncertainty")
    if spread is not None and spread.shape == y.shape:
        factor = float(np.nanmax(np.abs(ys)) / np.nanmax(np.abs(y)))
        axes.fill_between(
            xs[order],
            (ys - spread * factor)[order],
            (ys + spread * factor)[order],
            color="black",
            alpha=0.2,
            linewidth=0,
        )
    if along.quantity == "time":
        axes.set(xscale="log", yscale="log")
    axes.set(xlabel=_label(along, x_unit), ylabel=_label(shown, y_unit))
    caption = f"{shown.description[:1].upper()}{shown.description[1:]} against {along.description}, {reduction.sweep} by plan {reduction.plan.address}; band: combined standard uncertainty."
    return Drawn(name_of(reduction.plan.name, reduction), saved(figure), caption, (reduction.address,))


def _label(output: OutputEntry, unit: str) -> str:
    name = symbol(output.quantity)
    return name if unit == "1" else f"{name} / {parse_unit(unit).typographic}"

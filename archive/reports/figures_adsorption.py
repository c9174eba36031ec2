"""Figures of adsorption: dead volume by expansion, and isotherm with the analysis by Brunauer, Emmett and Teller and its range."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from numpy.typing import NDArray

from archive.reports.figure_plots import (
    bar_of_all,
    enlarged,
    letters,
    line,
    points,
    residuals,
    stacked,
)
from archive.reports.figure_style import HEIGHTS, WIDTH, Column, Drawn, name_of, saved
from archive.reports.figure_values import fact, scalar, spread_of, step_of, taken, told, wanted
from archive.reports.scope import Scope
from schemas.lineage import ReductionDocument

__all__ = ["dead_volume_figure", "isotherm_figure"]


def dead_volume_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return the gas admitted against pressure with what the dead volume and the stated volumes hold, and the residuals."""
    step = step_of(reduction, "dead-volume-fit")
    p, n = taken(scope, reduction, step, "pressure"), taken(scope, reduction, step, "amount")
    r = wanted(scope, reduction, "residual")
    point, common = spread_of(scope, reduction, step.inputs["amount"].address.partition("#")[2])
    order = np.argsort(p)
    figure, panels = stacked([2.4, 1], height=HEIGHTS[1])
    x, x_unit = enlarged(p, "Pa")
    factor, unit = enlarged(n, "mol")
    points(panels[0], p / x, n / factor, None if point is None else point / factor)
    line(panels[0], p[order] / x, (n - r)[order] / factor)
    panels[0].set(ylabel=f"$n$ / {unit}", ylim=(0, None))
    top = float(np.nanmax(n)) / factor
    bar_of_all(panels[0], 0.5 * top, 0.5 * common * top)
    factor, unit = enlarged(r, "mol")
    residuals(panels[1], p / x, r / factor, None if point is None else point / factor, name=f"$r$ / {unit}")
    panels[1].set(xlabel=f"$p$ / {x_unit}", xlim=(0, None))
    shared = f"; all points share {100 * common:.2g} per cent" if common > 0 else ""
    results = told(scope, reduction, dead_volume="dead volume", offset="amount at zero pressure of a line whose offset is free")  # fmt: skip
    caption = (
        f"Expansions of gas into the cell, {reduction.sweep}: amount admitted against pressure, with what the dead volume found and the stated volumes hold (line); "
        f"residuals below. Error bars: standard uncertainty of each point alone{shared}. {results}"
    )
    return Drawn(name_of("dead-volume", reduction), saved(figure), caption, (reduction.address,))


def isotherm_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return isotherm, BET plot, its residuals and the transform that ends the range (Rouquerol), with the chosen range marked."""
    step = step_of(reduction, "bet-area")
    x, n = taken(scope, reduction, step, "relative_pressure"), taken(scope, reduction, step, "amount")
    low, high = fact(step, "low"), fact(step, "high")
    unit = "mol/kg" if step.facts.get("amounts_in") == "specific_amount" else "mol"
    monolayer, C = scalar(reduction, "monolayer"), scalar(reduction, "constant")
    inside = (x >= low * (1 - 1e-12)) & (x <= high * (1 + 1e-12))
    factor, label = enlarged(n, unit)
    figure = Figure(figsize=(WIDTH, 4.2), layout="constrained")
    made = figure.subplots(2, 2, height_ratios=[1.4, 1])
    whole, plot, transform, below = made[0, 0], made[0, 1], made[1, 0], made[1, 1]

    def law(x: Column) -> Column:
        return np.asarray(monolayer * C * x / ((1 - x) * (1 + (C - 1) * x)))

    used, left = np.where(inside, x, np.nan), np.where(inside, np.nan, x)
    points(whole, used, n / factor, filled=True)
    points(whole, left, n / factor)
    grid = np.linspace(0, min(1.15 * high, float(np.nanmax(x))), 200)
    line(whole, grid, law(grid) / factor)
    whole.axhline(monolayer / factor, color="black", linewidth=0.4, linestyle=":")
    whole.set(xlabel="$p/p_0$", ylabel=f"$n$ / {label}", ylim=(0, 1.1 * np.nanmax(n) / factor))
    with np.errstate(invalid="ignore", divide="ignore"):
        y = x / (n / factor * (1 - x))
    near = x < 1.5 * high
    points(plot, np.where(near, used, np.nan), y, filled=True)
    points(plot, np.where(near, left, np.nan), y)
    ends = np.array([0.0, high])
    line(plot, ends, (1 / C + (C - 1) / C * ends) / (monolayer / factor))
    plot.set(xlabel="$p/p_0$", ylabel=f"$x/[n(1-x)]$ / ({label})$^{{-1}}$", ylim=(0, None), xlim=(0, 1.3 * high))  # fmt: skip
    _rouquerol(transform, x, n / factor, inside, label)
    with np.errstate(invalid="ignore", divide="ignore"):
        # A first row in vacuum has neither an amount nor a law.
        percent = 100 * (n / law(x) - 1)
    residuals(below, used, percent, name="$r$ / %")
    below.set(xlabel="$p/p_0$", xlim=(0, 1.05 * high))
    letters([whole, plot, transform, below])
    results = told(scope, reduction, area="area", monolayer="monolayer", constant="C", plateau_amount="plateau")  # fmt: skip
    caption = (
        f"Isotherm {reduction.sweep}, analysed by the method of Brunauer, Emmett and Teller: (a) amount against relative pressure, with the fitted equation (line) and the monolayer (dotted); "
        f"(b) the straight line of the method; (c) n(1 - x), up to whose greatest value the range may reach (criterion of Rouquerol); (d) departure of the amounts from the equation. "
        f"Filled: the range from {low:.4g} to {high:.4g} that was used. {results}"
    )
    return Drawn(name_of("isotherm", reduction), saved(figure), caption, (reduction.address,))


def _rouquerol(panel: Axes, x: Column, n: Column, inside: NDArray[np.bool_], label: str) -> None:
    y = n * (1 - x)
    points(panel, np.where(inside, x, np.nan), y, filled=True)
    points(panel, np.where(inside, np.nan, x), y)
    top = int(np.nanargmax(y))
    panel.axvline(x[top], color="black", linewidth=0.4, linestyle=":")
    panel.set(xlabel="$p/p_0$", ylabel=f"$n(1-x)$ / {label}")

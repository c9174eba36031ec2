"""Figure of the universal jump: areal density at the transition against its temperature, all films of a cell on one line."""

from __future__ import annotations

import numpy as np

from archive.physics.film_static import UNIVERSAL_JUMP
from archive.reports.figure_plots import bar_of_all, enlarged, line, points, residuals, stacked
from archive.reports.figure_style import HEIGHTS, Column, Drawn, NoFigure, name_of, saved
from archive.reports.figure_values import column_of, fact, spread_of, taken, told
from archive.reports.scope import Scope
from schemas.lineage import ReductionDocument, StepRecord

__all__ = ["jump_figure"]

_WAYS = (("line_density", "by the peak of dissipation"), ("line_density_by_fit", "by the dynamic theory"))


def jump_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return density at the transition against temperature with the fitted and the universal line, and residuals, for each way to the transition."""
    ways = [
        (step, name)
        for output, name in _WAYS
        for step in reduction.steps
        if output in step.outputs and column_of(scope, reduction, output) is not None
    ]
    if not ways:
        raise NoFigure("no line was fitted")
    figure, panels = stacked([2.6, 1], height=HEIGHTS[1])
    shares, highest, factor, unit = [], 0.0, 1.0, ""
    for k, (step, name) in enumerate(ways):
        T, sigma, u, common = _films(scope, reduction, step)
        factor, unit = enlarged(sigma, "kg/m^2") if k == 0 else (factor, unit)
        points(panels[0], T, sigma / factor, None if u is None else u / factor, look=k, label=name)
        highest = max(highest, float(np.nanmax(T)))
        ends = np.array([0.0, 1.12 * highest])
        line(panels[0], ends, fact(step, "slope_kg_m2_K") * ends / factor, look=k)
        r = column_of(scope, reduction, "residual" if k == 0 and "residual" in step.outputs else "residual_by_fit")  # fmt: skip
        if r is not None:
            # Two ways to one film would hide each other.
            residuals(panels[1], T + 0.004 * highest * k, r, name="$r/u$", look=k)
        shares.append((name, common, 0.93 + 0.03 * k, float(np.nanmax(sigma)) / factor))
    grid = np.array([0.0, 1.12 * highest])
    line(panels[0], grid, UNIVERSAL_JUMP * grid / factor, style=":", label="universal line", colour="#a61c00")
    panels[0].set(ylabel=r"$\sigma_\mathrm{s}(T_\mathrm{KT})$ / " + unit, xlim=(0, grid[1]), ylim=(0, None))
    panels[0].legend(loc="upper left")
    for _, common, at, top in shares:
        bar_of_all(panels[0], 0.45 * top, 0.45 * common * top, at=at)
    panels[1].set_xlabel(r"$T_\mathrm{KT}$ / K")
    common_words = "; ".join(f"{100 * common:.2g} per cent {name}" for name, common, _, _ in shares)
    results = told(scope, reduction, slope_ratio="slope over the universal one, by the peak", slope_ratio_by_fit="by the dynamic theory")  # fmt: skip
    caption = (
        f"Areal superfluid density at the static transition against its temperature, all films of the cell up to {reduction.sweep}, with lines through the origin and the universal one of Nelson "
        f"and Kosterlitz; below, the residuals in standard uncertainties. Error bars: what each film does not share with the others; the bars at the right: what all films share ({common_words}). {results}"
    )
    return Drawn(name_of("universal-jump", reduction), saved(figure), caption, (reduction.address,))


def _films(
    scope: Scope, reduction: ReductionDocument, step: StepRecord
) -> tuple[Column, Column, Column | None, float]:
    """Return transition temperatures, densities, what is each density's own uncertainty, and the common share."""
    T, sigma = (taken(scope, reduction, step, port) for port in ("transition", "density"))
    u, common = spread_of(scope, reduction, step.inputs["density"].address.partition("#")[2])
    return T, sigma, u if u is not None and u.shape == sigma.shape else None, common

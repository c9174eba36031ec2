"""Figure of third sound: speed, thickness and areal superfluid density while helium is added, with the universal jump."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from matplotlib.axes import Axes

from archive.physics.film_static import UNIVERSAL_JUMP
from archive.physics.linear_fit import straight_line
from archive.reports.figure_plots import (
    bar_of_all,
    enlarged,
    letters,
    line,
    points,
    residuals,
    stacked,
    tight_to,
)
from archive.reports.figure_style import Column, Drawn, NoFigure, name_of, saved
from archive.reports.figure_values import fact, output_of, spread_of, step_of, taken, told, wanted
from archive.reports.scope import Scope
from schemas.lineage import ReductionDocument

__all__ = ["third_sound_figure"]


def third_sound_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return speed and thickness against coverage, and the areal density with the line that meets the universal jump, and its residuals."""
    step = step_of(reduction, "areal-density-from-third-sound")
    n, d = taken(scope, reduction, step, "coverage"), taken(scope, reduction, step, "thickness")
    c, sigma = wanted(scope, reduction, "third_sound_speed"), wanted(scope, reduction, "superfluid_density")
    if not np.isfinite(n * sigma).any():
        raise NoFigure("no row has both a coverage and an areal density")
    figure, panels = stacked([1.2, 1, 1.8, 1], height=5.6)
    x, x_unit = enlarged(n, "mol/m^2")
    for panel, values, symbol, unit, name in (
        (panels[0], c, "$c_3$", "m/s", "third_sound_speed"), (panels[1], d, "$d$", "m", step.inputs["thickness"].address.partition("#")[2]),
        (panels[2], sigma, r"$\sigma_\mathrm{s}$", "kg/m^2", "superfluid_density"),
    ):  # fmt: skip
        factor, label = enlarged(values, unit)
        point, common = spread_of(scope, reduction, name)
        points(panel, n / x, values / factor, None if point is None or point.shape != values.shape else point / factor)  # fmt: skip
        panel.set_ylabel(f"{symbol} / {label}")
        panel.set_ylim(0, None)
        middle = float(np.nanmedian(values)) / factor
        bar_of_all(panel, middle, common * middle)
    results = told(scope, reduction, transition_coverage="transition at n/A", lowest_ratio="least density seen over the jump")  # fmt: skip
    onset = output_of(reduction, "transition_coverage")
    fitted = ""
    if onset is not None and onset.value is not None:
        _line_to_jump(scope, reduction, panels, (n, sigma), onset.value, x)
        fitted = ", with the straight line through the thinnest films (solid) that meets the universal jump (dashed) at the transition (mark), and its residuals below"
    else:
        figure.delaxes(panels.pop())
    panels[-1].set_xlabel(f"$n/A$ / {x_unit}")
    panels[-1].tick_params(labelbottom=True)
    tight_to(panels[-1], np.append(n, np.nan if onset is None or onset.value is None else onset.value) / x)
    letters(panels[:3])
    common = spread_of(scope, reduction, "superfluid_density")[1]
    shared = f"; all points of (c) share {100 * common:.2g} per cent, drawn as one bar where it can be seen" if common > 0 else ""  # fmt: skip
    caption = (
        f"Third sound against coverage, {reduction.sweep}: (a) speed, (b) thickness of the film, (c) areal superfluid density{fitted}. "
        f"Error bars: standard uncertainty of each point alone{shared}. {results}"
    )
    return Drawn(name_of("third-sound", reduction), saved(figure), caption, (reduction.address,))


def _line_to_jump(
    scope: Scope, reduction: ReductionDocument, panels: Sequence[Axes], columns: tuple[Column, Column], onset: float, x: float
) -> None:  # fmt: skip
    n, sigma = columns
    step = step_of(reduction, "third-sound-onset")
    jump = UNIVERSAL_JUMP * fact(step, "temperature_K")
    factor, unit = enlarged(sigma, "kg/m^2")
    known = np.flatnonzero(np.isfinite(n) & np.isfinite(sigma) & (np.nan_to_num(sigma) > 0))
    chosen = known[np.argsort(n[known], kind="stable")][: int(fact(step, "films"))]
    point = spread_of(scope, reduction, "superfluid_density")[0]
    u = None if point is None or not (point[chosen] > 0).all() else point[chosen]
    fit = straight_line(n[chosen] - onset, sigma[chosen], standard_uncertainty=u, absolute=False)
    ends = np.array([min(onset, float(n[chosen].min())), float(n[chosen].max())])
    level, slope = fit.value("intercept"), fit.value("slope")
    line(panels[2], ends / x, (level + slope * (ends - onset)) / factor)
    panels[2].axhline(jump / factor, color="black", linewidth=0.8, linestyle="--")
    panels[2].plot([onset / x], [jump / factor], marker="|", markersize=9, color="black")
    r = np.full(n.shape, np.nan)
    r[chosen] = sigma[chosen] - level - slope * (n[chosen] - onset)
    factor, unit = enlarged(r, "kg/m^2")
    residuals(panels[3], n / x, r / factor, None if point is None else point / factor, name=f"$r$ / {unit}")

"""Figure of the heat capacity at a superfluid transition in pores: the whole, what lies above the smooth part, and the residuals."""

from __future__ import annotations

import numpy as np

from archive.physics.porous_singularity import mean_shape
from archive.reports.figure_plots import enlarged, letters, line, points, residuals, stacked, tight_to
from archive.reports.figure_style import Drawn, NoFigure, name_of, saved
from archive.reports.figure_values import fact, scalar, step_of, taken, told, wanted
from archive.reports.scope import Scope
from schemas.lineage import ReductionDocument

__all__ = ["porous_heat_figure"]


def porous_heat_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return heat capacity with its smooth part, the rest with the fitted and the expected singularity, and the residuals."""
    step = step_of(reduction, "heat-capacity-singularity")
    T, C = taken(scope, reduction, step, "temperature"), taken(scope, reduction, step, "heat_capacity")
    smooth, r = wanted(scope, reduction, "background"), wanted(scope, reduction, "residual")
    used = np.isfinite(smooth) & np.isfinite(T) & np.isfinite(C)
    if not used.any():
        raise NoFigure("no reading was fitted")
    at, amplitude = fact(step, "at_K"), scalar(reduction, "singularity")
    grid = np.linspace(float(T[used].min()), float(T[used].max()), 400)
    shape = mean_shape(grid / at - 1, width=max(fact(step, "blur_mK") * 1e-3, 1e-9) / at)
    figure, panels = stacked([1.6, 1.6, 1], height=4.8)
    factor, unit = enlarged(C, "J/K")
    points(panels[0], np.where(used, T, np.nan), C / factor)
    points(panels[0], np.where(used, np.nan, T), C / factor, look=5, pale=True)
    order = np.flatnonzero(used)[np.argsort(T[used])]
    line(panels[0], T[order], (C - r)[order] / factor)
    panels[0].set_ylabel(f"$C$ / {unit}")
    # The singular part carries the constant A/alpha, which is no part of the shape: all are shown less their mean.
    middle = float(np.mean((C - smooth)[used]))
    factor, unit = enlarged((C - smooth - middle)[used], "J/K")
    points(panels[1], np.where(used, T, np.nan), (C - smooth - middle) / factor)
    centred = shape - float(np.mean(shape))
    line(panels[1], grid, amplitude * centred / factor, colour="#a61c00", label="fitted")
    expected = _expected(reduction)
    if expected is not None:
        line(panels[1], grid, expected * centred / factor, look=1, label="by two-scale-factor universality")
    panels[1].set_ylabel(rf"$\Delta C$ / {unit}")
    panels[1].legend(loc="upper right")
    factor, unit = enlarged(r[used], "J/K")
    residuals(panels[2], T, r / factor, name=f"$r$ / {unit}")
    panels[2].set_xlabel("$T$ / K")
    for panel in panels:
        panel.axvline(at, color="black", linewidth=0.4, linestyle=":")
    tight_to(panels[2], T)
    letters(panels[:2])
    results = told(scope, reduction, singularity="amplitude", bound="bound", bound_over_expected="bound over the expected amplitude")  # fmt: skip
    caption = (
        f"Heat capacity at the superfluid transition in a porous medium, {reduction.sweep}: (a) the whole with the fit (line), (b) less the smooth part of the fit and its mean, with the fitted "
        f"singularity{' and that which the coherence length asks for (dashed)' if expected is not None else ''}; residuals below. Dotted: transition of the superfluid. {results}"
    )
    return Drawn(name_of("porous-heat-capacity", reduction), saved(figure), caption, (reduction.address,))


def _expected(reduction: ReductionDocument) -> float | None:
    for step in reduction.steps:
        entry = step.inputs.get("expected")
        if step.name == "singularity-bound" and entry is not None and entry.value is not None:
            return entry.value.value
    return None

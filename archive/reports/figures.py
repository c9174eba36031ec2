"""Figures of the methods appendix: one for each reduction by its plan, and those over all films of a cell; vector PDF.

Rules
-----
* A plan of the laboratory's own, which has no figure of its kind, gets the curve of its arrays.
* Where a figure's numbers are not all held there is no figure, and a sentence that says why.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import nullcontext
from typing import Final

import matplotlib as mpl

from archive.reports.figure_curves import curve
from archive.reports.figure_style import STYLE, Drawn, NoFigure, Undrawn, as_svg
from archive.reports.figures_adsorption import dead_volume_figure, isotherm_figure
from archive.reports.figures_bulk import (
    addenda_figure,
    fraction_figure,
    heat_capacity_figure,
    superfluid_law_figure,
)
from archive.reports.figures_calibration import calibration_figure, drift_figures
from archive.reports.figures_cell import cell_figures
from archive.reports.figures_current import current_figure
from archive.reports.figures_drive import linearity_figure, stability_figure
from archive.reports.figures_film import dynamic_figure, porous_figure, sweep_figure, transition_figure
from archive.reports.figures_jump import jump_figure
from archive.reports.figures_lines import pulse_figure, spectrum_figure, tracking_figure
from archive.reports.figures_oscillator import (
    background_figure,
    decay_figure,
    dose_figure,
    resonance_figure,
)
from archive.reports.figures_porous_heat import porous_heat_figure
from archive.reports.figures_third_sound import third_sound_figure
from archive.reports.scope import Scope
from schemas.lineage import ReductionDocument

__all__ = ["MAKERS", "Drawn", "Undrawn", "figure_of", "figures"]

MAKERS: Final[dict[str, Callable[[Scope, ReductionDocument], Drawn]]] = {
    "bulk-oscillator": fraction_figure,
    "bulk-superfluid-density": superfluid_law_figure,
    "dead-volume": dead_volume_figure,
    "dose-run": dose_figure,
    "drive-linearity": linearity_figure,
    "drive-pulse": pulse_figure,
    "empty-calorimeter": addenda_figure,
    "empty-cell": background_figure,
    "film-dynamic": dynamic_figure,
    "film-transition": transition_figure,
    "heat-capacity": heat_capacity_figure,
    "isotherm-bet": isotherm_figure,
    "isotherm-from-doses": isotherm_figure,
    "line-tracking": tracking_figure,
    "persistent-current": current_figure,
    "porous-film": porous_figure,
    "porous-heat-capacity": porous_heat_figure,
    "pulse-lines": spectrum_figure,
    "resonance": resonance_figure,
    "resonance-tracking": tracking_figure,
    "ringdown": decay_figure,
    "stability": stability_figure,
    "thermometer-calibration": calibration_figure,
    "third-sound": third_sound_figure,
    "universal-jump": jump_figure,
}
"""Which figure a plan has, by the plan's name."""


def figures(scope: Scope) -> Iterator[Drawn | Undrawn]:
    """Yield the figures of the reductions at hand, why there is none of the others, those over all films of a cell, and the drift of thermometers."""
    with mpl.rc_context(STYLE):  # type: ignore[arg-type]
        told: set[str] = set()
        for reduction in scope.reductions:
            yield _made(MAKERS.get(reduction.plan.name, curve), scope, reduction)
            cell = scope.cell_of(reduction)
            # One sweep of each cell is shown from its raw signal to the amount that flows.
            if cell not in told and {"film-transition", "porous-film"} & {reduction.plan.name}:
                told.add(cell)
                yield _made(sweep_figure, scope, reduction, "figure of the whole way from signal to amount")
        yield from cell_figures(scope)
        yield from drift_figures(scope)


def figure_of(scope: Scope, reduction: ReductionDocument, *, kind: str = "pdf") -> Drawn | Undrawn:
    """Return the figure of one reduction, or why there is none.

    Parameters
    ----------
    scope : Scope
        That holds the reduction.
    reduction : ReductionDocument
    kind : {"pdf", "svg"}
    """
    maker = MAKERS.get(reduction.plan.name, curve)
    with mpl.rc_context(STYLE), as_svg() if kind == "svg" else nullcontext():  # type: ignore[arg-type]
        return _made(maker, scope, reduction)


def _made(
    maker: Callable[[Scope, ReductionDocument], Drawn],
    scope: Scope,
    reduction: ReductionDocument,
    what: str = "figure",
) -> Drawn | Undrawn:
    try:
        return maker(scope, reduction)
    except NoFigure as why:
        return Undrawn(reduction.address, str(why), what)

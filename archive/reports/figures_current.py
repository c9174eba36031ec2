"""Figures of persistent currents: density at kept circulation on the way there and back, decay at one temperature, dependence on coverage."""

from __future__ import annotations

import numpy as np

from archive.physics.helium_liquid import density, superfluid_fraction
from archive.physics.linear_fit import straight_line
from archive.physics.persistent_current import decaying
from archive.reports.figure_plots import enlarged, line, logarithmic, points, residuals, stacked, tight_to
from archive.reports.figure_style import HEIGHTS, Column, Drawn, NoFigure, name_of, saved
from archive.reports.figure_values import (
    column_of,
    fact,
    output_of,
    outputs_with,
    scalar,
    spread_of,
    step_of,
    taken,
    told,
)
from archive.reports.scope import Scope
from schemas.lineage import ReductionDocument

__all__ = ["current_figure"]


def current_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return the figure of what a record of a persistent current holds: a decay, a run of coverages, or a cycle of temperature."""
    if outputs_with(reduction, "exponent"):
        return _decay(scope, reduction)
    if outputs_with(reduction, "onset_coverage"):
        return _coverages(scope, reduction)
    return _cycle(scope, reduction)


def _cycle(scope: Scope, reduction: ReductionDocument) -> Drawn:
    T = column_of(scope, reduction, "temperature")
    rho = column_of(scope, reduction, "superfluid_density")
    if T is None or rho is None or not np.isfinite(T * rho).any():
        raise NoFigure(
            "the record holds neither a decay, nor a run of coverages, nor the density of a full ring"
        )
    point, common = spread_of(scope, reduction, "superfluid_density")
    table = density(T) * superfluid_fraction(T)
    turn = int(np.nanargmax(T))
    rows = np.arange(T.size)
    figure, panels = stacked([2.6, 1], height=HEIGHTS[1])
    for k, (part, name) in enumerate(((rows <= turn, "warming"), (rows > turn, "cooling"))):
        at = np.where(part, T, np.nan)
        points(panels[0], at, rho, point, look=k, label=name)
        residuals(panels[1], at, 100 * (rho / table - 1), None if point is None else 100 * point / table, name="$r$ / %", look=k)  # fmt: skip
    grid = np.linspace(float(np.nanmin(T)), float(np.nanmax(T)), 300)
    line(
        panels[0],
        grid,
        np.asarray(density(grid) * superfluid_fraction(grid)),
        label="tabulated",
        colour="#a61c00",
    )
    panels[0].set_ylabel(r"$\rho_\mathrm{s}$ / kg m$^{-3}$")
    panels[0].set_ylim(0, None)
    panels[0].legend(loc="lower left")
    panels[1].set_xlabel("$T$ / K")
    tight_to(panels[1], T)
    shared = f"; all points share {100 * common:.2g} per cent" if common > 0 else ""
    results = told(scope, reduction, remaining="on the way back over on the way there")
    caption = (
        f"Persistent current, {reduction.sweep}: superfluid density at kept circulation while the ring warmed and cooled again, put on the tabulated density "
        f"of the coldest rows, with the tabulated one (line; Donnelly and Barenghi 1998); below, the difference from that. Error bars: standard uncertainty of each point alone{shared}. {results}"
    )
    return Drawn(name_of("persistent-current", reduction), saved(figure), caption, (reduction.address,))


def _decay(scope: Scope, reduction: ReductionDocument) -> Drawn:
    step = step_of(reduction, "current-decay")
    t, L = taken(scope, reduction, step, "time"), taken(scope, reduction, step, "angular_momentum")
    t = t - np.nanmin(t)
    first, tau, m = (scalar(reduction, name) for name in ("initial_angular_momentum", "decay_time", "exponent"))  # fmt: skip
    fitted = decaying(np.nan_to_num(t), initial=first, rate=1 / tau, exponent=m)
    figure, panels = stacked([2.6, 1], height=HEIGHTS[1])
    factor, unit = enlarged(L, "kg m^2/s")
    scale = 3600.0
    points(panels[0], t / scale, L / factor)
    line(panels[0], t / scale, fitted / factor, label="power law in time", colour="#a61c00")
    early = first * np.exp(-t / tau)
    seen = early > 0.8 * np.nanmin(L)
    line(
        panels[0],
        np.where(seen, t, np.nan) / scale,
        early / factor,
        look=1,
        label="exponential of the same first slope",
    )
    logarithmic(panels[0])
    panels[0].set_ylabel(f"$L$ / {unit}")
    panels[0].legend(loc="upper right")
    r = L - fitted
    factor, unit = enlarged(r, "kg m^2/s")
    residuals(panels[1], t / scale, r / factor, name=f"$r$ / {unit}")
    panels[1].set_xlabel("$t$ / h")
    tight_to(panels[1], t / scale)
    results = told(scope, reduction, exponent="m", decay_time="decay time at the first reading", areal_density_from_decay="areal superfluid density")  # fmt: skip
    caption = f"Decay of a persistent current at one temperature, {reduction.sweep}: angular momentum (points) with the power law in time (solid) and the exponential of the same first slope (dashed); residuals of the power law below. {results}"
    return Drawn(name_of("persistent-current", reduction), saved(figure), caption, (reduction.address,))


def _coverages(scope: Scope, reduction: ReductionDocument) -> Drawn:
    step = step_of(reduction, "current-against-coverage")
    n, L = taken(scope, reduction, step, "coverage"), taken(scope, reduction, step, "angular_momentum")
    share = step.parameters.get("share", 1.0)
    known = np.isfinite(n) & np.isfinite(L)
    if isinstance(share, float) and share < 1:
        known &= np.nan_to_num(n) >= np.quantile(n[known], 1 - share)
    onset = scalar(reduction, "onset_coverage")
    # The line's zero is the result; its slope follows from these points.
    fitted = straight_line(n[known] - onset, L[known], absolute=False)
    thin = output_of(reduction, "onset_coverage")
    is_length = thin is not None and thin.quantity == "length"
    x, x_unit = enlarged(n, "m" if is_length else "mol/m^2")
    figure, panels = stacked([2.6, 1], height=HEIGHTS[1])
    factor, unit = enlarged(L, "kg m^2/s")
    points(panels[0], n / x, L / factor)
    ends = np.array([onset, float(np.nanmax(n))])

    def on_line(n: Column) -> Column:
        return np.asarray(fitted.value("intercept") + fitted.value("slope") * (n - onset))

    line(panels[0], ends / x, on_line(ends) / factor)
    panels[0].plot([onset / x], [0], marker="|", markersize=8, color="black")
    panels[0].set_ylabel(f"$L$ / {unit}")
    panels[0].set_ylim(0, None)
    r = np.where(known, L - on_line(n), np.nan)
    factor, unit = enlarged(r, "kg m^2/s")
    residuals(panels[1], n / x, r / factor, name=f"$r$ / {unit}")
    panels[1].set_xlabel(f"$d$ / {x_unit}" if is_length else f"$n/A$ / {x_unit}")
    tight_to(panels[1], np.append(n, onset) / x)
    results = told(scope, reduction, onset_coverage="the line vanishes at n/A")
    caption = f"Persistent current against {'thickness' if is_length else 'coverage'}, {reduction.sweep}: angular momentum (points) with the straight line whose zero is the onset (mark); residuals below. {fact(step, 'points'):.0f} points were fitted. {results}"
    return Drawn(name_of("persistent-current", reduction), saved(figure), caption, (reduction.address,))

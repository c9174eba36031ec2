"""Figures of bulk liquid: fractions between plates, power law of the superfluid density, heat capacity at the lambda point, addenda."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes

from archive.physics import helium_liquid
from archive.physics.constants import T_LAMBDA
from archive.physics.heat_capacity import LambdaLaw
from archive.reports.figure_plots import enlarged, letters, line, points, residuals, stacked, tight_to
from archive.reports.figure_style import HEIGHTS, Column, Drawn, NoFigure, name_of, saved
from archive.reports.figure_values import (
    column_of,
    fact,
    output_of,
    scalar,
    spread_of,
    step_of,
    taken,
    told,
    wanted,
)
from archive.reports.scope import Scope
from schemas.lineage import ReductionDocument

__all__ = [
    "addenda_figure",
    "fitted_law",
    "fraction_figure",
    "heat_capacity_figure",
    "mean_law",
    "superfluid_law_figure",
]


def fraction_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return normal and superfluid fraction against temperature with the tabulated ones and the difference from these, or under pressure alone."""
    T = wanted(scope, reduction, "temperature")
    fractions = [(name, wanted(scope, reduction, f"{name}_fraction")) for name in ("superfluid", "normal")]
    depth, step = column_of(scope, reduction, "penetration_depth"), step_of(reduction, "bulk-normal-fraction")
    half = fact(step, "half_gap_um") * 1e-6
    # The tables are of liquid at its own vapour pressure.
    pressed = step.facts.get("pressure_kPa")
    shares = [2.4] + ([1] if pressed is None else []) + ([1] if depth is not None else [])
    figure, panels = stacked(shares, height=4.4 if len(shares) == 3 else HEIGHTS[1])
    for k, (name, values) in enumerate(fractions):
        points(panels[0], T, values, spread_of(scope, reduction, f"{name}_fraction")[0], look=k, label=name)
    panels[0].set_ylabel("fraction")
    panels[0].set_ylim(-0.05, 1.05)
    if pressed is None:
        _tabulated(panels, T, fractions[0][1], spread_of(scope, reduction, "superfluid_fraction")[0])
    panels[0].legend(loc="center left")
    if depth is not None:
        points(panels[-1], T, half / depth)
        panels[-1].set_ylabel(r"$d/2\delta$")
        panels[-1].set_ylim(0, 1.25 * float(np.nanmax(half / depth)))
    panels[-1].set_xlabel("$T$ / K")
    tight_to(panels[-1], T)
    letters([panels[0], *([panels[-1]] if depth is not None else [])])
    gap = f"; (b) half the gap, {half * 1e6:.3g} um, over the viscous penetration depth" if depth is not None else ""  # fmt: skip
    results = told(scope, reduction, coupled_inertia="inertia of the liquid wholly coupled, over that of the cell")  # fmt: skip
    shown = (
        "superfluid and normal fraction (points) and the tabulated ones (lines; Donnelly and Barenghi 1998), below them the superfluid fraction less the tabulated one"
        if pressed is None
        else f"superfluid and normal fraction at {pressed:.5g} kPa"
    )
    caption = f"Liquid between plates, {reduction.sweep}: (a) {shown}{gap}. Error bars: standard uncertainty of each point alone. {results}"
    return Drawn(name_of("bulk-oscillator", reduction), saved(figure), caption, (reduction.address,))


def _tabulated(panels: list[Axes], T: Column, values: Column, u: Column | None) -> None:
    """Draw the tabulated fractions of saturated liquid, and what was found less these."""
    grid = np.linspace(float(np.nanmin(T)), float(np.nanmax(T)), 400)
    table = np.nan_to_num(helium_liquid.superfluid_fraction(np.minimum(grid, T_LAMBDA)))
    line(panels[0], grid, table, look=0)
    line(panels[0], grid, 1 - table, look=1)
    below = T < T_LAMBDA
    difference = np.where(
        below, values - np.nan_to_num(helium_liquid.superfluid_fraction(np.minimum(T, T_LAMBDA))), values
    )
    factor, unit = enlarged(difference, "1")
    residuals(panels[1], T, difference / factor, None if u is None else u / factor, name=f"$r$ / {unit}" if unit else "$r$")  # fmt: skip


def superfluid_law_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return the superfluid fraction against reduced temperature on logarithmic axes with the power law, and the residuals in per cent."""
    step = step_of(reduction, "bulk-superfluid-law")
    T, f = taken(scope, reduction, step, "temperature"), taken(scope, reduction, step, "superfluid_fraction")
    u = _point_at(scope, step.inputs["superfluid_fraction"].address)
    T_lambda, zeta, k0 = (scalar(reduction, name) for name in ("T_lambda", "exponent", "amplitude"))
    D, k1 = (_or_zero(reduction, name) for name in ("confluent", "regular"))
    low, high = fact(step, "low"), fact(step, "high")

    def law(t: Column) -> Column:
        return np.asarray(k0 * (1 + k1 * t) * t**zeta * (1 + D * np.sqrt(t)))

    t = 1 - T / T_lambda
    shown = (t > 0) & (f > 0)
    inside = shown & (t > 0.999 * low) & (t < 1.001 * high)
    if not inside.any():
        raise NoFigure("no row lies in the window that was fitted")
    figure, panels = stacked([2.6, 1], height=HEIGHTS[1])
    points(panels[0], np.where(inside, t, np.nan), f, u)
    points(panels[0], np.where(shown & ~inside, t, np.nan), f, u, look=5, pale=True)
    grid = np.geomspace(low, high, 200)
    line(panels[0], grid, law(grid), label="power law with corrections")
    line(panels[0], grid, k0 * grid**zeta, look=1, label="leading term alone")
    panels[0].set(xscale="log", yscale="log", ylabel=r"$\rho_\mathrm{s}/\rho$")
    panels[0].legend(loc="lower right")
    with np.errstate(invalid="ignore"):
        expected = law(np.where(inside, t, np.nan))
    percent = 100 * (f / expected - 1)
    residuals(panels[1], np.where(inside, t, np.nan), percent, None if u is None else 100 * u / expected, name="$r$ / %")  # fmt: skip
    panels[1].set_xlabel(r"$1 - T/T_\lambda$")
    results = told(scope, reduction, T_lambda="T_lambda", exponent="zeta", amplitude="k_0", confluent="D", regular="k_1")  # fmt: skip
    caption = (
        f"Superfluid fraction of the liquid, {reduction.sweep}, against reduced temperature, with k_0 (1 + k_1 t) t^zeta (1 + D t^0.5) (solid) and its leading term (dashed); residuals below. "
        f"Error bars: standard uncertainty of each point alone; grey crosses were not fitted. {results}"
    )
    return Drawn(name_of("bulk-superfluid-density", reduction), saved(figure), caption, (reduction.address,))


def heat_capacity_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return the heat capacity on both sides against log t with the law, residuals, and the exponent against the range fitted."""
    step = step_of(reduction, "lambda-heat-capacity")
    T, C = taken(scope, reduction, step, "temperature"), taken(scope, reduction, step, "molar_heat_capacity")
    rise = taken(scope, reduction, step, "rise") if "rise" in step.inputs else np.zeros(T.shape)
    u = spread_of(scope, reduction, "molar_heat_capacity")[0]
    T_lambda = scalar(reduction, "T_lambda")
    law = fitted_law(reduction, fact(step, "delta"))
    t = np.abs(1 - T / T_lambda)
    inside = (t > fact(step, "low")) & (t < fact(step, "high"))
    u = u if u is not None and u.shape == C.shape else None
    expected = mean_law(law, T, rise, T_lambda)
    figure, panels = stacked([2.5, 1, 1.2], height=4.8, shared=False)
    grid = np.geomspace(np.nanmin(t[inside]), np.nanmax(t[inside]), 300)
    for k, (side, name) in enumerate(((T_lambda > T, "below"), (T_lambda < T, "above"))):
        at = np.where(side & inside, t, np.nan)
        points(panels[0], at, C, u, look=k, label=f"{name} $T_\\lambda$")
        points(panels[0], np.where(side & ~inside, t, np.nan), C, u, look=k, pale=True)
        line(panels[0], grid, law.value(grid, below=np.full(grid.shape, k == 0)), look=k)
        percent = 100 * (C / expected - 1)
        residuals(panels[1], at, percent, None if u is None else 100 * u / expected, name="$r$ / %", look=k)
    panels[0].set(xscale="log", ylabel=r"$C$ / J mol$^{-1}$ K$^{-1}$")
    panels[0].legend(loc="upper right")
    panels[0].tick_params(labelbottom=False)
    panels[1].set(xscale="log", xlabel=r"$|1 - T/T_\lambda|$")
    for panel in panels[:2]:
        panel.set_xlim(0.7 * float(np.nanmin(t)), 1.4 * float(np.nanmax(t)))
    _ranges(panels[2], scope, reduction)
    letters([panels[0], panels[2]])
    results = told(scope, reduction, T_lambda="T_lambda", exponent="alpha", amplitude_ratio="amplitude above over below")  # fmt: skip
    caption = (
        f"Heat capacity of the liquid, {reduction.sweep}: (a) below and above T_lambda against reduced temperature with the fitted law (lines), and the residuals "
        "below it, where the law is averaged over each step of temperature; (b) the exponent against the upper end of the range that is fitted, with the exponent "
        f"of the whole range (line). Error bars: standard uncertainty of each point alone; grey points were not fitted. {results}"
    )
    return Drawn(name_of("heat-capacity", reduction), saved(figure), caption, (reduction.address,))


def fitted_law(reduction: ReductionDocument, delta: float) -> LambdaLaw:
    """Return the law of a reduction's results; `delta` is the confluent exponent that was held."""
    A, alpha = scalar(reduction, "amplitude_below"), scalar(reduction, "exponent")
    a, b = (_or_zero(reduction, name) for name in ("first_correction", "second_correction"))
    return LambdaLaw(
        A, alpha, scalar(reduction, "constant"), scalar(reduction, "asymmetry"), a * A / alpha, b * A / alpha, confluent_exponent=delta,
    )  # fmt: skip


def mean_law(law: LambdaLaw, T: Column, rise: Column, T_lambda: float) -> Column:
    """Return the law averaged over each step, as it was fitted."""
    nodes, weights = np.polynomial.legendre.leggauss(6)
    each = T[:, np.newaxis] + rise[:, np.newaxis] / 2 * nodes
    t = np.abs(1 - each / T_lambda)
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.asarray(
            law.value(np.where(t > 0, t, np.nan), below=each < T_lambda) @ weights / 2, dtype=np.float64
        )


def _ranges(panel: Axes, scope: Scope, reduction: ReductionDocument) -> None:
    upper, exponent = wanted(scope, reduction, "range_upper"), wanted(scope, reduction, "range_exponent")
    u = spread_of(scope, reduction, "range_exponent")[0]
    points(panel, upper, exponent, u)
    panel.axhline(scalar(reduction, "exponent"), color="black", linewidth=0.9)
    panel.set(xscale="log", xlabel=r"upper end of $|1 - T/T_\lambda|$", ylabel=r"$\alpha$")
    panel.set_xlim(float(np.nanmin(upper)) / 1.5, float(np.nanmax(upper)) * 1.5)
    panel.margins(y=0.2)


def addenda_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return the heat capacity of the empty calorimeter with its polynomial, and the residuals."""
    step = step_of(reduction, "addenda-fit")
    T, C = taken(scope, reduction, step, "temperature"), taken(scope, reduction, step, "values")
    u = _point_at(scope, step.inputs["values"].address)
    low, high = scalar(reduction, "addenda_low"), scalar(reduction, "addenda_high")
    coefficients = wanted(scope, reduction, "addenda")

    def fitted(T: Column) -> Column:
        return np.asarray(np.polynomial.chebyshev.chebval((2 * T - low - high) / (high - low), coefficients))

    figure, panels = stacked([2.4, 1], height=HEIGHTS[1])
    factor, unit = enlarged(C, "J/K")
    points(panels[0], T, C / factor, None if u is None else u / factor)
    grid = np.linspace(low, high, 200)
    line(panels[0], grid, fitted(grid) / factor)
    panels[0].set_ylabel(rf"$C_0$ / {unit}")
    r = C - fitted(T)
    factor, unit = enlarged(r, "J/K")
    residuals(panels[1], T, r / factor, None if u is None else u / factor, name=f"$r$ / {unit}")
    panels[1].set_xlabel("$T$ / K")
    tight_to(panels[1], T)
    results = told(scope, reduction, addenda_at_low="heat capacity at the lowest temperature")
    caption = f"Heat capacity of the empty calorimeter, {reduction.sweep}, with a polynomial of order {coefficients.size - 1}; residuals below. Error bars: standard uncertainty of each point alone. {results}"
    return Drawn(name_of("empty-calorimeter", reduction), saved(figure), caption, (reduction.address,))


def _point_at(scope: Scope, address: str) -> Column | None:
    """Return the standard uncertainty of each point of an output that a step took; None for a channel."""
    place, _, name = address.partition("#")
    held = scope.cooldowns.get(place.partition("/")[0])
    return None if held is None or "@" not in place else held.column(place, f"{name}.point")


def _or_zero(reduction: ReductionDocument, name: str) -> float:
    found = output_of(reduction, name)
    return 0.0 if found is None or found.value is None or not np.isfinite(found.value) else found.value

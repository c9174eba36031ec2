"""Figures of films on an oscillator: transition with its universal line, dynamic theory with residuals, power law in porous glass."""

from __future__ import annotations

import math

import numpy as np
from matplotlib.axes import Axes

from archive.physics.film_dynamic import complex_stiffness, dynamic_areal_density, fixed_start
from archive.physics.film_static import UNIVERSAL_JUMP
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
from archive.reports.figure_style import HEIGHTS, WIDTH, Column, Drawn, NoFigure, name_of, saved
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

__all__ = ["dynamic_figure", "fitted_theory", "porous_figure", "sweep_figure", "transition_figure"]

_SIGMA = r"$\sigma_\mathrm{s}$"


def transition_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return areal density with the universal line, their ratio, and the added dissipation."""
    T, sigma = wanted(scope, reduction, "temperature"), wanted(scope, reduction, "superfluid_density")
    point, common = spread_of(scope, reduction, "superfluid_density")
    crossing = output_of(reduction, "crossing_temperature")
    loss = column_of(scope, reduction, "added_dissipation")
    has_loss = loss is not None and np.isfinite(loss).any()
    figure, panels = stacked(
        [2.2, 1.3, 1.3] if has_loss else [2.2, 1.3], height=4.7 if has_loss else HEIGHTS[1]
    )
    factor, unit = enlarged(sigma, "kg/m^2")
    points(panels[0], T, sigma / factor, None if point is None else point / factor)
    grid = np.array([0.0, np.nanmax(T)])
    line(panels[0], grid, UNIVERSAL_JUMP * grid / factor, style="--", label="universal line")
    panels[0].set_ylabel(f"{_SIGMA} / {unit}")
    panels[0].set_ylim(-0.04 * np.nanmax(sigma) / factor, 1.08 * np.nanmax(sigma) / factor)
    panels[0].set_xlim(0, 1.02 * np.nanmax(T))
    near = np.nanmax(np.where(0.3 * np.nanmax(T) < T, sigma, np.nan)) / factor
    bar_of_all(panels[0], 0.6 * near, common * near)
    _ratio(panels[1], T, sigma, point, common)
    if has_loss and loss is not None:
        loss_point, _ = spread_of(scope, reduction, "added_dissipation")
        q, q_unit = enlarged(loss, "1")
        points(panels[2], T, loss / q, None if loss_point is None else loss_point / q)
        panels[2].set_ylabel(rf"$\Delta Q^{{-1}}$ / {q_unit}" if q_unit else r"$\Delta Q^{-1}$")
        panels[2].margins(y=0.12)
    crossed = None if crossing is None else crossing.value
    for panel in panels:
        if crossed is not None:
            panel.axvline(crossed, color="black", linewidth=0.4, linestyle=":")
    panels[0].legend(loc="upper right")
    panels[-1].set_xlabel("$T$ / K")
    letters(panels)
    results = told(
        scope,
        reduction,
        T_KT="T_KT",
        T_KT_by_peak="by the peak of dissipation T_KT",
        universal_ratio="density over the universal one at the transition",
    )
    caption = (
        f"Film of {reduction.sweep}: (a) areal superfluid density with the universal line of Nelson and Kosterlitz, (b) density over that line"
        f"{', (c) dissipation that the helium adds' if has_loss else ''}{'; dotted: where the density crosses the line' if crossed is not None else ''}. {results} {_bars(common)}"
    )
    return Drawn(name_of("film-transition", reduction), saved(figure), caption, (reduction.address,))


def _ratio(panel: Axes, T: Column, sigma: Column, point: Column | None, common: float) -> None:
    # Far below the transition the ratio says nothing, and at T = 0 it has no end.
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = sigma / (UNIVERSAL_JUMP * T)
        u = None if point is None else point / (UNIVERSAL_JUMP * T)
    shown = (ratio < 3) & (ratio > -1)
    points(panel, np.where(shown, T, np.nan), ratio, u)
    panel.axhline(1, color="black", linewidth=0.9, linestyle="--")
    panel.set_ylim(-0.2, 3.1)
    panel.set_ylabel(r"$\sigma_\mathrm{s}/\sigma_\mathrm{univ}$")
    bar_of_all(panel, 2.0, 2.0 * common)


def dynamic_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return period drop and added dissipation over the transition with the dynamic theory, each with its residuals."""
    step = step_of(reduction, "film-dynamic-fit")
    T, drop, loss = (
        taken(scope, reduction, step, port) for port in ("temperature", "period_drop", "dissipation")
    )
    period = float(np.nanmedian(taken(scope, reduction, step, "period")))
    low, high = fact(step, "low_K"), fact(step, "high_K")
    room = 0.06 * (high - low)
    shown = (low - room < T) & (high + room > T)
    if not np.any(shown):
        raise NoFigure("no row lies where the theory was fitted")
    fitted = np.isfinite(wanted(scope, reduction, "drop_residual"))
    grid = np.linspace(low, high, 400)
    theory = fitted_theory(reduction, grid, period=period, x0=x0 if isinstance(x0 := step.parameters.get("x0"), float) else -0.5, scale=fact(step, "scale_stated"))  # fmt: skip
    figure, panels = stacked([2.4, 1, 2.4, 1], height=HEIGHTS[2])
    for k, (y, name, unit, curve, of_what) in enumerate(
        ((drop, r"$\Delta P$", "s", theory[0], "drop"), (loss, r"$\Delta Q^{-1}$", "1", theory[1], "dissipation"))
    ):  # fmt: skip
        factor, label = enlarged(y[shown], unit)
        u = _point_of(scope, reduction, step.inputs[("period_drop", "dissipation")[k]].address)
        for part, pale in ((shown & fitted, False), (shown & ~fitted, True)):
            points(
                panels[2 * k],
                np.where(part, T, np.nan),
                y / factor,
                None if u is None else u / factor,
                pale=pale,
            )
        line(panels[2 * k], grid, curve / factor)
        panels[2 * k].set_ylabel(f"{name} / {label}" if label else name)
        panels[2 * k].margins(y=0.08)
        r = wanted(scope, reduction, f"{of_what}_residual")
        residuals(panels[2 * k + 1], T, r, name=r"$r/u$")
    panels[-1].set_xlabel("$T$ / K")
    panels[0].set_xlim(low - room, high + room)
    T_KT = scalar(reduction, "T_KT_by_fit")
    for panel in panels:
        panel.axvline(T_KT, color="black", linewidth=0.4, linestyle=":")
    letters([panels[0], panels[2]])
    results = told(
        scope,
        reduction,
        T_KT_by_fit="T_KT",
        b="b",
        scale_ratio="areal density over that of the universal jump",
    )
    caption = (
        f"Film of {reduction.sweep}: (a) period drop and (b) added dissipation with the frequency-dependent theory fitted to both together (lines); below each the "
        f"residuals in standard uncertainties. Dotted: static transition. {results} Error bars: standard uncertainty of each point alone; grey points were not fitted."
    )
    return Drawn(name_of("film-dynamic", reduction), saved(figure), caption, (reduction.address,))


def fitted_theory(
    reduction: ReductionDocument, T: Column, *, period: float, x0: float, scale: float
) -> tuple[Column, Column]:
    """Return period drop (s) and dissipation of the theory with a reduction's results.

    Parameters
    ----------
    reduction : ReductionDocument
        By the plan film-dynamic.
    T : ndarray
        K.
    period : float
        Of the oscillator, s.
    x0 : float
        Bare start of the flow, as it was held.
    scale : float
        Twice the fractional drop per areal density, as the records state it, m^2/kg.
    """
    omega = 2 * math.pi / period
    F = output_of(reduction, "F")
    stiffness = complex_stiffness(
        fixed_start(T / scalar(reduction, "T_KT_by_fit"), b=scalar(reduction, "b"), x0=x0),
        L=scalar(reduction, "log_diffusivity") - math.log(omega), F=1.0 if F is None or F.value is None else F.value,
    )  # fmt: skip
    ratio = output_of(reduction, "scale_ratio")
    factor = scale * (1.0 if ratio is None or ratio.value is None else ratio.value)
    response = factor * dynamic_areal_density(T, stiffness)
    drop = np.asarray(response.real) * period / 2 + scalar(reduction, "drop_offset")
    return drop, np.asarray(-response.imag) + scalar(reduction, "dissipation_offset")


def porous_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return areal density in a porous medium with its power law, residuals, and the same on logarithmic axes."""
    T, sigma = wanted(scope, reduction, "temperature"), wanted(scope, reduction, "superfluid_density")
    point, common = spread_of(scope, reduction, "superfluid_density")
    T_c, zeta, amplitude = (scalar(reduction, name) for name in ("T_c", "exponent", "amplitude_of_power_law"))
    step = step_of(reduction, "power-law-transition")
    low, high = fact(step, "low"), fact(step, "high")
    t = 1 - T / T_c
    law = amplitude * np.where(t > 0, np.abs(t), 0.0) ** zeta
    inside = (t >= low) & (t <= high)
    figure, panels = stacked([2.2, 1, 2.2], height=5.0, shared=False)
    factor, unit = enlarged(sigma, "kg/m^2")
    u = None if point is None else point / factor
    points(panels[0], T, sigma / factor, u)
    grid = T_c * (1 - np.linspace(0, high, 300))
    line(panels[0], grid, amplitude * (1 - grid / T_c) ** zeta / factor, label="fitted")
    panels[0].set(
        ylabel=f"{_SIGMA} / {unit}",
        xlabel="$T$ / K",
        xlim=(0, 1.03 * np.nanmax(T)),
        ylim=(-0.04 * np.nanmax(sigma) / factor, 1.1 * np.nanmax(sigma) / factor),
    )
    bar_of_all(panels[0], 0.5 * np.nanmax(sigma) / factor, 0.5 * common * np.nanmax(sigma) / factor)
    r_factor, r_unit = enlarged((sigma - law)[inside], "kg/m^2")
    edge = np.where(inside, t, np.nan)
    residuals(
        panels[1],
        edge,
        (sigma - law) / r_factor,
        None if point is None else point / r_factor,
        name=f"$r$ / {r_unit}",
    )
    panels[1].set_xscale("log")
    panels[1].set_xlim(low * 0.8, high * 1.25)
    panels[1].set_xlabel(r"$1 - T/T_\mathrm{c}$")
    positive = (t > low / 3) & (sigma > 0)
    points(panels[2], np.where(positive & inside, t, np.nan), sigma / factor, u, label="fitted")
    points(panels[2], np.where(positive & ~inside, t, np.nan), sigma / factor, u, look=5, pale=True)
    run = np.geomspace(low / 3, 0.9, 100)
    line(panels[2], run, amplitude * run**zeta / factor)
    panels[2].set(xscale="log", yscale="log", xlabel=r"$1 - T/T_\mathrm{c}$", ylabel=f"{_SIGMA} / {unit}")
    letters(panels)
    results = told(scope, reduction, T_c="T_c", exponent="exponent zeta")
    caption = (
        f"Film of {reduction.sweep} in a porous medium: (a) areal superfluid density with the power law over the range of the fit (line), (b) residuals against "
        f"reduced temperature, (c) the same density on logarithmic axes; grey crosses were not fitted. {results} {_bars(common)}"
    )
    return Drawn(name_of("porous-film", reduction), saved(figure), caption, (reduction.address,))


def sweep_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return one sweep from end to end: signal as recorded, period, period drop, areal superfluid density, on one temperature axis."""
    step = step_of(reduction, "period-drop")
    T, P = taken(scope, reduction, step, "temperature"), taken(scope, reduction, step, "period")
    drop, sigma = wanted(scope, reduction, "period_drop"), wanted(scope, reduction, "superfluid_density")
    drop_point, _ = spread_of(scope, reduction, "period_drop")
    sigma_point, common = spread_of(scope, reduction, "superfluid_density")
    figure, panels = stacked([1, 1.2, 1.2, 1.2], height=HEIGHTS[2], width=WIDTH)
    signal = _signal(scope, reduction)
    if signal is None:
        figure.delaxes(panels[0])
    else:
        factor, unit = enlarged(signal, "V")
        points(panels[0], T, signal / factor)
        panels[0].set_ylabel(f"$A$ / {unit}")
    base = math.floor(float(np.nanmin(P)) * 1e9) / 1e9
    factor, unit = enlarged(P - base, "s")
    points(panels[1], T, (P - base) / factor)
    # The shifted background is what the drop was counted from.
    line(panels[1], *_ordered(T, (P + drop - base) / factor), label="empty cell, shifted")
    panels[1].set_ylabel(f"$P - P_1$ / {unit}")
    panels[1].legend(loc="lower right")
    factor, unit = enlarged(drop, "s")
    points(panels[2], T, drop / factor, None if drop_point is None else drop_point / factor)
    panels[2].set_ylabel(rf"$\Delta P$ / {unit}")
    factor, unit = enlarged(sigma, "kg/m^2")
    points(panels[3], T, sigma / factor, None if sigma_point is None else sigma_point / factor)
    panels[3].set(ylabel=f"{_SIGMA} / {unit}", xlabel="$T$ / K")
    top = float(np.nanmax(sigma)) / factor
    bar_of_all(panels[3], 0.6 * top, 0.6 * common * top)
    tight_to(panels[3], T)
    shown = [panel for panel in panels if panel in figure.axes]
    letters(shown)
    parts = ["signal as recorded"] if signal is not None else []
    parts += [f"period (P_1 = {base * 1e3:.6f} ms) with that of the empty cell after its shift", "period drop", "areal superfluid density"]  # fmt: skip
    caption = f"Sweep {reduction.sweep} from end to end: {'; '.join(f'({letter}) {part}' for letter, part in zip('abcd', parts, strict=False))}. {_bars(common)}"
    return Drawn(name_of("sweep", reduction), saved(figure), caption, (reduction.address,))


def _signal(scope: Scope, reduction: ReductionDocument) -> Column | None:
    for step in reduction.steps:
        if "amplitude" in step.inputs:
            try:
                return taken(scope, reduction, step, "amplitude")
            except NoFigure:
                return None
    return None


def _ordered(x: Column, y: Column) -> tuple[Column, Column]:
    known = np.flatnonzero(np.isfinite(x) & np.isfinite(y))
    order = known[np.argsort(x[known], kind="stable")]
    return x[order], y[order]


def _point_of(scope: Scope, reduction: ReductionDocument, address: str) -> Column | None:
    name = address.partition("#")[2]
    return spread_of(scope, reduction, name)[0] if address.startswith(f"{reduction.address}#") else None


def _bars(common: float) -> str:
    shared = f"; all points share {100 * common:.2g} per cent, drawn as one bar where it can be seen" if common > 0 else ""  # fmt: skip
    return f"Error bars: standard uncertainty of each point alone{shared}."

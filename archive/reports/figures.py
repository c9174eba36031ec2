"""Figures of the methods appendix: background, dose run, areal density, resonance, decay, isotherm; vector PDF.

Rules
-----
* Series differ by marker and line, not by colour alone; text is 8 pt at print size; axes are quantity over unit.
* The same data give the same bytes: no dates, fixed metadata.
* A shared (scale) uncertainty is one separate bar, not on every point.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator

import matplotlib as mpl
import numpy as np
from matplotlib.figure import Figure
from numpy.typing import NDArray

from archive.physics.film_static import UNIVERSAL_JUMP
from archive.reports.figure_curves import curve
from archive.reports.figure_style import (
    LOOKS,
    STYLE,
    WIDTH,
    Column,
    Drawn,
    channel_of,
    column_of,
    name_of,
    saved,
)
from archive.reports.scope import Scope
from schemas.lineage import ReductionDocument
from schemas.quantity import unit_factor

__all__ = ["Drawn", "figures"]


def figures(scope: Scope) -> Iterator[Drawn]:
    """Yield the figures of the reductions at hand, one for each kind that is present."""
    with mpl.rc_context(STYLE):  # type: ignore[arg-type]
        for reduction in scope.reductions:
            made = _MAKERS.get(reduction.plan.name, curve)(scope, reduction)
            if made is not None:
                yield made
        yield from _films(scope)


def _background(scope: Scope, reduction: ReductionDocument) -> Drawn | None:
    T, P = column_of(scope, reduction, "temperature"), channel_of(scope, reduction, "period")
    outputs = {each.name: each for each in reduction.outputs}
    coefficients = column_of(scope, reduction, "period_background")
    low, high = (outputs.get(name) for name in ("period_low", "period_high"))
    if (
        T is None
        or P is None
        or coefficients is None
        or low is None
        or high is None
        or low.value is None
        or high.value is None
    ):
        return None
    scaled = (2 * T - low.value - high.value) / (high.value - low.value)
    fit = np.asarray(np.polynomial.chebyshev.chebval(scaled, coefficients), dtype=np.float64)
    order = np.argsort(T)
    base = float(np.nanmin(P))
    return _with_residual(
        T, (P - base) * 1e9, (fit - base) * 1e9, order, residual=(P - fit) * 1e12, labels=("T / K", f"(P \u2212 {base * 1e3:.6f} ms) / ns", "residual / ps"),
        name=name_of("background", reduction), source=reduction.address,
        caption=f"Background of the empty cell, {reduction.sweep}: period (points), fitted polynomial of order {len(coefficients) - 1} (line), and residual below.",
    )  # fmt: skip


def _with_residual(
    x: Column,
    y: Column,
    fit: Column,
    order: NDArray[np.int64],
    *,
    residual: Column,
    labels: tuple[str, str, str],
    name: str,
    source: str,
    caption: str,
) -> Drawn:
    figure = Figure(figsize=(WIDTH, 3.4), layout="constrained")
    top, below = figure.subplots(2, 1, sharex=True, height_ratios=[3, 1])
    top.plot(x, y, "o", color="black", markerfacecolor="none", markeredgewidth=0.5)
    top.plot(x[order], fit[order], "-", color="black")
    top.set_ylabel(labels[1])
    below.axhline(0, color="black", linewidth=0.5)
    below.plot(x, residual, "o", color="black", markersize=1.6)
    below.set_xlabel(labels[0])
    below.set_ylabel(labels[2])
    return Drawn(name, saved(figure), caption, (source,))


def _dose_run(scope: Scope, reduction: ReductionDocument) -> Drawn | None:
    n, P = column_of(scope, reduction, "amount"), channel_of(scope, reduction, "period")
    values = {each.name: each.value for each in reduction.outputs if each.rows is None}
    needed = ("mass_sensitivity", "slope_past", "onset_amount", "empty_period")
    if n is None or P is None or n.shape != P.shape or any(values.get(name) is None for name in needed):
        return None
    s, past, onset, empty = (float(values[name] or 0.0) for name in needed)
    fit = np.asarray(empty + s * np.minimum(n, onset) + past * np.maximum(n - onset, 0.0), dtype=np.float64)
    order = np.argsort(n)
    text = {each.name: scope.text(each) for each in reduction.outputs if each.name in needed}
    return _with_residual(
        n * 1e6, (P - empty) * 1e9, (fit - empty) * 1e9, order, residual=(P - fit) * 1e12, labels=("n / µmol", f"(P \u2212 {empty * 1e3:.6f} ms) / ns", "residual / ps"),
        name=name_of("dose-run", reduction), source=reduction.address,
        caption=f"Dose run {reduction.sweep}: period against amount (points) and the two fitted slopes, {text['mass_sensitivity']} below the onset and {text['slope_past']} past it (lines); residual below.",
    )  # fmt: skip


def _films(scope: Scope) -> Iterator[Drawn]:
    """Yield one figure per cell with the areal superfluid density of its films, and the universal line."""
    groups: dict[str, list[ReductionDocument]] = {}
    for reduction in scope.reductions:
        if any(
            each.name == "superfluid_density" and each.quantity == "areal_mass_density"
            for each in reduction.outputs
        ):
            entry = scope.taken_of(reduction).entry
            groups.setdefault("" if entry is None or entry.cell is None else entry.cell, []).append(reduction)
    for cell, members in sorted(groups.items()):
        made = _density(scope, cell, members)
        if made is not None:
            yield made


def _density(scope: Scope, cell: str, members: list[ReductionDocument]) -> Drawn | None:
    figure = Figure(figsize=(WIDTH, 3.2), layout="constrained")
    axes = figure.subplots()
    highest, biggest, names, shared = 0.0, 0.0, [], (0.0, 0.0)
    for number, reduction in enumerate(members):
        T, sigma = (
            column_of(scope, reduction, "temperature"),
            column_of(scope, reduction, "superfluid_density"),
        )
        if T is None or sigma is None:
            continue
        point = column_of(scope, reduction, "superfluid_density.point")
        order = np.argsort(T)
        order = order[np.isfinite(T[order]) & np.isfinite(sigma[order])]
        marker, line, colour = LOOKS[number % len(LOOKS)]
        every = max(1, order.size // 40)
        axes.plot(
            T[order],
            sigma[order] * 1e9,
            line,
            marker=marker,
            markevery=every,
            color=colour,
            markerfacecolor="none",
            markeredgewidth=0.6,
            label=reduction.sweep,
        )
        if point is not None:
            axes.fill_between(
                T[order],
                (sigma - point)[order] * 1e9,
                (sigma + point)[order] * 1e9,
                color=colour,
                alpha=0.2,
                linewidth=0,
            )
        highest, biggest = max(highest, float(T[order].max())), max(biggest, float(sigma[order].max()))
        shared = max(shared, _shared(scope, reduction, sigma, order))
        names.append(reduction.address)
    if not names:
        return None
    grid = np.array([0.0, highest])
    axes.plot(grid, UNIVERSAL_JUMP * grid * 1e9, "-", color="black", linewidth=1.2, label="universal line")
    axes.set(
        xlim=(0, highest * 1.03),
        ylim=(min(0.0, -0.02 * biggest * 1e9), biggest * 1.08e9),
        xlabel="T / K",
        ylabel=r"$\sigma_\mathrm{s}$ / $\mathrm{\mu g\,m^{-2}}$",
    )
    if shared[1] > 0:
        axes.errorbar(
            [highest * 0.98],
            [0.55 * biggest * 1e9],
            yerr=[shared[1] * 1e9],
            fmt="none",
            ecolor="black",
            capsize=3,
            elinewidth=1,
        )
    axes.legend(loc="upper right", fontsize=8)
    caption = (
        f"Areal superfluid mass density against temperature, cell {cell or 'not recorded'}, with the universal line of Nelson and Kosterlitz. "
        "Bands: standard uncertainty of the points alone; the single bar: standard uncertainty that all points share."
    )
    return Drawn(
        f"figures/areal-density-{cell or 'unknown'}.pdf".replace(".r", "-r"),
        saved(figure),
        caption,
        tuple(names),
    )


def _shared(
    scope: Scope, reduction: ReductionDocument, sigma: Column, order: NDArray[np.int64]
) -> tuple[float, float]:
    spread, point = (
        column_of(scope, reduction, "superfluid_density.uncertainty"),
        column_of(scope, reduction, "superfluid_density.point"),
    )
    if spread is None or order.size == 0:
        return 0.0, 0.0
    k = int(order[np.argmax(sigma[order])])
    alone = 0.0 if point is None else float(point[k])
    return float(sigma[k]), float(np.sqrt(max(spread[k] ** 2 - alone**2, 0.0)))


def _ringdown(scope: Scope, reduction: ReductionDocument) -> Drawn | None:
    t, A = channel_of(scope, reduction, "instant"), channel_of(scope, reduction, "amplitude")
    if t is None or A is None:
        return None
    figure = Figure(figsize=(WIDTH, 2.4), layout="constrained")
    axes = figure.subplots()
    axes.semilogy(t - np.nanmin(t), np.abs(A) * 1e3, "o", color="black", markersize=1.5)
    axes.set(xlabel="t / s", ylabel="A / mV")
    found = next((scope.text(each) for each in reduction.outputs if each.name == "quality_factor"), "[pend]")
    return Drawn(
        name_of("ringdown", reduction),
        saved(figure),
        f"Free decay {reduction.sweep}; Q = {found}.",
        (reduction.address,),
    )


def _resonance(scope: Scope, reduction: ReductionDocument) -> Drawn | None:
    entry = scope.taken_of(reduction).entry
    f = channel_of(scope, reduction, "frequency")
    if entry is None or f is None:
        return None
    channels = [each for each in entry.channels if each.quantity == "amplitude" and each.use][:2]
    figure = Figure(figsize=(WIDTH, 2.4), layout="constrained")
    axes = figure.subplots()
    for channel, (marker, line, colour) in zip(channels, LOOKS, strict=False):
        values = scope.holdings_of(reduction).column(reduction.sweep, channel.name)
        if values is not None:
            shown = values * unit_factor(channel.unit, "amplitude") * 1e3
            axes.plot(
                f,
                shown,
                line,
                marker=marker,
                markevery=max(1, f.size // 40),
                color=colour,
                markerfacecolor="none",
                label=channel.name.replace("_", " "),
            )
    axes.set(xlabel="f / Hz", ylabel="A / mV")
    axes.legend()
    told = next(
        (scope.text(each) for each in reduction.outputs if each.name == "resonance_frequency"), "[pend]"
    )
    return Drawn(
        name_of("resonance", reduction),
        saved(figure),
        f"Frequency sweep {reduction.sweep}; resonance: {told}.",
        (reduction.address,),
    )


def _isotherm(scope: Scope, reduction: ReductionDocument) -> Drawn | None:
    x = column_of(scope, reduction, "relative_pressure_of_rows")
    if x is None:
        x = channel_of(scope, reduction, "relative_pressure")
    n, unit = channel_of(scope, reduction, "amount"), "n / µmol"
    factor = 1e6
    if n is None:
        n, unit, factor = channel_of(scope, reduction, "specific_amount"), r"n / $\mathrm{mmol\,g^{-1}}$", 1.0
    if x is None or n is None or x.shape != n.shape:
        return None
    figure = Figure(figsize=(WIDTH, 2.4), layout="constrained")
    axes = figure.subplots()
    axes.plot(x, n * factor, "o", color="black", markerfacecolor="none", markeredgewidth=0.6)
    axes.set(xlabel="$p/p_0$", ylabel=unit)
    found = next((scope.text(each) for each in reduction.outputs if each.name == "area"), "[pend]")
    return Drawn(
        name_of("isotherm", reduction),
        saved(figure),
        f"Isotherm {reduction.sweep}; area by the method of Brunauer, Emmett and Teller: {found}.",
        (reduction.address,),
    )


def _linearity(scope: Scope, reduction: ReductionDocument) -> Drawn | None:
    drive, A = channel_of(scope, reduction, "drive"), channel_of(scope, reduction, "amplitude")
    if drive is None or A is None or drive.shape != A.shape:
        return None
    figure = Figure(figsize=(WIDTH, 2.4), layout="constrained")
    axes = figure.subplots()
    axes.plot(drive * 1e3, A * 1e3, "o", color="black", markerfacecolor="none", markeredgewidth=0.6)
    axes.set(xlabel="drive / mV", ylabel="A / mV", xlim=(0, None), ylim=(0, None))
    return Drawn(
        name_of("linearity", reduction),
        saved(figure),
        f"Drive sweep {reduction.sweep}: amplitude against drive.",
        (reduction.address,),
    )


_MAKERS: dict[str, Callable[[Scope, ReductionDocument], Drawn | None]] = {
    "empty-cell": _background, "dose-run": _dose_run, "ringdown": _ringdown, "resonance": _resonance, "isotherm-bet": _isotherm, "drive-linearity": _linearity,
}  # fmt: skip

"""Figures of the methods appendix: background, dose run, areal density, resonance, decay, isotherm; vector PDF.

Rules
-----
* Series differ by marker and line, not by colour alone; text is 8 pt at print size; axes are quantity over unit.
* The same data give the same bytes: no dates, fixed metadata.
* A shared (scale) uncertainty is one separate bar, not on every point.
"""

from __future__ import annotations

import io
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any

import matplotlib as mpl
import numpy as np
from matplotlib.backends.backend_pdf import FigureCanvasPdf
from matplotlib.figure import Figure
from numpy.typing import NDArray

from archive.physics.film_static import UNIVERSAL_JUMP
from archive.reports.scope import Scope
from schemas.lineage import ReductionDocument
from schemas.quantity import unit_factor

__all__ = ["Drawn", "figures"]

Column = NDArray[np.float64]

_STYLE: dict[str, Any] = {
    "font.size": 8, "axes.labelsize": 8, "xtick.labelsize": 8, "ytick.labelsize": 8, "legend.fontsize": 8, "font.family": "DejaVu Sans",
    "axes.linewidth": 0.5, "lines.linewidth": 0.8, "lines.markersize": 2.6, "xtick.direction": "in", "ytick.direction": "in", "xtick.top": True,
    "ytick.right": True, "xtick.major.width": 0.5, "ytick.major.width": 0.5, "legend.frameon": False, "pdf.fonttype": 42, "pdf.compression": 6,
    "axes.formatter.useoffset": False, "savefig.dpi": 300, "path.simplify": True,
}  # fmt: skip
_LOOKS = (
    ("o", "-", "black"),
    ("s", "--", "#444444"),
    ("^", "-.", "#0b5394"),
    ("v", ":", "#a61c00"),
    ("D", "-", "#38761d"),
    ("x", "--", "#674ea7"),
    ("+", "-.", "#7f6000"),
)
_WIDTH = 4.6  # inches: fits a text width of 120 mm


@dataclass(frozen=True)
class Drawn:
    """A figure: its file name, bytes, caption as plain text, and the reductions it shows."""

    name: str
    content: bytes
    caption: str
    sources: tuple[str, ...]


def figures(scope: Scope) -> Iterator[Drawn]:
    """Yield the figures of the reductions at hand, one for each kind that is present."""
    with mpl.rc_context(_STYLE):  # type: ignore[arg-type]
        for reduction in scope.reductions:
            maker = _MAKERS.get(reduction.plan.name)
            made = None if maker is None else maker(scope, reduction)
            if made is not None:
                yield made
        yield from _films(scope)


def _column(scope: Scope, reduction: ReductionDocument, name: str) -> Column | None:
    return scope.holdings_of(reduction).column(reduction.address, name)


def _channel(scope: Scope, reduction: ReductionDocument, quantity: str) -> Column | None:
    """Return a recorded channel in SI units."""
    entry = scope.taken_of(reduction).entry
    found = (
        None
        if entry is None
        else next((each for each in entry.channels if each.quantity == quantity and each.use), None)
    )
    values = None if found is None else scope.holdings_of(reduction).column(reduction.sweep, found.name)
    if values is None or found is None:
        return None
    return np.asarray(values * (1.0 if quantity == "instant" else unit_factor(found.unit, quantity)))


def _saved(figure: Figure) -> bytes:
    FigureCanvasPdf(figure)
    buffer = io.BytesIO()
    figure.savefig(
        buffer, format="pdf", metadata={"CreationDate": None, "Producer": "stillroom", "Creator": "stillroom"}
    )
    return buffer.getvalue()


def _named(kind: str, reduction: ReductionDocument) -> str:
    return f"figures/{kind}-{reduction.cooldown}-{reduction.sweep.partition('/')[2]}.pdf"


def _background(scope: Scope, reduction: ReductionDocument) -> Drawn | None:
    T, P = _column(scope, reduction, "temperature"), _channel(scope, reduction, "period")
    outputs = {each.name: each for each in reduction.outputs}
    coefficients = _column(scope, reduction, "period_background")
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
        name=_named("background", reduction), source=reduction.address,
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
    figure = Figure(figsize=(_WIDTH, 3.4), layout="constrained")
    top, below = figure.subplots(2, 1, sharex=True, height_ratios=[3, 1])
    top.plot(x, y, "o", color="black", markerfacecolor="none", markeredgewidth=0.5)
    top.plot(x[order], fit[order], "-", color="black")
    top.set_ylabel(labels[1])
    below.axhline(0, color="black", linewidth=0.5)
    below.plot(x, residual, "o", color="black", markersize=1.6)
    below.set_xlabel(labels[0])
    below.set_ylabel(labels[2])
    return Drawn(name, _saved(figure), caption, (source,))


def _dose_run(scope: Scope, reduction: ReductionDocument) -> Drawn | None:
    n, P = _column(scope, reduction, "amount"), _channel(scope, reduction, "period")
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
        name=_named("dose-run", reduction), source=reduction.address,
        caption=f"Dose run {reduction.sweep}: period against amount (points) and the two fitted slopes, {text['mass_sensitivity']} below the onset and {text['slope_past']} past it (lines); residual below.",
    )  # fmt: skip


def _films(scope: Scope) -> Iterator[Drawn]:
    """Yield one figure per cell with the areal superfluid density of its films, and the universal line."""
    groups: dict[str, list[ReductionDocument]] = {}
    for reduction in scope.reductions:
        if any(each.name == "superfluid_density" and each.rows for each in reduction.outputs):
            entry = scope.taken_of(reduction).entry
            groups.setdefault("" if entry is None or entry.cell is None else entry.cell, []).append(reduction)
    for cell, members in sorted(groups.items()):
        made = _density(scope, cell, members)
        if made is not None:
            yield made


def _density(scope: Scope, cell: str, members: list[ReductionDocument]) -> Drawn | None:
    figure = Figure(figsize=(_WIDTH, 3.2), layout="constrained")
    axes = figure.subplots()
    highest, biggest, names, shared = 0.0, 0.0, [], (0.0, 0.0)
    for number, reduction in enumerate(members):
        T, sigma = _column(scope, reduction, "temperature"), _column(scope, reduction, "superfluid_density")
        if T is None or sigma is None:
            continue
        point = _column(scope, reduction, "superfluid_density.point")
        order = np.argsort(T)
        order = order[np.isfinite(T[order]) & np.isfinite(sigma[order])]
        marker, line, colour = _LOOKS[number % len(_LOOKS)]
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
        f"Areal superfluid mass density against temperature, cell {cell or 'not recorded'}, with the universal line sigma_s = (2 m^2 k_B/pi hbar^2) T. "
        "Bands: standard uncertainty of the points alone; the single bar: standard uncertainty that all points share."
    )
    return Drawn(
        f"figures/areal-density-{cell or 'unknown'}.pdf".replace(".r", "-r"),
        _saved(figure),
        caption,
        tuple(names),
    )


def _shared(
    scope: Scope, reduction: ReductionDocument, sigma: Column, order: NDArray[np.int64]
) -> tuple[float, float]:
    spread, point = (
        _column(scope, reduction, "superfluid_density.uncertainty"),
        _column(scope, reduction, "superfluid_density.point"),
    )
    if spread is None or order.size == 0:
        return 0.0, 0.0
    k = int(order[np.argmax(sigma[order])])
    alone = 0.0 if point is None else float(point[k])
    return float(sigma[k]), float(np.sqrt(max(spread[k] ** 2 - alone**2, 0.0)))


def _ringdown(scope: Scope, reduction: ReductionDocument) -> Drawn | None:
    t, A = _channel(scope, reduction, "instant"), _channel(scope, reduction, "amplitude")
    if t is None or A is None:
        return None
    figure = Figure(figsize=(_WIDTH, 2.4), layout="constrained")
    axes = figure.subplots()
    axes.semilogy(t - np.nanmin(t), np.abs(A) * 1e3, "o", color="black", markersize=1.5)
    axes.set(xlabel="t / s", ylabel="A / mV")
    found = next((scope.text(each) for each in reduction.outputs if each.name == "quality_factor"), "[pend]")
    return Drawn(
        _named("ringdown", reduction),
        _saved(figure),
        f"Free decay {reduction.sweep}; Q = {found}.",
        (reduction.address,),
    )


def _resonance(scope: Scope, reduction: ReductionDocument) -> Drawn | None:
    entry = scope.taken_of(reduction).entry
    f = _channel(scope, reduction, "frequency")
    if entry is None or f is None:
        return None
    channels = [each for each in entry.channels if each.quantity == "amplitude" and each.use][:2]
    figure = Figure(figsize=(_WIDTH, 2.4), layout="constrained")
    axes = figure.subplots()
    for channel, (marker, line, colour) in zip(channels, _LOOKS, strict=False):
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
        _named("resonance", reduction),
        _saved(figure),
        f"Frequency sweep {reduction.sweep}; resonance: {told}.",
        (reduction.address,),
    )


def _isotherm(scope: Scope, reduction: ReductionDocument) -> Drawn | None:
    x = _column(scope, reduction, "relative_pressure_of_rows")
    if x is None:
        x = _channel(scope, reduction, "relative_pressure")
    n, unit = _channel(scope, reduction, "amount"), "n / µmol"
    factor = 1e6
    if n is None:
        n, unit, factor = _channel(scope, reduction, "specific_amount"), r"n / $\mathrm{mmol\,g^{-1}}$", 1.0
    if x is None or n is None or x.shape != n.shape:
        return None
    figure = Figure(figsize=(_WIDTH, 2.4), layout="constrained")
    axes = figure.subplots()
    axes.plot(x, n * factor, "o", color="black", markerfacecolor="none", markeredgewidth=0.6)
    axes.set(xlabel="$p/p_0$", ylabel=unit)
    found = next((scope.text(each) for each in reduction.outputs if each.name == "area"), "[pend]")
    return Drawn(
        _named("isotherm", reduction),
        _saved(figure),
        f"Isotherm {reduction.sweep}; area by the method of Brunauer, Emmett and Teller: {found}.",
        (reduction.address,),
    )


def _linearity(scope: Scope, reduction: ReductionDocument) -> Drawn | None:
    drive, A = _channel(scope, reduction, "drive"), _channel(scope, reduction, "amplitude")
    if drive is None or A is None or drive.shape != A.shape:
        return None
    figure = Figure(figsize=(_WIDTH, 2.4), layout="constrained")
    axes = figure.subplots()
    axes.plot(drive * 1e3, A * 1e3, "o", color="black", markerfacecolor="none", markeredgewidth=0.6)
    axes.set(xlabel="drive / mV", ylabel="A / mV", xlim=(0, None), ylim=(0, None))
    return Drawn(
        _named("linearity", reduction),
        _saved(figure),
        f"Drive sweep {reduction.sweep}: amplitude against drive.",
        (reduction.address,),
    )


_MAKERS: dict[str, Callable[[Scope, ReductionDocument], Drawn | None]] = {
    "empty-cell": _background, "dose-run": _dose_run, "ringdown": _ringdown, "resonance": _resonance, "isotherm-bet": _isotherm, "drive-linearity": _linearity,
}  # fmt: skip

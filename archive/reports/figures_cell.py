"""Figures over all films of one cell: areal density against temperature, and density at the transition against its temperature."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from archive.physics.film_static import UNIVERSAL_JUMP
from archive.reports.figure_plots import bar_of_all, enlarged, line, points, stacked
from archive.reports.figure_style import HEIGHTS, LOOKS, Drawn, saved
from archive.reports.figure_values import column_of, output_of, spread_of
from archive.reports.scope import Scope
from schemas.lineage import OutputEntry, ReductionDocument

__all__ = ["cell_figures"]


def cell_figures(scope: Scope) -> Iterator[Drawn]:
    """Yield, for each cell with films, their areal densities in one plane, and their transitions on the universal line."""
    groups: dict[str, dict[str, list[ReductionDocument]]] = {}
    for reduction in scope.reductions:
        if any(
            each.name == "superfluid_density" and each.rows and each.quantity == "areal_mass_density"
            for each in reduction.outputs
        ) and any(each.name == "temperature" and each.rows for each in reduction.outputs):
            films = groups.setdefault(scope.cell_of(reduction), {})
            films.setdefault(reduction.sweep, []).append(reduction)
    for cell, films in sorted(groups.items()):
        # One reduction of each sweep: they have the same density, and the last has the most to say of it.
        members = [each[-1] for _, each in sorted(films.items())]
        planar = any(output_of(each, "crossing_temperature") is not None for each in members)
        made = _densities(scope, cell, members, universal=planar)
        if made is not None:
            yield made
        transitions = [found for _, each in sorted(films.items()) if (found := _transition(each)) is not None]
        if len(transitions) > 1:
            yield _jumps(cell, transitions)


def _named(cell: str) -> str:
    return (cell or "unknown").replace(".r", "-r")


def _coverage(scope: Scope, reduction: ReductionDocument) -> str:
    entry = scope.taken_of(reduction).entry
    name = reduction.sweep
    if entry is None or entry.coverage is None or entry.coverage.value is None:
        return name
    return f"{name}, {entry.coverage.value * 1e6:.2f} µmol m$^{{-2}}$"


def _densities(scope: Scope, cell: str, members: list[ReductionDocument], *, universal: bool) -> Drawn | None:
    figure, (axes,) = stacked([1], height=3.3 + 0.15 * math.ceil(len(members) / 2))
    highest, biggest, common, names = 0.0, 0.0, 0.0, []
    factor, unit = enlarged(np.array([4e-8]), "kg/m^2")
    for number, reduction in enumerate(members):
        T, sigma = (column_of(scope, reduction, name) for name in ("temperature", "superfluid_density"))
        if T is None or sigma is None or not np.isfinite(T * sigma).any():
            continue
        point, shared = spread_of(scope, reduction, "superfluid_density")
        order = np.argsort(T)
        order = order[np.isfinite(T[order]) & np.isfinite(sigma[order])]
        marker, dash, colour = LOOKS[number % len(LOOKS)]
        axes.plot(
            T[order], sigma[order] / factor, dash, marker=marker, markevery=max(1, order.size // 40), color=colour, markerfacecolor="none",
            markeredgewidth=0.6, label=_coverage(scope, reduction),
        )  # fmt: skip
        if point is not None:
            low, high = ((sigma + sign * point)[order] / factor for sign in (-1, 1))
            axes.fill_between(T[order], low, high, color=colour, alpha=0.2, linewidth=0)
        highest, biggest = max(highest, float(T[order].max())), max(biggest, float(sigma[order].max()))
        common = max(common, shared)
        names.append(reduction.address)
    if not names:
        return None
    if universal:
        grid = np.array([0.0, highest])
        line(axes, grid, UNIVERSAL_JUMP * grid / factor, style="-", label="universal line")
    axes.set(
        xlim=(0, highest * 1.03), ylim=(min(0.0, -0.02 * biggest / factor), biggest * 1.08 / factor),
        xlabel="$T$ / K", ylabel=rf"$\sigma_\mathrm{{s}}$ / {unit}",
    )  # fmt: skip
    seen = bar_of_all(axes, 0.85 * biggest / factor, common * biggest / factor)
    figure.legend(loc="outside lower center", ncols=2)
    caption = (
        f"Areal superfluid mass density against temperature, cell {cell or 'not recorded'}{', with the universal line of Nelson and Kosterlitz' if universal else ''}. "
        f"Bands: standard uncertainty of the points alone{'; the single bar: standard uncertainty that all points share, at the largest density' if seen else ''}."
    )
    return Drawn(f"figures/areal-density-{_named(cell)}.pdf", saved(figure), caption, tuple(names))


@dataclass(frozen=True)
class _Transition:
    """One film at its static transition: K and kg/m^2, each with the part of its uncertainty that is its own; and the common part of the ratio."""

    address: str
    temperature: float
    own_temperature: float
    density: float
    own_density: float
    common: float


def _transition(reductions: list[ReductionDocument]) -> _Transition | None:
    """Return the transition of a film by the dynamic fit where there is one, else by the peak of dissipation."""
    for names in (("T_KT_by_fit", "scale_ratio"), ("T_KT_by_peak", "universal_ratio")):
        for reduction in reductions:
            T, ratio = (output_of(reduction, name) for name in names)
            if T is None or ratio is None or T.value is None or ratio.value is None:
                continue
            density = UNIVERSAL_JUMP * T.value * ratio.value
            (own_T, _), (own, common) = _parts(T), _parts(ratio)
            return _Transition(
                reduction.address, T.value, own_T, density, own / ratio.value * density, common / ratio.value
            )
    return None


def _parts(output: OutputEntry) -> tuple[float, float]:
    """Return the uncertainty of a result that is its own, and the rest that it shares with others."""
    whole, own = output.uncertainty or 0.0, output.point or 0.0
    return own, math.sqrt(max(whole**2 - own**2, 0.0))


def _jumps(cell: str, films: list[_Transition]) -> Drawn:
    T, sigma, u = (
        np.array([getattr(each, name) for each in films]) for name in ("temperature", "density", "own_density")
    )  # fmt: skip
    u_T = np.array([each.own_temperature for each in films])
    factor, unit = enlarged(sigma, "kg/m^2")
    figure, panels = stacked([2.6, 1], height=HEIGHTS[1])
    points(panels[0], T, sigma / factor, u / factor)
    panels[0].errorbar(T, sigma / factor, xerr=u_T, fmt="none", ecolor="black", elinewidth=0.5)
    grid = np.array([0.0, 1.15 * float(T.max())])
    line(panels[0], grid, UNIVERSAL_JUMP * grid / factor, label="universal line")
    panels[0].set(ylabel=r"$\sigma_\mathrm{s}(T_\mathrm{KT})$ / " + unit, xlim=(0, grid[1]), ylim=(0, None))
    panels[0].legend(loc="lower right")
    ratio = sigma / (UNIVERSAL_JUMP * T)
    panels[1].axhline(1, color="black", linewidth=0.9)
    points(panels[1], T, ratio, u / (UNIVERSAL_JUMP * T))
    common = max(each.common for each in films)
    room = 1.3 * max(float(np.max(np.abs(ratio - 1) + u / (UNIVERSAL_JUMP * T))), 1.5 * common, 1e-3)
    panels[1].set(
        ylabel=r"$\sigma_\mathrm{s}/\sigma_\mathrm{univ}$",
        xlabel=r"$T_\mathrm{KT}$ / K",
        ylim=(1 - room, 1 + room),
    )
    bar_of_all(panels[1], 1.0, common)
    top = float(sigma.max()) / factor
    bar_of_all(panels[0], 0.5 * top, 0.5 * common * top)
    caption = (
        f"Areal superfluid density at the static transition against its temperature, all {len(films)} films of cell {cell or 'not recorded'}, with the universal line of Nelson and "
        f"Kosterlitz; below, the density over that of the line. Error bars: what each film does not share with the others; the single bars: what all of them share, {100 * common:.2g} per cent."
    )
    return Drawn(
        f"figures/universal-jump-{_named(cell)}.pdf",
        saved(figure),
        caption,
        tuple(each.address for each in films),
    )

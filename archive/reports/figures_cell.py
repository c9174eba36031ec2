"""Figure over all films of one cell: areal density against temperature, with the universal line where films are flat."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from archive.physics.film_static import UNIVERSAL_JUMP
from archive.reports.figure_plots import bar_of_all, enlarged, line, stacked
from archive.reports.figure_style import LOOKS, Drawn, saved
from archive.reports.figure_values import column_of, output_of, spread_of
from archive.reports.scope import Scope
from schemas.lineage import ReductionDocument

__all__ = ["cell_figures"]


def cell_figures(scope: Scope) -> Iterator[Drawn]:
    """Yield, for each cell with films, their areal densities in one plane."""
    groups: dict[str, dict[str, list[ReductionDocument]]] = {}
    for reduction in scope.reductions:
        # Third sound gives a density too, at one temperature.
        if scope.taken_of(reduction).sheet.kind == "temperature-sweep" and {
            "temperature",
            "superfluid_density",
        } <= {
            each.name
            for each in reduction.outputs
            if each.rows and each.quantity in ("temperature", "areal_mass_density")
        }:
            films = groups.setdefault(scope.cell_of(reduction), {})
            films.setdefault(reduction.sweep, []).append(reduction)
    for cell, films in sorted(groups.items()):
        # One reduction of each sweep: they have the same density, and the last has the most to say of it.
        members = [each[-1] for _, each in sorted(films.items())]
        planar = all(output_of(each, "amplitude_of_power_law") is None for each in members)
        made = _densities(scope, cell, members, universal=planar)
        if made is not None:
            yield made


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

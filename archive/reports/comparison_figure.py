"""One figure of two reductions: their main curve laid over each other, its difference, and how far each result moved."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from contextlib import nullcontext

import matplotlib as mpl
import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from archive.reports.axis_units import in_unit, symbol
from archive.reports.figure_style import LOOKS, STYLE, WIDTH, Column, as_svg, raised, saved
from schemas.lineage import OutputEntry, ReductionDocument
from schemas.quantity import unit_factor
from schemas.units import parse_unit

__all__ = ["comparison_figure"]

# Along which output, and which one is laid over, in order of liking.
_ALONG = ("temperature", "middle_temperature", "amount", "averaging_time", "time")
_SHOWN = (
    "superfluid_density", "superfluid_fraction", "molar_heat_capacity", "heat_capacity", "period_drop",
    "added_dissipation", "allan_deviation",
)  # fmt: skip

Reader = Callable[[str, str], Column]


def comparison_figure(
    first: ReductionDocument,
    second: ReductionDocument,
    shifts: Sequence[tuple[str, float]],
    read: Reader,
    *,
    kind: str = "pdf",
) -> bytes:
    """Return a figure of two reductions, or of their results alone where they have no curve of the same kind.

    Parameters
    ----------
    first, second : ReductionDocument
    shifts : sequence of (str, float)
        Results with their change over its standard uncertainty.
    read : callable
        Array of a reduction by address and name, in the document's unit.
    kind : {"pdf", "svg"}

    Raises
    ------
    ValueError
        If there is neither a curve nor a result to show.
    """
    chosen = _curve(first, second)
    rows = [each for each in (("curve", 2.2), ("difference", 1.0)) if chosen is not None]
    if shifts:
        rows.append(("results", 0.5 + 0.17 * len(shifts)))
    if not rows:
        raise ValueError("there is neither a curve nor a result that both reductions have")
    with mpl.rc_context(STYLE):  # type: ignore[arg-type]
        figure = Figure(figsize=(WIDTH, sum(size for _, size in rows) + 0.3), layout="constrained")
        axes = figure.subplots(len(rows), 1, height_ratios=[size for _, size in rows], squeeze=False)[:, 0]
        if chosen is not None:
            _draw_curve(axes[0], axes[1], first, second, chosen, read)
        if shifts:
            _draw_shifts(axes[-1], shifts)
        with as_svg() if kind == "svg" else nullcontext():
            return saved(figure)


def _curve(first: ReductionDocument, second: ReductionDocument) -> tuple[OutputEntry, OutputEntry] | None:
    """Abscissa and ordinate that both have, of one kind and scale."""
    sides = [{entry.name: entry for entry in each.outputs if entry.rows} for each in (first, second)]
    both = {
        name: entry
        for name, entry in sides[0].items()
        if name in sides[1]
        and (entry.quantity, entry.scale) == (sides[1][name].quantity, sides[1][name].scale)
    }
    for along in (name for name in _ALONG if name in both):
        alike = [
            name
            for name in both
            if name not in _ALONG
            and both[name].rows == both[along].rows
            and sides[1][name].rows == sides[1][along].rows
        ]
        if alike:
            return both[along], both[next((name for name in _SHOWN if name in alike), alike[-1])]
    return None


def _draw_curve(
    top: Axes,
    below: Axes,
    first: ReductionDocument,
    second: ReductionDocument,
    chosen: tuple[OutputEntry, OutputEntry],
    read: Reader,
) -> None:
    along, shown = chosen
    drawn: list[tuple[Column, Column]] = []
    units = ("", "")
    for document, (marker, line, colour), face in zip(
        (first, second), LOOKS, ("none", "#444444"), strict=False
    ):
        x, x_unit = in_unit(_read(document, along, read), along.unit, along.quantity)
        y, y_unit = in_unit(_read(document, shown, read), shown.unit, shown.quantity)
        order = np.argsort(x)
        drawn.append((x[order], y[order]))
        units = (x_unit, y_unit)
        top.plot(
            *drawn[-1], marker=marker, linestyle=line, color=colour, markerfacecolor=face, linewidth=0.5,
            label=document.address, markevery=max(1, len(x) // 40),
        )  # fmt: skip
    top.figure.legend(*top.get_legend_handles_labels(), loc="outside upper left", ncols=2)
    top.set_ylabel(_label(shown.name, units[1]))
    below.sharex(top)
    below.set_xlabel(_label(along.name, units[0]))
    below.set_ylabel("difference")
    (x1, y1), (x2, y2) = drawn
    if x1.shape == x2.shape and np.array_equal(x1, x2, equal_nan=True):
        below.plot(x1, y2 - y1, marker=".", linestyle="none", color="black")
    else:
        # Other abscissae: the second is read off between its points, and only where it has points on both sides.
        known = np.isfinite(x2) & np.isfinite(y2)
        inside = (
            np.isfinite(x1)
            & (x1 >= np.min(x2[known], initial=np.inf))
            & (x1 <= np.max(x2[known], initial=-np.inf))
        )
        if known.any() and inside.any():
            between = np.interp(x1[inside], x2[known], y2[known])
            below.plot(x1[inside], between - y1[inside], marker=".", linestyle="none", color="black")
            below.set_ylabel("difference (interp.)")
    below.axhline(0.0, color="black", linewidth=0.4)


def _label(name: str, unit: str) -> str:
    if unit == "1":
        return symbol(name)
    written = raised(parse_unit(unit).typographic)
    return f"{symbol(name)} / {written}"


def _read(document: ReductionDocument, entry: OutputEntry, read: Reader) -> Column:
    own = next(each for each in document.outputs if each.name == entry.name)
    factor = unit_factor(own.unit, own.quantity) / unit_factor(entry.unit, entry.quantity)
    return np.asarray(read(document.address, entry.name) * factor, dtype=np.float64)


def _draw_shifts(axes: Axes, shifts: Sequence[tuple[str, float]]) -> None:
    names = [name for name, _ in shifts][::-1]
    values = [value for _, value in shifts][::-1]
    places = np.arange(len(names))
    axes.axvspan(-1, 1, color="#dddddd", linewidth=0)
    axes.axvline(0.0, color="black", linewidth=0.4)
    axes.plot(values, places, marker="o", linestyle="none", color="black")
    axes.set_yticks(places, names)
    axes.tick_params(axis="y", which="both", length=0)
    axes.set_ylim(-0.7, len(names) - 0.3)
    reach = max(2.0, 1.15 * max(map(abs, values)))
    axes.set_xlim(-reach, reach)
    axes.set_xlabel("change / its standard uncertainty")

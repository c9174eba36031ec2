"""The plane as a figure for a talk or a wall: the house style, vector PDF or SVG, the same bytes for the same archive."""

from __future__ import annotations

from contextlib import nullcontext
from typing import Any

import matplotlib as mpl
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Rectangle
from matplotlib.ticker import FixedFormatter, FixedLocator, NullLocator
from matplotlib.transforms import ScaledTranslation

from archive.physics.film_static import onset_coverage
from archive.reports.axis_units import symbol
from archive.reports.figure_style import LOOKS, STYLE, as_svg, raised, saved
from archive.reports.plane_layout import height_unit, is_short, logarithmic, mark_and_shade, side_by_side
from archive.reports.plane_ticks import round_values, value_texts
from archive.reports.plane_view import Bar, PlaneView

__all__ = ["plane_figure"]

_SIZE = (6.6, 4.4)
_POINTS_APART = 2.2
"""Points of paper between bars that stand beside each other at one height."""


def plane_figure(view: PlaneView, *, kind: str = "pdf") -> bytes:
    """Return the plane as a figure.

    Parameters
    ----------
    view : PlaneView
    kind : {"pdf", "svg"}
    """
    with mpl.rc_context(STYLE):  # type: ignore[arg-type]
        figure = Figure(figsize=_SIZE, layout="constrained")
        axes = figure.subplots()
        _sides(axes, view)
        _lines(axes, view)
        _strips(axes, view)
        _bars(axes, view)
        _points(axes, view)
        _legend(figure, view)
        with as_svg() if kind == "svg" else nullcontext():
            return saved(figure)


def _shade(look: int) -> str:
    return LOOKS[mark_and_shade(look)[1]][2]


def _sides(axes: Axes, view: PlaneView) -> None:
    window, unit, log = view.window, height_unit(view.axis), logarithmic(view.axis)
    axes.set_xscale("log" if log[0] else "linear")
    axes.set_yscale("log" if log[1] else "linear")
    axes.set_xlim(window.cold, window.warm)
    bottom, top = window.bottom * unit.per_si, window.top * unit.per_si
    axes.set_ylim(bottom, top)
    axes.set_xlabel(f"${symbol('temperature')}$ / K")
    values = round_values(window.cold, window.warm, log=log[0])
    axes.xaxis.set_major_locator(FixedLocator(values))
    axes.xaxis.set_major_formatter(FixedFormatter(list(map(raised, value_texts(values)))))
    axes.xaxis.set_minor_locator(NullLocator())
    axes.yaxis.set_minor_locator(NullLocator())
    if view.axis == "cell":
        names = [name for name, _ in view.lanes]
        axes.set_yticks([lane + 0.5 for lane in range(len(names))], names)
        for lane in range(1, len(names)):
            axes.axhline(lane, color="#bbbbbb", linewidth=0.4, zorder=0)
        axes.tick_params(axis="y", length=0)
        return
    values = round_values(bottom, top, log=log[1])
    axes.yaxis.set_major_locator(FixedLocator(values))
    axes.yaxis.set_major_formatter(FixedFormatter(list(map(raised, value_texts(values)))))
    axes.set_ylabel(f"${symbol(view.axis)}$ / {raised(unit.text)}")


def _lines(axes: Axes, view: PlaneView) -> None:
    scale = height_unit("coverage").per_si
    for line in view.lines:
        ends = (max(view.window.cold, 0.0), view.window.warm)
        heights = onset_coverage(ends, inert_coverage=line.inert) * scale
        colour = "black" if line.look is None else _shade(line.look)
        axes.plot(ends, heights, "--", color=colour, linewidth=0.7, dashes=(6, 3), zorder=1)
        if line.inert_uncertainty and ends[0] == 0.0:
            axes.errorbar([0.0], [line.inert * scale], yerr=[line.inert_uncertainty * scale], color=colour,
                          elinewidth=0.7, capsize=2, clip_on=False, zorder=4)  # fmt: skip


def _strips(axes: Axes, view: PlaneView) -> None:
    scale = height_unit(view.axis).per_si
    most = max((strip.count for strip in view.strips), default=1)
    for strip in view.strips:
        box = Rectangle(
            (strip.cold, strip.bottom * scale), strip.warm - strip.cold, (strip.top - strip.bottom) * scale,
            facecolor=_shade(strip.look), edgecolor=_shade(strip.look), alpha=0.15 + 0.6 * strip.count / most, linewidth=0.3,
        )  # fmt: skip
        axes.add_patch(box)


def _bars(axes: Axes, view: PlaneView) -> None:
    places, scale = side_by_side(view.bars), height_unit(view.axis).per_si
    for bar in view.bars:
        narrow = is_short(bar, view.window, log=logarithmic(view.axis)[0])
        x, y = [bar.cold, bar.warm], [bar.bottom * scale, bar.top * scale]
        if bar.bottom != bar.top and not narrow:
            # Which temperature went with which height is not known here: a box, not a slanted line.
            x, y = [x[0], x[1], x[1], x[0], x[0]], [y[0], y[0], y[1], y[1], y[0]]
        (drawn,) = axes.plot(
            x, y, linestyle=_line_of(bar), marker="|" if narrow and bar.bottom == bar.top else "", markersize=5, markeredgewidth=1.2,
            color=_shade(bar.look), linewidth=1.3, alpha=0.75, solid_capstyle="butt", zorder=2,
        )  # fmt: skip
        drawn.set_transform(_shifted(axes, places[bar.address] * _POINTS_APART))


def _shifted(axes: Axes, beside: float) -> Any:
    figure = axes.get_figure(root=True)
    if figure is None or not beside:
        return axes.transData
    return axes.transData + ScaledTranslation(0, beside / 72, figure.dpi_scale_trans)


def _line_of(bar: Bar) -> str | tuple[int, tuple[float, ...]]:
    """Return full for a reduced sweep, dotted for a withdrawn or stale one, broken for one that is not reduced."""
    if "withdrawn" in bar.marks or "stale" in bar.marks:
        return (0, (1, 1.5))
    return (0, (4, 1)) if "not reduced" in bar.marks else "-"


def _points(axes: Axes, view: PlaneView) -> None:
    scale = height_unit(view.axis).per_si
    for point in view.points:
        marker = mark_and_shade(point.look)[0]
        u = (point.temperature_uncertainty or 0.0, (point.height_uncertainty or 0.0) * scale)
        axes.errorbar(
            [point.temperature], [point.height * scale], xerr=[u[0]] if u[0] else None, yerr=[u[1]] if u[1] else None,
            fmt=marker, markersize=4, markerfacecolor="white" if marker not in "x+" else _shade(point.look), markeredgewidth=0.8,
            color=_shade(point.look), elinewidth=0.6, capsize=0, zorder=3,
        )  # fmt: skip


def _legend(figure: Figure, view: PlaneView) -> None:
    shown = {bar.look for bar in view.bars} | {each.look for each in view.strips}
    handles = [
        Line2D([], [], marker=mark_and_shade(look)[0], color=_shade(look), linewidth=1.3, markersize=4, markerfacecolor="white", label=name)
        for name, look in view.cells
        if look in shown
    ]  # fmt: skip
    if view.lines:
        handles.append(Line2D([], [], linestyle="--", dashes=(6, 3), color="black", linewidth=0.7, label="universal jump"))  # fmt: skip
    if handles:
        figure.legend(handles=handles, loc="outside upper left", ncols=7)

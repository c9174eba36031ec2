"""What figures are drawn with: panels one above the other, points with their uncertainty, residuals, the one bar that all points share."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter, LogLocator, MaxNLocator, NullFormatter

from archive.reports.figure_style import LOOKS, WIDTH, Column

__all__ = [
    "bar_of_all",
    "enlarged",
    "letters",
    "line",
    "logarithmic",
    "points",
    "residuals",
    "stacked",
    "tight_to",
]

_LADDERS: dict[str, tuple[tuple[float, str], ...]] = {
    "s": ((1e-12, "ps"), (1e-9, "ns"), (1e-6, "µs"), (1e-3, "ms"), (1.0, "s"), (3600.0, "h")),
    "V": ((1e-9, "nV"), (1e-6, "µV"), (1e-3, "mV"), (1.0, "V")),
    "K": ((1e-6, "µK"), (1e-3, "mK"), (1.0, "K")),
    "mol": ((1e-9, "nmol"), (1e-6, "µmol"), (1e-3, "mmol"), (1.0, "mol")),
    "m": ((1e-9, "nm"), (1e-6, "µm"), (1e-3, "mm"), (1.0, "m")),
    "kg/m^2": ((1e-12, "ng m$^{-2}$"), (1e-9, "µg m$^{-2}$"), (1e-6, "mg m$^{-2}$")),
    "mol/m^2": ((1e-9, "nmol m$^{-2}$"), (1e-6, "µmol m$^{-2}$")),
    "mol/kg": ((1e-3, "µmol g$^{-1}$"), (1.0, "mmol g$^{-1}$")),
    "J/K": ((1e-6, "µJ K$^{-1}$"), (1e-3, "mJ K$^{-1}$"), (1.0, "J K$^{-1}$")),
    "kg m^2/s": ((1e-12, "pJ s"), (1e-9, "nJ s"), (1e-6, "µJ s")),
    "kg/m^3": ((1e-3, "g m$^{-3}$"), (1.0, "kg m$^{-3}$")),
    "Hz": ((1e-9, "nHz"), (1e-6, "µHz"), (1e-3, "mHz"), (1.0, "Hz"), (1e3, "kHz")),
    "H": ((1e-9, "nH"), (1e-6, "µH"), (1e-3, "mH"), (1.0, "H")),
    "Ohm": ((1e-3, "mΩ"), (1.0, "Ω"), (1e3, "kΩ"), (1e6, "MΩ")),
    "Pa": ((1e-3, "mPa"), (1.0, "Pa"), (1e3, "kPa"), (1e6, "MPa")),
    "m/s": ((1e-6, "µm s$^{-1}$"), (1e-3, "mm s$^{-1}$"), (1.0, "m s$^{-1}$")),
}


def stacked(
    heights: Sequence[float], *, height: float, width: float = WIDTH, shared: bool = True
) -> tuple[Figure, list[Axes]]:
    """Return a figure with panels one above the other, and the panels from the top.

    Parameters
    ----------
    heights : sequence of float
        Relative heights.
    height, width : float
        Inches.
    shared : bool
        All panels have one abscissa, that of the lowest.
    """
    figure = Figure(figsize=(width, height), layout="constrained")
    made = figure.subplots(
        len(heights), 1, sharex=shared, squeeze=False, gridspec_kw={"height_ratios": list(heights)}
    )
    panels = [made[k, 0] for k in range(len(heights))]
    for panel, share in zip(panels, heights, strict=True):
        if share < max(heights) / 1.9 and len(heights) > 1:
            panel.yaxis.set_major_locator(MaxNLocator(3, steps=[1, 2, 5, 10]))
    figure.align_ylabels(panels)
    return figure, panels


def enlarged(values: Column, unit: str) -> tuple[float, str]:
    """Return what one is to divide by, and the unit to write, so that the largest value reads well.

    Parameters
    ----------
    values : ndarray
        SI.
    unit : str
        SI unit; ``1`` for a pure number, which gets a power of ten where it is small or large.

    Examples
    --------
    >>> enlarged(np.array([0.0, 3e-9]), "s")
    (1e-09, 'ns')
    >>> enlarged(np.array([2.4e-7]), "1")
    (1e-07, '10$^{-7}$')
    """
    finite = np.abs(values[np.isfinite(values)])
    largest = float(finite.max()) if finite.size else 0.0
    ladder = _LADDERS.get(unit)
    if ladder is None:
        power = math.floor(math.log10(largest)) if largest > 0 else 0
        if unit != "1" or -2 <= power <= 3:
            return 1.0, "" if unit == "1" else unit
        return 10.0**power, f"10$^{{{power}}}$"
    able = [each for each in ladder if largest >= 0.999 * each[0] * (3.0 if each[1] == "h" else 1.0)]
    return able[-1] if able else ladder[0]


def points(
    panel: Axes,
    x: Column,
    y: Column,
    u: Column | None = None,
    *,
    look: int = 0,
    label: str | None = None,
    filled: bool = False,
    pale: bool = False,
) -> None:
    """Draw points with their standard uncertainty; many points are drawn small."""
    marker, _, colour = LOOKS[look % len(LOOKS)]
    known = np.isfinite(x) & np.isfinite(y)
    many = np.count_nonzero(known) > 120
    face = colour if filled or marker in "x+" else "none"
    colour = "#999999" if pale else colour
    has = u is not None and bool(np.any(np.nan_to_num(u) > 0))
    panel.errorbar(
        x[known], y[known], yerr=np.nan_to_num(u[known]) if u is not None and has else None, fmt=marker, color=colour,
        markerfacecolor="#999999" if pale and filled else face, markeredgewidth=0.4 if many else 0.6, markersize=1.6 if many else 2.8, ecolor=colour,
        elinewidth=0.3 if many else 0.5, capsize=0, label=label, zorder=2,
    )  # fmt: skip


def line(
    panel: Axes, x: Column, y: Column, *, look: int = 0, label: str | None = None, style: str | None = None, colour: str | None = None
) -> None:  # fmt: skip
    """Draw a fitted or computed curve above the points."""
    _, dash, own = LOOKS[look % len(LOOKS)]
    panel.plot(x, y, style or dash, color=colour or own, linewidth=0.9, label=label, zorder=3)


def residuals(
    panel: Axes,
    x: Column,
    r: Column,
    u: Column | None = None,
    *,
    name: str,
    look: int = 0,
    pale: bool = False,
) -> None:
    """Draw residuals about a line at zero, with room on both sides alike."""
    panel.axhline(0, color="black", linewidth=0.5, zorder=1)
    points(panel, x, r, u, look=look, pale=pale)
    finite = np.abs(r[np.isfinite(r) & np.isfinite(x)])
    if finite.size and float(finite.max()) > 0:
        low, high = panel.get_ylim()
        most = max(1.15 * float(finite.max()), abs(low), abs(high))
        panel.set_ylim(-most, most)
    panel.set_ylabel(name)


def bar_of_all(panel: Axes, y: float, half: float, *, at: float = 0.965) -> bool:
    """Draw the standard uncertainty that all points share as one bar; return whether it is large enough to be seen.

    Parameters
    ----------
    panel : Axes
        With its final limits.
    y, half : float
        Middle of the bar and the standard uncertainty, both as the axis has them.
    at : float
        Place along the axis, 0 to 1.
    """
    low, high = panel.get_ylim()
    if not half > 0 or 2 * half < 0.012 * (high - low):
        return False
    panel.plot([at, at], [y - half, y + half], "-", marker="_", markersize=5, color="black", linewidth=1.0,
               transform=panel.get_yaxis_transform(), zorder=4)  # fmt: skip
    return True


def letters(panels: Sequence[Axes]) -> None:
    """Name panels (a), (b), ... in their upper left corners, above all that is drawn in them."""
    for panel, letter in zip(panels, "abcdef", strict=False):
        figure = panel.get_figure(root=True)
        # A line of 8 pt with its gap, as a share of the panel; the layout that follows changes the height by little.
        height = 72 * panel.get_position().height * (figure.get_figheight() if figure is not None else 3.0)
        share = min(11.5 / height, 0.4)
        low, high = panel.get_ylim()
        if panel.get_yscale() == "log":
            panel.set_ylim(low, high * (high / low) ** (share / (1 - share)))
        else:
            panel.set_ylim(low, high + (high - low) * share / (1 - share))
        panel.annotate(
            f"({letter})",
            (0, 1),
            xycoords="axes fraction",
            xytext=(3.5, -3),
            textcoords="offset points",
            ha="left",
            va="top",
            zorder=5,
        )


def logarithmic(panel: Axes, *, across: bool = False) -> None:
    """Make an axis logarithmic; over two decades or less its ticks are plain numbers and not powers of ten.

    Parameters
    ----------
    panel : Axes
        With all that is to be shown.
    across : bool
        The abscissa; else the ordinate.
    """
    (panel.set_xscale if across else panel.set_yscale)("log")
    axis = panel.xaxis if across else panel.yaxis
    low, high = axis.get_view_interval()
    if low > 0 and high < 200 * low:
        axis.set_major_locator(
            LogLocator(subs=(1.0, 2.0, 5.0) if high > 8 * low else (1.0, 1.5, 2.0, 3.0, 4.0, 5.0, 6.0, 8.0))
        )
        axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
        axis.set_minor_formatter(NullFormatter())


def tight_to(panel: Axes, x: Column, *, margin: float = 0.02) -> None:
    """Set the abscissa to the finite values with a small margin."""
    finite = x[np.isfinite(x)]
    if finite.size:
        low, high = float(finite.min()), float(finite.max())
        room = margin * (high - low) if high > low else max(abs(low), 1.0) * margin
        panel.set_xlim(low - room, high + room)

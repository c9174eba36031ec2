"""A small plot for each reduction: the array that it was made for, with the universal line where a film is flat."""

from __future__ import annotations

from typing import Final

import numpy as np

from archive.physics.film_static import UNIVERSAL_JUMP
from archive.reports.axis_units import in_unit, symbol, unit_text
from archive.reports.holdings import Holdings
from archive.reports.small_plots import Column
from archive.reports.svg import Series, axis_of, plot
from schemas.lineage import OutputEntry, ReductionDocument
from schemas.quantity import unit_factor

__all__ = ["reduction_plot", "shown_arrays"]

_PAIRS: Final[dict[str, tuple[tuple[str, str], ...]]] = {
    "bulk-oscillator": (("temperature", "superfluid_fraction"),),
    "empty-calorimeter": (("middle_temperature", "heat_capacity"), ("temperature", "heat_capacity")),
    "film-dynamic": (("temperature", "added_dissipation"), ("temperature", "period_drop")),
    "film-transition": (("temperature", "superfluid_density"),),
    "heat-capacity": (("middle_temperature", "molar_heat_capacity"), ("temperature", "molar_heat_capacity")),
    "isotherm-from-doses": (("relative_pressure_of_rows", "adsorbed"),),
    "line-tracking": (("spectra_temperature", "line_frequency"),),
    "persistent-current": (("temperature", "superfluid_density"), ("temperature", "ratio")),
    "porous-film": (("temperature", "superfluid_density"),),
    "porous-heat-capacity": (("middle_temperature", "residual"), ("temperature", "residual")),
    "resonance-tracking": (("spectra_temperature", "line_frequency"),),
    "stability": (("averaging_time", "allan_deviation"),),
    "thermometer-calibration": (("reference_temperature", "residual"),),
    "third-sound": (("coverage_from_amount", "superfluid_density"),),
    "universal-jump": (("films_T_KT_by_peak", "films_density_at_transition"),),
}
"""What is shown of a plan along what, in order of liking; what the other plans of the shipped ones found is in the plot of their sweep."""

_SHIPPED: Final = frozenset({"dead-volume", "dose-run", "drive-linearity", "drive-pulse", "empty-cell", "isotherm-bet", "pulse-lines", "resonance", "ringdown", "bulk-superfluid-density"})  # fmt: skip

# Of a laboratory's own plans: along which output, and which one is shown, in order of liking.
_ALONG = (
    "middle_temperature", "temperature", "averaging_time", "coverage", "coverage_from_amount", "relative_pressure_of_rows", "amount",
)  # fmt: skip
_SHOWN = (
    "superfluid_density", "molar_heat_capacity", "heat_capacity", "superfluid_fraction", "allan_deviation", "period_drop", "dissipation",
)  # fmt: skip


def shown_arrays(reduction: ReductionDocument) -> tuple[OutputEntry, OutputEntry] | None:
    """Return the array that a reduction by a plan of one's own is shown along, and the array that is shown; None where no two have one length."""
    arrays = {each.name: each for each in reduction.outputs if each.rows}
    along = next((arrays[name] for name in _ALONG if name in arrays), None)
    if along is None:
        return None
    alike = [each for each in arrays.values() if each.rows == along.rows and each.name not in _ALONG]
    shown = next((arrays[name] for name in _SHOWN if arrays.get(name) in alike), alike[-1] if alike else None)
    return None if shown is None else (along, shown)


def reduction_plot(held: Holdings, reduction: ReductionDocument) -> tuple[str, str] | None:
    """Return the plot of a reduction and what it shows, or None where its sweep's own plot shows as much.

    Parameters
    ----------
    held : Holdings
    reduction : ReductionDocument
    """
    for along, shown in _candidates(reduction):
        x, y = (held.column(reduction.address, each.name) for each in (along, shown))
        if x is None or y is None or x.shape != y.shape or not np.isfinite(x * y).any():
            continue
        # What was gathered from many reductions has no description of its own.
        gathered = any(each.many for each in reduction.plan.needs.values())
        return _plotted(
            reduction, along, shown, x, y
        ), reduction.plan.title if gathered else shown.description
    return None


def _candidates(reduction: ReductionDocument) -> list[tuple[OutputEntry, OutputEntry]]:
    name = reduction.plan.name
    if name in _SHIPPED:
        return []
    if name not in _PAIRS:
        own = shown_arrays(reduction)
        return [] if own is None else [own]
    arrays = {each.name: each for each in reduction.outputs if each.rows}
    return [(arrays[a], arrays[b]) for a, b in _PAIRS[name] if a in arrays and b in arrays]


def _plotted(
    reduction: ReductionDocument, along: OutputEntry, shown: OutputEntry, x: Column, y: Column
) -> str:
    xs, x_unit = in_unit(x, along.unit, along.quantity)
    ys, y_unit = in_unit(y, shown.unit, shown.quantity)
    log = along.quantity == "time" and bool((xs[np.isfinite(xs)] > 0).all() and (ys[np.isfinite(ys)] > 0).all())  # fmt: skip
    series = [Series(xs, ys, marks=True)]
    if shown.quantity == "areal_mass_density" and along.quantity == "temperature" and reduction.plan.name != "porous-film":  # fmt: skip
        # The line is drawn as far as the density goes: above that it says nothing here.
        factor = UNIVERSAL_JUMP * unit_factor(x_unit, along.quantity) / unit_factor(y_unit, shown.quantity)
        end = min(float(np.nanmax(xs)), float(np.nanmax(ys)) / factor)
        ends = np.array([0.0, end])
        series.append(Series(ends, factor * ends, dash="0.8 0.5"))
    x_axis = axis_of(_named(along, x_unit), [each.x for each in series], log=log)
    y_axis = axis_of(_named(shown, y_unit), [each.y for each in series], log=log)
    if x_axis is None or y_axis is None:
        raise ValueError(f"{shown.name}: found no value, expected some")
    label = f"{reduction.address}: {shown.description} against {along.description}"
    return plot(x_axis, y_axis, series, label=label)


def _named(output: OutputEntry, unit: str) -> str:
    shown = unit_text(unit)
    return f"{symbol(output.quantity)} / {shown}" if shown else symbol(output.quantity)

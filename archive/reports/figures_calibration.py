"""Figures of thermometers: a calibration with its residuals and their bands, and the drift from one calibration to the next."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from archive.reduction.calibration_comparison import Drift, drifts
from archive.reports.figure_plots import enlarged, letters, line, logarithmic, points, residuals, stacked
from archive.reports.figure_style import HEIGHTS, Drawn, name_of, saved
from archive.reports.figure_values import column_of, output_of, spread_of, step_of, told, wanted
from archive.reports.scope import Scope
from schemas.lineage import ReductionDocument
from schemas.quantity import Quantity
from schemas.thermometer import Calibration

__all__ = ["calibration_figure", "drift_figures"]

_SYMBOLS = {"resistance": "$R$", "mutual_inductance": "$M$", "voltage": "$U$", "pressure": "$p$"}


def calibration_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return reading against temperature with the curve, and residuals with the uncertainty of fit and form."""
    T, reading = wanted(scope, reduction, "reference_temperature"), wanted(scope, reduction, "reading")
    fitted, r = wanted(scope, reduction, "fitted_temperature"), wanted(scope, reduction, "residual")
    point, common = spread_of(scope, reduction, "reference_temperature")
    entry = next(each for each in reduction.outputs if each.name == "reading")
    order = np.argsort(fitted)
    figure, panels = stacked([1.8, 1.4], height=HEIGHTS[1])
    unit = Quantity(value=1.0, unit=entry.unit, kind=entry.quantity).si_unit
    factor, label = enlarged(reading, unit)
    points(panels[0], T, reading / factor)
    line(panels[0], fitted[order], reading[order] / factor)
    named = _SYMBOLS.get(entry.quantity, "reading")
    panels[0].set_ylabel(f"{named} / {label}" if label else named)
    if float(np.nanmin(reading)) > 0 and float(np.nanmax(reading)) > 3 * float(np.nanmin(reading)):
        logarithmic(panels[0])
    scale, r_label = enlarged(r, "K")
    own = np.zeros(T.shape) if point is None else point
    residuals(panels[1], T, r / scale, own / scale, name=f"$T_\\mathrm{{ref}} - T$ / {r_label}")
    form = output_of(reduction, "interpolation_uncertainty")
    share = 0.0 if form is None or form.value is None else form.value
    u_fit = column_of(scope, reduction, "fit_uncertainty")
    band = np.hypot(0.0 if u_fit is None else u_fit, share * fitted)[order] / scale
    panels[1].fill_between(fitted[order], -band, band, color="0.75", linewidth=0, zorder=1)
    if common > 0:
        whole = np.hypot(band, common * fitted[order] / scale)
        line(panels[1], fitted[order], whole, style="--")
        line(panels[1], fitted[order], -whole, style="--")
        panels[1].set_ylim(-1.15 * max(np.max(whole), np.nanmax(np.abs(r) + own) / scale), 1.15 * max(np.max(whole), np.nanmax(np.abs(r) + own) / scale))  # fmt: skip
    panels[1].set_xlabel("$T$ / K")
    panels[1].set_xlim(0.93 * float(np.nanmin(T)), 1.07 * float(np.nanmax(T)))
    logarithmic(panels[1], across=True)
    letters(panels)
    step = step_of(reduction, "calibration-fit")
    shared = "; dashed, with what the reference shares" if common > 0 else ""
    results = told(scope, reduction, residual_rms="rms of the residuals", leave_one_out="rms of points left out of their own fit")  # fmt: skip
    caption = (
        f"Calibration {reduction.sweep}: (a) reading against reference temperature with the curve of form {step.facts.get('form', 'not recorded')} (line), (b) reference less curve. "
        f"Error bars: standard uncertainty of each point alone; grey band: standard uncertainty of the fit with that of the form between the points{shared}. {results}"
    )
    return Drawn(name_of("calibration", reduction), saved(figure), caption, (reduction.address,))


def drift_figures(scope: Scope) -> Iterator[Drawn]:
    """Yield, for each thermometer in use with several calibrations at hand, the difference of each from the one before it."""
    used = {each.thermometer for each in scope.calibrations}
    known: dict[str, dict[str, Calibration]] = {}
    for held in scope.cooldowns.values():
        for record in held.of_type(Calibration):
            if record.thermometer in used:
                known.setdefault(record.thermometer, {})[record.address] = record
    for thermometer, records in sorted(known.items()):
        found = [each for each in drifts(records.values()) if each.found is not None]
        if found:
            yield _drift(thermometer, found)


def _drift(thermometer: str, found: list[Drift]) -> Drawn:
    figure, (axes,) = stacked([1], height=HEIGHTS[0] + 0.4)
    axes.axhline(0, color="black", linewidth=0.5)
    ends = []
    for k, each in enumerate(found):
        if each.found is None:
            continue
        T, difference, u = each.found.temperature, each.found.difference, each.found.uncertainty
        line(axes, T, difference * 1e3, look=k, label=f"{each.later} less {each.earlier}")
        axes.fill_between(T, (difference - u) * 1e3, (difference + u) * 1e3, color="0.8", linewidth=0, zorder=1)  # fmt: skip
        ends += [float(T.min()), float(T.max())]
    axes.set(xlabel="$T$ / K", ylabel=r"$\Delta T$ / mK", xlim=(min(ends), max(ends)))
    logarithmic(axes, across=True)
    axes.legend(loc="best")
    scales = ", ".join(sorted({each.scale for each in found}))
    sources = tuple(dict.fromkeys(side for each in found for side in (each.earlier, each.later)))
    caption = (
        f"Drift of thermometer {thermometer}: temperature by each calibration less that by the one before it, for the same readings, on {scales}. "
        "Band: standard uncertainty of the difference, in which what both calibrations share cancels."
    )
    return Drawn(f"figures/drift-{thermometer}.pdf", saved(figure), caption, sources)

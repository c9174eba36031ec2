"""Figures of how an oscillator is driven and how steady it is: linearity of drive and detection, stability."""

from __future__ import annotations

import math

import numpy as np
from matplotlib.axes import Axes

from archive.physics.linear_fit import linear_fit, straight_line
from archive.reports.figure_plots import enlarged, letters, line, points, residuals, stacked, tight_to
from archive.reports.figure_style import Column, Drawn, NoFigure, name_of, saved
from archive.reports.figure_values import fact, output_of, scalar, spread_of, step_of, taken, told, wanted
from archive.reports.scope import Scope
from schemas.lineage import ReductionDocument

__all__ = ["linearity_figure", "stability_figure"]


def linearity_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return amplitude against torque with proportionality, the departure from it, and the period against amplitude."""
    step = step_of(reduction, "drive-linearity")
    drive, A = taken(scope, reduction, step, "drive"), taken(scope, reduction, step, "amplitude")
    power = int(fact(step, "p")) if math.isfinite(fact(step, "p")) else 1
    known = np.isfinite(drive) & np.isfinite(A)
    torque = drive**power
    slope = linear_fit(torque[known][:, np.newaxis], A[known], names=("response",), absolute=False).value(
        "response"
    )
    P = taken(scope, reduction, step, "period") if "period" in step.inputs else None
    figure, panels = stacked([2.2, 1] + ([1.4] if P is not None else []), height=4.4 if P is not None else 3.2, shared=False)  # fmt: skip
    factor, unit = enlarged(A, "V")
    if power == 1:
        scale, scaled_unit = enlarged(torque, "V")
        name = f"drive / {scaled_unit}"
    else:
        scale, name = 1.0, f"drive$^{power}$ / V$^{power}$"
    points(panels[0], torque / scale, A / factor)
    line(panels[0], np.array([0.0, float(np.nanmax(torque))]) / scale, slope * np.array([0.0, float(np.nanmax(torque))]) / factor)  # fmt: skip
    panels[0].set(ylabel=f"$A$ / {unit}", ylim=(0, None))
    panels[0].tick_params(labelbottom=False)
    r = A - slope * torque
    r_factor, r_unit = enlarged(r, "V")
    residuals(panels[1], torque / scale, r / r_factor, name=f"$r$ / {r_unit}")
    panels[1].set_xlabel(name)
    for panel in panels[:2]:
        panel.set_xlim(0, 1.04 * np.nanmax(torque) / scale)
    parts = ["(a) amplitude against torque, with proportionality (line) and the departure from it below"]
    if P is not None:
        _period_against(panels[2], A, P, factor, unit)
        for name, dash in (("tested_amplitude", ":"), ("linear_amplitude", "--")):
            found = output_of(reduction, name)
            if found is not None and found.value is not None:
                panels[2].axvline(found.value / factor, color="black", linewidth=0.6, linestyle=dash)
        parts.append(
            "(b) period against amplitude, with a straight line; dotted: the amplitude up to which period and dissipation were seen to be constant, dashed: that at which one has changed by its limit, where it was reached"
        )
    letters([panels[0], *panels[2:]])
    results = told(scope, reduction, departure="largest departure over largest amplitude", period_change="change of the period over the amplitudes", tested_amplitude="constant up to", linear_amplitude="changed at")  # fmt: skip
    caption = f"Drive sweep {reduction.sweep}: {'; '.join(parts)}. {results}"
    return Drawn(name_of("linearity", reduction), saved(figure), caption, (reduction.address,))


def _period_against(panel: Axes, A: Column, P: Column, factor: float, unit: str) -> None:
    known = np.isfinite(A) & np.isfinite(P)
    middle = float(np.median(P[known]))
    p_factor, p_unit = enlarged(P[known] - middle, "s")
    points(panel, A / factor, (P - middle) / p_factor)
    if np.count_nonzero(known) > 2 and np.ptp(A[known]) > 0:
        fitted = straight_line(A[known], P[known] - middle, absolute=False)
        ends = np.array([np.min(A[known]), np.max(A[known])])
        line(panel, ends / factor, (fitted.value("intercept") + fitted.value("slope") * ends) / p_factor)
    panel.set(xlabel=f"$A$ / {unit}", ylabel=rf"$P - \overline{{P}}$ / {p_unit}")
    panel.set_xlim(0, 1.04 * np.nanmax(A) / factor)


def stability_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return the record of a period with its drift, and the Allan deviation with the lines of white noise and of that drift."""
    step = step_of(reduction, "period-stability")
    t, P = taken(scope, reduction, step, "time"), taken(scope, reduction, step, "period")
    tau, sigma = wanted(scope, reduction, "averaging_time"), wanted(scope, reduction, "allan_deviation")
    u = spread_of(scope, reduction, "allan_deviation")[0]
    known = np.isfinite(t) & np.isfinite(P)
    if not tau.size or np.count_nonzero(known) < 2:
        raise NoFigure("the record is empty")
    t, P = t[known] - np.min(t[known]), P[known]
    mean = float(np.mean(P))
    drift = scalar(reduction, "drift_per_hour") / 3600.0
    figure, panels = stacked([1, 1.5], height=4.2, shared=False)
    factor, unit = enlarged(P - mean, "s")
    points(panels[0], t / 3600, (P - mean) / factor)
    ends = np.array([0.0, float(np.max(t))])
    line(panels[0], ends / 3600, drift * (ends - float(np.mean(t))) / factor, colour="#a61c00")
    panels[0].set(xlabel="$t$ / h", ylabel=rf"$P - \overline{{P}}$ / {unit}")
    tight_to(panels[0], t / 3600)
    points(panels[1], tau, sigma, u)
    grid = np.geomspace(float(tau[0]), float(tau[-1]), 50)
    line(panels[1], grid, float(sigma[0]) * np.sqrt(float(tau[0]) / grid), label="white noise of the period")
    if drift != 0:
        slow = abs(drift) / mean * grid / math.sqrt(2)
        shown = slow > 0.2 * float(np.min(sigma))
        if shown.any():
            line(panels[1], grid[shown], slow[shown], look=1, label="drift alone")
    panels[1].set(xscale="log", yscale="log", xlabel=r"$\tau$ / s", ylabel=r"$\sigma_P(\tau)/P$")
    panels[1].legend(loc="lower left")
    letters(panels)
    results = told(scope, reduction, resolution="smallest change of period resolved", drift_per_hour="drift in an hour")  # fmt: skip
    caption = (
        f"Stability of the oscillator, {reduction.sweep}: (a) period less its mean with the drift (line), (b) overlapping Allan deviation of the fractional period, with "
        f"white noise at the level of single readings (solid) and the drift alone (dashed); error bars: standard uncertainty for white noise. {results}"
    )
    return Drawn(name_of("stability", reduction), saved(figure), caption, (reduction.address,))

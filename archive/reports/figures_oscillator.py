"""Figures of an oscillator by itself: empty cell, dose run, free decay, resonance."""

from __future__ import annotations

import math

import numpy as np
from matplotlib.figure import Figure
from numpy.typing import NDArray

from archive.physics.resonance import resonance_curve
from archive.reports.figure_plots import enlarged, letters, line, points, residuals, stacked, tight_to
from archive.reports.figure_style import HEIGHTS, WIDTH, Column, Drawn, name_of, saved
from archive.reports.figure_values import (
    column_of,
    output_of,
    scalar,
    spread_of,
    step_of,
    taken,
    told,
    wanted,
)
from archive.reports.scope import Scope
from schemas.lineage import ReductionDocument, StepRecord

Complexes = NDArray[np.complex128]

__all__ = [
    "background_figure",
    "decay_figure",
    "dose_figure",
    "resonance_figure",
]


def background_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return period, and where it was measured dissipation, of the empty cell with the fitted polynomials and residuals."""
    both = [
        (kind, name, unit)
        for kind, name, unit in (("period", "P", "s"), ("dissipation", "Q^{-1}", "1"))
        if kind == "period" or column_of(scope, reduction, f"{kind}_background") is not None
    ]
    figure, panels = stacked([2.4, 1] * len(both), height=HEIGHTS[len(both)])
    orders = []
    for k, (kind, symbol, unit) in enumerate(both):
        step = step_of(reduction, "background-fit", gives=f"{kind}_background")
        T, y = taken(scope, reduction, step, "temperature"), taken(scope, reduction, step, "values")
        coefficients = wanted(scope, reduction, f"{kind}_background")
        low, high = scalar(reduction, f"{kind}_low"), scalar(reduction, f"{kind}_high")

        def fitted(T: Column, c: Column = coefficients, ends: tuple[float, float] = (low, high)) -> Column:
            scaled = (2 * T - ends[0] - ends[1]) / (ends[1] - ends[0])
            return np.asarray(np.polynomial.chebyshev.chebval(scaled, c), dtype=np.float64)

        base = math.floor(float(np.nanmin(y)) * 1e9) / 1e9 if kind == "period" else 0.0
        factor, label = enlarged(y - base, unit)
        points(panels[2 * k], T, (y - base) / factor)
        grid = np.linspace(low, high, 200)
        line(panels[2 * k], grid, (fitted(grid) - base) / factor)
        name = "$P - P_1$" if kind == "period" else f"${symbol}$"
        panels[2 * k].set_ylabel(f"{name} / {label}" if label else name)
        r = y - fitted(T)
        factor, label = enlarged(r, unit)
        u = _own_uncertainty(scope, reduction, step, "values")
        residuals(panels[2 * k + 1], T, r / factor, None if u is None else u / factor, name=f"$r$ / {label}")
        orders.append(
            f"{kind}{f' (P_1 = {base * 1e3:.6f} ms)' if kind == 'period' else ''} with a polynomial of order {coefficients.size - 1}"
        )
    panels[-1].set_xlabel("$T$ / K")
    tight_to(panels[-1], T)
    letters(panels[::2])
    what = "; ".join(f"({letter}) {each}" for letter, each in zip("ab", orders, strict=False))
    results = told(scope, reduction, empty_period="period at the lowest temperature", empty_quality_factor="Q there")  # fmt: skip
    caption = f"Empty cell, {reduction.sweep}: {what}; below each the residuals. {results}"
    return Drawn(name_of("background", reduction), saved(figure), caption, (reduction.address,))


def _own_uncertainty(
    scope: Scope, reduction: ReductionDocument, step: StepRecord, port: str
) -> Column | None:
    address = step.inputs[port].address
    if not address.startswith(f"{reduction.address}#"):
        return None
    return spread_of(scope, reduction, address.partition("#")[2])[0]


def dose_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return period against amount with the two slopes of mass loading and the residuals."""
    step = step_of(reduction, "loading-fit")
    n, P = taken(scope, reduction, step, "amount"), taken(scope, reduction, step, "period")
    s, past, onset, empty = (
        scalar(reduction, name) for name in ("mass_sensitivity", "slope_past", "onset_amount", "empty_period")
    )

    def fitted(n: Column) -> Column:
        return np.asarray(empty + s * np.minimum(n, onset) + past * np.maximum(n - onset, 0.0))

    figure, panels = stacked([2.6, 1], height=HEIGHTS[1])
    x, x_unit = enlarged(n, "mol")
    factor, unit = enlarged(P - empty, "s")
    points(panels[0], n / x, (P - empty) / factor)
    grid = np.array([0.0, onset, float(np.nanmax(n))])
    line(panels[0], grid / x, (fitted(grid) - empty) / factor)
    line(panels[0], np.array([onset, grid[2]]) / x, s * np.array([onset, grid[2]]) / factor, style=":")
    panels[0].axvline(onset / x, color="black", linewidth=0.4, linestyle=":")
    panels[0].set_ylabel(f"$P - P_0$ / {unit}")
    r = P - fitted(n)
    factor, unit = enlarged(r, "s")
    residuals(panels[1], n / x, r / factor, name=f"$r$ / {unit}")
    panels[1].set_xlabel(f"$n$ / {x_unit}")
    tight_to(panels[1], n / x)
    results = told(scope, reduction, mass_sensitivity="slope below the onset", slope_past="past it", chi="chi", onset_coverage="onset")  # fmt: skip
    caption = (
        f"Dose run {reduction.sweep}: period above that of the empty cell, P_0 = {empty * 1e3:.6f} ms, against amount, with the two fitted slopes (lines) and the first "
        f"one carried on (dotted); residuals below. {results}"
    )
    return Drawn(name_of("dose-run", reduction), saved(figure), caption, (reduction.address,))


def decay_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return the logarithm of a free decay with its exponential, and the residuals."""
    step = step_of(reduction, "ringdown-quality-factor")
    t, A = taken(scope, reduction, step, "time"), taken(scope, reduction, step, "amplitude")
    tau = scalar(reduction, "decay_time")
    if str(step.parameters.get("decays", "amplitude")) != "amplitude":
        tau = tau / 2
    known = np.isfinite(t) & np.isfinite(A)
    t, A = t[known] - np.min(t[known]), A[known]
    fitted = _decay(t, A, tau, str(step.parameters.get("background", "none")))
    figure, panels = stacked([2.6, 1], height=HEIGHTS[1])
    factor, unit = enlarged(A, "V")
    points(panels[0], t, np.abs(A) / factor)
    line(panels[0], t, fitted / factor, colour="#a61c00")
    panels[0].set(yscale="log", ylabel=f"$A$ / {unit}")
    r_factor, r_unit = enlarged(A - fitted, "V")
    residuals(panels[1], t, (A - fitted) / r_factor, name=f"$r$ / {r_unit}")
    panels[1].set_xlabel("$t$ / s")
    tight_to(panels[1], t)
    results = told(
        scope,
        reduction,
        quality_factor="Q",
        decay_time="decay time",
        dissipation_change="dissipation at the start over that at rest, less one",
    )
    caption = (
        f"Free decay {reduction.sweep}: amplitude (points) with the exponential of the decay time found (line), whose height and floor were set to these "
        f"points anew; residuals below. {results}"
    )
    return Drawn(name_of("ringdown", reduction), saved(figure), caption, (reduction.address,))


def _decay(t: Column, A: Column, tau: float, background: str) -> Column:
    """Return the decay of a known time constant: height and background are linear (of A^2 where a noise floor adds in quadrature)."""
    decay = np.exp(-t / tau)
    if background == "noise floor":
        # du(A^2) = 2 A du(A): weights 1/A^2 make the squares as good as the amplitudes themselves; floors are not below zero.
        weight = 1 / np.maximum(np.abs(A), 1e-3 * np.max(np.abs(A)))
        design = np.stack([decay**2, np.ones(t.shape)], axis=1)
        height, floor = np.linalg.lstsq(design * weight[:, np.newaxis], A**2 * weight, rcond=None)[0]
        return np.asarray(np.sqrt(np.maximum(height, 0.0) * decay**2 + max(float(floor), 0.0)))
    design = decay[:, np.newaxis] if background == "none" else np.stack([decay, np.ones(t.shape)], axis=1)
    return np.asarray(design @ np.linalg.lstsq(design, A, rcond=None)[0])


def resonance_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return both components of a response against frequency with the fitted resonance, residuals, and the circle in the plane."""
    step = step_of(reduction, "resonance-fit")
    f, x, y = (taken(scope, reduction, step, port) for port in ("frequency", "x", "y"))
    known = np.isfinite(f) & np.isfinite(x) & np.isfinite(y)
    f, z = f[known], x[known] + 1j * y[known]
    found = output_of(reduction, "resonance_frequency")
    curve = None if found is None or found.value is None else _response(reduction, step, f, z)
    figure = Figure(figsize=(WIDTH, 2.9), layout="constrained")
    grid = figure.add_gridspec(2, 2, width_ratios=[1.45, 1], height_ratios=[2.4, 1])
    top, below, circle = (
        figure.add_subplot(grid[0, 0]),
        figure.add_subplot(grid[1, 0]),
        figure.add_subplot(grid[:, 1]),
    )
    middle = float(found.value) if found is not None and found.value is not None else float(np.mean(f))
    factor, unit = enlarged(np.abs(z), "V")
    span, f_unit = enlarged(f - middle, "Hz")
    order = np.argsort(f)
    for k, (part, name) in enumerate(((z.real, "$X$"), (z.imag, "$Y$"))):
        points(top, (f - middle) / span, part / factor, look=k, label=name)
        if curve is not None:
            shown = (curve.real, curve.imag)[k]
            line(top, (f - middle)[order] / span, shown[order] / factor, look=k)
    top.set_ylabel(f"$X$, $Y$ / {unit}")
    top.legend(loc="upper right")
    top.tick_params(labelbottom=False)
    circle.plot(z.real / factor, z.imag / factor, "o", color="black", markerfacecolor="none", markeredgewidth=0.4, markersize=1.8)  # fmt: skip
    if curve is not None:
        line(circle, curve.real[order] / factor, curve.imag[order] / factor)
        r, r_unit = enlarged(np.abs(z - curve), "V")
        for k, part in enumerate(((z - curve).real, (z - curve).imag)):
            residuals(below, (f - middle) / span, part / r, name=f"$r$ / {r_unit}", look=k)
    else:
        below.set_ylabel("$r$")
    circle.set(aspect="equal", xlabel=f"$X$ / {unit}", ylabel=f"$Y$ / {unit}")
    below.set_xlabel(rf"$f - f_0$ / {f_unit}" if curve is not None else rf"$f - f_1$ / {f_unit}")
    for panel in (top, below):
        tight_to(panel, (f - middle) / span)
    letters([top, circle])
    verdict = "" if curve is not None else f" {found.verdict if found is not None and found.verdict else 'no resonance'}; f_1 = {middle:.5f} Hz."  # fmt: skip
    results = told(scope, reduction, resonance_frequency="f_0", quality_factor="Q")
    line_told = " with the fitted resonance (lines; phase, height and background were set to these points anew) and its residuals" if curve is not None else ""  # fmt: skip
    caption = f"Frequency sweep {reduction.sweep}: (a) both components of the response{line_told}, (b) the same in the plane.{verdict} {results}".rstrip()
    return Drawn(name_of("resonance", reduction), saved(figure), caption, (reduction.address,))


def _response(reduction: ReductionDocument, step: StepRecord, f: Column, z: Complexes) -> Complexes:
    """Return the resonance of known frequency and Q; its complex height and the background are linear."""
    f0 = scalar(reduction, "resonance_frequency")
    shape = resonance_curve(f, resonance_frequency=f0, quality_factor=scalar(reduction, "quality_factor"), height=1.0, phase=0.0,
                            convention="-" if step.parameters.get("convention") == "-" else "+")  # fmt: skip
    columns = [shape, np.ones(f.shape, dtype=np.complex128)]
    if step.parameters.get("background") == "sloped":
        columns.append((f - f0).astype(np.complex128) / float(np.ptp(f)))
    design = np.stack(columns, axis=1)
    return np.asarray(design @ np.linalg.lstsq(design, z, rcond=None)[0])

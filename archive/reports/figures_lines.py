"""Figures of spectra: one pulse and its response with the lines found, and one line followed through many spectra."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.ticker import MaxNLocator

from archive.physics.pulse_response import pulse_response
from archive.reports.figure_plots import enlarged, letters, line, points, residuals, stacked, tight_to
from archive.reports.figure_style import HEIGHTS, Column, Drawn, NoFigure, name_of, saved
from archive.reports.figure_values import (
    column_of,
    outputs_with,
    step_of,
    taken,
    told,
    wanted,
)
from archive.reports.scope import Scope
from schemas.lineage import ReductionDocument

__all__ = ["pulse_figure", "spectrum_figure", "tracking_figure"]

_BINS = 700
"""More than a line of 110 mm can show apart."""

_SLOTS = range(1, 5)


def pulse_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return the pulse as it was sent, and its spectrum."""
    pulse = wanted(scope, reduction, "pulse")
    known = np.nan_to_num(pulse - np.nanmean(pulse))
    spectrum = np.abs(np.fft.rfft(known))
    figure, panels = stacked([1, 1], height=HEIGHTS[1], shared=False)
    place = np.arange(pulse.size, dtype=np.float64)
    line(panels[0], *_envelope(place, pulse))
    panels[0].set(xlabel="reading", ylabel="pulse", xlim=(0, pulse.size))
    share = np.arange(spectrum.size) / pulse.size
    at, top = _largest(share[1:], spectrum[1:] / max(float(spectrum[1:].max()), 1e-300))
    line(panels[1], at, top)
    panels[1].set(xlabel="frequency over rate of readings", ylabel="relative amplitude", xlim=(0, 0.5), ylim=(0, 1.1))  # fmt: skip
    letters(panels)
    caption = f"Pulse {reduction.sweep}: (a) as it was sent, (b) amplitude of its spectrum over the largest."
    return Drawn(name_of("drive-pulse", reduction), saved(figure), caption, (reduction.address,))


def spectrum_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return the spectrum of one record with the resonances and the tones that were found."""
    step = step_of(reduction, "pulse-lines")
    signal, rate = taken(scope, reduction, step, "signal"), taken(scope, reduction, step, "rate")
    pulse = taken(scope, reduction, step, "pulse") if "pulse" in step.inputs else None
    try:
        found = pulse_response(signal, rate=float(rate[0]), pulse=pulse, low=_limit(step.parameters.get("low_hz")), high=_limit(step.parameters.get("high_hz")))  # fmt: skip
    except ValueError as error:
        raise NoFigure(f"the spectrum cannot be formed: {error}") from None
    ratio = np.abs(found.response - found.feedthrough) / found.standard_uncertainty
    f, top = _largest(found.frequency, ratio)
    figure, (axes,) = stacked([1], height=HEIGHTS[0] + 0.5)
    line(axes, f, np.maximum(top, 0.1))
    axes.set(yscale="log", xlabel="$f$ / Hz", ylabel="response over its noise")
    high = float(top.max())
    for kind, mark, fill in (("frequency", "v", "black"), ("tone", "x", "black")):
        at = [each.value for each in outputs_with(reduction, *(f"{kind}_{k}" for k in _SLOTS)).values() if each.value is not None]  # fmt: skip
        if at:
            axes.plot(at, [2.2 * high] * len(at), mark, color=fill, markersize=4, markerfacecolor=fill, label="resonances" if kind == "frequency" else "tones")  # fmt: skip
    axes.set_ylim(0.5, 20 * high)
    axes.set_xlim(float(f[0]), float(f[-1]))
    axes.legend(loc="upper left", ncols=2)
    over = " over that of the pulse" if pulse is not None else ""
    results = told(scope, reduction, frequency_1="f_1", quality_factor_1="Q_1", frequency_2="f_2", quality_factor_2="Q_2")  # fmt: skip
    caption = (
        f"Spectrum of record {reduction.sweep}{over}, less its smooth part, in units of the noise beside each frequency (the largest value of each of {_BINS} intervals); triangles: "
        f"resonances, crosses: lines narrower than the resolution. {results}"
    )
    return Drawn(name_of("pulse-lines", reduction), saved(figure), caption, (reduction.address,))


def tracking_figure(scope: Scope, reduction: ReductionDocument) -> Drawn:
    """Return all lines of all spectra with the one that was followed, its quality factor, and the fraction that it means."""
    f, Q = wanted(scope, reduction, "line_frequency"), wanted(scope, reduction, "line_quality_factor")
    step = step_of(reduction, "followed-line")
    by_T = "temperature" in step.inputs
    x = taken(scope, reduction, step, "temperature") if by_T else np.arange(1, f.size + 1, dtype=np.float64)
    if not np.isfinite(f).any():
        raise NoFigure("no line was followed")
    fraction = column_of(scope, reduction, "superfluid_fraction")
    has = fraction is not None and np.isfinite(fraction).any()
    figure, panels = stacked([2, 1] + ([1.6, 1] if has else []), height=5.4 if has else HEIGHTS[1])
    order = np.argsort(x)
    for port, entry in step.inputs.items():
        if port.startswith(("frequency_", "tone_")):
            other = column_of(scope, reduction, entry.address.partition("#")[2])
            if other is not None and other.shape == x.shape:
                points(panels[0], x, other, look=5 if port.startswith("tone_") else 0, pale=True)
    points(panels[0], x, f, filled=True)
    known = order[np.isfinite(f[order])]
    line(panels[0], x[known], f[known])
    panels[0].set_ylabel("$f$ / Hz")
    factor, unit = enlarged(Q, "1")
    Q_point = column_of(scope, reduction, "line_quality_factor.uncertainty")
    points(panels[1], x, Q / factor, None if Q_point is None else Q_point / factor)
    panels[1].set_ylabel(f"$Q$ / {unit}" if unit else "$Q$")
    panels[1].set_ylim(0, None)
    if has and fraction is not None:
        _fraction(scope, reduction, panels[2:], x, fraction)
    panels[-1].set_xlabel("$T$ / K" if by_T else "spectrum")
    if not by_T:
        panels[-1].xaxis.set_major_locator(MaxNLocator(integer=True))
    tight_to(panels[-1], x)
    letters(panels[:3])
    more = "; (c) superfluid fraction if the frequency is that of fourth sound, with the tabulated one (line), and the difference below it; error bars: combined standard uncertainty" if has else ""  # fmt: skip
    results = told(scope, reduction, spectra_with_line="spectra with the line")
    caption = f"Lines of the spectra up to {reduction.sweep}: (a) the line that was followed (filled, joined) among all resonances (grey circles) and tones (grey crosses); (b) its quality factor{more}. {results}"
    return Drawn(name_of("line-tracking" if has else "resonance-tracking", reduction), saved(figure), caption, (reduction.address,))  # fmt: skip


def _fraction(
    scope: Scope, reduction: ReductionDocument, panels: list[Axes], x: Column, fraction: Column
) -> None:
    point = column_of(scope, reduction, "superfluid_fraction.uncertainty")
    tabulated = column_of(scope, reduction, "tabulated_fraction")
    points(panels[0], x, fraction, point)
    panels[0].set_ylabel(r"$\rho_\mathrm{s}/\rho$")
    panels[0].margins(y=0.15)
    if tabulated is not None:
        known = np.flatnonzero(np.isfinite(tabulated))
        order = known[np.argsort(x[known])]
        line(panels[0], x[order], tabulated[order])
        difference = 100 * (fraction - tabulated)
        residuals(panels[1], x, difference, None if point is None else 100 * point, name="$r$ / %")


def _limit(value: object) -> float | None:
    return float(value) if isinstance(value, int | float) else None


def _largest(x: Column, y: Column) -> tuple[Column, Column]:
    """Return middle and largest value of each of many intervals."""
    parts = np.array_split(np.arange(x.size), min(_BINS, x.size))
    return np.array([float(np.mean(x[part])) for part in parts]), np.array([float(np.max(y[part])) for part in parts])  # fmt: skip


def _envelope(x: Column, y: Column) -> tuple[Column, Column]:
    """Return the least and the largest value of each of many intervals, one after the other."""
    parts = np.array_split(np.arange(x.size), min(_BINS, x.size))
    ends = np.array([[float(np.nanmin(y[part])), float(np.nanmax(y[part]))] for part in parts])
    return np.repeat([float(np.mean(x[part])) for part in parts], 2), ends.ravel()

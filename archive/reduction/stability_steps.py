"""How stable an oscillator is: Allan deviation, drift, and whether that is enough for a film."""

from __future__ import annotations

import math

import numpy as np

from archive.physics.allan_deviation import allan_deviation
from archive.physics.allan_uncertainty import relative_uncertainty
from archive.physics.constants import MOLAR_MASS_HELIUM4
from archive.physics.film_static import UNIVERSAL_JUMP
from archive.physics.linear_fit import straight_line
from archive.reduction.background_steps import known_rows
from archive.reduction.estimate import FloatArray
from archive.reduction.step import Outcome, Port, Step
from schemas.base import Record
from schemas.finding import Finding

__all__ = [
    "STABILITY_STEPS",
    "SignalParameters",
    "StabilityParameters",
    "period_stability",
    "signal_over_resolution",
]

LEAST = 16
"""Readings below which an Allan deviation says nothing (common practice, no source)."""


class StabilityParameters(Record):
    """How the record is read."""

    spacing: float = 0.05
    """Readings whose distance differs from the usual one by more than this share begin a new stretch."""


class SignalParameters(Record):
    """What the oscillator is to resolve."""

    temperature_kelvin: float = 0.1
    """The period drop at the universal jump of a film with this transition temperature is the signal."""
    signal_ns: float | None = None
    """A signal in nanoseconds in its place."""
    drag_factor: float = 0.0
    """chi, which makes the signal smaller."""
    enough: float = 30.0
    """Signal over resolution that counts as enough: a thirtieth is 3 per cent of the jump (common practice, no source)."""


def period_stability(parameters: StabilityParameters, *, time: FloatArray, period: FloatArray) -> Outcome:
    """Return the Allan deviation of a period record, its drift, and the smallest change it resolves.

    Parameters
    ----------
    time, period : ndarray
        s.

    Raises
    ------
    ValueError
        Fewer than 16 equally spaced readings in a row.

    Notes
    -----
    Overlapping estimator, fractional values, no dead time; a counter that averages over overlapping windows gives another
    number. The uncertainty of each deviation is that of white noise; neighbouring ones are not independent. The drift is a
    straight line, its uncertainty that of white scatter about it.
    """
    rows = known_rows(time, period)
    t, P = time[rows], period[rows]
    if t.size < LEAST:
        raise ValueError(f"period: found {t.size} readings, expected at least {LEAST}")
    order = np.argsort(t, kind="stable")
    t, P = t[order], P[order]
    interval = float(np.median(np.diff(t)))
    if not interval > 0:
        raise ValueError("time: found most readings at one instant, expected them one after the other")
    stretch, gaps = _longest(t, interval, parameters.spacing)
    t, P = t[stretch], P[stretch]
    if t.size < LEAST:
        raise ValueError(
            f"time: found at most {t.size} readings in a row that are {interval:.6g} s apart, expected at least {LEAST}"
        )
    found = allan_deviation(P, interval=interval)
    factors = np.rint(found.tau / interval).astype(np.int64)
    u = found.sigma * np.array([relative_uncertainty(P.size, int(m)) for m in factors])
    best = int(np.argmin(found.sigma))
    mean = float(np.mean(P))
    line = straight_line(t - np.mean(t), P, absolute=False)
    findings = []
    if gaps:
        findings.append(
            Finding(
                code="record-with-gaps", severity="note",
                what=f"the record has {gaps} gaps; the Allan deviation is that of its longest stretch, {t.size} readings",
            )
        )  # fmt: skip
    # A factor of two is beyond the scatter of white noise at a third of the record (common practice, no source).
    if found.sigma[-1] > 2 * found.sigma[best]:
        findings.append(
            Finding(
                code="drift-limits-averaging", severity="note",
                what=f"averaging beyond {found.tau[best]:.4g} s makes the period no better: at {found.tau[-1]:.4g} s the Allan deviation is {found.sigma[-1] / found.sigma[best]:.2g} times as large",
            )
        )  # fmt: skip
    return Outcome(
        {
            "averaging_time": found.tau, "allan_deviation": found.sigma, "white_level": float(found.sigma[0]), "resolution": mean * float(found.sigma[best]),
            "resolution_time": float(found.tau[best]), "drift_per_hour": 3600.0 * line.value("slope"),
        },
        point={
            "allan_deviation": u, "white_level": float(u[0]), "resolution": mean * float(u[best]),
            "drift_per_hour": 3600.0 * line.standard_uncertainty("slope"),
        },
        facts={
            "readings": int(P.size), "interval_s": interval, "longest_s": float(found.tau[-1]), "averages": int(found.averages[best]), "gaps": gaps,
            "first_slope": math.log(found.sigma[1] / found.sigma[0]) / math.log(2) if found.sigma[0] > 0 and found.sigma[1] > 0 else math.nan,
            "scatter_ns": float(np.std(line.residuals, ddof=2)) * 1e9,
        },
        findings=tuple(findings),
    )  # fmt: skip


def signal_over_resolution(
    parameters: SignalParameters, *, resolution: float, slope: float | None, area: float | None
) -> Outcome:
    """Return the period drop at a universal jump over the smallest period change that is resolved.

    Parameters
    ----------
    resolution : float
        s.
    slope : float or None
        Period per amount of coupled helium, s/mol.
    area : float or None
        m^2.

    Raises
    ------
    ValueError
        No stated signal, and no mass sensitivity and area to compute one from.
    """
    if parameters.signal_ns is not None:
        signal, named = parameters.signal_ns * 1e-9, f"the stated {parameters.signal_ns:g} ns"
    elif slope is None or area is None:
        raise ValueError(
            "slope, area: the signal follows from the cell's mass sensitivity and the substrate's area; record both, or set signal_ns"
        )
    else:
        per_density = slope * area / MOLAR_MASS_HELIUM4 * (1 - parameters.drag_factor)
        signal = per_density * UNIVERSAL_JUMP * parameters.temperature_kelvin
        named = (
            f"the period drop at the universal jump of a film with T_KT = {parameters.temperature_kelvin:g} K"
        )
    if not resolution > 0:
        raise ValueError(f"resolution: found {resolution}, expected > 0")
    ratio = signal / resolution
    findings: tuple[Finding, ...] = ()
    if ratio < parameters.enough:
        findings = (
            Finding(
                code="resolution-too-coarse", severity="warning",
                what=f"{named} is {signal * 1e9:.3g} ns, only {ratio:.2g} times what the record resolves; expected at least {parameters.enough:g}",
                remedy="average longer where the drift allows it, quieten the oscillator, or measure a film with a higher transition",
            ),
        )  # fmt: skip
    return Outcome({"ratio": ratio, "signal": signal}, facts={"signal_is": named, "enough": parameters.enough}, findings=findings)  # fmt: skip


def _longest(t: FloatArray, interval: float, spacing: float) -> tuple[slice, int]:
    """Return the longest stretch of equally spaced readings, and how many gaps the record has."""
    breaks = np.flatnonzero(np.abs(np.diff(t) / interval - 1) > spacing) + 1
    ends = np.concatenate([[0], breaks, [t.size]])
    k = int(np.argmax(np.diff(ends)))
    return slice(int(ends[k]), int(ends[k + 1])), int(breaks.size)


STABILITY_STEPS: tuple[Step, ...] = (
    Step(
        name="period-stability", version=1, function=period_stability, parameters=StabilityParameters,
        takes={"time": Port("time", "array", "time of each reading"), "period": Port("period", "array", "period of each reading")},
        yields={
            "averaging_time": Port("time", "array", "averaging times"), "allan_deviation": Port("number", "array", "overlapping Allan deviation of the fractional period"),
            "white_level": Port("number", "scalar", "Allan deviation of single readings"), "resolution": Port("period", "scalar", "smallest Allan deviation, as a period"),
            "resolution_time": Port("time", "scalar", "averaging time of the smallest Allan deviation"), "drift_per_hour": Port("period", "scalar", "change of the period in an hour"),
        },
        sentence="{readings} readings {interval_s} s apart (dead time taken as none) give an overlapping Allan deviation of {white_level} for one reading and resolve {resolution} "
        "after {resolution_time} ({averages} differences); the period drifts by {drift_per_hour} in an hour.",
        citations=("ieee-1139-2022",), spread="refit",
    ),
    Step(
        name="signal-over-resolution", version=1, function=signal_over_resolution, parameters=SignalParameters,
        takes={
            "resolution": Port("period", "scalar", "smallest change of period that is resolved"),
            "slope": Port("amount_sensitivity", "scalar", "period per amount of coupled helium", optional=True), "area": Port("area", "scalar", "adsorbing area", optional=True),
        },
        yields={"ratio": Port("number", "scalar", "signal over resolution"), "signal": Port("period", "scalar", "signal to be resolved")},
        sentence="{signal_is}, {signal}, is {ratio} times the resolution.", citations=("nelson-kosterlitz-1977",),
    ),
)  # fmt: skip
"""Steps of this module."""

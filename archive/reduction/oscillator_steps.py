"""Steps of an oscillator or resonator itself: dissipation, ringdown, linearity, resonance."""

from __future__ import annotations

import math
from typing import Literal

import numpy as np

from archive.physics import oscillator, resonance, ringdown
from archive.physics.linear_fit import linear_fit, straight_line
from archive.reduction.background_steps import known_rows, weights
from archive.reduction.estimate import FloatArray
from archive.reduction.step import Covariance, NoParameters, Outcome
from schemas.base import Record
from schemas.finding import Finding
from schemas.sweep import Detection

__all__ = [
    "LinearityParameters",
    "ResonanceParameters",
    "RingdownParameters",
    "dissipation_from_amplitude",
    "drive_linearity",
    "resonance_fit",
    "ringdown_quality_factor",
]


STEADY_DRIVE = 0.01
"""Largest change of a recorded drive, as a share of its median, that still is a constant drive (common practice, no source)."""


class RingdownParameters(Record):
    """What falls, and on what it stands."""

    decays: Literal["amplitude", "energy"] = "amplitude"
    background: Literal["none", "constant", "noise floor"] = "noise floor"
    """`noise floor`: for a magnitude, which a lock-in reads too large at low signal."""


class LinearityParameters(Record):
    """Thresholds (common practice, no source)."""

    largest_residual: float = 0.01
    period_sigmas: float = 3.0


class ResonanceParameters(Record):
    """Form of the resonance curve."""

    background: Literal["constant", "sloped"] = "sloped"
    convention: Literal["+", "-"] = "+"
    """Sign of i w t in the lock-in."""
    largest_inside: bool = True
    """Whether the response above a constant must also be largest inside the sweep."""


def dissipation_from_amplitude(
    _: NoParameters,
    *,
    amplitude: FloatArray,
    period: FloatArray,
    drive: float | FloatArray | None,
    detection: Detection,
    reference_signal: float,
    reference_drive: float | None,
    reference_quality_factor: float,
    reference_period: float,
) -> Outcome:
    """Return Q^-1 from the detected amplitude against the reference point where Q was measured.

    Parameters
    ----------
    amplitude : ndarray
        V, rms.
    period : ndarray
        s.
    drive : float, ndarray or None
        rms; None when the drive was constant and is that of the reference point.
    detection : Detection
        Exponents p and s of drive and detection.
    reference_signal, reference_drive, reference_quality_factor, reference_period : float
        The reference point.

    Raises
    ------
    ValueError
        Constant amplitude without a recorded drive, a drive that changed without one at the reference point, or values that
        are not positive.
    """
    if drive is None or reference_drive is None:
        if detection.drive_mode == "constant-amplitude":
            raise ValueError(
                "drive: at constant amplitude the drive carries the dissipation, and it is not recorded with its reference"
            )
        if drive is not None and _spread(drive) > STEADY_DRIVE:
            raise ValueError(
                f"reference_drive: none is recorded, and the drive changed by {_spread(drive):.1%} during the sweep, which would be taken for dissipation; state the drive at the reference point"
            )
        drive, reference_drive = 1.0, 1.0
        treatment = "taken as that of the reference point"
    else:
        treatment = "recorded"
    signal = np.where(amplitude > 0, amplitude, np.nan)
    if np.isnan(signal).all():
        raise ValueError("amplitude: found no value above 0")
    reference = oscillator.DriveReference(
        dissipation=1 / reference_quality_factor, drive=reference_drive, signal=reference_signal, frequency=1 / reference_period,
        drive_power=detection.torque_exponent, signal_power=detection.signal_exponent,
    )  # fmt: skip
    found = oscillator.dissipation_from_amplitude(
        signal=signal, drive=drive, frequency=1 / period, reference=reference
    )
    facts = {
        "p": detection.torque_exponent,
        "s": detection.signal_exponent,
        "drive_was": treatment,
        "drive_mode": detection.drive_mode,
    }
    return Outcome({"dissipation": found}, facts=facts)


def _spread(drive: float | FloatArray) -> float:
    known = np.asarray(drive)[np.isfinite(drive)]
    return float(np.ptp(known) / abs(np.median(known))) if known.size and np.median(known) else 0.0


def ringdown_quality_factor(
    parameters: RingdownParameters,
    *,
    time: FloatArray,
    amplitude: FloatArray,
    period: float | FloatArray,
    u_amplitude: FloatArray | None,
) -> Outcome:
    """Return Q and decay time of a free decay.

    Raises
    ------
    ValueError
        Too few rows, or a fit that does not converge.
    """
    rows = known_rows(time, amplitude)
    t, y, u = time[rows], amplitude[rows], weights(u_amplitude, rows)
    frequency = 1 / float(np.nanmedian(period))
    # Seconds since 1970 lose digits in the exponent.
    found = ringdown.ringdown(
        t - t[0] if t.size else t, y, frequency=frequency, convention=parameters.decays, background=parameters.background,
        standard_uncertainty=u, absolute=u is not None,
    )  # fmt: skip
    if not found.converged:
        raise ValueError(f"amplitude: the decay was not fitted: {found.message}")
    quality, u_quality = found.quality_factor, found.standard_uncertainty
    per_second = math.pi * frequency * (1.0 if parameters.decays == "amplitude" else 2.0)
    tau = quality / per_second
    row = np.array([u_quality, u_quality / per_second, u_quality / quality**2 * -1])
    findings: tuple[Finding, ...] = ()
    if found.curved:
        findings = (
            Finding(
                code="curved-ringdown",
                severity="warning",
                what="the decay is no single exponential; Q depends on amplitude, and the number is an average",
                remedy="reduce ranges of the decay apart, or reduce the drive",
            ),
        )
    return Outcome(
        {"quality_factor": quality, "decay_time": tau, "dissipation": 1 / quality},
        covariance=Covariance(("quality_factor", "decay_time", "dissipation"), np.outer(row, row)),
        facts={"points": int(t.size), "frequency_Hz": frequency, "curved": found.curved, "reduced_chi2": found.fit.reduced_chi2 if u is not None else math.nan},
        findings=findings,
    )  # fmt: skip


def drive_linearity(
    parameters: LinearityParameters,
    *,
    drive: FloatArray,
    amplitude: FloatArray,
    period: FloatArray | None,
    detection: Detection | None,
    u_amplitude: FloatArray | None,
    u_period: FloatArray | None,
) -> Outcome:
    """Return how far the response departs from proportionality to the torque, and how far the period moves with amplitude.

    Parameters
    ----------
    drive, amplitude, period : ndarray
        One row for each drive level.
    detection : Detection or None
        Its exponent p; 1 if it is not recorded.

    Raises
    ------
    ValueError
        Fewer than three drive levels.
    """
    p = detection.torque_exponent if detection is not None else 1
    rows = known_rows(drive, amplitude)
    torque, y = drive[rows] ** p, amplitude[rows]
    if np.unique(torque).size < 3:
        raise ValueError(f"drive: found {np.unique(torque).size} different levels, expected at least 3")
    fit = linear_fit(
        torque[:, np.newaxis],
        y,
        names=("response",),
        standard_uncertainty=weights(u_amplitude, rows),
        absolute=False,
    )
    departure = float(np.max(np.abs(fit.residuals)) / np.max(np.abs(y)))
    findings = []
    if departure > parameters.largest_residual:
        findings.append(
            Finding(
                code="drive-not-linear",
                severity="warning",
                what=f"the amplitude departs from proportionality to the drive by {departure:.2%} of the largest amplitude; expected below {parameters.largest_residual:.0%}",
            )
        )
    moved, u_moved = math.nan, 0.0
    if period is not None:
        moved, u_moved = _period_change(amplitude, period, u_period)
        if abs(moved) > parameters.period_sigmas * u_moved > 0:
            findings.append(
                Finding(
                    code="amplitude-dependent-period",
                    severity="warning",
                    what=f"the period moves by {moved * 1e9:.3g} ns over the amplitudes used, more than {parameters.period_sigmas:g} standard uncertainties",
                )
            )
    factor = float(np.max(torque) / np.min(torque)) if np.min(torque) > 0 else math.nan
    return Outcome(
        {"departure": departure, "period_change": moved}, point={"period_change": u_moved},
        facts={"levels": int(np.unique(torque).size), "factor": factor, "p": p, "departure_percent": f"{100 * departure:.2g}"}, findings=tuple(findings),
    )  # fmt: skip


def _period_change(
    amplitude: FloatArray, period: FloatArray, u_period: FloatArray | None
) -> tuple[float, float]:
    rows = known_rows(amplitude, period)
    u = weights(u_period, rows)
    if np.count_nonzero(rows) < 3 or np.ptp(amplitude[rows]) == 0:
        return math.nan, 0.0
    line = straight_line(amplitude[rows], period[rows], standard_uncertainty=u, absolute=u is not None)
    span = float(np.ptp(amplitude[rows]))
    return line.value("slope") * span, line.standard_uncertainty("slope") * span


def _range(frequency: FloatArray) -> str:
    """Return the ends of a sweep with the digits that its width needs: a high Q is swept over parts in a million."""
    low, high = float(np.min(frequency)), float(np.max(frequency))
    places = max(0, 2 - math.floor(math.log10(high - low))) if high > low else 3
    return f"{low:.{places}f} Hz to {high:.{places}f} Hz"


def resonance_fit(
    parameters: ResonanceParameters,
    *,
    frequency: FloatArray,
    x: FloatArray,
    y: FloatArray,
    u_x: FloatArray | None,
) -> Outcome:
    """Return the one resonance of a frequency sweep, or the verdict that there is none in range.

    Notes
    -----
    A Lorentzian as broad as the sweep can always be bent to fit a background that curves. So besides the fit there must
    be a sign of the resonance that rests on no model of the background: with the medians of both components taken off,
    the response is largest inside the sweep, not at its end.
    """
    rows = known_rows(frequency, x, y)
    largest = resonance.frequency_of_largest_response(frequency[rows], x[rows], y[rows])
    found = resonance.fit_resonance(
        frequency[rows], x[rows], y[rows], background=parameters.background, convention=parameters.convention,
        standard_uncertainty=weights(u_x, rows),
    )  # fmt: skip
    names = ("resonance_frequency", "quality_factor", "height", "frequency_at_maximum", "width")
    facts = {
        "points": int(np.count_nonzero(rows)),
        "low_Hz": float(np.min(frequency[rows])),
        "high_Hz": float(np.max(frequency[rows])),
        "range": _range(frequency[rows]),
        "reason": found.reason,
        "noise": found.noise,
        "probability": found.probability,
    }
    unseen = parameters.largest_inside and math.isnan(largest)
    if not found.found or found.fit is None or unseen:
        verdict = "no resonance in range"
        if found.found and unseen:
            facts["reason"] = (
                "no resonance in range: above a constant the response is largest at the end of the sweep, so the broad line"
                f" that would fit, {found.frequency:.5g} Hz with Q = {found.quality_factor:.2g}, cannot be told from the background"
            )
        finding = Finding(code="no-resonance", severity="note", what=str(facts["reason"]))
        return Outcome(
            dict.fromkeys(names, math.nan),
            facts=facts,
            findings=(finding,),
            verdicts=dict.fromkeys(names, verdict),
        )
    fit = found.fit
    index = [fit.names.index(name) for name in ("frequency", "quality_factor", "height")]
    f0, Q = found.frequency, found.quality_factor
    jacobian = np.vstack([np.eye(3), [1 / Q, -f0 / Q**2, 0.0]])
    covariance = jacobian @ np.asarray(fit.covariance)[np.ix_(index, index)] @ jacobian.T
    step = float(np.median(np.diff(np.unique(frequency[rows]))))
    outputs = {
        "resonance_frequency": f0,
        "quality_factor": Q,
        "height": fit.value("height"),
        "frequency_at_maximum": largest if parameters.largest_inside else found.frequency_at_maximum,
        "width": f0 / Q,
    }
    # A grid frequency is known to the grid: all places between half steps alike (JCGM 100:2008, 4.3.7).
    return Outcome(
        outputs, point={"frequency_at_maximum": step / math.sqrt(12)},
        covariance=Covariance(("resonance_frequency", "quality_factor", "height", "width"), covariance), facts=facts,
    )  # fmt: skip

"""Steps that stand before any physics: rows left out, known corrections, inverses, and a scale of temperature."""

from __future__ import annotations

import math
from typing import Literal

import numpy as np

from archive.physics import scales
from archive.reduction.estimate import FloatArray
from archive.reduction.step import NoParameters, Outcome
from schemas.base import Record
from schemas.finding import Finding
from schemas.lineage import SourceEntry

__all__ = [
    "CorrectionParameters",
    "LeaveOutParameters",
    "ScaleParameters",
    "corrected",
    "inverted",
    "inverted_scalar",
    "kept_rows",
    "on_scale",
]


class LeaveOutParameters(Record):
    """Rows that are kept in the archive and not reduced with."""

    rows: tuple[tuple[int, int], ...]
    """First and last row of each range, from 1."""
    reasons: tuple[str, ...]
    """One for each range, as the sheet gives them."""


class CorrectionParameters(Record):
    """A known correction of one channel."""

    correct: Literal["zero", "gain", "phase", "clock"]
    stated: str
    """As written in the sheet."""
    known: str
    """Measured, computed, document or assumed, and from where."""


class ScaleParameters(Record):
    """Scale to convert temperatures to."""

    source: str
    target: str


def kept_rows(parameters: LeaveOutParameters, *, values: FloatArray) -> Outcome:
    """Return a column with the rows left out made NaN; no row moves."""
    kept = np.array(values, dtype=np.float64)
    for first, last in parameters.rows:
        kept[first - 1 : last] = np.nan
    left_out = int(np.count_nonzero(np.isnan(kept) & ~np.isnan(values)))
    facts = {
        "count": left_out, "total": int(np.size(values)),
        "reason": "; ".join(dict.fromkeys(parameters.reasons)),
    }  # fmt: skip
    return Outcome({"values": kept}, facts=facts)


def corrected(
    parameters: CorrectionParameters, *, values: FloatArray, correction: float, values_kind: str
) -> Outcome:
    """Return a column after a known correction.

    Notes
    -----
    zero: value - correction. gain: value / correction. clock: value + correction. phase of a phase channel: subtracted;
    of an amplitude channel, which a loop off resonance by phi reads as the true one times cos phi: divided by cos phi.

    Raises
    ------
    ValueError
        A gain of zero, or a phase correction of a channel that neither is a phase nor an amplitude.
    """
    match parameters.correct:
        case "zero":
            result = values - correction
        case "clock":
            result = values + correction
        case "gain":
            if correction == 0:
                raise ValueError("correction: found a gain of 0, expected another number")
            result = values / correction
        case "phase":
            result = _phase_corrected(values, correction, values_kind)
    change = np.abs(result - values)
    largest = float(np.nanmax(change)) if np.isfinite(change).any() else math.nan
    return Outcome({"values": result}, facts={"largest_change": largest})


def _phase_corrected(values: FloatArray, phase: float, kind: str) -> FloatArray:
    if kind == "phase":
        return values - phase
    if kind == "amplitude":
        if not abs(phase) < math.pi / 2:
            raise ValueError(
                f"correction: found a phase of {phase:.4g} rad, expected less than a quarter turn"
            )
        return values / math.cos(phase)
    raise ValueError(f"values: a phase correction acts on a phase or an amplitude, found a channel of {kind}")


def inverted(_: NoParameters, *, values: FloatArray) -> Outcome:
    """Return the inverse of a column: period from frequency, dissipation from quality factor."""
    with np.errstate(divide="ignore"):
        result = 1 / np.asarray(values, dtype=np.float64)
    return Outcome({"inverse": np.where(np.isfinite(result), result, np.nan)})


def inverted_scalar(_: NoParameters, *, values: float) -> Outcome:
    """Return the inverse of a number: quality factor from dissipation.

    Raises
    ------
    ValueError
        The value is not above zero.
    """
    if not values > 0:
        raise ValueError(f"values: found {values:.4g}, expected > 0")
    return Outcome({"inverse": 1 / values})


def on_scale(
    parameters: ScaleParameters, *, temperature: FloatArray, temperature_scale: str | None
) -> Outcome:
    """Return temperatures converted to another named scale, with the uncertainty of the conversion.

    Parameters
    ----------
    temperature : ndarray
        K.
    temperature_scale : str or None
        Scale that the temperatures carry.

    Raises
    ------
    ValueError
        Temperatures on another scale than the plan converts from, or scales between which no conversion is known.
    """
    if temperature_scale is not None and temperature_scale != parameters.source:
        raise ValueError(
            f"temperature: it is on {temperature_scale}, and the plan converts from {parameters.source}"
        )
    values = np.asarray(temperature, dtype=np.float64)
    result = np.full(values.shape, np.nan)
    spread = np.zeros(values.shape)
    known = np.isfinite(values)
    found, u, method = scales.convert(values[known], source=parameters.source, target=parameters.target)
    result[known], spread[known] = found, u
    name = f"conversion {parameters.source} to {parameters.target}"
    source = SourceEntry(name=name, description=str(method), level="laboratory")
    change = float(np.max(np.abs(result[known] - values[known]), initial=0.0))
    shared = {"temperature": {name: spread}} if np.any(spread > 0) else {}
    finding = Finding(
        code="scale-converted",
        severity="note",
        what=f"temperatures were converted from {parameters.source} to {parameters.target}; the largest change is {change * 1e3:.3g} mK",
    )
    return Outcome(
        {"temperature": result}, shared=shared, sources=(source,) if shared else (), scales={"temperature": parameters.target},
        facts={"largest_change_K": change, "method": str(method)}, findings=(finding,),
    )  # fmt: skip

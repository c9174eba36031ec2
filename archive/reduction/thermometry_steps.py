"""Temperatures from readings: every form of a calibration record, never extrapolated."""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from archive.physics import melting_pressure, vapour_pressure
from archive.physics.resistance_curves import (
    ChebyshevCurve,
    LogPolynomialCurve,
    ResistanceCurve,
    SplineCurve,
    log_polynomial_span,
)
from archive.physics.resistance_thermometer import evaluate
from archive.reduction.calibration_sources import (
    calibration_curve,
    points_fit,
    temperature_contributions,
)
from archive.reduction.estimate import FloatArray
from archive.reduction.step import NoParameters, Outcome
from schemas.finding import Finding
from schemas.quantity import unit_factor
from schemas.thermometer import (
    Calibration,
    ChebyshevForm,
    CurieWeissForm,
    LogPolynomialForm,
    MeltingCurveForm,
    SplineForm,
    VapourPressureForm,
)

__all__ = ["calibrated_temperature", "resistance_curve", "temperature_from_calibration"]


def temperature_from_calibration(
    _: NoParameters, *, reading: FloatArray, reading_kind: str, calibration: Calibration | None
) -> Outcome:
    """Return temperatures from a thermometer's readings.

    Parameters
    ----------
    reading : ndarray
        SI unit of its kind. A column that already is a temperature on a named scale passes unchanged.
    reading_kind : str
        Quantity kind of the reading.
    calibration : Calibration or None
        None only for a temperature.

    Raises
    ------
    ValueError
        A reading of another kind than the calibration is for, or a calibration whose relation belongs to another scale.

    Notes
    -----
    The sources of `calibration_sources.temperature_contributions` are common to every temperature of every sweep that uses
    the calibration. Outside the calibrated range there is no temperature, and a finding says how many rows that concerns.
    """
    if calibration is None:
        if reading_kind != "temperature":
            raise ValueError(
                f"reading: found a {reading_kind} and no calibration, expected a calibration or a temperature"
            )
        return Outcome(
            {"temperature": reading},
            facts={
                "calibration": "none, as recorded",
                "outside": 0,
                "origin": "Temperatures were taken as recorded",
                "outside_words": "",
            },
        )
    try:
        factor = unit_factor(calibration.reading_unit, reading_kind)
    except ValueError as error:
        raise ValueError(
            f"reading: calibration {calibration.address} is for readings in {calibration.reading_unit}; {error}"
        ) from None
    temperature = calibrated_temperature(calibration, np.asarray(reading, dtype=np.float64) / factor, factor)
    outside = int(np.count_nonzero(np.isnan(temperature) & ~np.isnan(reading)))
    findings = _outside_finding(calibration, outside, int(np.size(reading))) if outside else ()
    parts = temperature_contributions(
        calibration, np.asarray(reading, dtype=np.float64) / factor, temperature
    )
    return Outcome(
        {"temperature": temperature},
        shared={"temperature": {entry.name: part for entry, part in parts}},
        sources=tuple(entry for entry, _ in parts),
        scales={"temperature": calibration.scale},
        facts={
            "calibration": calibration.address, "form": calibration.relation.form, "outside": outside, "scale": calibration.scale,
            "made_from": calibration.made_from or "no reduction of this archive", "low_K": calibration.temperature_low.si, "high_K": calibration.temperature_high.si,
            "outside_words": f"; {outside} reading{'s' * (outside != 1)} outside ha{'s' if outside == 1 else 've'} none" if outside else "",
            "origin": f"Readings became temperatures on {calibration.scale} by calibration {calibration.address} ({calibration.relation.form}),"
            f" from {calibration.temperature_low.format()} to {calibration.temperature_high.format()}",
        },
        findings=findings,
    )  # fmt: skip


def _outside_finding(calibration: Calibration, outside: int, rows: int) -> tuple[Finding, ...]:
    low, high = calibration.temperature_low.format(), calibration.temperature_high.format()
    return (
        Finding(
            code="temperature-outside-calibration", severity="warning",
            what=f"{outside} of {rows} readings lie outside calibration {calibration.address}, which reaches from {low} to {high}; they have no temperature",
            remedy="leave these rows out with a reason, or name a calibration that covers them",
        ),
    )  # fmt: skip


def calibrated_temperature(calibration: Calibration, reading: FloatArray, factor: float) -> FloatArray:
    """Return temperatures on the calibration's scale, NaN outside its range.

    Parameters
    ----------
    calibration : Calibration
    reading : ndarray
        In the calibration's own unit.
    factor : float
        SI units in one of the calibration's unit; the definitions of the scales need it.
    """
    relation = calibration.relation
    low, high = calibration.temperature_low.si, calibration.temperature_high.si
    fitted = calibration_curve(calibration)
    if fitted is not None:
        found = fitted.temperature(reading).reshape(np.shape(reading))
    elif isinstance(relation, CurieWeissForm):
        with np.errstate(divide="ignore", invalid="ignore"):
            excess = reading - relation.offset
            found = np.where(
                excess * np.sign(relation.constant) > 0, relation.theta + relation.constant / excess, np.nan
            )
    elif isinstance(relation, VapourPressureForm):
        _same_scale(calibration, "ITS-90")
        span = vapour_pressure.pressure_range_its90(relation.isotope)
        found = _within(
            reading * factor, span, lambda p: vapour_pressure.temperature_its90(p, relation.isotope)
        )
    elif isinstance(relation, MeltingCurveForm):
        _same_scale(calibration, "PLTS-2000")
        span = melting_pressure.pressure_range_plts2000(relation.branch)
        found = _within(
            reading * factor, span, lambda p: melting_pressure.temperature_plts2000(p, branch=relation.branch)
        )
    else:
        return np.asarray(
            evaluate(resistance_curve(calibration), reading, temperature_span=(low, high)).temperature,
            dtype=np.float64,
        )
    with np.errstate(invalid="ignore"):
        # A part in 1e12 is the rounding of the ends.
        return np.where((found >= low * (1 - 1e-12)) & (found <= high * (1 + 1e-12)), found, np.nan)


def _same_scale(calibration: Calibration, scale: str) -> None:
    if calibration.scale != scale:
        raise ValueError(
            f"calibration {calibration.address}: its relation defines temperatures on {scale}, and the record says {calibration.scale}"
        )


def _within(pressure: FloatArray, span: tuple[float, float], function: object) -> FloatArray:
    assert callable(function)  # noqa: S101 - narrows the type of a local lambda
    found = np.full(pressure.shape, np.nan)
    with np.errstate(invalid="ignore"):
        inside = (pressure >= span[0]) & (pressure <= span[1])
    if inside.any():
        found[inside] = function(pressure[inside])
    return found


# A fit of points is the same for every column and every shifted evaluation.
@lru_cache(maxsize=64)
def resistance_curve(calibration: Calibration) -> ResistanceCurve:
    """Return the curve of a calibration of a resistance that does not state the readings of its points."""
    relation = calibration.relation
    span = (calibration.temperature_low.si, calibration.temperature_high.si)
    if isinstance(relation, ChebyshevForm):
        return ChebyshevCurve(relation.coefficients, relation.lower, relation.upper, relation.logarithm)
    if isinstance(relation, LogPolynomialForm):
        scaled = {"centre": relation.centre, "scale": relation.half_width}
        resistances = log_polynomial_span(relation.coefficients, span, **scaled)
        return LogPolynomialCurve(relation.coefficients, resistances, **scaled)
    if isinstance(relation, SplineForm):
        readings, temperatures = (tuple(column) for column in zip(*calibration.points, strict=True))
        return SplineCurve(readings, temperatures)
    return points_fit(calibration).curve

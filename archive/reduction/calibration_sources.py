"""What makes a calibrated temperature uncertain, source by source.

Rules: every source is common to all readings of its thermometer and keeps its name wherever it appears, so that two
thermometers that were calibrated against one reference stay correlated. A calibration that says how each source moves its
coefficients is taken at its word; otherwise its stated uncertainty is one source. What the form leaves open between the
points is a source of its own.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from archive.physics.calibration_curve import CalibrationCurve
from archive.physics.resistance_fit import fit_log_polynomial
from archive.physics.resistance_order import CurveFit
from archive.reduction.estimate import FloatArray
from schemas.lineage import SourceEntry
from schemas.thermometer import (
    Calibration,
    ChebyshevForm,
    CurieWeissForm,
    LogPolynomialForm,
    PointsForm,
    SplineForm,
)

__all__ = ["calibration_curve", "points_fit", "temperature_contributions"]


@lru_cache(maxsize=64)
def points_fit(calibration: Calibration) -> CurveFit:
    """Return the polynomial that the points of a calibration of form ``fitted-points`` support.

    Notes
    -----
    A fit of points is the same for every column and every shifted evaluation; it is kept.
    """
    readings, temperatures = zip(*calibration.points, strict=True)
    largest = calibration.relation.largest_order if isinstance(calibration.relation, PointsForm) else 9
    return fit_log_polynomial(readings, temperatures, largest_order=largest)


@lru_cache(maxsize=64)
def calibration_curve(calibration: Calibration) -> CalibrationCurve | None:
    """Return the curve of a fitted calibration that states the readings of its points; None for any other.

    Notes
    -----
    Its coefficients stand in the order of `Calibration.coefficients`, for the spline with rising readings.
    """
    relation, span, found = calibration.relation, calibration.readings, calibration.coefficients
    if span is None or found is None:
        return None
    match relation:
        case ChebyshevForm():
            # ZL and ZU are natural or decadic logarithms; the variable is the same.
            factor = 1.0 if relation.logarithm == "ln" else float(np.log(10.0))
            middle, half = (relation.lower + relation.upper) / 2, (relation.upper - relation.lower) / 2
            return CalibrationCurve("chebyshev", found, span, middle * factor, half * factor)
        case LogPolynomialForm():
            return CalibrationCurve("log-polynomial", found, span, relation.centre, relation.half_width)
        case CurieWeissForm():
            return CalibrationCurve("curie-weiss", found, span)
        case SplineForm():
            points = sorted(calibration.points)
            knots, temperatures = (tuple(column) for column in zip(*points, strict=True))
            return CalibrationCurve("spline", temperatures, span, knots=knots)
    return None


def temperature_contributions(
    calibration: Calibration, reading: FloatArray, temperature: FloatArray
) -> list[tuple[SourceEntry, FloatArray]]:
    """Return the sources of a calibration and what each contributes to temperatures.

    Parameters
    ----------
    calibration : Calibration
    reading : ndarray
        In the calibration's own unit.
    temperature : ndarray
        What the calibration gives for them, K; NaN where there is none, and there is no contribution.

    Returns
    -------
    list of (SourceEntry, ndarray)
        Signed standard contributions in K, of the shape of `temperature`.
    """
    known = ~np.isnan(temperature)
    found = [
        (entry, np.where(known, part, 0.0)) for entry, part in _own(calibration, reading, np.where(known, temperature, 0.0))
    ]  # fmt: skip
    if calibration.interpolation_uncertainty:
        entry = _entry(
            calibration,
            "interpolation",
            f"form of the calibration of {calibration.thermometer} between its points",
        )
        found.append((entry, np.where(known, calibration.interpolation_uncertainty * temperature, 0.0)))
    return found


def _own(
    calibration: Calibration, reading: FloatArray, temperature: FloatArray
) -> list[tuple[SourceEntry, FloatArray]]:
    curve = calibration_curve(calibration)
    if calibration.contribution and curve is not None:
        order = np.argsort([r for r, _ in calibration.points]) if curve.form == "spline" else slice(None)
        shifts = np.array([each.coefficients for each in calibration.contribution])[:, order]
        parts = curve.contributions(reading, shifts)
        return [
            (SourceEntry(name=each.source, description=each.description, level=each.level, address=each.address), part)
            for each, part in zip(calibration.contribution, parts, strict=True)
        ]  # fmt: skip
    spread = (
        np.full(temperature.shape, abs(calibration.uncertainty.si))
        if calibration.uncertainty is not None
        else (calibration.relative_uncertainty or 0.0) * temperature
    )
    stated = SourceEntry(
        name=calibration.address, description=f"calibration of {calibration.thermometer} against {calibration.against}",
        level="laboratory", address=calibration.address,
    )  # fmt: skip
    found = [(stated, spread)]
    if isinstance(calibration.relation, PointsForm):
        u = points_fit(calibration).standard_uncertainty(reading)
        fit = _entry(calibration, "fit", f"scatter of the calibration points of {calibration.thermometer}")
        found.append((fit, np.nan_to_num(u)))
    return found


def _entry(calibration: Calibration, what: str, description: str) -> SourceEntry:
    return SourceEntry(
        name=f"{calibration.address} {what}",
        description=description,
        level="laboratory",
        address=calibration.address,
    )

"""Calibrations of one thermometer compared over their common range: what has drifted between them.

Rules: what cannot be compared is said, never guessed: another unit, no common range, scales without a published conversion.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from archive.physics import melting_pressure, scales, vapour_pressure
from archive.physics.calibration_drift import CalibrationDifference, calibration_difference
from archive.reduction.calibration_sources import (
    calibration_curve,
    temperature_contributions,
)
from archive.reduction.estimate import FloatArray
from archive.reduction.thermometry_steps import calibrated_temperature, resistance_curve
from schemas.quantity import unit_factor
from schemas.thermometer import Calibration, CurieWeissForm, MeltingCurveForm, VapourPressureForm

__all__ = ["Drift", "compared", "drifts", "readings_at"]

_POINTS = 25
_GRID = 400


@dataclass(frozen=True)
class Drift:
    """Two calibrations of one thermometer, one after the other.

    Attributes
    ----------
    earlier, later : str
        Addresses of the records.
    scale : str
        Scale of the comparison, that of the later one.
    found : CalibrationDifference or None
        None if they cannot be compared.
    why_not : str
        Why they cannot.
    conversion : str
        How the earlier one's temperatures came to that scale; empty if they were on it.
    """

    earlier: str
    later: str
    scale: str
    found: CalibrationDifference | None
    why_not: str = ""
    conversion: str = ""


def drifts(calibrations: Iterable[Calibration]) -> list[Drift]:
    """Return each calibration of one thermometer held against the one before it, in order of date and revision."""
    order = sorted(calibrations, key=lambda each: (each.date, each.revision, each.name))
    return [compared(first, second) for first, second in pairwise(order)]


def compared(earlier: Calibration, later: Calibration) -> Drift:
    """Return by how much a later calibration differs from an earlier one.

    Parameters
    ----------
    earlier, later : Calibration
        Of one thermometer.

    Notes
    -----
    On 25 temperatures, evenly spaced in their logarithm over the range that both cover. Sources of one name are one source.
    The conversion between scales adds its own uncertainty.
    """
    try:
        reading, factor, first = _common(earlier, later)
        second = calibrated_temperature(later, reading * factor, unit_factor_of(later))
        first, conversion, spread = _on_scale(first, earlier, later)
    except ValueError as problem:
        return Drift(earlier.address, later.address, later.scale, None, why_not=str(problem))
    known = np.isfinite(first) & np.isfinite(second)
    if not known.any():
        return Drift(
            earlier.address, later.address, later.scale, None, why_not="they have no reading in common"
        )
    parts = [
        {entry.name: part[known] for entry, part in temperature_contributions(each, at, T)}
        for each, at, T in ((earlier, reading, first), (later, reading * factor, second))
    ]
    if conversion:
        parts[0][f"conversion {earlier.scale} to {later.scale}"] = spread[known]
    found = calibration_difference(first[known], second[known], earlier_parts=parts[0], later_parts=parts[1])
    return Drift(earlier.address, later.address, later.scale, found, conversion=conversion)


def unit_factor_of(calibration: Calibration) -> float:
    """Return SI units in one of a calibration's unit for pressures, which the scales define; 1 for anything else."""
    if isinstance(calibration.relation, VapourPressureForm | MeltingCurveForm):
        return unit_factor(calibration.reading_unit, "pressure")
    return 1.0


def _common(earlier: Calibration, later: Calibration) -> tuple[FloatArray, float, FloatArray]:
    """Return readings in the earlier one's unit, the factor to the later one's unit, and the earlier one's temperatures."""
    factor = _ratio(earlier.reading_unit, later.reading_unit)
    low = max(earlier.temperature_low.si, later.temperature_low.si)
    high = min(earlier.temperature_high.si, later.temperature_high.si)
    if not low < high:
        raise ValueError("they have no temperatures in common")
    wanted = np.geomspace(low, high, _POINTS)
    reading = readings_at(earlier, wanted)
    return reading, factor, calibrated_temperature(earlier, reading, unit_factor_of(earlier))


def _ratio(earlier: str, later: str) -> float:
    if earlier == later:
        return 1.0
    for kind in (
        "resistance",
        "mutual_inductance",
        "inductance",
        "capacitance",
        "pressure",
        "voltage",
        "number",
    ):
        try:
            return unit_factor(earlier, kind) / unit_factor(later, kind)
        except ValueError:
            continue
    raise ValueError(f"their readings are in {earlier} and in {later}")


def readings_at(calibration: Calibration, temperature: FloatArray) -> FloatArray:
    """Return readings at which a calibration gives about these temperatures; they need not be exact.

    Parameters
    ----------
    calibration : Calibration
    temperature : ndarray, shape (n,)
        K, on its scale and in its range.

    Returns
    -------
    ndarray, shape (n,)
        In its `reading_unit`.
    """
    relation = calibration.relation
    if isinstance(relation, CurieWeissForm):
        return np.asarray(relation.offset + relation.constant / (temperature - relation.theta))
    if isinstance(relation, VapourPressureForm):
        return np.asarray(
            vapour_pressure.pressure_its90(temperature, relation.isotope) / unit_factor_of(calibration)
        )
    if isinstance(relation, MeltingCurveForm):
        return np.asarray(melting_pressure.pressure_plts2000(temperature) / unit_factor_of(calibration))
    stated = calibration_curve(calibration)
    low, high = resistance_curve(calibration).resistance_span if stated is None else stated.reading_span
    grid = np.geomspace(low, high, _GRID)
    found = calibrated_temperature(calibration, grid, 1.0)
    known = np.flatnonzero(np.isfinite(found))
    order = known[np.argsort(found[known])]
    return np.exp(np.interp(np.log(temperature), np.log(found[order]), np.log(grid[order])))


def _on_scale(
    temperature: FloatArray, earlier: Calibration, later: Calibration
) -> tuple[FloatArray, str, FloatArray]:
    if earlier.scale == later.scale:
        return temperature, "", np.zeros(temperature.shape)
    result, spread = np.full(temperature.shape, np.nan), np.zeros(temperature.shape)
    method, problem = "", ""
    for k, each in enumerate(temperature):
        if np.isfinite(each):
            try:
                found = scales.convert(each, source=earlier.scale, target=later.scale)
            except ValueError as error:
                problem = str(error)
                continue
            result[k], spread[k], method = float(found.temperature), float(found.uncertainty), found.method
    if not method:
        raise ValueError(f"{earlier.scale} and {later.scale} are not compared: {problem}")
    return result, method, spread

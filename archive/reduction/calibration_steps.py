"""Steps of a calibration made in the archive: points from the rows of a sweep, and the curve through them.

Rules: what all points share (the reference's calibration, a gauge, a correction) is no weight of the fit; the runner moves
all points together by it, so that each source moves the coefficients as a whole. The choice of order and the scaling of the
variable are held meanwhile.
"""

from __future__ import annotations

import math
from typing import Literal

import numpy as np
from pydantic import Field

from archive.physics.calibration_curve import CurveForm
from archive.physics.calibration_fit import CalibrationFit, fit_calibration
from archive.physics.residual_tests import runs_test
from archive.reduction.calibration_pressure import PRESSURE_STEPS
from archive.reduction.coulomb_steps import COULOMB_STEPS
from archive.reduction.estimate import FloatArray
from archive.reduction.step import Covariance, Outcome, Port, Step
from schemas.base import Record
from schemas.finding import Finding

__all__ = ["CALIBRATION_STEPS", "FitParameters", "PointParameters", "calibration_fit", "calibration_points"]

_PARAMAGNETIC = ("mutual_inductance", "inductance")
_POOR = 0.01
"""Chance of so large a chi-squared, or of so few runs, below which it is told (common practice, no source)."""


class PointParameters(Record):
    """How rows become points."""

    plateau: float = Field(default=0.0, ge=0, lt=0.5)
    """Rows one after the other whose temperature stays within this fraction of their mean are one point; 0: every row is one."""
    fewest: int = Field(default=1, ge=1)
    """Plateaus of fewer rows are left out: they were passed, not held."""
    groups: tuple[int, ...] | None = None
    """Point that each row belongs to, from 0, or -1; left out: found from the data."""


class FitParameters(Record):
    """Form of the curve and how far its order may rise."""

    form: Literal["by-kind", "chebyshev", "log-polynomial", "spline", "curie-weiss"] = "by-kind"
    """`by-kind`: curie-weiss for an inductance, log-polynomial for everything else."""
    largest_order: int = Field(default=9, ge=1, le=14)
    order: int | None = Field(default=None, ge=1, le=14)
    """The order itself; left out: by F-test and AICc."""
    centre: float | None = None
    half_width: float | None = Field(default=None, gt=0)
    """Of the logarithm of the reading; left out: those of the outermost points."""
    reduced_chi2: float | None = None
    """In place of what the points give: held while inputs are shifted or drawn, for a statistic of the readings has no uncertainty of its own."""


def calibration_points(
    parameters: PointParameters,
    *,
    temperature: FloatArray,
    reading: FloatArray,
    u_temperature: FloatArray,
    u_reading: FloatArray,
) -> Outcome:
    """Return one reading and one reference temperature for each point of a calibration.

    Parameters
    ----------
    temperature, reading : ndarray
        Of each row; NaN in one of both leaves the row out.
    u_temperature, u_reading : ndarray
        What each row shares with no other.

    Raises
    ------
    ValueError
        No row has both, or no plateau is long enough.

    Notes
    -----
    The uncertainty of a plateau is the larger of what its rows state and of their scatter, over the root of their number.
    """
    T, R = np.asarray(temperature, dtype=np.float64), np.asarray(reading, dtype=np.float64)
    groups = np.array(parameters.groups) if parameters.groups is not None else _groups(parameters, T, R)
    count = int(groups.max(initial=-1)) + 1
    if count == 0:
        raise ValueError(
            "temperature: found no point that has a reading and a reference temperature, expected some"
        )
    rows = [np.flatnonzero(groups == k) for k in range(count)]
    size = np.array([each.size for each in rows])
    return Outcome(
        {
            "temperature": np.array([T[each].mean() for each in rows]),
            "reading": np.array([R[each].mean() for each in rows]),
        },
        point={
            "temperature": np.array([_mean_spread(T[each], u_temperature[each]) for each in rows]),
            "reading": np.array([_mean_spread(R[each], u_reading[each]) for each in rows]),
        },
        held={"groups": tuple(int(each) for each in groups)},
        facts={
            "points": count, "rows": int(size.sum()), "left_out": int(T.size - size.sum()), "rows_each": float(np.median(size)),
            "made": "each row is a point" if parameters.plateau == 0 else f"means of plateaus within {100 * parameters.plateau:.3g} per cent",
        },
    )  # fmt: skip


def _groups(parameters: PointParameters, T: FloatArray, R: FloatArray) -> FloatArray:
    known = np.isfinite(T) & np.isfinite(R)
    groups = np.full(T.shape, -1)
    if parameters.plateau == 0:
        groups[known] = np.arange(int(known.sum()))
        return groups
    plateaus: list[list[int]] = []
    for row in np.flatnonzero(known):
        mean = float(np.mean(T[plateaus[-1]])) if plateaus else math.nan
        if plateaus and abs(T[row] - mean) <= parameters.plateau * mean:
            plateaus[-1].append(int(row))
        else:
            plateaus.append([int(row)])
    for k, each in enumerate([each for each in plateaus if len(each) >= parameters.fewest]):
        groups[each] = k
    return groups


def _mean_spread(values: FloatArray, stated: FloatArray) -> float:
    n = values.size
    # Two rows tell no scatter.
    scatter = float(np.std(values, ddof=1)) if n > 2 else 0.0
    return max(float(np.sqrt(np.sum(stated**2))) / n, scatter / math.sqrt(n))


def calibration_fit(
    parameters: FitParameters,
    *,
    temperature: FloatArray,
    reading: FloatArray,
    u_temperature: FloatArray,
    u_reading: FloatArray,
    reading_kind: str,
) -> Outcome:
    """Return the calibration curve through points, with its covariance and all that a record of it needs.

    Parameters
    ----------
    temperature, reading : ndarray
        Points: K, SI unit of the reading.
    u_temperature, u_reading : ndarray
        Of each point alone.
    reading_kind : str
        Quantity kind of the reading.

    Raises
    ------
    ValueError
        Too few points, or a curve that turns within them.
    """
    form: CurveForm = (
        parameters.form if parameters.form != "by-kind" else "curie-weiss" if reading_kind in _PARAMAGNETIC else "log-polynomial"
    )  # fmt: skip
    scaled = (
        (parameters.centre, parameters.half_width)
        if parameters.centre is not None and parameters.half_width is not None
        else None
    )
    fit = fit_calibration(
        form, reading, temperature, temperature_uncertainty=u_temperature, reading_uncertainty=u_reading,
        largest_order=parameters.largest_order, order=parameters.order, centre_and_half_width=scaled,
    )  # fmt: skip
    curve = fit.curve
    order = np.argsort(curve.temperature(curve.reading_span))
    ends = curve.temperature(curve.reading_span)[order]
    # The outermost readings are single ones, each with its own noise.
    u_ends = np.array([u_reading[np.argmin(reading)], u_reading[np.argmax(reading)]], dtype=np.float64)
    u_T = (np.abs(curve.slope(curve.reading_span)) * u_ends)[order]
    in_order = fit.residuals[np.argsort(temperature)]
    names = tuple(f"coefficients[{k}]" for k in range(len(curve.coefficients)))
    chi2 = fit.reduced_chi2 if parameters.reduced_chi2 is None else parameters.reduced_chi2
    held: dict[str, object] = {"form": form, "centre": curve.centre, "half_width": curve.half_width, "reduced_chi2": chi2}  # fmt: skip
    if form in ("chebyshev", "log-polynomial"):
        held["order"] = fit.order
    nan = math.nan
    return Outcome(
        {
            "coefficients": np.array(curve.coefficients), "centre": curve.centre, "half_width": curve.half_width, "order": float(fit.order),
            "reading_low": curve.reading_span[0], "reading_high": curve.reading_span[1],
            "temperature_low": float(ends[0]), "temperature_high": float(ends[1]),
            "fitted": temperature - fit.residuals, "residual": fit.residuals, "residual_rms": fit.rms, "leave_one_out": fit.leave_one_out,
            "interpolation": fit.interpolation, "fit_uncertainty": fit.standard_uncertainty(reading),
            "reduced_chi2": nan if chi2 is None else chi2,
        },
        point={"reading_low": u_ends[0], "reading_high": u_ends[1], "temperature_low": u_T[0], "temperature_high": u_T[1]},
        covariance=Covariance(names, fit.covariance),
        held=held,
        verdicts={} if fit.reduced_chi2 is not None else {"reduced_chi2": "no uncertainty stated"},
        facts={
            "form": form, "order": fit.order, "points": int(temperature.size), "rms_mK": 1e3 * fit.rms, "largest_mK": 1e3 * fit.largest,
            "leave_one_out_mK": 1e3 * fit.leave_one_out, "interpolation_ppm": 1e6 * fit.interpolation, "low_K": float(ends[0]), "high_K": float(ends[1]),
            "chance": fit.chance, "orders_tried": [trial.order for trial in fit.trials],
            "chances_of_orders": [trial.f_probability for trial in fit.trials], "aicc": [trial.aicc for trial in fit.trials],
            "chosen": "held" if parameters.order is not None else "chosen by F-test and AICc" if fit.trials else "given by the form",
            "against_stated": "" if fit.reduced_chi2 is None else f", chi^2 per degree of freedom {fit.reduced_chi2:.3g}",
        },
        findings=_findings(fit, in_order),
    )  # fmt: skip


def _findings(fit: CalibrationFit, in_order: FloatArray) -> tuple[Finding, ...]:
    found = []
    if fit.chance is not None and fit.chance < _POOR:
        found.append(
            Finding(
                code="calibration-fit-poor", severity="warning",
                what=f"chi-squared per degree of freedom is {fit.reduced_chi2:.3g}, of chance {fit.chance:.2g}; the excess is part of the interpolation uncertainty",
                remedy="look at the residuals: a point that had not settled is left out with the reason, or the stated uncertainties are too small",
            )
        )  # fmt: skip
    runs = runs_test(in_order) if np.any(in_order != 0) else None
    if runs is not None and runs.probability < _POOR:
        found.append(
            Finding(
                code="calibration-residuals-structured", severity="warning",
                what=f"the residuals change sign {runs.runs - 1} times in order of temperature, {runs.expected - 1:.3g} times are expected (chance {runs.probability:.2g})",
                remedy="allow a higher order in a copy of the plan, or another form",
            )
        )  # fmt: skip
    if fit.rms > 0 and fit.leave_one_out > 2 * fit.rms:
        found.append(
            Finding(
                code="calibration-leans-on-points", severity="warning",
                what=f"points left out are missed by {1e3 * fit.leave_one_out:.3g} mK, more than twice the residual of {1e3 * fit.rms:.3g} mK",
                remedy="lower largest_order in a copy of the plan, or measure more points",
            )
        )  # fmt: skip
    return tuple(found)


_TEMPERATURE = Port("temperature", "array", "reference temperature of each point")
_DIFFERENCE = Port("temperature_difference", "scalar", "rms of the residuals")

CALIBRATION_STEPS: tuple[Step, ...] = (
    *PRESSURE_STEPS,
    Step(
        name="calibration-points", version=1, function=calibration_points, parameters=PointParameters,
        takes={"temperature": Port("temperature", "array", "reference temperature of each row"), "reading": Port("any", "array", "reading of the thermometer under calibration")},
        yields={"temperature": _TEMPERATURE, "reading": Port("same:reading", "array", "reading of each point")},
        sentence="{rows} rows gave {points} calibration points ({made}; {left_out} rows without a reading or a reference temperature).",
        spread="refit", weights=("temperature", "reading"),
    ),
    Step(
        name="calibration-fit", version=2, function=calibration_fit, parameters=FitParameters,
        takes={"temperature": _TEMPERATURE, "reading": Port("any", "array", "reading of each point")},
        yields={
            "coefficients": Port("number", "array", "coefficients of the form, with readings in their SI unit and temperatures in K"),
            "centre": Port("number", "scalar", "centre of the logarithm of the reading"), "half_width": Port("number", "scalar", "half width of the logarithm of the reading"),
            "order": Port("count", "scalar", "highest power, parameters less one"),
            "reading_low": Port("same:reading", "scalar", "smallest reading of the points"), "reading_high": Port("same:reading", "scalar", "largest reading of the points"),
            "temperature_low": Port("temperature", "scalar", "lowest temperature of the curve"), "temperature_high": Port("temperature", "scalar", "highest temperature of the curve"),
            "fitted": Port("temperature", "array", "temperature of the curve at each point"), "residual": Port("temperature_difference", "array", "reference temperature minus that of the curve"),
            "fit_uncertainty": Port("temperature_difference", "array", "standard uncertainty that the fit leaves at each point"),
            "residual_rms": _DIFFERENCE, "leave_one_out": Port("temperature_difference", "scalar", "rms residual of points left out of their own fit"),
            "interpolation": Port("fraction", "scalar", "uncertainty of the form between the points, over T"), "reduced_chi2": Port("number", "scalar", "chi-squared per degree of freedom"),
        },
        sentence="A curve of form {form} and order {order}, {chosen}, was fitted to {points} points from {low_K} K to {high_K} K: residual rms {rms_mK} mK, largest {largest_mK} mK, {leave_one_out_mK} mK for points left out{against_stated}; the form leaves {interpolation_ppm} ppm of T open between the points.",
        spread="refit", weights=("temperature", "reading"), kinds=("reading",),
    ),
    *COULOMB_STEPS,
)  # fmt: skip

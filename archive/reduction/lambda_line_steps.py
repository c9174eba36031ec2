"""Steps of the lambda line: where the transition lies at a pressure, and over how much gravity spreads it."""

from __future__ import annotations

import math

import numpy as np

from archive.physics import helium_liquid
from archive.physics.constants import T_LAMBDA
from archive.physics.lambda_gravity import lambda_spread
from archive.physics.lambda_line import (
    COARSE_UNCERTAINTY,
    LAMBDA_PRESSURE,
    LAMBDA_SLOPE,
    coarse_lambda_temperature,
    lambda_slope,
)
from archive.physics.linear_fit import straight_line
from archive.reduction.background_steps import known_rows
from archive.reduction.estimate import FloatArray
from archive.reduction.step import Outcome, Port, Step
from schemas.base import Record
from schemas.finding import Finding
from schemas.lineage import SourceEntry

__all__ = ["LAMBDA_LINE_STEPS", "LIQUID_PORTS", "GravityParameters", "LineParameters"]

HIGHEST_LINE_PRESSURE = 1e5
"""Pa; the linear form of the lambda line ends there."""

LOW_PRESSURE = 3e5
"""Pa; below it the slope is less well known than above, see `lambda_slope`."""

SLOPE_SOURCE = "slope of the lambda line"

LINE_UNCERTAINTY = 1e-3
"""K, of that form."""


class LineParameters(Record):
    """Which rows tell the pressure at the lambda point."""

    within_kelvin: float = 0.01


class GravityParameters(Record):
    """Local gravity."""

    gravity_m_s2: float = 9.80665


def lambda_line(
    parameters: LineParameters,
    *,
    temperature: FloatArray,
    pressure: float | FloatArray,
    lambda_temperature: float,
) -> Outcome:
    """Return the pressure at the lambda point, the lambda temperature expected there, and how far the measured one is above it.

    Parameters
    ----------
    temperature : ndarray
        K.
    pressure : float or ndarray
        Pa, as stated for the sweep or of each row.
    lambda_temperature : float
        As measured, K on ITS-90.

    Raises
    ------
    ValueError
        Fewer than three rows with a pressure near the lambda point.

    Notes
    -----
    The line is known here near saturated vapour pressure only, to about a millikelvin and up to 1 bar; above it there is a pressure and no
    expectation, and the coarse line, good to 15 mK, tells only whether the measured one is plausible.
    """
    p, u_p, count = _pressure_there(parameters, temperature, pressure, lambda_temperature)
    expected, verdicts = math.nan, {}
    if p > HIGHEST_LINE_PRESSURE:
        verdicts = dict.fromkeys(("expected", "difference"), "no equation of the lambda line above 1 bar")
        words, findings = _coarse(p, lambda_temperature)
    else:
        # A gauge may read a little less than the liquid's own vapour pressure.
        expected = float(helium_liquid.lambda_temperature_estimate(max(p, LAMBDA_PRESSURE)))
        away = lambda_temperature - expected
        words = f"the lambda line near saturated vapour pressure has it at {expected:.6g} K, so the measured one differs by {away * 1e3:.3g} mK"
        findings = _off_the_line(away, p, 2e-3)
    difference = lambda_temperature - expected
    spread = 0.0 if math.isnan(expected) else LINE_UNCERTAINTY
    return Outcome(
        {"pressure": p, "expected": expected, "difference": difference},
        point={"pressure": u_p, "expected": spread, "difference": spread},
        facts={"rows": "as stated" if count is None else f"{count} rows", "compared": words},
        verdicts=verdicts,
        findings=findings,
    )


def _pressure_there(
    parameters: LineParameters, T: FloatArray, pressure: float | FloatArray, lambda_temperature: float
) -> tuple[float, float, int | None]:
    """Return the pressure at the lambda point, its own uncertainty, and from how many rows; from none if one was stated."""
    p = np.asarray(pressure, dtype=np.float64)
    if p.ndim == 0:
        return float(p), 0.0, None
    rows = known_rows(T, p) & (np.abs(np.nan_to_num(T) - lambda_temperature) < parameters.within_kelvin)
    count = int(np.count_nonzero(rows))
    if count < 3:
        raise ValueError(
            f"temperature: found {count} rows with a pressure within {parameters.within_kelvin} K of the lambda point, expected at least 3"
        )
    # A saturated liquid's pressure rises by 12 Pa in a millikelvin: a line is read at the lambda point, not a mean.
    line = straight_line(T[rows] - lambda_temperature, p[rows], absolute=False)
    return line.value("intercept"), line.standard_uncertainty("intercept"), count


def _coarse(pressure: float, lambda_temperature: float) -> tuple[str, tuple[Finding, ...]]:
    """Return how far a lambda temperature is from the coarse line, in words, and a warning if that is too far."""
    try:
        away = lambda_temperature - float(coarse_lambda_temperature(pressure))
    except ValueError:
        return "no lambda line reaches that pressure, so it is compared with nothing", ()
    words = f"no equation of the lambda line is taken above 1 bar; from the coarse line on a scale of 1948 (to {COARSE_UNCERTAINTY * 1e3:.0f} mK) the measured one differs by {away * 1e3:.2g} mK"
    return words, _off_the_line(away, pressure, COARSE_UNCERTAINTY)


def _off_the_line(away: float, pressure: float, limit: float) -> tuple[Finding, ...]:
    if abs(away) <= limit:
        return ()
    return (
        Finding(
            code="lambda-temperature", severity="warning",
            what=f"the lambda point lies {away * 1e3:.3g} mK from where the lambda line has it at {pressure / 1e3:.4g} kPa",
            expected=f"{limit * 1e3:.0f} mK at most",
            remedy="look at the scale, the calibration and the gauge",
        ),
    )  # fmt: skip


def gravity(
    parameters: GravityParameters,
    *,
    height: float,
    liquid_pressure: float | None = None,
    liquid_density: float | None = None,
) -> Outcome:
    """Return over how much gravity spreads the lambda point of a cell, and the reduced temperature inside which it is rounded.

    Parameters
    ----------
    height : float
        m.
    liquid_pressure, liquid_density : float or None
        Stated for a run under pressure, Pa and kg/m^3; else those of saturated liquid.

    Raises
    ------
    ValueError
        A height below zero, or a pressure beyond the lambda line.
    """
    slope, at, share = LAMBDA_SLOPE, T_LAMBDA, 0.02
    if liquid_pressure is not None:
        slope, at = float(lambda_slope(liquid_pressure)), float(coarse_lambda_temperature(liquid_pressure))
        share = 0.10 if liquid_pressure < LOW_PRESSURE else 0.05
    rho = float(helium_liquid.density(T_LAMBDA)) if liquid_density is None else liquid_density
    spread = float(lambda_spread(height, density=rho, gravity=parameters.gravity_m_s2, slope=slope))
    limit = spread / at
    source = SourceEntry(
        name=SLOPE_SOURCE, description=f"{100 * share:.0f} per cent of the slope", level="laboratory"
    )
    return Outcome(
        {"spread": spread, "limit": limit},
        shared={"spread": {SLOPE_SOURCE: share * spread}, "limit": {SLOPE_SOURCE: share * limit}},
        sources=(source,),
        facts={"spread_uK": spread * 1e6, "limit_is": limit, "density": rho, "slope_mK_bar": slope * 1e8},
    )


LIQUID_PORTS = {
    "liquid_pressure": Port("pressure", "scalar", "stated pressure of the liquid", optional=True),
    "liquid_density": Port("density", "scalar", "stated density of the liquid at its lambda point", optional=True),
}  # fmt: skip
"""What a sheet states of bulk liquid under pressure."""

LAMBDA_LINE_STEPS: tuple[Step, ...] = (
    Step(
        name="lambda-line", version=1, function=lambda_line, parameters=LineParameters,
        takes={
            "temperature": Port("temperature", "array", "temperature of each row"), "pressure": Port("pressure", "number", "pressure of the liquid"),
            "lambda_temperature": Port("temperature", "scalar", "lambda temperature as measured"),
        },
        yields={
            "pressure": Port("pressure", "scalar", "pressure of the liquid at the lambda point"),
            "expected": Port("temperature", "scalar", "lambda temperature expected at that pressure"),
            "difference": Port("temperature_difference", "scalar", "measured less expected"),
        },
        sentence="At the lambda point, {lambda_temperature}, the liquid was at {pressure} ({rows}); {compared}.",
        citations=("ahlers-1968", "swenson-1952"), spread="refit",
    ),
    Step(
        name="lambda-gravity", version=2, function=gravity, parameters=GravityParameters,
        takes={"height": Port("length", "scalar", "height of the liquid"), **LIQUID_PORTS},
        yields={
            "spread": Port("temperature_difference", "scalar", "difference of the lambda temperature between top and bottom"),
            "limit": Port("number", "scalar", "reduced temperature inside which gravity rounds the transition"),
        },
        sentence="Over a height of {height} gravity spreads the lambda temperature by {spread_uK} uK (slope of the lambda line {slope_mK_bar} mK/bar), so that nothing inside a reduced temperature of {limit_is} is sharp.",
        citations=("ahlers-1968", "swenson-1952"),
        effects={"gravity rounding": "Gravity spreads the lambda temperature over the cell by {spread_uK} uK; a heat capacity is compared with the mean of the law over the height, and rows inside the spread are not fitted."},
    ),
)  # fmt: skip
"""Steps of this module."""

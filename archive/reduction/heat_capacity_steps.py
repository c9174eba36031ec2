"""Steps of the heat capacity: pulses, addenda, molar values, and the law at the lambda point."""

from __future__ import annotations

import math

import numpy as np

from archive.physics.heat_capacity import heat_capacity_of_pulse
from archive.reduction.background_steps import (
    BackgroundParameters,
    background_fit,
    background_value,
    known_rows,
)
from archive.reduction.estimate import FloatArray
from archive.reduction.lambda_law import LambdaLawParameters, lambda_law
from archive.reduction.step import NoParameters, Outcome, Port, Step
from schemas.finding import Finding

__all__ = ["HEAT_CAPACITY_STEPS"]


def pulses(
    _: NoParameters,
    *,
    before: FloatArray,
    rise: FloatArray,
    power: float | FloatArray,
    duration: float | FloatArray,
    drift: FloatArray | None,
) -> Outcome:
    """Return temperature in the middle, step and heat capacity of each heat pulse.

    Parameters
    ----------
    before : ndarray
        Temperature before the pulse, K.
    rise : ndarray
        Step of temperature, K.
    power, duration : float or ndarray
        Of the heater, W and s.
    drift : ndarray or None
        Rate of the temperature without heat that the step still holds, K/s.
    """
    step = np.asarray(rise, dtype=np.float64)
    heat = heat_capacity_of_pulse(power, duration=duration, rise=step, drift=0.0 if drift is None else drift)
    missing = int(np.count_nonzero(np.isfinite(step) & np.isnan(heat)))
    findings: tuple[Finding, ...] = ()
    if missing:
        findings = (
            Finding(
                code="pulse-without-rise",
                severity="warning",
                what=f"{missing} of {step.size} pulses did not raise the temperature and give no heat capacity",
                remedy="leave these rows out with the reason",
            ),
        )
    facts = {
        "pulses": int(np.count_nonzero(np.isfinite(heat))),
        "smallest_uK": float(np.nanmin(step)) * 1e6,
        "largest_mK": float(np.nanmax(step)) * 1e3,
        "drift_was": "taken off" if drift is not None else "not recorded, or extrapolated away before",
    }
    return Outcome(
        {"temperature": before + step / 2, "rise": step, "heat_capacity": heat},
        facts=facts,
        findings=findings,
    )


def molar(
    _: NoParameters,
    *,
    temperature: FloatArray,
    heat_capacity: FloatArray,
    amount: float,
    addenda: FloatArray | None,
    low: float | None,
    high: float | None,
) -> Outcome:
    """Return the molar heat capacity: the measured one less that of the empty cell, over the amount.

    Parameters
    ----------
    temperature, heat_capacity : ndarray
        K, J/K.
    amount : float
        mol of helium.
    addenda : ndarray or None
        Chebyshev coefficients of the empty cell's heat capacity, J/K.
    low, high : float or None
        Range of those, K.

    Raises
    ------
    ValueError
        No helium.

    Notes
    -----
    Rows outside the range of the addenda have no value: they are not extrapolated. Without addenda nothing is subtracted, with a warning.
    """
    if not amount > 0:
        raise ValueError(
            f"amount: found {amount} mol, expected > 0; state the cell's helium_amount or the doses"
        )
    findings: list[Finding] = []
    if addenda is None or low is None or high is None:
        empty: FloatArray = np.zeros(temperature.shape)
        share = math.nan
        findings.append(
            Finding(
                code="addenda-not-subtracted",
                severity="warning",
                what="no run of the empty cell is reduced; its heat capacity is still in the molar values",
                remedy="ingest and reduce a heat-capacity run with empty_cell = true, then reduce this run again",
            )
        )
    else:
        empty = background_value(temperature, addenda, low, high)
        with np.errstate(invalid="ignore", divide="ignore"):
            each = empty / heat_capacity
        share = float(np.nanmax(each)) if np.isfinite(each).any() else math.nan
        outside = int(np.count_nonzero(known_rows(temperature, heat_capacity) & np.isnan(empty)))
        if outside:
            findings.append(
                Finding(
                    code="outside-addenda", severity="warning",
                    what=f"{outside} of {temperature.size} rows lie outside the range of the addenda, {low:.5g} K to {high:.5g} K; they have no molar value",
                    remedy="measure the empty cell over the whole range, or leave these rows out with a reason",
                )
            )  # fmt: skip
    facts = {
        "largest_share": share,
        "subtracted": "was subtracted" if math.isfinite(share) else "was not subtracted",
    }
    return Outcome(
        {"molar_heat_capacity": (heat_capacity - empty) / amount}, facts=facts, findings=tuple(findings)
    )


_TEMPERATURE = Port("temperature", "array", "temperature of each row")
_HEAT = Port("heat_capacity", "array", "heat capacity of cell and helium")
_MOLAR = Port("molar_heat_capacity", "array", "heat capacity per mole of helium")
_STEP = Port("temperature_difference", "array", "step of temperature of each pulse", optional=True)

HEAT_CAPACITY_STEPS: tuple[Step, ...] = (
    Step(
        name="heat-capacity-from-pulses", version=1, function=pulses,
        takes={
            "before": Port("temperature", "array", "temperature before each pulse"),
            "rise": Port("temperature_difference", "array", "step of temperature of each pulse"), "power": Port("power", "number", "power of the heater"), "duration": Port("time", "number", "length of the pulse"),
            "drift": Port("temperature_rate", "array", "rate of the temperature without heat", optional=True),
        },
        yields={
            "temperature": Port("temperature", "array", "temperature in the middle of each step"),
            "rise": Port("temperature_difference", "array", "step of temperature of each pulse"), "heat_capacity": _HEAT,
        },
        sentence="{pulses} heat pulses with steps from {smallest_uK} uK to {largest_mK} mK give the heat capacity as heat over step, at the middle of each; the drift was {drift_was}.",
    ),
    Step(
        name="addenda-fit", version=1, function=background_fit, parameters=BackgroundParameters,
        takes={"temperature": _TEMPERATURE, "values": Port("heat_capacity", "array", "heat capacity of the empty cell")},
        yields={
            "coefficients": Port("same:values", "array", "Chebyshev coefficients of the addenda, lowest first"),
            "low": Port("temperature", "scalar", "lowest temperature of the addenda"), "high": Port("temperature", "scalar", "highest temperature of the addenda"),
            "value_at_low": Port("same:values", "scalar", "addenda at their lowest temperature"),
        },
        sentence="The heat capacity of the empty cell was measured between {low_K} K and {high_K} K and fitted by a polynomial of order {order} ({points} points, rms {rms} J/K).",
        spread="refit", weights=("values",), kinds=("values",),
    ),
    Step(
        name="molar-heat-capacity", version=1, function=molar,
        takes={
            "temperature": _TEMPERATURE, "heat_capacity": _HEAT, "amount": Port("amount", "scalar", "helium in the cell"),
            "addenda": Port("heat_capacity", "array", "coefficients of the empty cell's heat capacity", optional=True),
            "low": Port("temperature", "scalar", "lower end of the addenda", optional=True), "high": Port("temperature", "scalar", "upper end of the addenda", optional=True),
        },
        yields={"molar_heat_capacity": _MOLAR},
        sentence="The heat capacity of the empty cell {subtracted} (at most {largest_share} of the whole), and the rest divided by {amount}.",
    ),
    Step(
        name="lambda-heat-capacity", version=2, function=lambda_law, parameters=LambdaLawParameters,
        takes={
            "temperature": _TEMPERATURE, "molar_heat_capacity": _MOLAR, "rise": _STEP,
            "limit": Port("number", "scalar", "reduced temperature inside which gravity rounds the transition", optional=True),
        },
        yields={
            "lambda_temperature": Port("temperature", "scalar", "lambda temperature"), "amplitude_below": Port("molar_heat_capacity", "scalar", "amplitude below the transition"),
            "amplitude_above": Port("molar_heat_capacity", "scalar", "amplitude above the transition"), "amplitude_ratio": Port("number", "scalar", "amplitude above over below"),
            "exponent": Port("number", "scalar", "exponent alpha"), "background": Port("molar_heat_capacity", "scalar", "background B, common to both sides"),
            "constant": Port("molar_heat_capacity", "scalar", "B + A/alpha below the transition"), "asymmetry": Port("number", "scalar", "(1 - A above/A below)/alpha"),
            "first_correction": Port("number", "scalar", "a of the factor 1 + a t^Delta + b t^(2 Delta), common to both sides"), "second_correction": Port("number", "scalar", "b of that factor"),
            "logarithm_probability": Port("number", "scalar", "chance that the exponent gains as much where the logarithm is true"),
            "range_upper": Port("number", "array", "upper ends of the window that were tried"), "range_exponent": Port("number", "array", "exponent for each upper end"),
        },
        sentence="C = (A/alpha) t^-alpha + B, with {confluent_terms} confluent terms (Delta = {delta}) and alpha and B common to both sides, was fitted to {points_below} points below and {points_above} above T_lambda = {lambda_temperature} ({treated}) with t from {low} to {high}, averaged {gravity}: alpha = {exponent}, A above/A below = {amplitude_ratio}, A below = {amplitude_below}, B + A/alpha = {constant}; chi^2 per degree of freedom {reduced_chi2}. Against the logarithm the F-test gives a probability of {chance}. Range dependence of alpha: {ranges}.",
        citations=("lipa-2003",), spread="refit", weights=("molar_heat_capacity", "temperature"),
    ),
)  # fmt: skip

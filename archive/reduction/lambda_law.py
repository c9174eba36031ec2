"""The law of the heat capacity on both sides of the lambda point, with the logarithm beside it and the dependence on the range.

Rule: the exponent is never fitted with the background held; the great terms A/alpha and B are reported with their covariance.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from archive.physics.heat_capacity_fit import LambdaFit, Sides, fit_lambda_law, sides_of_transition
from archive.reduction.background_steps import known_rows, weights
from archive.reduction.estimate import FloatArray
from archive.reduction.row_choice import chosen_rows, row_numbers
from archive.reduction.step import Covariance, Outcome
from schemas.base import Record
from schemas.finding import Finding
from schemas.uncertain_text import rounded

__all__ = ["LambdaLawParameters", "lambda_law"]


class LambdaLawParameters(Record):
    """Window and form of the law."""

    low: float = 1e-6
    high: float = 1e-2
    highs: tuple[float, ...] = (1e-3, 3e-3, 1e-2)
    """Upper ends of the window that are tried to show how the exponent depends on it."""
    corrections: int = 2
    """Confluent terms: 0, 1 or 2."""
    confluent_exponent: float = 0.529
    lambda_temperature_kelvin: float | None = None
    """Held; fitted when none."""
    clear_of_gravity: float = 1.0
    """Rows closer to the transition than this many times the limit of gravity are not fitted. The law is averaged over the height; at one half,
    part of the cell is on the other side."""
    rows_below: tuple[int, ...] | None = None
    """The rows to fit below the transition, from 1, in place of the window."""
    rows_above: tuple[int, ...] | None = None
    chance: float | None = None
    """Of the F-test, in place of what the readings give: held while inputs are shifted or drawn, for a statistic of the readings has no
    uncertainty of its own."""


def lambda_law(
    parameters: LambdaLawParameters,
    *,
    temperature: FloatArray,
    molar_heat_capacity: FloatArray,
    rise: FloatArray | None,
    limit: float | None,
    u_molar_heat_capacity: FloatArray | None,
    u_temperature: FloatArray | None,
) -> Outcome:
    """Return amplitudes, exponent and background of the heat capacity on both sides, and the F-test against the logarithm.

    Parameters
    ----------
    temperature, molar_heat_capacity : ndarray
        K (middle of each step), J/(mol K).
    rise : ndarray or None
        Step of each row, K; the law is averaged over it.
    limit : float or None
        Reduced temperature inside which gravity rounds the transition.
    u_molar_heat_capacity, u_temperature : ndarray or None
        Point uncertainties.

    Raises
    ------
    ValueError
        Too few rows on a side or in the window, or a fit that does not converge.
    """
    known = known_rows(temperature, molar_heat_capacity, rise)
    low = parameters.low
    if limit is not None:
        low = max(low, parameters.clear_of_gravity * limit)
    data = _Data(
        known, temperature[known], molar_heat_capacity[known], None if rise is None else rise[known],
        weights(u_molar_heat_capacity, known), weights(u_temperature, known),
    )  # fmt: skip
    sides, rows = _sides(parameters, data, temperature.size)
    if limit is not None:
        data = replace(data, spread=limit * (sides.low + sides.high) / 2)
    found = _fitted(parameters, data, sides, (low, parameters.high), rows)
    if not found.converged:
        raise ValueError(f"molar_heat_capacity: the law was not fitted: {found.message}")
    inflation = max(found.fit.reduced_chi2, 1.0) if data.u is not None else 1.0
    outputs, covariance = _outputs(found, inflation)
    highs, exponents, spreads, counts = _ranges(parameters, data, sides, low, rows, found)
    used = found.used & sides.below, found.used & sides.above
    numbers = [row_numbers(_spread(known, mask)) for mask in used]
    chance = found.probability if parameters.chance is None else parameters.chance
    return Outcome(
        {
            **outputs, "logarithm_probability": chance, "range_upper": highs, "range_exponent": exponents,
        },
        point={"range_exponent": spreads},
        verdicts={name: "not fitted" for name in _NAMES[-2:] if math.isnan(float(outputs[name]))},
        covariance=covariance,
        held={"rows_below": numbers[0], "rows_above": numbers[1], "chance": chance},
        facts={
            "points_below": len(numbers[0]), "points_above": len(numbers[1]), "low": low, "gravity": "over each step" if limit is None else "over each step and the height of the cell", "high": parameters.high, "confluent_terms": parameters.corrections,
            "reduced_chi2": found.fit.reduced_chi2 if data.u is not None else math.nan, "chance": chance, "delta": parameters.confluent_exponent,
            "treated": "held" if sides.low == sides.high else "fitted",
            "ranges": ", ".join(_range(*each) for each in zip(highs, exponents, spreads, counts, strict=True)),
        },
        findings=_findings(parameters, limit, chance),
    )  # fmt: skip


def _range(high: float, exponent: float, spread: float, count: int) -> str:
    known = math.isfinite(exponent) and spread > 0
    said = rounded(float(exponent), float(spread)).plain() if known else "not found"
    return f"{said} up to {high:.3g} ({count} points)"


@dataclass(frozen=True)
class _Data:
    """The known rows, and which of all they are."""

    known: npt.NDArray[np.bool_]
    T: FloatArray
    C: FloatArray
    rise: FloatArray | None
    u: FloatArray | None
    temperature_spread: FloatArray | None
    spread: float = 0.0
    """Difference of T_lambda over the height of the cell, K."""


def _spread(known: npt.NDArray[np.bool_], mask: npt.NDArray[np.bool_]) -> npt.NDArray[np.bool_]:
    whole = np.zeros(known.shape, dtype=np.bool_)
    whole[np.flatnonzero(known)[mask]] = True
    return whole


def _sides(
    parameters: LambdaLawParameters, data: _Data, size: int
) -> tuple[Sides, npt.NDArray[np.bool_] | None]:
    """Return the sides, and the rows that are held while inputs are shifted."""
    given = parameters.lambda_temperature_kelvin
    if parameters.rows_below is None or parameters.rows_above is None:
        return sides_of_transition(data.T, data.C, rise=data.rise, lambda_temperature=given), None
    below, above = (
        chosen_rows(numbers, size)[data.known] for numbers in (parameters.rows_below, parameters.rows_above)
    )
    half = np.zeros(data.T.shape) if data.rise is None else data.rise / 2
    if given is not None:
        return Sides(below, above, given, given), below | above
    return (
        Sides(below, above, float(np.max((data.T + half)[below])), float(np.min((data.T - half)[above]))),
        below | above,
    )


def _fitted(
    parameters: LambdaLawParameters,
    data: _Data,
    sides: Sides,
    window: tuple[float, float],
    rows: npt.NDArray[np.bool_] | None,
) -> LambdaFit:
    return fit_lambda_law(
        data.T, data.C, sides=sides, rise=data.rise, window=window, rows=rows, corrections=parameters.corrections,
        confluent_exponent=parameters.confluent_exponent, standard_uncertainty=data.u, temperature_uncertainty=data.temperature_spread,
        spread=data.spread, absolute=data.u is not None,
    )  # fmt: skip


_NAMES = (
    "amplitude_below", "amplitude_above", "amplitude_ratio", "exponent", "background", "constant", "asymmetry", "first_correction",
    "second_correction",
)  # fmt: skip


def _outputs(found: LambdaFit, inflation: float) -> tuple[dict[str, float | FloatArray], Covariance]:
    """Return the numbers that are published, from those that were fitted, with their covariance."""
    law = found.law
    A, alpha, P, ratio = law.amplitude, law.exponent, law.asymmetry, law.amplitude_ratio
    E, G = law.first, law.second
    values = (A, A * ratio, ratio, alpha, law.background, law.constant, P, alpha * E / A, alpha * G / A)
    slopes = {
        "amplitude": (1, ratio, 0, 0, -1 / alpha, 0, 0, -alpha * E / A**2, -alpha * G / A**2),
        "exponent": (0, -A * P, -P, 1, A / alpha**2, 0, 0, E / A, G / A),
        "asymmetry": (0, -A * alpha, -alpha, 0, 0, 0, 1, 0, 0),
        "constant": (0, 0, 0, 0, 1, 1, 0, 0, 0),
        "first": (0, 0, 0, 0, 0, 0, 0, alpha / A, 0),
        "second": (0, 0, 0, 0, 0, 0, 0, 0, alpha / A),
    }
    # A confluent term that is not fitted is zero, which says nothing of the liquid.
    count = len(_NAMES) - 2 + sum(name in found.names for name in ("first", "second"))
    names = list(_NAMES[:count])
    columns = [list(slopes.get(name, (0,) * len(_NAMES)))[:count] for name in found.names]
    if "lambda_temperature" in found.names:
        names.append("lambda_temperature")
        columns = [
            [*column, 1 if name == "lambda_temperature" else 0]
            for name, column in zip(found.names, columns, strict=True)
        ]
    jacobian = np.array(columns, dtype=np.float64).T
    outputs: dict[str, float | FloatArray] = dict.fromkeys(_NAMES, math.nan)
    outputs |= dict(zip(_NAMES[:count], values, strict=False))
    outputs["lambda_temperature"] = found.lambda_temperature
    return outputs, Covariance(tuple(names), jacobian @ (found.covariance * inflation) @ jacobian.T)


def _ranges(
    parameters: LambdaLawParameters,
    data: _Data,
    sides: Sides,
    low: float,
    rows: npt.NDArray[np.bool_] | None,
    found: LambdaFit,
) -> tuple[FloatArray, FloatArray, FloatArray, list[int]]:
    """Return the exponent for each upper end of the window; NaN where too few rows are left or the fit fails."""
    highs = np.array(parameters.highs, dtype=np.float64)
    exponents, spreads, counts = np.full(highs.shape, np.nan), np.zeros(highs.shape), []
    t = np.abs(1 - data.T / found.lambda_temperature)
    held = Sides(sides.below, sides.above, found.lambda_temperature, found.lambda_temperature)
    for k, high in enumerate(highs):
        chosen = (sides.below | sides.above) & (t > low) & (t < high)
        if rows is not None:
            chosen = chosen & rows
        counts.append(int(np.count_nonzero(chosen)))
        try:
            each = _fitted(parameters, data, held, (low, float(high)), chosen)
        except ValueError:
            # Too few rows for this end; the others still tell.
            continue
        if each.converged:
            index = each.names.index("exponent")
            exponents[k], spreads[k] = each.law.exponent, math.sqrt(each.covariance[index, index])
    return highs, exponents, spreads, counts


def _findings(parameters: LambdaLawParameters, limit: float | None, chance: float) -> tuple[Finding, ...]:
    findings: list[Finding] = []
    if limit is None:
        findings.append(
            Finding(
                code="gravity-not-known", severity="note",
                what="the height of the liquid is not known, so gravity was not counted",
                remedy="record the cell's height",
            )
        )  # fmt: skip
    elif parameters.low < parameters.clear_of_gravity * limit:
        findings.append(
            Finding(
                code="gravity-limit", severity="warning",
                what=f"a reduced temperature of {parameters.low:.2g} is asked for, and gravity rounds everything inside {limit:.2g}; the fit begins at {parameters.clear_of_gravity * limit:.2g}",
                remedy="raise low in a plan of your own, or use a lower cell",
            )
        )  # fmt: skip
    if chance > 0.05:
        findings.append(
            Finding(
                code="logarithm-not-excluded", severity="note",
                what=f"a logarithm (alpha = 0) serves these data as well: the free exponent gains as much by chance with probability {chance:.2g}",
            )
        )  # fmt: skip
    return tuple(findings)

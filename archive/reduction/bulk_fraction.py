"""Normal and superfluid fraction of bulk liquid between the plates of an oscillator.

Rules: properties of the liquid are those of Donnelly and Barenghi (1998) at saturated vapour pressure, against temperatures on ITS-90; under
pressure the density is the stated one, held over the run, and the viscosity the tabulated one at the same T/T_lambda.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics import helium_viscosity
from archive.physics.bulk_oscillator import (
    added_inertia,
    dragged_fraction,
    normal_density_from_inertia,
    penetration_depth,
)
from archive.physics.constants import T_LAMBDA
from archive.physics.vapour_pressure import pressure_its90
from archive.reduction.background_steps import background_value, known_rows
from archive.reduction.estimate import FloatArray
from archive.reduction.liquid_state import LiquidState
from archive.reduction.row_choice import chosen_rows, row_numbers
from archive.reduction.step import Outcome
from schemas.base import Record
from schemas.finding import Finding
from schemas.lineage import SourceEntry

__all__ = ["BulkParameters", "normal_fraction"]

LOWEST, HIGHEST = 0.8, 4.2221
"""K; where the viscosity of the liquid is tabulated."""

LEAST_ABOVE = 5
"""Rows above the lambda point that set the scale (common practice, no source)."""


class BulkParameters(Record):
    """How the fractions follow from the period."""

    normal_above_kelvin: float | None = None
    """From here on all the liquid is normal, and the rows set the scale; left out: 2.18 K, and under a stated pressure 20 mK above where the
    coarse lambda line has the transition, which is good to 15 mK."""
    drag_factor: float = 0.0
    """Part of the superfluid that the body displaces; 0 for smooth flat discs that turn about their own axis."""
    density_kg_m3: float | None = None
    """Density of the liquid, constant over the run, in place of what the sheet states for a run under pressure; none and nothing stated: at
    saturated vapour pressure."""
    rows: tuple[int, ...] | None = None
    """The rows that set the scale, from 1, in place of those above a temperature."""


@dataclass(frozen=True)
class _Liquid:
    """Liquid and inertia of the rows that can be reduced."""

    rows: npt.NDArray[np.bool_]
    inertia: FloatArray
    per_period: FloatArray
    density: FloatArray
    viscosity: FloatArray
    frequency: FloatArray


def normal_fraction(
    parameters: BulkParameters,
    *,
    temperature: FloatArray,
    period: FloatArray,
    background: FloatArray,
    low: float,
    high: float,
    gap: float,
    pressure: FloatArray | None,
    u_period: FloatArray | None,
    liquid_pressure: float | None = None,
    liquid_density: float | None = None,
) -> Outcome:
    """Return normal and superfluid density and fraction of bulk liquid between plates, from the period.

    Parameters
    ----------
    temperature, period : ndarray
        K on ITS-90, s.
    background, low, high
        Chebyshev coefficients of the empty cell's period (s) and their range (K).
    gap : float
        Distance of neighbouring plates, m.
    pressure : ndarray or None
        Of the liquid, Pa; only looked at.
    u_period : ndarray or None
        Point uncertainty.
    liquid_pressure, liquid_density : float or None
        Stated for a run under pressure, Pa and kg/m^3 at the lambda point.

    Raises
    ------
    ValueError
        Fewer than five rows above the lambda point, plates too far apart, or a period that does not rise when the cell is filled.

    Notes
    -----
    The inertia that the liquid adds is (P/P_empty)^2 - 1, in a scale that the rows above the lambda point set, where all of the liquid is
    normal. Between plates a distance 2h apart a part Re tanh(kh)/(kh) of the normal component moves, k = (1 - i)/depth; it is solved for
    with the normal density that results, row by row. Liquid outside the stack counts as if it were inside. Under pressure the density's own
    change with temperature goes into the fraction; it is about proportional to the reduced temperature close below the lambda point, where the
    regular term of the power law takes it up (at saturated vapour pressure it is 0.17 per cent at 1 - T/T_lambda = 0.03, from the table).
    """
    size = temperature.size
    state = LiquidState.of(
        liquid_pressure,
        liquid_density,
        held_density=parameters.density_kg_m3,
        normal_above=parameters.normal_above_kelvin,
    )
    liquid = _liquid(state, temperature, period, background_value(temperature, background, low, high))
    rows = liquid.rows
    scale, u_scale, above = _scale(parameters, state, liquid, temperature, gap, u_period)
    rho_n, ratio = np.full(size, np.nan), np.full(size, np.nan)
    rho_n[rows] = normal_density_from_inertia(
        liquid.inertia[rows] / scale, density=liquid.density[rows], viscosity=liquid.viscosity[rows],
        angular_frequency=liquid.frequency[rows], half_gap=gap / 2, drag_factor=parameters.drag_factor,
    )  # fmt: skip
    depth = np.full(size, np.nan)
    depth[rows] = penetration_depth(
        rho_n[rows], viscosity=liquid.viscosity[rows], angular_frequency=liquid.frequency[rows]
    )
    ratio = gap / 2 / depth
    depth[np.isinf(depth)] = np.nan
    fraction = rho_n / liquid.density
    point = np.zeros(size) if u_period is None else np.nan_to_num(liquid.per_period * u_period / scale)
    point = point / (1 - parameters.drag_factor)
    part = np.nan_to_num(-rho_n * u_scale / scale)
    share = np.nan_to_num(part / liquid.density)
    own = "own coupling of the liquid"
    lambda_density = state.densities(np.array([T_LAMBDA]))[0]
    entry = SourceEntry(name=own, description="scale from the rows above the lambda point", level="run")
    worst = float(np.nanmax(ratio))
    return Outcome(
        {
            "normal_density": rho_n, "superfluid_density": liquid.density - rho_n, "normal_fraction": fraction,
            "superfluid_fraction": 1 - fraction, "penetration_depth": depth,
            "coupled_inertia": scale * lambda_density, "lambda_density": lambda_density,
        },
        point={
            "normal_density": point, "superfluid_density": point, "normal_fraction": np.nan_to_num(point / liquid.density),
            "superfluid_fraction": np.nan_to_num(point / liquid.density),
        },
        shared={
            "normal_density": {own: part}, "superfluid_density": {own: -part}, "normal_fraction": {own: share},
            "superfluid_fraction": {own: -share}, "coupled_inertia": {own: u_scale * lambda_density},
        } if u_scale > 0 else {},
        sources=(entry,) if u_scale > 0 else (),
        held={"rows": row_numbers(above)},
        facts={
            "rows_above": int(np.count_nonzero(above)), "largest_gap_over_depth": worst, "half_gap_um": gap * 5e5,
            "missing_inertia": float(1 - dragged_fraction(worst, depth=1.0).real), "chi": parameters.drag_factor,
            "density_from": state.origin,
            **({} if liquid_pressure is None else {"pressure_kPa": liquid_pressure / 1e3, "stated_density": state.density}),
        },
        findings=(
            *_gap_findings(worst), *_pressure_findings(state, temperature, pressure), *_viscosity_findings(state, worst), *_outside(temperature, period, rows),
        ),
    )  # fmt: skip


def _liquid(state: LiquidState, T: FloatArray, period: FloatArray, empty: FloatArray) -> _Liquid:
    tabulated = state.saturated_equivalent(T)
    inside = (np.nan_to_num(tabulated, nan=-1.0) >= LOWEST) & (np.nan_to_num(tabulated, nan=-1.0) <= HIGHEST)
    rows = known_rows(T, period, empty) & inside
    if not rows.any():
        raise ValueError(
            f"temperature: found no row between {LOWEST} K and {HIGHEST} K inside the range of the empty cell's background"
        )
    density, viscosity = np.full(T.shape, np.nan), np.full(T.shape, np.nan)
    density[rows] = state.densities(T[rows])
    viscosity[rows] = helium_viscosity.viscosity(tabulated[rows])
    return _Liquid(
        rows,
        added_inertia(period, empty_period=empty),
        2 * period / empty**2,
        density,
        viscosity,
        2 * math.pi / period,
    )


def _scale(
    parameters: BulkParameters,
    state: LiquidState,
    liquid: _Liquid,
    T: FloatArray,
    gap: float,
    u_period: FloatArray | None,
) -> tuple[float, float, npt.NDArray[np.bool_]]:
    """Return the inertia per density of liquid that is wholly dragged along, its uncertainty, and the rows it is from."""
    if parameters.rows is not None:
        above = chosen_rows(parameters.rows, T.size) & liquid.rows
    else:
        above = liquid.rows & (np.nan_to_num(T) >= state.normal_above)
    count = int(np.count_nonzero(above))
    if count < LEAST_ABOVE:
        raise ValueError(
            f"temperature: found {count} rows from {state.normal_above:.5g} K up, where all the liquid is normal, expected at least "
            f"{LEAST_ABOVE}; they set the scale, so measure on into the normal liquid, or set normal_above_kelvin"
        )
    rho = liquid.density[above]
    depth = penetration_depth(
        rho, viscosity=liquid.viscosity[above], angular_frequency=liquid.frequency[above]
    )
    dragged = rho * dragged_fraction(gap / 2, depth=depth).real
    each = liquid.inertia[above] / dragged
    scale = float(np.mean(each))
    if not scale > 0:
        raise ValueError(
            "period: found no rise above that of the empty cell, expected the liquid to add inertia"
        )
    spread = float(np.std(each, ddof=1)) / math.sqrt(count)
    if u_period is not None:
        stated = liquid.per_period[above] * u_period[above] / dragged
        spread = max(spread, float(np.sqrt(np.sum(np.square(stated)))) / count)
    return scale, spread, above


def _gap_findings(ratio: float) -> tuple[Finding, ...]:
    if not ratio > 0.05:
        return ()
    lost = 1 - float(dragged_fraction(ratio, depth=1.0).real)
    locked = "is not wholly locked to" if ratio <= 0.2 else "slips against"
    return (
        Finding(
            code="gap-over-penetration-depth", severity="warning",
            what=f"half the gap reaches {ratio:.3g} of the viscous penetration depth: the normal component {locked} the plates; {lost:.2g} of its inertia is missing there and was counted",
            expected="at most 0.05",
            remedy="check the recorded gap; a warped stack has wider ones",
        ),
    )  # fmt: skip


def _viscosity_findings(state: LiquidState, ratio: float) -> tuple[Finding, ...]:
    if state.pressure is None:
        return ()
    lost = 1 - float(dragged_fraction(ratio, depth=1.0).real)
    return (
        Finding(
            code="viscosity-under-pressure", severity="note",
            what=f"no viscosity under pressure is tabulated here; that of saturated liquid at the same T/T_lambda was taken, which bears on {lost:.2g} of the inertia",
        ),
    )  # fmt: skip


def _pressure_findings(state: LiquidState, T: FloatArray, pressure: FloatArray | None) -> tuple[Finding, ...]:
    if pressure is None or state.density is not None or not np.isfinite(pressure).any():
        return ()
    warmest = min(float(np.nanmax(T)), HIGHEST)
    typical, saturated = float(np.nanmedian(pressure)), float(pressure_its90(max(warmest, 1.25)))
    if typical < saturated + 2e4:
        return ()
    return (
        Finding(
            code="pressure-above-saturation", severity="warning",
            what=f"the liquid was at {typical / 1e3:.4g} kPa, and its density was taken at saturated vapour pressure",
            remedy="state pressure and density of the liquid for the sweep, and supplement the cooldown",
        ),
    )  # fmt: skip


def _outside(T: FloatArray, period: FloatArray, rows: npt.NDArray[np.bool_]) -> tuple[Finding, ...]:
    count = int(np.count_nonzero(known_rows(T, period) & ~rows))
    if not count:
        return ()
    return (
        Finding(
            code="outside-background", severity="warning",
            what=f"{count} of {T.size} rows lie outside the empty-cell background or outside {LOWEST} K to {HIGHEST} K, where liquid helium is tabulated; they are not reduced",
            remedy="measure the empty cell over the whole range, or leave these rows out with a reason",
        ),
    )  # fmt: skip

"""Steps of an adsorption isotherm: relative pressure, BET area, plateau."""

from __future__ import annotations

import math

import numpy as np

from archive.physics.adsorption import bet_area
from archive.reduction.background_steps import known_rows
from archive.reduction.estimate import FloatArray
from archive.reduction.step import Covariance, NoParameters, Outcome
from schemas.base import Record
from schemas.finding import Finding
from schemas.substrate import Sample

__all__ = ["BetParameters", "PlateauParameters", "bet", "plateau", "relative_pressure"]

CROSS_SECTIONS = {"N2": 0.162, "Ar": 0.142}
"""nm^2 per molecule, N2 at 77 K and Ar at 87 K by convention: M. Thommes et al., Pure Appl. Chem. 87, 1051 (2015)."""


class BetParameters(Record):
    """What BET needs beyond the isotherm."""

    cross_section_nm2: float | None = None
    """Area of one molecule; by convention for N2 and Ar, to be given for any other gas."""
    low: float | None = None
    high: float | None = None
    """Range of relative pressure; chosen by the criteria when none."""


class PlateauParameters(Record):
    """Where the isotherm is flat."""

    low: float = 0.3
    high: float = 0.7
    largest_rise: float = 0.1
    """Largest rise over the range, as a share of the mean, that still is a plateau (common practice, no source)."""


def relative_pressure(
    _: NoParameters, *, pressure: FloatArray, saturated_pressure: float | FloatArray
) -> Outcome:
    """Return pressure over saturated pressure at the temperature of the film."""
    saturated = np.asarray(saturated_pressure, dtype=np.float64)
    if not (saturated[np.isfinite(saturated)] > 0).all():
        raise ValueError("saturated_pressure: found a value that is not above 0")
    return Outcome({"relative_pressure": pressure / saturated})


def bet(
    parameters: BetParameters,
    *,
    relative_pressure: FloatArray,
    amount: FloatArray,
    amount_kind: str,
    sample: Sample | None,
) -> Outcome:
    """Return monolayer, constant and area of an isotherm by the method of Brunauer, Emmett and Teller.

    Raises
    ------
    ValueError
        No area per molecule, or no range that meets the criteria; with the reasons.
    """
    gas = sample.isotope if sample is not None else "a gas that is not recorded"
    cross = parameters.cross_section_nm2 or CROSS_SECTIONS.get(gas)
    if cross is None:
        raise ValueError(
            f"cross_section_nm2: the area per molecule of {gas} is not standardised; give it in a plan of your own, with its source"
        )
    rows = known_rows(relative_pressure, amount)
    bounds = None if parameters.low is None or parameters.high is None else (parameters.low, parameters.high)
    found = bet_area(relative_pressure[rows], amount[rows], cross_section=cross * 1e-18, bounds=bounds)
    if not found.accepted:
        raise ValueError(f"amount: no BET area can be given: {'; '.join(found.reasons)}")
    names = ("monolayer", "constant", "area")
    joint = np.diag([found.u_monolayer**2, found.u_constant**2, found.u_area**2])
    # The area is the monolayer times a constant.
    joint[0, 2] = joint[2, 0] = found.u_monolayer * found.u_area
    outputs = dict(zip(names, (found.monolayer, found.constant, found.area), strict=True))
    label = "He-BET" if "He" in gas else f"{gas} BET"
    findings: tuple[Finding, ...] = ()
    if "He" in gas:
        findings = (
            Finding(
                code="helium-bet",
                severity="note",
                what="an area by helium rests on an area per atom that is not standardised; never merge it with areas by nitrogen",
            ),
        )
    return Outcome(
        outputs, covariance=Covariance(names, joint), held={"low": found.low, "high": found.high},
        facts={
            "label": label, "cross_section_nm2": cross, "low": found.low, "high": found.high, "points": found.points, "r_squared": found.r_squared,
            "x_at_monolayer": found.x_at_monolayer, "x_expected": found.x_expected, "amounts_in": amount_kind.replace("_", " "),
        },
        findings=findings,
    )  # fmt: skip


def plateau(parameters: PlateauParameters, *, relative_pressure: FloatArray, amount: FloatArray) -> Outcome:
    """Return the mean amount on the plateau of an isotherm: filled pores.

    Raises
    ------
    ValueError
        Fewer than three points in the range, or amounts that rise too much over it.
    """
    rows = known_rows(relative_pressure, amount) & (
        np.nan_to_num(relative_pressure, nan=-1.0) > parameters.low
    )
    rows &= np.nan_to_num(relative_pressure, nan=2.0) < parameters.high
    chosen = amount[rows]
    if chosen.size < 3:
        raise ValueError(
            f"relative_pressure: found {chosen.size} points between {parameters.low:g} and {parameters.high:g}, expected at least 3"
        )
    mean = float(np.mean(chosen))
    rise = float(np.ptp(chosen)) / mean
    if rise > parameters.largest_rise:
        raise ValueError(
            f"amount: it rises by {rise:.0%} between {parameters.low:g} and {parameters.high:g}; that is no plateau"
        )
    u = float(np.std(chosen, ddof=1)) / math.sqrt(chosen.size)
    return Outcome(
        {"plateau_amount": mean},
        point={"plateau_amount": u},
        facts={"points": int(chosen.size), "rise": rise},
    )

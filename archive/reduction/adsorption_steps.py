"""Steps of an adsorption isotherm: relative pressure, BET area, plateau."""

from __future__ import annotations

import math

import numpy as np

from archive.physics.adsorption import BetArea, bet_area
from archive.reduction.background_steps import known_rows
from archive.reduction.estimate import FloatArray
from archive.reduction.step import Covariance, NoParameters, Outcome
from schemas.base import Record
from schemas.finding import Finding
from schemas.lineage import SourceEntry
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


def _propagated(
    x: FloatArray, n: FloatArray, u_n: FloatArray | None, *, cross_section: float, low: float, high: float
) -> FloatArray:
    """Return the variances of monolayer, constant and area that the amounts' own uncertainty makes, one by one."""
    total = np.zeros(3)
    if u_n is None:
        return total
    for index in np.flatnonzero((x >= low) & (x <= high) & (u_n > 0)):
        sides = []
        for sign in (1.0, -1.0):
            moved = n.copy()
            moved[index] += sign * u_n[index]
            each = bet_area(x, moved, cross_section=cross_section, bounds=(low, high))
            sides.append((each.monolayer, each.constant, each.area))
        total += np.square((np.array(sides[0]) - np.array(sides[1])) / 2)
    return total


def _range_choice(x: FloatArray, n: FloatArray, found: BetArea) -> tuple[float, ...]:
    """Return how far monolayer, constant and area hang on one point more or less, as signed standard uncertainties."""
    used = np.unique(x[(x >= found.low) & (x <= found.high)])
    centre = np.array([found.monolayer, found.constant, found.area])
    if used.size < 5:
        return (0.0, 0.0, 0.0)
    ranges = ((used[1], used[-1]), (used[0], used[-2]))
    moved = [
        bet_area(x, n, cross_section=found.cross_section, bounds=(float(low), float(high)))
        for low, high in ranges
    ]
    parts = np.array([[each.monolayer, each.constant, each.area] for each in moved]) - centre
    largest = parts[int(np.argmax(np.abs(parts[:, 0])))]
    return tuple(float(part) / math.sqrt(3) for part in largest)


def bet(
    parameters: BetParameters,
    *,
    relative_pressure: FloatArray,
    amount: FloatArray,
    amount_kind: str,
    sample: Sample | None,
    u_amount: FloatArray | None = None,
) -> Outcome:
    """Return monolayer, constant and area of an isotherm by the method of Brunauer, Emmett and Teller.

    Raises
    ------
    ValueError
        No range that meets the criteria; with the reasons.

    Notes
    -----
    The fit's variances are the larger of what the scatter about the line and what the amounts' own uncertainty make. The
    choice of range is a source of its own: all results between those of the range and of the ranges one point shorter at
    either end count alike (JCGM 100:2008, 4.3.7). The area per molecule carries no uncertainty here: it is a convention.
    """
    gas = sample.isotope if sample is not None else "a gas that is not recorded"
    cross = parameters.cross_section_nm2 or CROSS_SECTIONS.get(gas)
    rows = known_rows(relative_pressure, amount)
    bounds = None if parameters.low is None or parameters.high is None else (parameters.low, parameters.high)
    # Without an area per molecule there is a monolayer but no area; the line is fitted with a unit one.
    per_molecule = math.nan if cross is None else cross * 1e-18
    found = bet_area(
        relative_pressure[rows], amount[rows], cross_section=(cross or 1.0) * 1e-18, bounds=bounds
    )
    if not found.accepted:
        raise ValueError(f"amount: no BET line can be given: {'; '.join(found.reasons)}")
    names: tuple[str, ...] = ("monolayer", "constant", "area")
    x, n = relative_pressure[rows], amount[rows]
    own = _propagated(
        x,
        n,
        u_amount[rows] if u_amount is not None else None,
        cross_section=found.cross_section,
        low=found.low,
        high=found.high,
    )
    variances = np.maximum(np.square([found.u_monolayer, found.u_constant, found.u_area]), own)
    joint = np.diag(variances)
    # The area is the monolayer times a constant.
    joint[0, 2] = joint[2, 0] = math.sqrt(variances[0] * variances[2])
    choice = _range_choice(x, n, found)
    source = SourceEntry(
        name="own range of the BET line", description="choice of the range of relative pressure", level="run"
    )
    if math.isnan(per_molecule):
        names, joint, choice = names[:2], joint[:2, :2], choice[:2]
    outputs = dict(zip(names, (found.monolayer, found.constant, found.area), strict=False))
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
    verdicts = {}
    if math.isnan(per_molecule):
        outputs["area"] = math.nan
        verdicts["area"] = "area per molecule not given"
        findings += (
            Finding(
                code="cross-section-asked", severity="warning",
                what=f"the area per molecule (cross-section) of {gas} is not standardised and was not given, so there is a monolayer but no area",
                remedy="copy the plan, set cross_section_nm2 with its source, and reduce again",
            ),
        )  # fmt: skip
    return Outcome(
        outputs, covariance=Covariance(names, joint), verdicts=verdicts, held={"low": found.low, "high": found.high},
        shared={name: {source.name: part} for name, part in zip(names, choice, strict=True)}, sources=(source,),
        facts={
            "label": label, "per_molecule": "no stated area" if cross is None else f"{cross:g} nm^2", "low": found.low, "high": found.high, "points": found.points, "r_squared": found.r_squared,
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

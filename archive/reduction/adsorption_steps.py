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


class BetParameters(Record):
    """What BET needs beyond the isotherm. No area per molecule is assumed: it is stated here or in the record of the gas."""

    cross_section_nm2: float | None = None
    """Area of one molecule, whatever the gas."""
    nitrogen_nm2: float | None = None
    argon_nm2: float | None = None
    """Those of the two gases that have a convention (N2 at 77 K, Ar at 87 K), used for nothing else."""
    low: float | None = None
    high: float | None = None
    """Range of relative pressure; chosen by the criteria when none."""
    least_r_squared: float = 0.999
    """Of the straight line (common practice, no source)."""


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


def _propagated(x: FloatArray, n: FloatArray, u_n: FloatArray | None, found: BetArea) -> FloatArray:
    """Return the covariance of monolayer and constant that the amounts' own uncertainty makes, to first order."""
    if u_n is None:
        return np.zeros((2, 2))
    inside = (x >= found.low) & (x <= found.high)
    px, pn, pu = x[inside], n[inside], u_n[inside]
    ordinate = px / (pn * (1 - px))
    # The line is unweighted, so slope and intercept are these sums over the ordinates.
    by_slope = (px - px.mean()) / float(np.sum((px - px.mean()) ** 2))
    by_intercept = 1 / px.size - px.mean() * by_slope
    by_monolayer = -(found.monolayer**2) * (by_slope + by_intercept)
    by_constant = (by_slope - (found.constant - 1) * by_intercept) / found.intercept
    parts = np.array([by_monolayer, by_constant]) * (-ordinate / pn * pu)
    return np.asarray(parts @ parts.T, dtype=np.float64)


def _joint(scatter: FloatArray, own: FloatArray, per_area: float) -> FloatArray:
    """Return the covariance of monolayer, constant and area: the larger variances, with the correlation of the greater monolayer's."""
    spread = np.sqrt(np.maximum(np.diag(scatter), np.diag(own)))
    taken = scatter if scatter[0, 0] >= own[0, 0] else own
    size = math.sqrt(taken[0, 0] * taken[1, 1])
    r = taken[0, 1] / size if size > 0 else 0.0
    joint = np.array([[1.0, r], [r, 1.0]]) * np.outer(spread, spread)
    # The area is the monolayer times a constant.
    turn = np.array([[1.0, 0.0], [0.0, 1.0], [per_area, 0.0]])
    return np.asarray(turn @ joint @ turn.T, dtype=np.float64)


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


def _area_per_molecule(
    parameters: BetParameters, gas: str, recorded: float | None
) -> tuple[float | None, str]:
    """Return the area of one molecule, m^2, and where it is stated."""
    if parameters.cross_section_nm2 is not None:
        return parameters.cross_section_nm2 * 1e-18, "stated in the plan"
    if recorded is not None:
        return recorded, "stated in the record of the gas"
    convention = {"N2": parameters.nitrogen_nm2, "Ar": parameters.argon_nm2}.get(gas)
    return (None, "") if convention is None else (convention * 1e-18, "the convention for this gas")


def bet(
    parameters: BetParameters,
    *,
    relative_pressure: FloatArray,
    amount: FloatArray,
    amount_kind: str,
    sample: Sample | None,
    cross_section: float | None = None,
    u_amount: FloatArray | None = None,
) -> Outcome:
    """Return monolayer, constant and area of an isotherm by the method of Brunauer, Emmett and Teller.

    Parameters
    ----------
    relative_pressure, amount : ndarray
        Pressure over the saturated one; mol or mol/kg.
    sample : Sample or None
        The gas.
    cross_section : float or None
        Area of one molecule as the record of the gas states it, m^2.
    u_amount : ndarray or None
        Point uncertainty of the amounts.

    Raises
    ------
    ValueError
        No range that meets the criteria; with the reasons.

    Notes
    -----
    The fit's variances are the larger of what the scatter about the line and what the amounts' own uncertainty make. The
    choice of range is a source of its own: all results between those of the range and of the ranges one point shorter at
    either end count alike (JCGM 100:2008, 4.3.7). An area per molecule that is a convention carries no uncertainty; one from
    the record of the gas carries what is stated there. Without one there is a monolayer and no area.
    """
    gas = sample.isotope if sample is not None else "a gas that is not recorded"
    each, stated = _area_per_molecule(parameters, gas, cross_section)
    rows = known_rows(relative_pressure, amount)
    bounds = None if parameters.low is None or parameters.high is None else (parameters.low, parameters.high)
    x, n = relative_pressure[rows], amount[rows]
    # Without an area per molecule the line is fitted with a unit one.
    found = bet_area(
        x, n, cross_section=each or 1e-18, bounds=bounds, least_r_squared=parameters.least_r_squared
    )
    if not found.accepted:
        raise ValueError(f"amount: no BET line can be given: {'; '.join(found.reasons)}")
    names: tuple[str, ...] = ("monolayer", "constant", "area")
    own = _propagated(x, n, u_amount[rows] if u_amount is not None else None, found)
    both = found.correlation * found.u_monolayer * found.u_constant
    scatter = np.array([[found.u_monolayer**2, both], [both, found.u_constant**2]])
    joint = _joint(scatter, own, found.area / found.monolayer)
    choice = _range_choice(x, n, found)
    source = SourceEntry(
        name="own range of the BET line", description="choice of the range of relative pressure", level="run"
    )
    if each is None:
        names, joint, choice = names[:2], joint[:2, :2], choice[:2]
    outputs = dict(zip(names, (found.monolayer, found.constant, found.area), strict=False))
    on_line = (relative_pressure >= found.low) & (relative_pressure <= found.high) & rows
    with np.errstate(divide="ignore", invalid="ignore"):
        ordinate = np.where(rows, relative_pressure / (amount * (1 - relative_pressure)), math.nan)
        rising = np.where(rows, amount * (1 - relative_pressure), math.nan)
    fitted = np.where(on_line, found.intercept + found.slope * relative_pressure, math.nan)
    return Outcome(
        outputs | ({"area": math.nan} if each is None else {}) | {"range_low": found.low, "range_high": found.high, "x_at_monolayer": found.x_at_monolayer, "rising": rising, "residual": (ordinate - fitted) * found.monolayer},
        covariance=Covariance(names, joint), verdicts={"area": "area per molecule not given"} if each is None else {},
        held={"low": found.low, "high": found.high},
        shared={name: {source.name: part} for name, part in zip(names, choice, strict=True)}, sources=(source,),
        facts={
            "label": "He-BET" if "He" in gas else f"{gas} BET", "per_molecule": "no stated area" if each is None else f"{each * 1e18:g} nm^2 ({stated})",
            "low": found.low, "high": found.high, "points": found.points, "r_squared": found.r_squared,
            "x_at": found.x_at_monolayer, "x_expected": found.x_expected, "amounts_in": amount_kind.replace("_", " "),
        },
        findings=_findings(gas, each),
    )  # fmt: skip


def _findings(gas: str, each: float | None) -> tuple[Finding, ...]:
    findings: tuple[Finding, ...] = ()
    if "He" in gas:
        findings = (
            Finding(
                code="helium-bet", severity="note",
                what="an area by helium rests on an area per atom that is not standardised; never merge it with areas by nitrogen",
            ),
        )  # fmt: skip
    if each is None:
        findings += (
            Finding(
                code="cross-section-asked", severity="warning",
                what=f"the area per molecule (cross-section) of {gas} is not standardised and was not given, so there is a monolayer but no area",
                remedy="state area_per_molecule in the record of the gas, or cross_section_nm2 in a copy of the plan, with its source, and reduce again",
            ),
        )  # fmt: skip
    return findings


def plateau(parameters: PlateauParameters, *, relative_pressure: FloatArray, amount: FloatArray) -> Outcome:
    """Return the mean amount on the plateau of an isotherm: filled pores; a verdict where there is none.

    Notes
    -----
    Many isotherms have no plateau, or end before it: fewer than three points in the range, or amounts that rise too much over it,
    give a verdict and a note.
    """
    rows = known_rows(relative_pressure, amount) & (
        np.nan_to_num(relative_pressure, nan=-1.0) > parameters.low
    )
    rows &= np.nan_to_num(relative_pressure, nan=2.0) < parameters.high
    chosen = amount[rows]
    within = f"between p/p0 = {parameters.low:g} and {parameters.high:g}"
    if chosen.size < 3:
        return _no_plateau(f"has {chosen.size} points there, 3 at least are wanted", within)
    mean = float(np.mean(chosen))
    rise = float(np.ptp(chosen)) / mean
    if rise > parameters.largest_rise:
        return _no_plateau(f"rises by {rise:.0%}, at most {parameters.largest_rise:.0%} is a plateau", within)
    u = float(np.std(chosen, ddof=1)) / math.sqrt(chosen.size)
    return Outcome(
        {"plateau_amount": mean},
        point={"plateau_amount": u},
        facts={"points": int(chosen.size), "shape": f"is flat within {rise:.2g}"},
    )


def _no_plateau(shape: str, within: str) -> Outcome:
    what = f"{within} the isotherm {shape}: no plateau"
    return Outcome(
        {"plateau_amount": math.nan}, verdicts={"plateau_amount": "no plateau"}, facts={"shape": shape},
        findings=(Finding(code="no-plateau", severity="note", what=what),),
    )  # fmt: skip

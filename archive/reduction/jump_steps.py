"""Steps of the universal jump of many films: areal densities at the transition against transition temperatures, on one line."""

from __future__ import annotations

import math

import numpy as np

from archive.physics.arrays import BoolArray
from archive.physics.film_static import UNIVERSAL_JUMP
from archive.physics.universal_slope import Proportion, proportion
from archive.reduction.background_steps import known_rows
from archive.reduction.estimate import Estimate, FloatArray
from archive.reduction.step import NoParameters, Outcome, Port, Step
from schemas.base import Record
from schemas.finding import Finding

__all__ = ["JUMP_STEPS", "LineParameters"]

UNLIKELY = 0.01
"""Chance below which films are said to miss one line (common practice, no source)."""


class LineParameters(Record):
    """How the films are weighed."""

    fitted: tuple[tuple[float, ...], ...] | None = None
    """Weights, residuals, and chi squared with its chance, in place of what the films give: held while inputs are shifted, for a
    statistic of the readings has no uncertainty of its own."""


def density_of_fit(_: NoParameters, *, scale_ratio: FloatArray, transition: FloatArray) -> Outcome:
    """Return the areal density at each transition, from a fit's ratio of its areal density to that of the universal jump.

    Parameters
    ----------
    scale_ratio, transition : ndarray
        Pure number; K.
    """
    return Outcome({"density": scale_ratio * UNIVERSAL_JUMP * transition})


def universal_line(
    parameters: LineParameters,
    *,
    transition: FloatArray,
    density: FloatArray,
    transition_estimate: Estimate,
    density_estimate: Estimate,
) -> Outcome:
    """Return the slope of a line through the origin and all films, over the universal one.

    Parameters
    ----------
    transition, density : ndarray
        Static transition temperature, K, and areal superfluid density there, kg/m^2, of each film; rows that lack one do not count.
    transition_estimate, density_estimate : Estimate
        The same with every source of uncertainty.

    Raises
    ------
    ValueError
        No film has both numbers, one of them is not above zero, or the films have no uncertainty of their own.

    Notes
    -----
    The density must come from a transition temperature that does not itself rest on the universal line, or there is nothing to
    test. A film's weight comes from the sources that are its alone, so the slope lies among those of the films. Common sources (area, mass sensitivity, chi, thermometer, held parameters) stay in the uncertainty of the slope and are
    not made smaller by many films. Scatter beyond the stated uncertainty does not enlarge the slope's: whether the films share a
    line is the result, told as chi squared.
    """
    rows = known_rows(transition, density)
    if not rows.any():
        raise ValueError(
            "transition, density: no film has both a transition temperature and an areal density there"
        )
    x, y = transition[rows], density[rows]
    lone, fitted = 0.0, parameters.fitted
    if fitted is None:
        found, own = _line(x, y, transition_estimate, density_estimate, rows)
        fitted = (tuple(found.weights), tuple(found.residuals), (found.chi2, found.probability))
        # Points that no source shares, if a laboratory's own step brings some; those of results are all named.
        lone = float(np.hypot.reduce([*(found.weights * own[1]), *(found.slope * found.weights * own[0])]))
    weights, (chi2, chance) = np.array(fitted[0]), fitted[2]
    slope = float(weights @ y) / float(weights @ x)
    residual = np.full(transition.shape, math.nan)
    residual[rows] = fitted[1]
    ratio = slope / UNIVERSAL_JUMP
    count = int(x.size)
    return Outcome(
        {
            "ratio": ratio, "chi2": chi2, "probability": chance, "films": float(count),
            "line_density": slope * np.where(rows, transition, math.nan), "residual": residual,
        },
        point={"ratio": lone / UNIVERSAL_JUMP}, held={"fitted": fitted},
        verdicts={} if count > 1 else dict.fromkeys(("chi2", "probability"), "one film"),
        facts={
            "count": count, "of": int(transition.size), "slope_kg_m2_K": slope, "dof": count - 1,
            "low_K": float(x.min()), "high_K": float(x.max()), "chi2_is": chi2, "chance": chance,
        },
        findings=_findings(count, chance),
    )  # fmt: skip


def _line(
    x: FloatArray, y: FloatArray, transition: Estimate, density: Estimate, rows: BoolArray
) -> tuple[Proportion, list[FloatArray]]:
    """Return the line, and the points' own uncertainty of either coordinate."""
    names = sorted({*transition.shared, *density.shared})
    own = [each.points[rows] for each in (transition, density)]
    nothing = np.zeros((x.size, x.size))
    found = proportion(
        x, y, contributions_x=np.vstack([_shared(transition, names, rows), np.diag(own[0]), nothing]),
        contributions_y=np.vstack([_shared(density, names, rows), nothing, np.diag(own[1])]),
    )  # fmt: skip
    return found, own


def _shared(estimate: Estimate, names: list[str], rows: BoolArray) -> FloatArray:
    nothing = np.zeros(rows.shape)
    return np.array([estimate.shared.get(name, nothing)[rows] for name in names]).reshape(
        len(names), int(np.count_nonzero(rows))
    )


def _findings(count: int, chance: float) -> tuple[Finding, ...]:
    if count == 1:
        return (
            Finding(
                code="one-film", severity="note",
                what="there is one film so far; whether all coverages lie on one line takes two at least",
            ),
        )  # fmt: skip
    if chance < UNLIKELY:
        return (
            Finding(
                code="films-off-one-line", severity="warning",
                what=f"the films scatter about one line through the origin more than their uncertainty allows: chance {chance:.2g}",
                expected=f"a chance of {UNLIKELY:g} at least",
                remedy="look at the residuals: a film off by itself, or a trend with coverage (chi, dense vapour, alignment)",
            ),
        )  # fmt: skip
    return ()


_T = Port("temperature", "array", "static transition temperature of each film")
_DENSITY = Port("areal_mass_density", "array", "areal superfluid density of each film at its transition")

JUMP_STEPS: tuple[Step, ...] = (
    Step(
        name="density-of-fit", version=1, function=density_of_fit,
        takes={"scale_ratio": Port("number", "array", "areal density over that of the universal jump"), "transition": _T},
        yields={"density": _DENSITY},
        sentence="The areal density of each film at its transition is the fitted ratio times that of the universal jump there.",
        citations=("nelson-kosterlitz-1977",),
    ),
    Step(
        name="universal-line", version=2, function=universal_line, parameters=LineParameters,
        takes={"transition": _T, "density": _DENSITY},
        yields={
            "ratio": Port("number", "scalar", "slope of the line through the origin over the universal one"), "chi2": Port("number", "scalar", "chi squared of the films about the line"),
            "probability": Port("number", "scalar", "chance of a larger chi squared if all films lie on the line"), "films": Port("count", "scalar", "films on the line"),
            "line_density": Port("areal_mass_density", "array", "areal density of the line at each transition"), "residual": Port("number", "array", "areal density less line, in standard uncertainties"),
        },
        sentence="A line through the origin was fitted to {count} of {of} films with transitions from {low_K} K to {high_K} K, each weighed by what it has alone, what they share propagated through these weights: sigma_s(T_KT)/T_KT is {ratio} of the universal value; chi^2 = {chi2_is} with {dof} degrees of freedom (chance {chance}).",
        citations=("nelson-kosterlitz-1977",), spread="refit", estimates=("transition", "density"),
    ),
)  # fmt: skip
"""Steps of this module."""

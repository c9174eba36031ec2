"""Steps of persistent currents: superfluid density at kept circulation, the way back, decay, dependence on coverage.

Rules: a density is given only for a ring that is full of liquid; a current that has decayed says so and is no density.
"""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from archive.physics.constants import MOLAR_MASS_HELIUM4, T_LAMBDA
from archive.physics.helium_liquid import density, superfluid_fraction
from archive.physics.persistent_current import branch_ratio
from archive.reduction.background_steps import known_rows, weights
from archive.reduction.current_decay_steps import (
    CoverageParameters,
    HeldParameters,
    current_against_coverage,
    current_decay,
    relative_spread,
    turning_row,
)
from archive.reduction.estimate import FloatArray
from archive.reduction.row_choice import row_indices
from archive.reduction.step import Outcome, Port, Step
from schemas.base import Record
from schemas.finding import Finding
from schemas.lineage import SourceEntry

__all__ = ["CURRENT_STEPS", "CurrentParameters", "current_reversibility", "density_from_current"]

_Rows = npt.NDArray[np.bool_]

FULL = 0.9
"""Liquid over open volume from which a ring counts as full (common practice, no source)."""

TABLE = 0.001
"""Standard uncertainty of the tabulated superfluid fraction, Donnelly and Barenghi (1998)."""

VORTEX_CHANGE = 0.012
"""Largest change of the density by vortices: H. Kojima, W. Veith, E. Guyon, I. Rudnick, J. Low Temp. Phys. 25, 195 (1976)."""

_TABLE_SOURCE = "superfluid fraction of liquid 4He, tabulated"


class CurrentParameters(Record):
    """On what a density is put."""

    reference_share: float = 0.1
    """Share of the coldest rows, where the superfluid fraction is taken from tables."""
    full: bool | None = None
    """Whether the ring is full of liquid; from amount and open volume when none."""
    rows: tuple[int, ...] | None = None
    """The rows of reference, from 1, in place of a share."""


def density_from_current(
    parameters: CurrentParameters,
    *,
    temperature: FloatArray,
    angular_momentum: FloatArray,
    amount: float | None,
    free_volume: float | None,
    u_angular_momentum: FloatArray | None,
) -> Outcome:
    """Return angular momentum over that of the coldest rows, and for a full ring the superfluid density.

    Parameters
    ----------
    temperature, angular_momentum : ndarray
        K, kg m^2/s.
    amount, free_volume : float or None
        Helium in the ring in mol and its open volume in m^3; they tell whether it is full.
    u_angular_momentum : ndarray or None
        Point uncertainty; without it the scatter of the coldest rows counts for all.

    Raises
    ------
    ValueError
        Fewer than five rows of reference.

    Notes
    -----
    Rows are taken in the order of time. At kept circulation L(T)/L(T_0) = rho_s(T)/rho_s(T_0), whatever the geometry and the drag factor. The coldest rows
    up to the turn of a cycle are put on
    the tabulated rho_s of the liquid at saturated vapour pressure; all other rows are measured against them.
    """
    known = known_rows(temperature, angular_momentum)
    reference = _reference(parameters, temperature, known)
    full, why = _full(parameters, amount, free_volume, temperature[known])
    T, L = temperature[reference], angular_momentum[reference]
    shape = _bulk(T) if full else np.ones(T.shape)
    u = (
        u_angular_momentum
        if u_angular_momentum is not None and (u_angular_momentum[known] > 0).all()
        else None
    )
    w = np.ones(T.shape) if u is None else 1 / u[reference] ** 2
    per = float(np.sum(w * L * shape) / np.sum(w * shape**2))
    scatter = float(np.sqrt(np.sum(w * (L - per * shape) ** 2) / (T.size - 1)))
    u_per = (scatter if u is None else max(scatter, 1.0)) / math.sqrt(float(np.sum(w * shape**2)))
    point = np.full(temperature.shape, scatter) if u is None else np.nan_to_num(u)
    level = float(np.mean(shape)) * per
    own = SourceEntry(
        name="own level of the coldest rows", description="scatter of the rows of reference", level="run"
    )
    entries, shared = [own], {"ratio": {own.name: -np.nan_to_num(angular_momentum) / level * u_per / per}}
    outputs: dict[str, float | FloatArray] = {"ratio": angular_momentum / level, "superfluid_density": np.full(temperature.shape, np.nan)}  # fmt: skip
    points = {"ratio": np.abs(point / level)}
    findings: tuple[Finding, ...] = ()
    facts = {
        "rows_of_reference": int(T.size), "reference_low_K": float(T.min()), "reference_high_K": float(T.max()), "full": full, "why": why,
        "largest_departure": math.nan,
    }  # fmt: skip
    if full:
        outputs["superfluid_density"] = angular_momentum / per
        points["superfluid_density"] = np.abs(point / per)
        fraction = TABLE / float(np.mean(superfluid_fraction(T)))
        shared["superfluid_density"] = {
            own.name: -np.nan_to_num(angular_momentum) / per * u_per / per, _TABLE_SOURCE: np.nan_to_num(angular_momentum) / per * fraction,
        }  # fmt: skip
        entries.append(SourceEntry(name=_TABLE_SOURCE, description=f"standard uncertainty {TABLE:g} of rho_s/rho", level="laboratory"))  # fmt: skip
        facts["largest_departure"], findings = _identity(temperature, angular_momentum / per, known)
    return Outcome(
        outputs, point=points, shared=shared, sources=tuple(entries), facts=facts, findings=findings,
        held={"rows": tuple(int(row) + 1 for row in np.flatnonzero(reference)), "full": full},
    )  # fmt: skip


def current_reversibility(
    parameters: HeldParameters,
    *,
    abscissa: FloatArray,
    angular_momentum: FloatArray,
    time: FloatArray,
    u_angular_momentum: FloatArray | None,
) -> Outcome:
    """Return how much of the current is left when the record comes back to where it was.

    Parameters
    ----------
    abscissa : ndarray
        Temperature in K, or coverage, thickness or amount.
    angular_momentum : ndarray
        kg m^2/s.
    time : ndarray
        s; the rows are taken in its order.

    Notes
    -----
    The record is taken to turn once, where the abscissa is furthest from both its ends. One, within the uncertainty: the
    circulation was kept, and L follows the density. Less: what is missing has decayed.
    """
    rows = np.flatnonzero(known_rows(abscissa, angular_momentum, time))
    rows = rows[np.argsort(time[rows], kind="stable")]
    x, L, u = abscissa[rows], angular_momentum[rows], weights(u_angular_momentum, rows)
    if rows.size < 16 or relative_spread(x) < parameters.largest_spread:
        return _silent("no way back")
    turn = turning_row(x)
    found = branch_ratio(x, L, turn=turn, standard_uncertainty=u)
    if found is None:
        return _silent("no way back")
    spread = found.standard_uncertainty * math.sqrt(max(found.chi2 / found.dof, 1.0) if found.dof else 1.0)
    findings: tuple[Finding, ...] = ()
    if abs(found.ratio - 1) > 3 * spread:
        lost = found.ratio < 1
        findings = (
            Finding(
                code="current-not-reversible", severity="warning",
                what=f"on the way back the angular momentum is {found.ratio:.4f} of what it was, {abs(found.ratio - 1) / spread:.1f} standard uncertainties from one; "
                + ("the current has decayed, and readings after the turn are no superfluid density" if lost else "no decay raises it: look for a drift of the detector"),
                remedy="leave out the rows after the loss, or repeat the cycle at a smaller current",
            ),
        )  # fmt: skip
    return Outcome(
        {"remaining": found.ratio}, point={"remaining": spread}, findings=findings,
        facts={"groups": found.groups, "turned_at": float(x[turn]), "reversible": not findings, "abscissa_is": "temperature or coverage"},
    )  # fmt: skip


def _reference(parameters: CurrentParameters, T: FloatArray, known: _Rows) -> _Rows:
    chosen = np.zeros(T.shape, dtype=np.bool_)
    if parameters.rows is not None:
        chosen[row_indices(parameters.rows, chosen.size)] = True
        return chosen
    count = int(np.count_nonzero(known))
    if count:
        # Up to the turn: what is lost there must not lower the level that it is measured against.
        first = np.flatnonzero(known)
        turn = turning_row(T[first])
        if min(turn, count - turn) > parameters.reference_share * count:
            first = first[: turn + 1]
        chosen[first[T[first] <= np.quantile(T[first], parameters.reference_share)]] = True
    if np.count_nonzero(chosen) < 5:
        raise ValueError(
            f"temperature: found {np.count_nonzero(chosen)} rows of reference among {count}, expected at least 5"
        )
    return chosen


def _full(
    parameters: CurrentParameters, amount: float | None, volume: float | None, T: FloatArray
) -> tuple[bool, str]:
    """Return whether the ring is full of liquid 4He, and why that is believed."""
    if parameters.full is not None:
        return parameters.full, "stated in the plan"
    if amount is None or volume is None:
        return False, "amount of helium or open volume is not recorded"
    share = amount * MOLAR_MASS_HELIUM4 / float(density(float(np.median(T)))) / volume
    return share >= FULL, f"the helium would fill {share:.3g} of the open volume"


def _bulk(T: FloatArray) -> FloatArray:
    return np.asarray(density(T) * superfluid_fraction(T))


def _identity(T: FloatArray, found: FloatArray, known: _Rows) -> tuple[float, tuple[Finding, ...]]:
    """Return the largest relative departure from the tabulated density, in medians of groups, and what to say of it."""
    # Closer to the transition an error of the temperature is all that is compared.
    rows = np.flatnonzero(known & (np.nan_to_num(T, nan=9.0) < 0.99 * T_LAMBDA))
    order = rows[np.argsort(T[rows], kind="stable")]
    groups = [group for group in np.array_split(order, max(1, min(30, order.size // 10))) if group.size]
    departures = [float(np.median(found[group] / _bulk(T[group]))) - 1 for group in groups]
    worst = max(departures, key=abs, default=math.nan)
    if not abs(worst) > 2 * VORTEX_CHANGE:
        return worst, ()
    return worst, (
        Finding(
            code="current-not-bulk-density", severity="warning",
            what=f"the density from the current departs from that of bulk liquid by up to {worst:.1%}; vortices change it by 1.2 per cent at most, so the current has decayed or the ring was not full",
        ),
    )  # fmt: skip


def _silent(verdict: str) -> Outcome:
    return Outcome(
        {"remaining": math.nan},
        verdicts={"remaining": verdict},
        facts={"reversible": "not tested", "abscissa_is": "temperature or coverage"},
    )


_L = Port("angular_momentum", "array", "angular momentum of the current")
_T = Port("temperature", "array", "temperature of each row")

CURRENT_STEPS: tuple[Step, ...] = (
    Step(
        name="density-from-current", version=1, function=density_from_current, parameters=CurrentParameters,
        takes={
            "temperature": _T, "angular_momentum": _L, "amount": Port("amount", "scalar", "helium in the ring", optional=True),
            "free_volume": Port("volume", "scalar", "open volume of the ring", optional=True),
        },
        yields={
            "ratio": Port("number", "array", "angular momentum over that of the coldest rows"),
            "superfluid_density": Port("density", "array", "superfluid density at kept circulation"),
        },
        sentence="At kept circulation the angular momentum follows the superfluid density; {rows_of_reference} rows from {reference_low_K} K to {reference_high_K} K are the reference. "
        "Full of liquid: {full} ({why}); below 0.99 of the lambda point the largest departure from the tabulated density is {largest_departure}.",
        citations=("reppy-depatie-1964", "donnelly-1998"), spread="refit", weights=("angular_momentum",),
    ),
    Step(
        name="current-reversibility", version=1, function=current_reversibility, parameters=HeldParameters,
        takes={"abscissa": Port("temperature|coverage|length|amount", "array", "what was changed"), "angular_momentum": _L, "time": Port("time", "array", "time of each row")},
        yields={"remaining": Port("number", "scalar", "angular momentum on the way back over that on the way there")},
        sentence="Angular momentum on the way back over that on the way there, at equal {abscissa_is}: {remaining}; reversible: {reversible}.", citations=("reppy-1965",),
        spread="refit", weights=("angular_momentum",),
    ),
    Step(
        name="current-decay", version=1, function=current_decay, parameters=HeldParameters,
        takes={"time": Port("time", "array", "time of each row"), "angular_momentum": _L, "temperature": Port("temperature", "array", "temperature of each row", optional=True), "coverage": Port("coverage|length", "array", "coverage or thickness of each row", optional=True)},
        yields={
            "initial_angular_momentum": Port("angular_momentum", "scalar", "angular momentum at the first reading"), "decay_time": Port("time", "scalar", "one over the relative rate of decay at the first reading"),
            "exponent": Port("number", "scalar", "m of -dv/dt ~ v^(1 + m)"), "stiffness_ratio": Port("number", "scalar", "stiffness of a film over the universal one, m/2"),
            "areal_density_from_decay": Port("areal_mass_density", "scalar", "areal superfluid density of a film by its decay"),
        },
        sentence="Decay at one temperature as a power law in time, -dv/dt ~ v^(1 + m), over {points} points: {reason}. m: {exponent}; decay time at the first reading: {decay_time}; "
        "chi^2: {chi2_power}, of an exponential {chi2_exponential}.",
        citations=("ahns-1980",), spread="refit", weights=("angular_momentum",),
    ),
    Step(
        name="current-against-coverage", version=1, function=current_against_coverage, parameters=CoverageParameters,
        takes={"coverage": Port("coverage|length", "array", "coverage or thickness of each row"), "angular_momentum": _L},
        yields={"onset_coverage": Port("same:coverage", "scalar", "coverage or thickness at which the current would vanish")},
        sentence="A straight line through {points} points ({coverage}) vanishes at {onset_coverage}.", spread="refit", weights=("angular_momentum",),
    ),
)  # fmt: skip
"""Steps of this module."""

"""Fit of the frequency-dependent theory to a film's period drop and dissipation at once.

Rules: the full flow is integrated, never its step form; F is held unless freed by name, and what holding it costs is a
source of its own; a film in pores narrower than the diffusion length is refused.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import numpy.typing as npt
from pydantic import Field

from archive.physics.constants import HBAR, MASS_HELIUM4, MOLAR_MASS_HELIUM4
from archive.physics.film_curves import curves
from archive.physics.film_dynamic import DEBYE
from archive.physics.film_static import UNIVERSAL_JUMP
from archive.physics.film_transition import FilmTransition, fit_film_transition
from archive.physics.film_transition_local import LocalSolution, local_solution, moved
from archive.reduction.background_steps import known_rows, weights
from archive.reduction.estimate import FloatArray
from archive.reduction.row_choice import row_indices
from archive.reduction.step import Covariance, NoParameters, Outcome, Port, Step
from schemas.base import Record
from schemas.finding import Finding
from schemas.lineage import SourceEntry, Value
from schemas.substrate import Substrate

__all__ = ["DYNAMIC_STEPS", "FilmDynamicParameters", "film_dynamic_fit", "transition_difference"]

LEAST = 40
"""Rows that a fit of six parameters to two curves should have (common practice, no source)."""

FEW = 250
"""Rows of the first, rough fit, whose slopes tell how much the temperature's scatter adds."""


class FilmDynamicParameters(Record):
    """What is fitted, what is held, and over which rows."""

    free: tuple[str, ...] = (
        "transition_temperature", "b", "log_diffusivity", "scale", "drop_offset", "dissipation_offset",
    )  # fmt: skip
    """Of these and F; freeing the scale tests the universal jump."""
    free_vortices: float = 1.0
    """F: free-vortex density F/xi_+^2, with xi_+ where the flow reaches half the universal stiffness."""
    free_vortices_uncertainty: float = 0.3
    x0: float = -0.5
    """Bare start of the flow; only a combination with the core size is measurable, so it is chosen."""
    low: float = 0.9
    """Lower end of the rows over the temperature of the highest dissipation; far below, thermal excitations count too."""
    high: float = 1.25
    drag_factor: float | None = None
    """chi, where no dose run gives it."""
    diffusivity_over_quantum: float = 0.25
    """D in units of hbar/m for the diffusion length that pores are compared with: P. W. Adams, W. I. Glaberson,
    Phys. Rev. Lett. 57, 82 (1986), at the static transition."""
    rows: tuple[int, ...] | None = None
    """The rows to fit, from 1, in place of `low` and `high`."""
    local: Any = Field(default=None, exclude=True)
    """The `LocalSolution` that shifted inputs start from; the runner holds it, no plan sets it."""


def film_dynamic_fit(
    parameters: FilmDynamicParameters,
    *,
    temperature: FloatArray,
    period_drop: FloatArray,
    dissipation: FloatArray,
    period: float | FloatArray,
    slope_below: float,
    slope_past: float | None,
    area: float,
    substrate: Substrate | None,
    u_temperature: FloatArray | None,
    u_period_drop: FloatArray | None,
    u_dissipation: FloatArray | None,
) -> Outcome:
    """Return the parameters of the dynamic theory that fit period drop and dissipation together.

    Parameters
    ----------
    temperature, period_drop, dissipation : ndarray
        K, s, and what the helium adds to 1/Q.
    period : float or ndarray
        s; its median counts.
    slope_below, slope_past : float
        dP/dn of the dose run, s/mol.
    area : float
        m^2.
    substrate : Substrate or None
        Its pore diameter decides whether the theory of a flat film may be used.
    u_temperature, u_period_drop, u_dissipation : ndarray or None
        Point uncertainties; that of the temperature counts through the slope of the dissipation. It is in the drop's already.

    Raises
    ------
    ValueError
        Pores narrower than the diffusion length, too few rows, missing uncertainties, or a fit that does not converge.

    Notes
    -----
    The drop's and the dissipation's scatter are taken as independent, though a misread temperature moves both. Scatter beyond
    what is stated widens the result, less scatter does not narrow it. D is taken as constant over the transition.
    """
    P = float(np.nanmedian(period))
    omega = 2 * math.pi / P
    length = math.sqrt(DEBYE * parameters.diffusivity_over_quantum * HBAR / MASS_HELIUM4 / omega)
    findings = _pores(substrate, length)
    chi = slope_past / slope_below if slope_past is not None else parameters.drag_factor
    if chi is None or not 0 <= chi < 1:
        raise ValueError(
            f"slope_past: found chi = {chi}, expected 0 to 1; set drag_factor in a plan of your own"
        )
    if not (area > 0 and slope_below > 0):
        raise ValueError(f"area, slope_below: found {area}, {slope_below}, expected > 0")
    scale = 2 * slope_below * area / MOLAR_MASS_HELIUM4 * (1 - chi) / P
    rows = _rows(parameters, temperature, period_drop, dissipation)
    T, drop, loss = temperature[rows], 2 * period_drop[rows] / P, dissipation[rows]
    if parameters.local is not None:
        values = moved(
            parameters.local,
            temperature=T,
            twice_fractional_drop=drop,
            dissipation=loss,
            angular_frequency=omega,
        )
        # Without values a shifted column moves nothing: residuals belong to the one fit.
        empty = np.full(temperature.shape, np.nan)
        return Outcome(_numbers(values, scale, P) | {"reduced_chi2": math.nan, "drop_residual": empty, "dissipation_residual": empty})  # fmt: skip
    u_drop, u_loss = (weights(each, rows) for each in (u_period_drop, u_dissipation))
    if u_drop is None or u_loss is None:
        raise ValueError(
            "period_drop, dissipation: no standard uncertainty is stated for every row, so the two cannot be weighed against each other"
        )
    u_T = np.zeros(T.shape) if u_temperature is None else np.nan_to_num(u_temperature[rows])
    found, u_loss = _fitted(parameters, T, drop, loss, 2 * u_drop / P, u_loss, u_T, omega, scale)
    if not found.fit.converged:
        raise ValueError(f"period_drop, dissipation: the dynamic theory was not fitted: {found.fit.message}")
    local = local_solution(
        found,
        temperature=T,
        u_drop=2 * u_drop / P,
        u_dissipation=u_loss,
        angular_frequency=omega,
        x0=parameters.x0,
    )
    shared, sources = _held_vortices(parameters, local, found, T, drop, loss, omega, scale, P)
    names, matrix = _covariance(found, scale, P)
    height = _peak_height(found, loss)
    findings += _judged(found, height)
    residuals = [np.full(temperature.shape, np.nan) for _ in range(2)]
    residuals[0][rows], residuals[1][rows] = np.split(found.fit.residuals, 2)
    verdicts = {} if "scale" in found.fit.names else {"scale_ratio": "held"}
    if "F" not in found.fit.names:
        verdicts["F"] = f"held at {parameters.free_vortices:g}"
    return Outcome(
        _numbers(found.values, scale, P) | {"reduced_chi2": found.fit.reduced_chi2, "drop_residual": residuals[0], "dissipation_residual": residuals[1]},
        shared=shared, sources=sources, covariance=Covariance(names, matrix), verdicts=verdicts,
        held={"local": local, "rows": tuple(int(row) + 1 for row in np.flatnonzero(rows))},
        facts={
            "points": int(T.size), "low_K": float(T.min()), "high_K": float(T.max()), "reduced_chi2_value": found.fit.reduced_chi2,
            "chi2_drop": found.chi2_drop, "chi2_dissipation": found.chi2_dissipation, "L": found.L, "F_used": found.values["F"],
            "F_was": "fitted" if "F" in found.fit.names else "held", "trajectory": found.trajectory, "chi": chi,
            "scale_stated": scale, "peak_height": height, "diffusion_length_um": length * 1e6,
        },
        findings=tuple(findings),
    )  # fmt: skip


def transition_difference(_: NoParameters, *, first: float, second: float) -> Outcome:
    """Return by how much two transition temperatures of one record differ; what they share cancels in the uncertainty."""
    return Outcome({"difference": first - second})


def _pores(substrate: Substrate | None, length: float) -> list[Finding]:
    if substrate is None or substrate.pore_diameter is None:
        return []
    diameter = float(substrate.pore_diameter.si)
    around = math.pi * diameter / 2
    if length > around:
        raise ValueError(
            f"substrate.pore_diameter: found {diameter * 1e6:.4g} um, whose half circumference is less than the diffusion length of {length * 1e6:.4g} um; "
            "the theory of a flat film does not hold there, use the power law (plan porous-film)"
        )
    if length > 0.3 * around:
        # Recommended limit of the planar theory (common practice, no source).
        return [
            Finding(
                code="pores-near-diffusion-length", severity="warning",
                what=f"the diffusion length of {length * 1e6:.3g} um is more than 0.3 of half the pores' circumference; the pores cut off vortex pairs",
            )
        ]  # fmt: skip
    return []


def _rows(
    parameters: FilmDynamicParameters, T: FloatArray, drop: FloatArray, loss: FloatArray
) -> npt.NDArray[np.bool_]:
    if parameters.rows is not None:
        chosen = np.zeros(T.shape, dtype=np.bool_)
        chosen[row_indices(parameters.rows, chosen.size)] = True
        return chosen
    known = known_rows(T, drop, loss)
    if np.count_nonzero(known) < LEAST:
        raise ValueError(
            f"temperature: found {np.count_nonzero(known)} rows with drop and dissipation, expected at least {LEAST}"
        )
    order = np.flatnonzero(known)[np.argsort(T[known], kind="stable")]
    groups = np.array_split(order, max(3, min(60, order.size // 5)))
    top = max(groups, key=lambda group: float(np.median(loss[group])))
    peak = float(np.median(T[top]))
    chosen = (
        known & (np.nan_to_num(T) >= parameters.low * peak) & (np.nan_to_num(T) <= parameters.high * peak)
    )
    if np.count_nonzero(chosen) < LEAST:
        raise ValueError(
            f"temperature: found {np.count_nonzero(chosen)} rows from {parameters.low:g} to {parameters.high:g} of the dissipation peak at {peak:.5g} K, expected at least {LEAST}"
        )
    return chosen


def _fitted(
    parameters: FilmDynamicParameters, T: FloatArray, drop: FloatArray, loss: FloatArray, u_drop: FloatArray,
    u_loss: FloatArray, u_T: FloatArray, omega: float, scale: float,
) -> tuple[FilmTransition, FloatArray]:  # fmt: skip
    """Return the fit, and the dissipation's uncertainty with the temperature's scatter in it."""

    def fit(part: slice, u: FloatArray, start: dict[str, float] | None, evaluations: int) -> FilmTransition:
        return fit_film_transition(
            T[part], drop[part], loss[part], standard_uncertainty_drop=u_drop[part], standard_uncertainty_dissipation=u[part],
            angular_frequency=omega, scale=scale, free=parameters.free, F=parameters.free_vortices, x0=parameters.x0, start=start,
            max_evaluations=evaluations,
        )  # fmt: skip

    # A dozen steps: the rough fit only has to come near, and from there a few are enough.
    rough = fit(slice(None, None, max(T.size // FEW, 1)), u_loss, None, 160)
    if np.any(u_T > 0):
        step = 1e-5 * T
        above, below = (
            curves(T + sign * step, rough.values, angular_frequency=omega, x0=parameters.x0)[1]
            for sign in (1, -1)
        )
        u_loss = np.hypot(u_loss, (above - below) / (2 * step) * u_T)
    found = fit(slice(None), u_loss, rough.values, 130)
    return (found if found.fit.converged else fit(slice(None), u_loss, found.values, 3000)), u_loss


def _numbers(values: dict[str, float], scale: float, P: float) -> dict[str, float | FloatArray]:
    return {
        "transition_temperature": values["transition_temperature"], "b": values["b"], "log_diffusivity": values["log_diffusivity"],
        "F": values["F"], "scale_ratio": values["scale"] / scale, "drop_offset": values["drop_offset"] * P / 2,
        "dissipation_offset": values["dissipation_offset"],
    }  # fmt: skip


def _covariance(found: FilmTransition, scale: float, P: float) -> tuple[tuple[str, ...], FloatArray]:
    factors = {"scale": 1 / scale, "drop_offset": P / 2}
    factor = np.array([factors.get(name, 1.0) for name in found.fit.names])
    names = tuple("scale_ratio" if name == "scale" else name for name in found.fit.names)
    inflation = max(found.fit.reduced_chi2, 1.0)
    return names, np.asarray(found.fit.covariance) * np.outer(factor, factor) * inflation


def _held_vortices(
    parameters: FilmDynamicParameters, local: LocalSolution, found: FilmTransition, T: FloatArray, drop: FloatArray,
    loss: FloatArray, omega: float, scale: float, P: float,
) -> tuple[dict[str, dict[str, float]], tuple[SourceEntry, ...]]:  # fmt: skip
    """Return what the held F contributes to each result."""
    u = min(parameters.free_vortices_uncertainty, parameters.free_vortices)
    if "F" in found.fit.names or u <= 0:
        return {}, ()
    up, down = (
        _numbers(
            moved(local, temperature=T, twice_fractional_drop=drop, dissipation=loss, angular_frequency=omega, steps=8, F=found.values["F"] + sign * u),
            scale, P,
        )
        for sign in (1, -1)
    )  # fmt: skip
    name = f"F = {parameters.free_vortices:g} of the dynamic theory, held"
    entry = SourceEntry(
        name=name, description=f"standard uncertainty {u:g} of the held parameter", level="laboratory",
        stated=Value(value=parameters.free_vortices, uncertainty=u, unit="1"),
    )  # fmt: skip
    return {key: {name: (float(up[key]) - float(down[key])) / 2} for key in up if key != "F"}, (entry,)


def _peak_height(found: FilmTransition, loss: FloatArray) -> float:
    """Return the measured peak over twice the fractional period drop at the jump, from the rows where the fit is near its top."""
    curve = found.dissipation - found.values["dissipation_offset"]
    peak = float(np.mean(loss[curve >= 0.95 * np.max(curve)])) - found.values["dissipation_offset"]
    return peak / (found.values["scale"] * UNIVERSAL_JUMP * found.transition_temperature)


def _judged(found: FilmTransition, height: float) -> list[Finding]:
    findings = []
    if not 0.15 <= height <= 0.45:
        findings.append(
            Finding(
                code="dissipation-peak-height", severity="warning",
                what=f"the dissipation peak is {height:.3f} of twice the fractional period drop at the jump, where the theory gives 0.26 to 0.33; "
                "outside 0.15 to 0.45 the dissipation's calibration, an uneven film or narrow pores are to blame",
            )
        )  # fmt: skip
    if found.fit.at_bound:
        findings.append(
            Finding(
                code="fit-at-bound", severity="warning",
                what=f"the fit of the dynamic theory ended on a bound: {', '.join(found.fit.at_bound)}; that uncertainty is not known",
            )
        )  # fmt: skip
    return findings


_T = Port("temperature", "scalar", "static transition temperature")

DYNAMIC_STEPS: tuple[Step, ...] = (
    Step(
        name="film-dynamic-fit", version=1, function=film_dynamic_fit, parameters=FilmDynamicParameters,
        takes={
            "temperature": Port("temperature", "array", "temperature of each row"), "period_drop": Port("period", "array", "period drop"),
            "dissipation": Port("dissipation", "array", "dissipation that the helium adds"), "period": Port("period", "number", "period; its median sets the frequency"),
            "slope_below": Port("amount_sensitivity", "scalar", "period per amount of coupled helium"),
            "slope_past": Port("amount_sensitivity", "scalar", "period per amount past the onset", optional=True), "area": Port("area", "scalar", "adsorbing area"),
            "substrate": Port("any", "record", "substrate, for its pores", optional=True),
        },
        yields={
            "transition_temperature": Port("temperature", "scalar", "static transition temperature by the dynamic theory"), "b": Port("number", "scalar", "non-universal constant b"),
            "log_diffusivity": Port("number", "scalar", "ln(D/a^2) with D/a^2 in 1/s"), "F": Port("number", "scalar", "free-vortex prefactor, with xi_+ where the stiffness is half universal"),
            "scale_ratio": Port("number", "scalar", "fitted areal density over that of the universal jump"), "drop_offset": Port("period", "scalar", "period drop left where the film is normal"),
            "dissipation_offset": Port("dissipation", "scalar", "dissipation left where the film is normal"), "reduced_chi2": Port("number", "scalar", "chi squared per degree of freedom"),
            "drop_residual": Port("number", "array", "period drop less fit, in standard uncertainties"), "dissipation_residual": Port("number", "array", "dissipation less fit, in standard uncertainties"),
        },
        sentence="The frequency-dependent theory (full vortex flow, {trajectory}) was fitted to period drop and dissipation together, {points} points from {low_K} K to {high_K} K: "
        "T_KT = {transition_temperature}, b = {b}, ln(D/a^2 s) = {log_diffusivity}; F, which goes with xi_+ where the stiffness is half the universal one, was {F_was} at {F_used}; "
        "the areal density is {scale_ratio} of what the universal jump asks for; D is taken as constant; chi^2 per degree of freedom {reduced_chi2_value}.",
        citations=("ahns-1980", "bishop-reppy-1980"), spread="refit", weights=("temperature", "period_drop", "dissipation"),
    ),
    Step(
        name="transition-difference", version=1, function=transition_difference, takes={"first": _T, "second": _T},
        yields={"difference": Port("temperature_difference", "scalar", "first less second transition temperature")},
        sentence="The two ways to the static transition differ by {difference}.",
    ),
)  # fmt: skip
"""Steps of this module."""

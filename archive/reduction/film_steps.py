"""Steps of a superfluid film: areal density, crossing of the universal line, power law of porous media."""

from __future__ import annotations

import math

import numpy as np

from archive.physics import film_static
from archive.physics.constants import MOLAR_MASS_HELIUM4
from archive.physics.power_law import fit_power_law
from archive.physics.universal_line import crossing_of_universal_line
from archive.reduction.background_steps import known_rows, weights
from archive.reduction.estimate import FloatArray
from archive.reduction.step import Covariance, Outcome
from schemas.base import Record
from schemas.substrate import Sample

__all__ = [
    "CrossingParameters",
    "DensityParameters",
    "PowerLawParameters",
    "power_law_transition",
    "superfluid_density",
    "universal_crossing",
]


class DensityParameters(Record):
    """The drag factor, where no dose run gives it."""

    drag_factor: float | None = None
    """chi; 0 for a smooth closed annulus or a flat disc turning about its own axis."""


class CrossingParameters(Record):
    """How the crossing of the universal line is read."""

    half_width: float = 0.01
    """Rows within this share of the temperature are fitted."""
    points: int | None = None
    order: int = 2


class PowerLawParameters(Record):
    """Window of the power law in reduced temperature."""

    low: float = 1e-3
    high: float = 0.1


def superfluid_density(
    parameters: DensityParameters,
    *,
    period_drop: FloatArray,
    slope_below: float,
    slope_past: float | None,
    area: float,
    sample: Sample | None,
) -> Outcome:
    """Return the areal superfluid density from the period drop.

    Parameters
    ----------
    period_drop : ndarray
        s.
    slope_below, slope_past : float
        dP/dn below the onset and past it, s/mol; their difference is S_n (1 - chi), with the correlation of both.
    area : float
        m^2.
    sample : Sample or None
        Must not be 3He.

    Raises
    ------
    ValueError
        Neither a slope past the onset nor a drag factor, both of them, or a chi outside [0, 1).
    """
    if sample is not None and sample.isotope not in ("4He", "3He-4He"):
        raise ValueError(f"sample: found {sample.isotope}, expected 4He")
    if slope_past is None and parameters.drag_factor is None:
        raise ValueError(
            "slope_past: no dose run gives the part of the film that is dragged along; set drag_factor in a plan of your own, 0 for a smooth flat disc"
        )
    if slope_past is not None and parameters.drag_factor is not None:
        raise ValueError(
            f"drag_factor: found {parameters.drag_factor:g}, and a dose run gives {slope_past / slope_below:.4g}; leave one of them out of the plan"
        )
    if not area > 0:
        raise ValueError(f"area: found {area} m^2, expected > 0")
    chi = parameters.drag_factor if slope_past is None else slope_past / slope_below
    assert chi is not None  # noqa: S101 - refused above
    per_areal_density = slope_below * area / MOLAR_MASS_HELIUM4
    sigma = film_static.superfluid_areal_density(
        period_drop, period_per_areal_density=per_areal_density, drag_factor=chi
    )
    facts = {
        "period_per_areal_density": per_areal_density,
        "chi": chi,
        "chi_from": "the slopes of the dose run" if slope_past is not None else "the plan",
    }
    return Outcome({"superfluid_density": sigma}, facts=facts)


def universal_crossing(
    parameters: CrossingParameters,
    *,
    temperature: FloatArray,
    superfluid_density: FloatArray,
    u_superfluid_density: FloatArray | None,
) -> Outcome:
    """Return where the areal density, as the oscillator reports it, falls through the universal line.

    Parameters
    ----------
    temperature, superfluid_density : ndarray
        K, kg/m^2.
    u_superfluid_density : ndarray or None
        Point uncertainty. What the temperature's own makes through the slope is in it already, from the period drop.

    Raises
    ------
    ValueError
        No crossing, with the reason.
    """
    rows = known_rows(temperature, superfluid_density)
    T, sigma = temperature[rows], superfluid_density[rows]
    u = weights(u_superfluid_density, rows)
    points = parameters.points or _points(T, sigma, u, parameters)
    found = crossing_of_universal_line(
        T, sigma, standard_uncertainty=u, points=points, order=parameters.order
    )
    if not found.found:
        raise ValueError(f"superfluid_density: {found.reason}")
    return Outcome(
        {"crossing_temperature": found.temperature}, point={"crossing_temperature": found.standard_uncertainty},
        held={"points": points}, facts={"points": found.points, "slope": found.slope},
    )  # fmt: skip


def _points(T: FloatArray, sigma: FloatArray, u: FloatArray | None, parameters: CrossingParameters) -> int:
    least = parameters.order + 6
    rough = crossing_of_universal_line(
        T, sigma, standard_uncertainty=u, points=max(least, T.size // 50), order=1
    )
    if not rough.found:
        return least
    near = int(np.count_nonzero(np.abs(T / rough.temperature - 1) < parameters.half_width))
    return max(least, near)


def power_law_transition(
    parameters: PowerLawParameters,
    *,
    temperature: FloatArray,
    superfluid_density: FloatArray,
    u_superfluid_density: FloatArray | None,
) -> Outcome:
    """Return T_c, exponent and amplitude of a power law, as films in porous media follow.

    Raises
    ------
    ValueError
        Too few rows in the window, or a fit that does not converge.
    """
    rows = known_rows(temperature, superfluid_density)
    T, sigma, u = temperature[rows], superfluid_density[rows], weights(u_superfluid_density, rows)
    if T.size < 8:
        raise ValueError(f"superfluid_density: found {T.size} rows, expected at least 8")
    gone = sigma < 0.02 * float(np.max(sigma))
    start = float(np.min(T[gone])) if gone.any() else float(np.max(T))
    found = fit_power_law(
        T,
        sigma,
        start_temperature=start,
        window=(parameters.low, parameters.high),
        standard_uncertainty=u,
        absolute=False,
    )
    if not found.converged:
        raise ValueError(f"superfluid_density: the power law was not fitted: {found.message}")
    fit = found.fit
    outputs = {
        "transition_temperature": fit.value("transition_temperature"),
        "exponent": fit.value("exponent"),
        "amplitude": fit.value("amplitude"),
    }
    facts = {
        "points": int(np.count_nonzero(found.used)),
        "reduced_chi2": fit.reduced_chi2 if u is not None else math.nan,
        "low": parameters.low,
        "high": parameters.high,
    }
    return Outcome(outputs, covariance=Covariance(fit.names, np.asarray(fit.covariance)), facts=facts)

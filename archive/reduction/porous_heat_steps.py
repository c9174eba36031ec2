"""Steps of the heat capacity at a superfluid transition in a porous medium: the singularity, and the bound that its scatter sets."""

from __future__ import annotations

import math

import numpy as np

from archive.physics import porous_singularity
from archive.physics.porous_singularity import singular_part, upper_bound
from archive.reduction.background_steps import known_rows, weights
from archive.reduction.estimate import Estimate, FloatArray
from archive.reduction.porous_steps import bulk_per_volume
from archive.reduction.step import Covariance, Outcome, Port, Step
from schemas.base import Record
from schemas.finding import Finding

__all__ = ["POROUS_HEAT_STEPS", "BoundParameters", "SingularityParameters"]


class SingularityParameters(Record):
    """Where the singularity is looked for."""

    transition_temperature_kelvin: float | None = None
    """In place of that of the film at the same filling."""
    window: float = 0.1
    """Greatest distance from the transition, in its temperature; that of work on films in porous glass."""
    order: int = 3
    """Degree of the background."""


class BoundParameters(Record):
    """How sure the bound is."""

    probability: float = 0.95


def heat_capacity_singularity(
    parameters: SingularityParameters,
    *,
    temperature: FloatArray,
    heat_capacity: FloatArray,
    rise: FloatArray | None,
    transition: float | None,
    transition_estimate: Estimate | None,
    u_heat_capacity: FloatArray | None,
) -> Outcome:
    """Return the amplitude of a singularity of the heat capacity at a transition that is known from elsewhere.

    Parameters
    ----------
    temperature, heat_capacity : ndarray
        K (middle of each step), J/K, of the whole cell: addenda are part of the smooth background.
    rise : ndarray or None
        Step of each reading, K.
    transition : float or None
        K.
    transition_estimate : Estimate or None
        The same with its uncertainty, over which the singularity is blurred.
    u_heat_capacity : ndarray or None
        Point uncertainty.

    Raises
    ------
    ValueError
        No transition temperature, or too few readings on a side of it.
    """
    at = parameters.transition_temperature_kelvin or transition
    if at is None:
        raise ValueError(
            "transition: no film at the same filling is reduced; reduce its temperature sweep by porous-film first, or set transition_temperature_kelvin in a plan of your own"
        )
    rows = known_rows(temperature, heat_capacity, rise)
    T, C = temperature[rows], heat_capacity[rows]
    if T.size < 2:
        raise ValueError(f"heat_capacity: found {T.size} readings")
    own = parameters.transition_temperature_kelvin is not None
    spread = 0.0 if own or transition_estimate is None else float(transition_estimate.uncertainty)
    # A distance of readings blurs too: nothing is known of what lies between them.
    steps = np.full(T.shape, float(np.median(np.diff(np.sort(T))))) if rise is None else np.abs(rise[rows])
    width = np.maximum(np.hypot(steps, math.sqrt(12) * spread), 1e-9 * at)
    found = singular_part(
        T, C, transition_temperature=at, width=width, window=parameters.window, order=parameters.order,
        standard_uncertainty=weights(u_heat_capacity, rows),
    )  # fmt: skip
    smooth, residual = (np.full(temperature.shape, math.nan) for _ in range(2))
    chosen = np.flatnonzero(rows)[found.used]
    smooth[chosen], residual[chosen] = found.smooth, found.residuals
    return Outcome(
        {"amplitude": found.amplitude, "scatter": found.scatter, "background": smooth, "residual": residual},
        covariance=Covariance(("amplitude",), np.array([[found.standard_uncertainty**2]])),
        facts={
            "points": int(chosen.size), "at_K": at, "blur_mK": float(np.median(width)) * 1e3, "alpha": porous_singularity.ALPHA,
            "shape_ratio": porous_singularity.AMPLITUDE_RATIO, "reduced_chi2": found.reduced_chi2,
        },
    )  # fmt: skip


def singularity_bound(
    parameters: BoundParameters,
    *,
    amplitude: float,
    amplitude_estimate: Estimate,
    expected: float | None,
    volume: float | None,
) -> Outcome:
    """Return the amplitude that the singularity does not exceed, over the expected one and over that of bulk liquid.

    Parameters
    ----------
    amplitude : float
        As fitted, J/K; what counts is its estimate, so that the uncertainty, which is in the bound, is not counted again.
    amplitude_estimate : Estimate
        The same with its uncertainty from all sources.
    expected : float or None
        Amplitude by two-scale-factor universality, J/K.
    volume : float or None
        Of the sample, m^3.

    Raises
    ------
    ValueError
        An amplitude without uncertainty.
    """
    del amplitude
    value, u = float(amplitude_estimate.value), float(amplitude_estimate.uncertainty)
    limit = upper_bound(value, standard_uncertainty=u, probability=parameters.probability)
    outputs = {"bound": limit, "over_expected": math.nan, "over_bulk": math.nan}
    verdicts = {}
    findings: tuple[Finding, ...] = ()
    if expected is None:
        verdicts["over_expected"] = "no coherence length at this filling"
    else:
        outputs["over_expected"] = limit / expected
        if limit < expected:
            findings = (
                Finding(
                    code="singularity-smaller-than-expected", severity="note",
                    what=f"the bound is {limit / expected:.2g} of what the coherence length asks for by two-scale-factor universality",
                ),
            )  # fmt: skip
    if volume is None:
        verdicts["over_bulk"] = "no volume of the sample is recorded"
    else:
        outputs["over_bulk"] = limit / volume / bulk_per_volume()
    return Outcome(
        outputs, verdicts=verdicts, findings=findings,
        facts={"percent": parameters.probability * 100, "significance": value / u},
    )  # fmt: skip


POROUS_HEAT_STEPS: tuple[Step, ...] = (
    Step(
        name="heat-capacity-singularity", version=1, function=heat_capacity_singularity, parameters=SingularityParameters,
        takes={
            "temperature": Port("temperature", "array", "temperature of each reading"), "heat_capacity": Port("heat_capacity", "array", "heat capacity of cell and helium"),
            "rise": Port("temperature_difference", "array", "step of temperature of each reading", optional=True),
            "transition": Port("temperature", "scalar", "transition temperature of the superfluid", optional=True),
        },
        yields={
            "amplitude": Port("heat_capacity", "scalar", "amplitude of the singularity below the transition"), "scatter": Port("heat_capacity", "scalar", "rms of the residuals"),
            "background": Port("heat_capacity", "array", "smooth background"), "residual": Port("heat_capacity", "array", "heat capacity less fit"),
        },
        sentence="At the transition of the superfluid, {at_K} K, a singularity (A/alpha)|t|^-alpha (alpha = {alpha}, A above/A below = {shape_ratio}, blurred over {blur_mK} mK) on a polynomial of order {order} was fitted to {points} readings within |t| = {window}: A = {amplitude}, rms of the residuals {scatter}.",
        citations=("lipa-2003",), spread="refit", weights=("heat_capacity",), estimates=("transition",),
    ),
    Step(
        name="singularity-bound", version=1, function=singularity_bound, parameters=BoundParameters,
        takes={
            "amplitude": Port("heat_capacity", "scalar", "amplitude of the singularity as fitted"),
            "expected": Port("heat_capacity", "scalar", "expected amplitude", optional=True), "volume": Port("volume", "scalar", "outer volume of the sample", optional=True),
        },
        yields={
            "bound": Port("heat_capacity", "scalar", "amplitude that the singularity does not exceed"), "over_expected": Port("number", "scalar", "bound over the expected amplitude"),
            "over_bulk": Port("number", "scalar", "bound over the amplitude of bulk liquid, per volume"),
        },
        sentence="No singularity with an amplitude above {bound} is there ({percent} per cent); that is {over_expected} of the amplitude expected for the coherence length, and {over_bulk} of that of bulk liquid in the same volume.",
        citations=("lipa-2003",), estimates=("amplitude",),
    ),
)  # fmt: skip
"""Steps of this module."""

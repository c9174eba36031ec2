"""Steps of helium in porous media: coherence length, the singularity of the heat capacity that goes with it, and what a measurement bounds."""

from __future__ import annotations

import math

import numpy as np

from archive.physics import helium_liquid, porous_singularity
from archive.physics.constants import MOLAR_MASS_HELIUM4, T_LAMBDA
from archive.physics.porous_singularity import expected_amplitude, singular_part, upper_bound
from archive.physics.power_law import transverse_correlation_length
from archive.reduction.background_steps import known_rows, weights
from archive.reduction.estimate import Estimate, FloatArray
from archive.reduction.film_steps import DensityParameters
from archive.reduction.step import Covariance, Outcome, Port, Step
from schemas.base import Record
from schemas.finding import Finding
from schemas.lineage import SourceEntry

__all__ = ["POROUS_STEPS", "BoundParameters", "ExpectedParameters", "SingularityParameters"]


class ExpectedParameters(Record):
    """The two-scale-factor combination, with its standard uncertainty.

    Theory: M. Stroesser, M. Moennigmann, V. Dohm, Physica B 284, 41 (2000).
    """

    combination: float = porous_singularity.COMBINATION
    combination_uncertainty: float = porous_singularity.COMBINATION_UNCERTAINTY


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


def coherence_length(
    parameters: DensityParameters,
    *,
    transition: float,
    amplitude: float,
    exponent: float,
    area: float,
    volume: float,
    slope_below: float | None,
    slope_past: float | None,
    pore_diameter: float | None,
) -> Outcome:
    """Return the amplitude of the coherence length below the transition, and the superfluid density it belongs to.

    Parameters
    ----------
    transition, amplitude, exponent : float
        Of the power law: K, kg/m^2 and a pure number.
    area, volume : float
        Adsorbing area, m^2, and outer volume of the sample, m^3.
    slope_below, slope_past : float or None
        dP/dn below the onset and past it, s/mol: their ratio is chi.
    pore_diameter : float or None
        m.

    Raises
    ------
    ValueError
        A volume or amplitude that is not above zero, or no chi.

    Notes
    -----
    rho_s = sigma_s (A/V)(1 - chi): what flows freely, per volume of the sample. The area cancels against that in sigma_s, and so
    does 1 - chi, so neither is in the uncertainty. A film is three-dimensional where xi_T exceeds the pores.
    """
    if not (volume > 0 and amplitude > 0 and transition > 0):
        raise ValueError(
            f"volume, amplitude, transition: found {volume}, {amplitude}, {transition}, expected > 0"
        )
    if slope_past is not None and slope_below is not None:
        chi = slope_past / slope_below
    elif parameters.drag_factor is not None:
        chi = parameters.drag_factor
    else:
        raise ValueError("slope_past: no dose run gives chi; set drag_factor in a plan of your own")
    density = amplitude * area / volume * (1 - chi)
    length = float(transverse_correlation_length(transition, superfluid_density=density))
    outputs = {"length": length, "density": density}
    verdicts = {}
    findings: tuple[Finding, ...] = ()
    if pore_diameter is None:
        outputs["crossover"], verdicts["crossover"] = math.nan, "no pore diameter is recorded"
    else:
        outputs["crossover"] = min((length / pore_diameter) ** (1 / exponent), 1.0)
        if outputs["crossover"] < 1e-2:
            findings = (
                Finding(
                    code="coherence-length-below-pores", severity="note",
                    what=f"beyond 1 - T/T_c = {outputs['crossover']:.2g} the coherence length is shorter than the pores: a power law fitted farther out is not that of one three-dimensional superfluid",
                ),
            )  # fmt: skip
    return Outcome(
        outputs, verdicts=verdicts, findings=findings,
        facts={"chi": chi, "area_per_volume_m1": area / volume, "pore_nm": math.nan if pore_diameter is None else pore_diameter * 1e9},
    )  # fmt: skip


def _bulk_per_volume() -> float:
    return porous_singularity.BULK_AMPLITUDE * float(helium_liquid.density(T_LAMBDA)) / MOLAR_MASS_HELIUM4


def expected_singularity(parameters: ExpectedParameters, *, length: float, volume: float) -> Outcome:
    """Return the amplitude of the heat capacity that goes with a coherence length, for the whole sample, and over that of bulk liquid.

    Parameters
    ----------
    length : float
        Amplitude of the coherence length below the transition, m.
    volume : float
        Of the sample, m^3.

    Raises
    ------
    ValueError
        A length that is not above zero.

    Notes
    -----
    The ratio compares equal volumes of sample and of bulk liquid at saturated vapour pressure.
    """
    per_volume = float(expected_amplitude(length, combination=parameters.combination))
    u = parameters.combination_uncertainty
    relative = 3 * u / parameters.combination
    ratio = per_volume / _bulk_per_volume()
    source = SourceEntry(
        name=f"two-scale-factor combination {parameters.combination:g}",
        description=f"standard uncertainty {u:g}", level="laboratory",
    )  # fmt: skip
    outputs = {"amplitude": per_volume * volume, "ratio": ratio}
    return Outcome(
        outputs, shared={name: {source.name: value * relative} for name, value in outputs.items()}, sources=(source,) if relative else (),
        facts={"per_volume_J_K_m3": per_volume, "below_bulk": 1 / ratio},
    )  # fmt: skip


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
        outputs["over_bulk"] = limit / volume / _bulk_per_volume()
    return Outcome(
        outputs, verdicts=verdicts, findings=findings,
        facts={"percent": parameters.probability * 100, "significance": value / u},
    )  # fmt: skip


_T = Port("temperature", "array", "temperature of each reading")
_VOLUME = Port("volume", "scalar", "outer volume of the sample")
_LENGTH = Port("length", "scalar", "amplitude of the coherence length below the transition")

POROUS_STEPS: tuple[Step, ...] = (
    Step(
        name="porous-coherence-length", version=1, function=coherence_length, parameters=DensityParameters,
        takes={
            "transition": Port("temperature", "scalar", "transition temperature of the power law"), "amplitude": Port("areal_mass_density", "scalar", "amplitude of the power law"),
            "exponent": Port("number", "scalar", "exponent of the power law"), "area": Port("area", "scalar", "adsorbing area"), "volume": _VOLUME,
            "slope_below": Port("amount_sensitivity", "scalar", "period per amount below the onset", optional=True),
            "slope_past": Port("amount_sensitivity", "scalar", "period per amount past the onset", optional=True),
            "pore_diameter": Port("length", "scalar", "pore diameter", optional=True),
        },
        yields={
            "length": _LENGTH, "density": Port("density", "scalar", "amplitude of the superfluid density per volume of the sample"),
            "crossover": Port("number", "scalar", "1 - T/T_c at which the coherence length equals the pore diameter"),
        },
        sentence="Per volume of the sample the superfluid density has the amplitude {density} (chi = {chi}), so the transverse correlation length, m^2 k_B T/(hbar^2 rho_s), has the amplitude {length}; it equals the pore diameter at 1 - T/T_c = {crossover}.",
        citations=("josephson-1966", "bishop-1981"),
    ),
    Step(
        name="expected-singularity", version=1, function=expected_singularity, parameters=ExpectedParameters,
        takes={"length": _LENGTH, "volume": _VOLUME},
        yields={
            "amplitude": Port("heat_capacity", "scalar", "expected amplitude of the heat capacity below the transition, of the sample"),
            "ratio": Port("number", "scalar", "expected amplitude over that of bulk liquid, per volume"),
        },
        sentence="Two-scale-factor universality, xi_0T (A^-/k_B)^(1/3) = {combination}, asks for a singularity of the heat capacity with the amplitude {amplitude} in the sample, {below_bulk} times smaller than that of bulk liquid in the same volume.",
        citations=("stroesser-2000",),
    ),
    Step(
        name="heat-capacity-singularity", version=1, function=heat_capacity_singularity, parameters=SingularityParameters,
        takes={
            "temperature": _T, "heat_capacity": Port("heat_capacity", "array", "heat capacity of cell and helium"),
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

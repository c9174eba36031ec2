"""Steps of helium in porous media: coherence length, and the singularity of the heat capacity that goes with it."""

from __future__ import annotations

import math

from archive.physics import helium_liquid, porous_singularity
from archive.physics.constants import MOLAR_MASS_HELIUM4, T_LAMBDA
from archive.physics.porous_singularity import expected_amplitude
from archive.physics.power_law import transverse_correlation_length
from archive.reduction.film_steps import DensityParameters
from archive.reduction.step import Outcome, Port, Step
from schemas.base import Record
from schemas.finding import Finding
from schemas.lineage import SourceEntry

__all__ = ["POROUS_STEPS", "ExpectedParameters", "bulk_per_volume"]


class ExpectedParameters(Record):
    """The two-scale-factor combination, with its standard uncertainty.

    Theory: M. Stroesser, M. Moennigmann, V. Dohm, Physica B 284, 41 (2000).
    """

    combination: float = porous_singularity.COMBINATION
    combination_uncertainty: float = porous_singularity.COMBINATION_UNCERTAINTY


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


def bulk_per_volume() -> float:
    """Return the amplitude of bulk liquid at saturated vapour pressure, per volume, J/(K m^3)."""
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
    ratio = per_volume / bulk_per_volume()
    source = SourceEntry(
        name=f"two-scale-factor combination {parameters.combination:g}",
        description=f"standard uncertainty {u:g}", level="laboratory",
    )  # fmt: skip
    outputs = {"amplitude": per_volume * volume, "ratio": ratio}
    return Outcome(
        outputs, shared={name: {source.name: value * relative} for name, value in outputs.items()}, sources=(source,) if relative else (),
        facts={"per_volume_J_K_m3": per_volume, "below_bulk": 1 / ratio},
    )  # fmt: skip


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
)  # fmt: skip
"""Steps of this module."""

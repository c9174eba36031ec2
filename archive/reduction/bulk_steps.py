"""Steps of bulk liquid near the lambda point: fractions from an oscillator, their power law, the two-scale-factor combination."""

from __future__ import annotations

import math

import numpy as np

from archive.physics import helium_liquid
from archive.physics.bulk_superfluid import fit_superfluid_law, transition_estimate
from archive.physics.constants import MOLAR_MASS_HELIUM4, T_LAMBDA
from archive.physics.power_law import transverse_correlation_length
from archive.physics.two_scale_factor import two_scale_factor
from archive.reduction.background_steps import known_rows, weights
from archive.reduction.bulk_fraction import BulkParameters, normal_fraction
from archive.reduction.estimate import FloatArray
from archive.reduction.lambda_line_steps import LIQUID_PORTS
from archive.reduction.row_choice import chosen_rows, row_numbers
from archive.reduction.step import Covariance, NoParameters, Outcome, Port, Step
from schemas.base import Record
from schemas.finding import Finding

__all__ = ["BULK_STEPS", "LawParameters"]


class LawParameters(Record):
    """Window and form of the power law."""

    low: float = 1e-4
    high: float = 0.03
    terms: int = 4
    """2: amplitude and exponent; 3: with the confluent term; 4: with the regular term, too."""
    lambda_temperature_kelvin: float | None = None
    """Held; fitted when none."""
    rows: tuple[int, ...] | None = None
    """The rows to fit, from 1, in place of the window."""


def superfluid_law(
    parameters: LawParameters,
    *,
    temperature: FloatArray,
    superfluid_fraction: FloatArray,
    lambda_density: float,
    u_superfluid_fraction: FloatArray | None,
    u_temperature: FloatArray | None,
) -> Outcome:
    """Return transition temperature, amplitude and exponent of the superfluid fraction, and the length that goes with them.

    Parameters
    ----------
    temperature, superfluid_fraction : ndarray
    lambda_density : float
        Density of the liquid at its lambda point, kg/m^3.
    u_superfluid_fraction, u_temperature : ndarray or None
        Point uncertainties.

    Raises
    ------
    ValueError
        Too few rows in the window, or a fit that does not converge.

    Notes
    -----
    The covariance of all outputs is kept; scatter beyond the stated uncertainty enlarges it, less scatter does not make it smaller.
    """
    known = known_rows(temperature, superfluid_fraction)
    T, f = temperature[known], superfluid_fraction[known]
    u, u_T = weights(u_superfluid_fraction, known), weights(u_temperature, known)
    fixed = parameters.lambda_temperature_kelvin is not None
    start = parameters.lambda_temperature_kelvin or transition_estimate(T, f)
    rows = None if parameters.rows is None else chosen_rows(parameters.rows, temperature.size)[known]
    found = fit_superfluid_law(
        T, f, start_temperature=start, fixed=fixed, terms=parameters.terms, window=(parameters.low, parameters.high), rows=rows,
        standard_uncertainty=u, temperature_uncertainty=u_T, absolute=u is not None,
    )  # fmt: skip
    if not found.converged:
        raise ValueError(f"superfluid_fraction: the power law was not fitted: {found.message}")
    fit = found.fit
    values = dict(zip(fit.names, map(float, fit.values), strict=True))
    T_lambda = found.transition_temperature
    length = float(
        transverse_correlation_length(T_lambda, superfluid_density=values["amplitude"] * lambda_density)
    )
    slopes = [
        {"amplitude": -length / values["amplitude"], "transition_temperature": length / T_lambda}.get(
            name, 0.0
        )
        for name in fit.names
    ]
    jacobian = np.vstack([np.eye(len(fit.names)), slopes])
    covariance = np.asarray(fit.covariance) * (max(fit.reduced_chi2, 1.0) if u is not None else 1.0)
    spread = np.sqrt(np.diag(covariance))
    called = {"transition_temperature": "lambda_temperature"}
    names = (*(called.get(name, name) for name in fit.names), "coherence_length")
    used = np.zeros(temperature.shape, dtype=np.bool_)
    used[np.flatnonzero(known)[found.used]] = True
    return Outcome(
        {
            "lambda_temperature": T_lambda, "exponent": values["exponent"], "amplitude": values["amplitude"],
            "confluent": values.get("confluent", math.nan), "regular": values.get("regular", math.nan), "coherence_length": length,
        },
        covariance=Covariance(names, jacobian @ covariance @ jacobian.T),
        held={"rows": row_numbers(used)},
        facts={
            "points": int(np.count_nonzero(used)), "low": float(1 - T[found.used].max() / T_lambda), "high": float(1 - T[found.used].min() / T_lambda),
            "reduced_chi2": fit.reduced_chi2 if u is not None else math.nan,
            "correlation": float(covariance[0, 1] / (spread[0] * spread[1])), "treated": "held" if fixed else "fitted",
        },
    )  # fmt: skip


def two_scale(
    _: NoParameters,
    *,
    heat_capacity_amplitude: float,
    coherence_length: float,
    liquid_density: float | None = None,
) -> Outcome:
    """Return the two-scale-factor combination, with a warning outside 0.80 to 0.88.

    Parameters
    ----------
    heat_capacity_amplitude, coherence_length : float
        J/(mol K), m.
    liquid_density : float or None
        At the lambda point, as stated for a run under pressure, kg/m^3; else that of saturated liquid.

    Raises
    ------
    ValueError
        An amplitude that is not above zero.
    """
    rho = float(helium_liquid.density(T_LAMBDA)) if liquid_density is None else liquid_density
    volume = MOLAR_MASS_HELIUM4 / rho
    R = float(
        two_scale_factor(
            coherence_length, heat_capacity_amplitude=heat_capacity_amplitude, molar_volume=volume
        )
    )
    findings: tuple[Finding, ...] = ()
    if not 0.80 <= R <= 0.88:
        findings = (
            Finding(
                code="two-scale-factor",
                severity="warning",
                what=f"the two-scale-factor combination is {R:.3f}; one of the amplitudes is off, or is defined otherwise",
                expected="0.80 to 0.88 (common practice, no source)",
            ),
        )
    return Outcome({"combination": R}, facts={"molar_volume_cm3": volume * 1e6}, findings=findings)


_TEMPERATURE = Port("temperature", "array", "temperature of each row")
_FRACTION = Port("fraction", "array", "superfluid density over density")

BULK_STEPS: tuple[Step, ...] = (
    Step(
        name="bulk-normal-fraction", version=1, function=normal_fraction, parameters=BulkParameters,
        takes={
            "temperature": _TEMPERATURE, "period": Port("period", "array", "period of each row"),
            "background": Port("period", "array", "coefficients of the empty cell's period"),
            "low": Port("temperature", "scalar", "lower end of the background"), "high": Port("temperature", "scalar", "upper end of the background"),
            "gap": Port("length", "scalar", "distance of neighbouring plates"),
            "pressure": Port("pressure", "array", "pressure of the liquid", optional=True), **LIQUID_PORTS,
        },
        yields={
            "normal_density": Port("density", "array", "density of the normal component"),
            "superfluid_density": Port("density", "array", "density of the superfluid component"),
            "normal_fraction": Port("fraction", "array", "normal density over density"), "superfluid_fraction": _FRACTION,
            "penetration_depth": Port("length", "array", "viscous penetration depth"),
            "coupled_inertia": Port("number", "scalar", "inertia of the wholly coupled liquid at the lambda point over that of the empty cell"),
            "lambda_density": Port("density", "scalar", "density of the liquid at the lambda point"),
        },
        sentence="The normal fraction is the inertia that the liquid adds, (P/P_empty)^2 - 1, over {coupled_inertia}, which {rows_above} rows above the lambda point give; half the gap, {half_gap_um} um, is at most {largest_gap_over_depth} of the viscous penetration depth, and the inertia missing for that (up to {missing_inertia}) was counted. The density is from {density_from}; chi = {chi}.",
        citations=("donnelly-1998",), spread="refit", weights=("period",),
        effects={"slip": "The part of the normal component that the plates do not drag along was computed from gap and viscosity (at most {missing_inertia} of its inertia) and counted."},
    ),
    Step(
        name="bulk-superfluid-law", version=1, function=superfluid_law, parameters=LawParameters,
        takes={
            "temperature": _TEMPERATURE, "superfluid_fraction": _FRACTION,
            "lambda_density": Port("density", "scalar", "density of the liquid at the lambda point"),
        },
        yields={
            "lambda_temperature": Port("temperature", "scalar", "lambda temperature"), "exponent": Port("number", "scalar", "exponent zeta"),
            "amplitude": Port("number", "scalar", "amplitude k_0 of the superfluid fraction"), "confluent": Port("number", "scalar", "coefficient of the confluent term"),
            "regular": Port("number", "scalar", "coefficient of the regular term"),
            "coherence_length": Port("length", "scalar", "amplitude of the transverse correlation length"),
        },
        sentence="rho_s/rho = k_0 (1 + k_1 t) t^zeta (1 + D t^0.5) was fitted to {points} points with t from {low} to {high}: zeta = {exponent}, k_0 = {amplitude} (correlation {correlation}), D = {confluent}, k_1 = {regular}, T_lambda = {lambda_temperature} ({treated}); chi^2 per degree of freedom {reduced_chi2}. The transverse correlation length, m^2 k_B T/(hbar^2 rho_s), has the amplitude {coherence_length}.",
        citations=("singsaas-1984", "josephson-1966"), spread="refit", weights=("superfluid_fraction", "temperature"),
    ),
    Step(
        name="two-scale-factor", version=1, function=two_scale,
        takes={
            "heat_capacity_amplitude": Port("molar_heat_capacity", "scalar", "amplitude of the heat capacity below the transition"),
            "coherence_length": Port("length", "scalar", "amplitude of the transverse correlation length"),
            "liquid_density": LIQUID_PORTS["liquid_density"],
        },
        yields={"combination": Port("number", "scalar", "two-scale-factor combination")},
        sentence="The two-scale-factor combination xi_0T (A^-/k_B)^(1/3), with {molar_volume_cm3} cm^3/mol, is {combination}.",
        citations=("stroesser-2000",),
    ),
)  # fmt: skip

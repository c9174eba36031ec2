"""The static transition of a film from what an oscillator shows, by the dynamic theory with held parameters.

Rules: what holding a parameter costs is a source of uncertainty of its own, named after the parameter and common to
every film; nothing here is fitted.
"""

from __future__ import annotations

import math
from functools import lru_cache

import numpy as np

from archive.physics import film_dynamic, film_features, film_static
from archive.physics.linear_fit import linear_fit
from archive.reduction.background_steps import known_rows
from archive.reduction.estimate import Estimate, FloatArray
from archive.reduction.step import Outcome
from schemas.base import Record
from schemas.finding import Finding
from schemas.lineage import SourceEntry, Value

__all__ = [
    "BEYOND",
    "DynamicParameters",
    "RatioParameters",
    "static_transition",
    "transition_from_peak",
    "universal_ratio",
]

BEYOND = "T_KT beyond first order, in the areal density at the transition"
"""Name of the source; held parameters move T_KT of all films together, so all films share it."""


class DynamicParameters(Record):
    """Parameters of the dynamic theory that are held, with the standard uncertainty that holding them costs.

    b: films on plastic gave 5 to 6 (D. J. Bishop, J. D. Reppy, Phys. Rev. B 22, 5171 (1980), from memory). ln(D/a^2): D from
    hbar/4m (P. W. Adams, W. I. Glaberson, Phys. Rev. Lett. 57, 82 (1986)) to hbar/m, a vortex core of 2.5(1.2) nm
    (K. Shirahama et al., Phys. Rev. Lett. 64, 1541 (1990)) give 20.9 with D in m^2/s and a in m.
    """

    b: float = 5.5
    b_uncertainty: float = 1.0
    log_diffusivity: float = 20.9
    """ln(D/a^2 in 1/s)."""
    log_diffusivity_uncertainty: float = 1.0
    free_vortices: float = 1.0
    """F."""
    free_vortices_uncertainty: float = 0.3
    x0: float = -0.5
    """Bare start of the flow; only a combination with the core size is measurable, so it is chosen."""


class RatioParameters(DynamicParameters):
    """The same for an areal density that is read at the transition."""

    beyond_first_order: bool = True
    """Whether to state what first order misses; held at no while inputs are moved or drawn, for a drawn transition finds it by
    itself."""


# The shift depends on held numbers alone; every shifted evaluation asks for it again.
@lru_cache(maxsize=256)
def _shift(b: float, L: float, F: float, x0: float) -> float:
    return film_features.shift_of_crossing(b=b, L=L, F=F, x0=x0)


@lru_cache(maxsize=256)
def _peak_ratio(b: float, L: float, F: float, x0: float) -> float:
    return film_features.dissipation_peak(
        lambda ratio: film_dynamic.fixed_start(ratio, b=b, x0=x0), L=L, F=F
    ).ratio


@lru_cache(maxsize=256)
def _at_transition(b: float, L: float, F: float, x0: float) -> float:
    """Observed areal density at the static transition over the universal value there."""
    ratio = np.array([1.0])
    stiffness = film_dynamic.complex_stiffness(film_dynamic.fixed_start(ratio, b=b, x0=x0), L=L, F=F)
    return float(film_dynamic.reduced_response(ratio, stiffness)[0][0])


def _held(
    parameters: DynamicParameters, period: float | FloatArray
) -> tuple[dict[str, float], list[tuple[str, float, str]]]:
    """Return the held parameters at the oscillator's frequency, and their uncertainties with the names of the sources."""
    P = float(np.nanmedian(period))
    # Rounded, so that a period moved by a nanosecond does not start the flow integration anew.
    L = round(parameters.log_diffusivity - math.log(2 * math.pi / P), 5)
    values = {"b": parameters.b, "L": L, "F": parameters.free_vortices, "x0": parameters.x0}
    spreads = [
        ("b", parameters.b_uncertainty, f"b = {parameters.b:g} of the dynamic theory, held"),
        ("L", parameters.log_diffusivity_uncertainty, f"ln(D/a^2 s) = {parameters.log_diffusivity:g} of the dynamic theory, held"),
        ("F", min(parameters.free_vortices_uncertainty, parameters.free_vortices), f"F = {parameters.free_vortices:g} of the dynamic theory, held"),
    ]  # fmt: skip
    return values, spreads


def _theory(
    function: object, parameters: DynamicParameters, period: float | FloatArray
) -> tuple[float, dict[str, float], tuple[SourceEntry, ...], dict[str, float]]:
    """Return a number of the dynamic theory, what each held parameter contributes, the sources, and the values."""
    assert callable(function)  # noqa: S101 - one of the three cached functions above
    values, spreads = _held(parameters, period)
    parts: dict[str, float] = {}
    entries = []
    for key, u, name in spreads:
        if u > 0:
            up, down = (function(**{**values, key: values[key] + sign * u}) for sign in (1, -1))
            parts[name] = (up - down) / 2
            entries.append(
                SourceEntry(
                    name=name,
                    description=f"standard uncertainty {u:g} of the held parameter",
                    level="laboratory",
                    stated=Value(
                        value=parameters.log_diffusivity if key == "L" else values[key],
                        uncertainty=u,
                        unit="1",
                    ),
                )
            )
    return float(function(**values)), parts, tuple(entries), values


def static_transition(
    parameters: DynamicParameters, *, crossing: float, period: float | FloatArray
) -> Outcome:
    """Return the static transition temperature from the crossing, which the dynamics moves up.

    Parameters
    ----------
    crossing : float
        Where the observed areal density meets the universal line, K.
    period : float or ndarray
        s; its median counts.

    Raises
    ------
    ValueError
        Held parameters for which theory has no crossing.
    """
    shift, parts, sources, values = _theory(_shift, parameters, period)
    T = crossing / (1 + shift)
    shared = {name: -T / (1 + shift) * part for name, part in parts.items()}
    facts = {"shift_mK": (crossing - T) * 1e3, "relative_shift": shift, "L": values["L"]}
    return Outcome(
        {"transition_temperature": T}, shared={"transition_temperature": shared}, sources=sources, facts=facts
    )


def transition_from_peak(
    parameters: DynamicParameters, *, peak: float, period: float | FloatArray
) -> Outcome:
    """Return the static transition temperature from the dissipation peak, which rests on no areal density."""
    ratio, parts, sources, values = _theory(_peak_ratio, parameters, period)
    T = peak / ratio
    shared = {name: -T / ratio * part for name, part in parts.items()}
    return Outcome(
        {"transition_temperature": T},
        shared={"transition_temperature": shared},
        sources=sources,
        facts={"ratio": ratio, "L": values["L"], "shift_mK": (peak - T) * 1e3},
    )


def universal_ratio(
    parameters: RatioParameters,
    *,
    temperature: FloatArray,
    superfluid_density: FloatArray,
    transition: float,
    period: float | FloatArray,
    transition_estimate: Estimate | None = None,
) -> Outcome:
    """Return sigma_s(T_KT)/T_KT over the universal constant: a test of area, mass loading and alignment.

    Parameters
    ----------
    transition : float
        Static transition temperature, K; from the dissipation peak, or the test says nothing of the areal density.
    transition_estimate : Estimate, optional
        The same with its uncertainty; without it nothing beyond first order is stated.

    Raises
    ------
    ValueError
        The record does not reach the transition.

    Notes
    -----
    What the oscillator reports at T_KT exceeds the static jump by a factor that the dynamic theory gives with its held
    parameters; the measured value is divided by it.

    The areal density falls ever more steeply past T_KT. Over the standard uncertainty of T_KT, most of it that of held parameters, it
    is no straight line, and first order understates. So the results are also taken at five temperatures about T_KT, and averaged
    with the weights of a normal law; by how much their variance exceeds that of first order is a source of its own, common to all
    films. The distribution stays skewed towards small values: a Monte Carlo run gives its interval.

    References
    ----------
    JCGM 100:2008, 5.1.2 note (where the function is significantly not linear, more than first order is needed).
    M. Abramowitz, I. A. Stegun, Handbook of Mathematical Functions (1964), 25.4.46 (Gauss-Hermite quadrature).
    """
    excess, parts, sources, _ = _theory(_at_transition, parameters, period)
    level, u_level, points = _level(temperature, superfluid_density, transition)
    density, u = level / excess, u_level / excess
    ratio = density / (film_static.UNIVERSAL_JUMP * transition)
    relative = {name: -part / excess for name, part in parts.items()}
    shared = {"ratio": {n: ratio * p for n, p in relative.items()}, "density_at_transition": {n: density * p for n, p in relative.items()}}  # fmt: skip
    findings = _off_the_line(ratio, transition)
    spread = None if transition_estimate is None else float(transition_estimate.uncertainty)
    if parameters.beyond_first_order and spread:
        added, entries, said = _beyond_first_order(
            temperature, superfluid_density, transition, spread, excess
        )
        for name, part in added.items():
            shared[name] |= {BEYOND: part}
        sources, findings = (*sources, *entries), (*findings, *said)
    return Outcome(
        {"ratio": ratio, "density_at_transition": density},
        point={"ratio": u / (film_static.UNIVERSAL_JUMP * transition), "density_at_transition": u},
        shared=shared, sources=sources, held={"beyond_first_order": False},
        facts={"dynamic_excess": excess, "points": points}, findings=findings,
    )  # fmt: skip


def _level(temperature: FloatArray, superfluid_density: FloatArray, at: float) -> tuple[float, float, int]:
    """Return the observed areal density at a temperature, its uncertainty by scatter, and the number of rows."""
    rows = known_rows(temperature, superfluid_density)
    near = rows & (np.abs(np.nan_to_num(temperature) / at - 1) < 0.01)
    count = int(np.count_nonzero(near))
    if count < 6:
        raise ValueError(
            f"temperature: found {count} rows within one per cent of {at:.5g} K, expected at least 6"
        )
    x = temperature[near] / at - 1
    fit = linear_fit(
        np.vander(x / 0.01, 3, increasing=True),
        superfluid_density[near],
        names=("level", "slope", "curve"),
        absolute=False,
    )
    return float(fit.values[0]), float(np.sqrt(fit.covariance[0, 0])), count


def _beyond_first_order(
    temperature: FloatArray, superfluid_density: FloatArray, transition: float, u: float, excess: float
) -> tuple[dict[str, float], tuple[SourceEntry, ...], tuple[Finding, ...]]:  # fmt: skip
    """Return what the uncertainty of T_KT adds to both results beyond first order, its source, and what is to be said of it."""
    nodes, weights = np.polynomial.hermite_e.hermegauss(5)
    weights = weights / weights.sum()

    def results(sizes: FloatArray) -> dict[str, FloatArray]:
        at = transition + u * sizes
        density = np.array([_level(temperature, superfluid_density, float(each))[0] for each in at]) / excess
        return {"ratio": density / (film_static.UNIVERSAL_JUMP * at), "density_at_transition": density}

    try:
        straight, drawn = results(np.array([-1.0, 1.0])), results(nodes)
    except ValueError as error:
        what = f"T_KT is uncertain by {u * 1e3:.2g} mK; what that does to the areal density there beyond first order cannot be told, and may be more than is stated: {error}"
        return {}, (), (Finding(code="first-order-only", severity="warning", what=what, remedy="record more rows on both sides of the transition"),)  # fmt: skip
    added, larger = {}, 1.0
    for name, values in drawn.items():
        first = float(straight[name][1] - straight[name][0]) / 2
        variance = float(weights @ (values - weights @ values) ** 2)
        added[name] = math.sqrt(max(variance - first**2, 0.0))
        larger = max(larger, math.sqrt(variance) / abs(first) if first else 1.0)
    entry = SourceEntry(
        name=BEYOND, level="laboratory",
        description="scatter of the areal density over the uncertainty of T_KT, less that of first order (JCGM 100:2008, 5.1.2 note)",
    )  # fmt: skip
    said: tuple[Finding, ...] = ()
    if larger > 1.1:
        low, high = (float(each) for each in drawn["ratio"][[1, 3]])
        said = (
            Finding(
                code="skewed", severity="note",
                what=f"sigma_s(T_KT)/T_KT is {low:.2f} of the universal value at T_KT less {nodes[3]:.2g} of its standard uncertainties, {high:.2f} at T_KT and as much; the distribution is skewed",
                remedy="quote the interval of a Monte Carlo run (--monte-carlo) in place of value and uncertainty",
            ),
        )  # fmt: skip
    return added, (entry,), said


def _off_the_line(ratio: float, transition: float) -> tuple[Finding, ...]:
    if abs(ratio - 1) <= 0.15:
        return ()
    what = f"sigma_s(T_KT)/T_KT is {ratio:.3f} of the universal value; more than 15 per cent off points to area, chi or alignment, above 1 K also to dense vapour"
    return (Finding(code="universal-line", severity="warning" if transition < 1 else "note", what=what),)

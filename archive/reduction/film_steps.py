"""Steps of a superfluid film: areal density, crossing of the universal line, static transition, power law."""

from __future__ import annotations

import math
from functools import lru_cache

import numpy as np
import numpy.typing as npt

from archive.physics import film_dynamic, film_features, film_static
from archive.physics.constants import MOLAR_MASS_HELIUM4
from archive.physics.linear_fit import linear_fit
from archive.physics.power_law import fit_power_law
from archive.physics.universal_line import crossing_of_universal_line
from archive.reduction.background_steps import known_rows, weights
from archive.reduction.estimate import FloatArray
from archive.reduction.step import Covariance, Outcome
from schemas.base import Record
from schemas.finding import Finding
from schemas.lineage import SourceEntry
from schemas.substrate import Sample

__all__ = [
    "CrossingParameters",
    "DensityParameters",
    "DynamicParameters",
    "PeakParameters",
    "PowerLawParameters",
    "dissipation_peak",
    "power_law_transition",
    "static_transition",
    "superfluid_density",
    "transition_from_peak",
    "universal_crossing",
    "universal_ratio",
]


class DensityParameters(Record):
    """The drag factor, where no dose run gives it."""

    drag_factor: float | None = None
    """chi; 0 for a smooth closed annulus or a flat disc turning about its own axis."""


class PeakParameters(Record):
    """How the maximum of the dissipation is read."""

    share: float = 0.6
    """Rows of at least this share of the maximum are fitted."""
    rows: tuple[int, ...] | None = None
    """The rows to fit, from 1, in place of that rule."""


class CrossingParameters(Record):
    """How the crossing of the universal line is read."""

    half_width: float = 0.01
    """Rows within this share of the temperature are fitted."""
    points: int | None = None
    order: int = 2


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
        Neither a slope past the onset nor a drag factor, or a chi outside [0, 1).
    """
    if sample is not None and sample.isotope not in ("4He", "3He-4He"):
        raise ValueError(f"sample: found {sample.isotope}, expected 4He")
    if slope_past is None and parameters.drag_factor is None:
        raise ValueError(
            "slope_past: no dose run gives the part of the film that is dragged along; set drag_factor in a plan of your own, 0 for a smooth flat disc"
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
        "period_per_areal_density": per_areal_density * 1e9,
        "chi": chi,
        "chi_from": "the slopes of the dose run" if slope_past is not None else "the plan",
    }
    return Outcome({"superfluid_density": sigma}, facts=facts)


def dissipation_peak(
    parameters: PeakParameters,
    *,
    temperature: FloatArray,
    dissipation: FloatArray,
    u_dissipation: FloatArray | None,
) -> Outcome:
    """Return the temperature and height of the dissipation peak, from a cubic through its top.

    Raises
    ------
    ValueError
        No peak inside the record.
    """
    rows = known_rows(temperature, dissipation)
    if np.count_nonzero(rows) < 8:
        raise ValueError(f"dissipation: found {np.count_nonzero(rows)} rows, expected at least 8")
    order = np.flatnonzero(rows)[np.argsort(temperature[rows], kind="stable")]
    chosen = (
        np.array(parameters.rows, dtype=np.int64) - 1
        if parameters.rows
        else _top(temperature[order], dissipation[order], order, parameters.share)
    )
    T, q = temperature[chosen], dissipation[chosen]
    u = weights(u_dissipation, chosen)
    low, high = float(T.min()), float(T.max())
    if chosen.size < 5:
        raise ValueError(
            f"dissipation: found {chosen.size} rows in the top of the peak, from {low:.5g} K to {high:.5g} K, expected at least 5"
        )
    centre, half = (low + high) / 2, (high - low) / 2
    x = (T - centre) / half
    fit = linear_fit(
        np.vander(x, 4, increasing=True),
        q,
        names=("a", "b", "c", "d"),
        standard_uncertainty=u,
        absolute=False,
    )
    _, b, c, d = map(float, fit.values)
    at = _vertex(b, c, d)
    if not -1 < at < 1:
        raise ValueError("dissipation: its maximum lies at the edge of the record; there is no peak")
    curvature = 2 * c + 6 * d * at
    powers = np.array([1.0, at, at**2, at**3])
    slopes = np.array([0.0, 1.0, 2 * at, 3 * at**2])
    # The vertex moves by -(d slope)/curvature; the height to first order by the value alone.
    jacobian = np.vstack([-slopes / curvature * half, powers])
    covariance = jacobian @ fit.covariance @ jacobian.T
    outputs = {"peak_temperature": centre + half * at, "peak_height": float(powers @ fit.values)}
    return Outcome(
        outputs, covariance=Covariance(("peak_temperature", "peak_height"), covariance), held={"rows": tuple(int(row) + 1 for row in chosen)},
        facts={"points": int(chosen.size), "low_K": low, "high_K": high},
    )  # fmt: skip


def _top(T: FloatArray, q: FloatArray, order: npt.NDArray[np.int64], share: float) -> npt.NDArray[np.int64]:
    """Return the rows around the maximum with at least a share of it, smoothed twice: roughly, then finer than the peak."""
    width = max(1, min(T.size // 40, 25))
    first, after = 0, T.size
    for _ in range(3):
        smooth = _smoothed(q, width)
        k = first + int(np.argmax(smooth[first:after]))
        enough = smooth >= share * smooth[k]
        before, behind = np.flatnonzero(~enough[:k]), np.flatnonzero(~enough[k:])
        if not (before.size and behind.size):
            raise ValueError(
                "dissipation: it does not fall to either side of its maximum inside the record; there is no peak"
            )
        first, after = int(before[-1]) + 1, k + int(behind[0])
        width = max(1, min(width, (after - first) // 10))
    return order[first:after]


def _smoothed(q: FloatArray, width: int) -> FloatArray:
    return np.convolve(np.pad(q, width, mode="edge"), np.ones(2 * width + 1) / (2 * width + 1), mode="valid")


def _vertex(b: float, c: float, d: float) -> float:
    """Return the maximum of b x + c x^2 + d x^3 nearest to zero."""
    roots = np.polynomial.polynomial.polyroots(np.trim_zeros(np.array([b, 2 * c, 3 * d]), "b"))
    real = roots.real[(np.abs(roots.imag) < 1e-12) & (2 * c + 6 * d * roots.real < 0)]
    return float(real[np.argmin(np.abs(real))]) if real.size else math.nan


def universal_crossing(
    parameters: CrossingParameters,
    *,
    temperature: FloatArray,
    superfluid_density: FloatArray,
    u_superfluid_density: FloatArray | None,
    u_temperature: FloatArray | None,
) -> Outcome:
    """Return where the areal density, as the oscillator reports it, falls through the universal line.

    Raises
    ------
    ValueError
        No crossing, with the reason.
    """
    rows = known_rows(temperature, superfluid_density)
    T, sigma = temperature[rows], superfluid_density[rows]
    u = weights(u_superfluid_density, rows)
    points = parameters.points or _points(T, sigma, u, parameters)
    if u is not None and u_temperature is not None:
        rough = crossing_of_universal_line(
            T, sigma, standard_uncertainty=u, points=points, order=parameters.order
        )
        if rough.found:
            u = np.hypot(u, rough.slope * u_temperature[rows])
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
    parameters: DynamicParameters,
    *,
    temperature: FloatArray,
    superfluid_density: FloatArray,
    transition: float,
    period: float | FloatArray,
) -> Outcome:
    """Return sigma_s(T_KT)/T_KT over the universal constant: a test of area, mass loading and alignment.

    Parameters
    ----------
    transition : float
        Static transition temperature, K; from the dissipation peak, or the test says nothing of the areal density.

    Raises
    ------
    ValueError
        The record does not reach the transition.

    Notes
    -----
    What the oscillator reports at T_KT exceeds the static jump by a factor that the dynamic theory gives with its held
    parameters; the measured value is divided by it.
    """
    rows = known_rows(temperature, superfluid_density)
    near = rows & (np.abs(np.nan_to_num(temperature) / transition - 1) < 0.01)
    if np.count_nonzero(near) < 6:
        raise ValueError(
            f"temperature: found {np.count_nonzero(near)} rows within one per cent of {transition:.5g} K, expected at least 6"
        )
    x = temperature[near] / transition - 1
    fit = linear_fit(
        np.vander(x / 0.01, 3, increasing=True),
        superfluid_density[near],
        names=("level", "slope", "curve"),
        absolute=False,
    )
    excess, parts, sources, _ = _theory(_at_transition, parameters, period)
    density = float(fit.values[0]) / excess
    ratio = density / (film_static.UNIVERSAL_JUMP * transition)
    u = float(np.sqrt(fit.covariance[0, 0])) / excess
    shared = {name: -part / excess for name, part in parts.items()}
    findings: tuple[Finding, ...] = ()
    if abs(ratio - 1) > 0.15:
        findings = (
            Finding(
                code="universal-line",
                severity="warning" if transition < 1 else "note",
                what=f"sigma_s(T_KT)/T_KT is {ratio:.3f} of the universal value; more than 15 per cent off points to area, chi or alignment, above 1 K also to dense vapour",
            ),
        )
    return Outcome(
        {"ratio": ratio, "density_at_transition": density},
        point={"ratio": u / (film_static.UNIVERSAL_JUMP * transition), "density_at_transition": u},
        shared={"ratio": {n: ratio * p for n, p in shared.items()}, "density_at_transition": {n: density * p for n, p in shared.items()}},
        sources=sources, facts={"dynamic_excess": excess, "points": int(np.count_nonzero(near))}, findings=findings,
    )  # fmt: skip


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

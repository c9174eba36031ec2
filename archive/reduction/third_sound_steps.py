"""Steps of third sound: its speed, the film's thickness, the areal superfluid density, and where it ends.

Rules: thickness is that of the whole film; Gamma is the substrate's attraction less helium's own, in K layer^3 with layers of
0.36 nm; what holding it costs is a source of its own, the same in thickness and density.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from archive.physics.constants import MOLAR_MASS_HELIUM4
from archive.physics.film_static import UNIVERSAL_JUMP
from archive.physics.frenkel_halsey_hill import film_thickness, van_der_waals_strength
from archive.physics.linear_fit import straight_line
from archive.physics.third_sound import third_sound_speed
from archive.reduction.background_steps import known_rows, weights
from archive.reduction.estimate import FloatArray
from archive.reduction.step import Outcome, Port, Step
from schemas.base import Record
from schemas.cell import ThirdSoundRing
from schemas.finding import Finding
from schemas.lineage import SourceEntry
from schemas.substrate import Substrate

__all__ = [
    "THIRD_SOUND_STEPS",
    "OnsetParameters",
    "SpeedParameters",
    "WallParameters",
    "areal_density_from_speed",
    "speed_of_third_sound",
    "thickness_from_pressure",
    "third_sound_onset",
]

LAYER = 0.36e-9
"""m: the layer that Gamma is stated in (common practice, no source)."""


class SpeedParameters(Record):
    """Which resonance was followed."""

    mode: int = 1
    """Wavelengths round a closed ring, or half wavelengths between the ends of a path."""


class WallParameters(Record):
    """The wall's attraction, where the substrate's record does not state it, and its retardation."""

    gamma_kelvin_layer3: float | None = None
    """In place of the substrate's own, in K layer^3, layers of 0.36 nm."""
    gamma_relative_uncertainty: float = 0.0
    half_thickness_nm: float | None = 15.0
    """Where retardation has halved the potential: E. Cheng, M. W. Cole, Phys. Rev. B 38, 987 (1988) (from memory), glass-like
    substrates; none: no retardation."""
    entropy_over_latent_heat: float = 0.0
    """T S/L, for thick warm films."""


class OnsetParameters(Record):
    """Over which films the areal density is taken as a straight line."""

    thinnest_share: float = 0.4
    least: int = 6


def speed_of_third_sound(
    parameters: SpeedParameters, *, frequency: FloatArray | None, flight_time: FloatArray | None, path: float, cell: ThirdSoundRing
) -> Outcome:  # fmt: skip
    """Return the speed of third sound from a resonance, or from a time of flight.

    Parameters
    ----------
    frequency, flight_time : ndarray or None
        Hz, s; exactly one of them.
    path : float
        m: round the ring, or from end to end.
    cell : ThirdSoundRing
        Whether the path is closed.

    Raises
    ------
    ValueError
        Both or neither, or a path or mode that is none.

    Notes
    -----
    A closed ring holds whole wavelengths, c = f L/n; a path whose ends reflect alike holds halves, c = 2 f L/n; a pulse takes L/c.
    """
    if (frequency is None) == (flight_time is None):
        found = "both" if frequency is not None else "neither"
        raise ValueError(f"frequency, flight_time: found {found}, expected one of them")
    if not (path > 0 and parameters.mode >= 1):
        raise ValueError(f"path, mode: found {path} m, {parameters.mode}, expected > 0")
    if frequency is not None:
        wavelength = (1 if cell.closed else 2) * path / parameters.mode
        how = f"resonances with a wavelength of {wavelength * 1e3:.5g} mm"
        return Outcome({"speed": wavelength * np.where(frequency > 0, frequency, np.nan)}, facts={"how": how})
    assert flight_time is not None  # noqa: S101 - one of the two is there
    t = np.where(flight_time > 0, flight_time, np.nan)
    return Outcome({"speed": path / t}, facts={"how": f"times of flight over {path * 1e3:.5g} mm"})


def thickness_from_pressure(
    parameters: WallParameters, *, relative_pressure: FloatArray, temperature: float | FloatArray, substrate: Substrate
) -> Outcome:  # fmt: skip
    """Return the thickness of a film in equilibrium with its vapour.

    Parameters
    ----------
    relative_pressure : ndarray
        At the temperature of the film; NaN comes back outside 0 to 1.
    temperature : float or ndarray
        K.
    substrate : Substrate
        Its Gamma.

    Raises
    ------
    ValueError
        No Gamma, neither stated nor set.

    Notes
    -----
    T ln(p_0/p) = Gamma/(d^3 (1 + d/d_half)). Good from about three layers.
    """
    gamma = _gamma(parameters, substrate)
    T = np.broadcast_to(np.asarray(temperature, dtype=np.float64), relative_pressure.shape)

    def thickness(factor: float) -> FloatArray:
        known = np.isfinite(T)
        found = film_thickness(
            relative_pressure, temperature=np.where(known, T, 1.0), gamma=gamma * factor * LAYER**3, half_thickness=_half(parameters)
        )  # fmt: skip
        return np.where(known, found, np.nan)

    d = thickness(1.0)
    shared, sources, findings = _held(parameters, gamma, thickness)
    thin = int(np.count_nonzero(d < 3 * LAYER))
    if thin:
        findings.append(
            Finding(
                code="film-too-thin-for-slab", severity="note",
                what=f"{thin} of {d.size} films are thinner than three layers, where a wall without structure is a poor picture",
            )
        )  # fmt: skip
    return Outcome({"thickness": d}, shared={"thickness": shared}, sources=sources, findings=tuple(findings), facts=_wall(parameters, gamma))  # fmt: skip


def areal_density_from_speed(
    parameters: WallParameters, *, speed: FloatArray, thickness: FloatArray, coverage: FloatArray, substrate: Substrate
) -> Outcome:  # fmt: skip
    """Return the areal superfluid density that a speed of third sound means.

    Parameters
    ----------
    speed, thickness, coverage : ndarray
        m/s, m, mol/m^2; thickness and coverage of the whole film.
    substrate : Substrate
        Its Gamma.

    Raises
    ------
    ValueError
        No Gamma.

    Notes
    -----
    sigma_s = sigma (c/c_0)^2, where c_0 is the speed if all of the film flowed. The film's temperature oscillation is left out
    unless T S/L is set, and so are the oscillations of the speed with the layers.
    """
    gamma = _gamma(parameters, substrate)

    def areal(factor: float) -> FloatArray:
        whole = third_sound_speed(
            np.where(thickness > 0, thickness, np.nan), strength=float(van_der_waals_strength(gamma * factor * LAYER**3)),
            half_thickness=_half(parameters), entropy_over_latent_heat=parameters.entropy_over_latent_heat,
        )  # fmt: skip
        return np.asarray(MOLAR_MASS_HELIUM4 * coverage * (speed / whole) ** 2)

    sigma = areal(1.0)
    shared, sources, findings = _held(parameters, gamma, areal)
    more = int(np.count_nonzero(sigma > 1.03 * MOLAR_MASS_HELIUM4 * coverage))
    if more:
        # 3 per cent: recommended limit (common practice, no source).
        findings.append(
            Finding(
                code="more-superfluid-than-helium", severity="warning",
                what=f"in {more} of {sigma.size} rows more helium would flow than the film holds; Gamma, thickness or the mode's number is wrong",
            )
        )  # fmt: skip
    return Outcome({"superfluid_density": sigma}, shared={"superfluid_density": shared}, sources=sources, findings=tuple(findings), facts=_wall(parameters, gamma))  # fmt: skip


def third_sound_onset(
    parameters: OnsetParameters,
    *,
    coverage: FloatArray,
    superfluid_density: FloatArray,
    temperature: float | FloatArray,
    u_superfluid_density: FloatArray | None,
) -> Outcome:
    """Return where the areal density falls to the universal jump, and the smallest one that was seen, over the jump.

    Parameters
    ----------
    coverage, superfluid_density : ndarray
        mol/m^2, kg/m^2, at one temperature.
    temperature : float or ndarray
        K; its median counts.

    Raises
    ------
    ValueError
        Too few films, or a density that does not rise with coverage.

    Notes
    -----
    A straight line through the thinnest films meets sigma_s = (2 m^2 k_B/(pi hbar^2)) T at the coverage of the transition.
    The line is extrapolated where the record ends above the jump. The frequency of third sound moves the end a little, which is left out.
    """
    rows = np.flatnonzero(known_rows(coverage, superfluid_density) & (np.nan_to_num(superfluid_density) > 0))
    count = max(parameters.least, math.ceil(parameters.thinnest_share * rows.size))
    chosen = rows[np.argsort(coverage[rows], kind="stable")][:count]
    n, sigma, u = coverage[chosen], superfluid_density[chosen], weights(u_superfluid_density, chosen)
    if n.size < parameters.least or np.unique(n).size < 3:
        raise ValueError(
            f"coverage: found {np.unique(n).size} films with third sound, expected at least {parameters.least} readings of three"
        )
    T = float(np.nanmedian(temperature))
    jump = UNIVERSAL_JUMP * T
    middle = float(np.mean(n))
    line = straight_line(n - middle, sigma, standard_uncertainty=u, absolute=False)
    level, slope = line.value("intercept"), line.value("slope")
    if not slope > 0:
        raise ValueError("superfluid_density: found no rise with coverage")
    order = [line.names.index(name) for name in ("intercept", "slope")]
    covariance = np.asarray(line.covariance)[np.ix_(order, order)]
    if u is not None and 0 < line.chi2 < line.dof:
        covariance = covariance / (line.chi2 / line.dof)
    gradient = np.array([-1 / slope, -(jump - level) / slope**2])
    u_coverage = math.sqrt(float(gradient @ covariance @ gradient))
    # The line's value at the thinnest film, which rests on more than one reading.
    at = np.array([1.0, float(n[0]) - middle])
    lowest, u_lowest = float(at @ [level, slope]) / jump, math.sqrt(float(at @ covariance @ at)) / jump
    findings: tuple[Finding, ...] = ()
    if lowest < 1 - 3 * u_lowest:
        findings = (
            Finding(
                code="below-universal-line", severity="note",
                what=f"third sound is seen down to {lowest:.3f} of the universal jump; within Gamma, thickness and temperature there should be none below one",
            ),
        )  # fmt: skip
    return Outcome(
        {"transition_coverage": middle + (jump - level) / slope, "lowest_ratio": lowest},
        point={"transition_coverage": u_coverage, "lowest_ratio": u_lowest}, findings=findings,
        facts={"films": int(n.size), "temperature_K": T, "extrapolated": bool(lowest > 1)},
    )  # fmt: skip


def _gamma(parameters: WallParameters, substrate: Substrate) -> float:
    gamma = (
        parameters.gamma_kelvin_layer3
        if parameters.gamma_kelvin_layer3 is not None
        else substrate.van_der_waals
    )
    if gamma is None or not gamma > 0:
        raise ValueError(
            f"substrate: {substrate.address} states no van_der_waals (Gamma in K layer^3, layers of 0.36 nm); record it, or set gamma_kelvin_layer3"
        )
    return gamma


def _half(parameters: WallParameters) -> float | None:
    return None if parameters.half_thickness_nm is None else parameters.half_thickness_nm * 1e-9


def _held(parameters: WallParameters, gamma: float, function: Any) -> tuple[dict[str, FloatArray], tuple[SourceEntry, ...], list[Finding]]:  # fmt: skip
    """Return what the uncertainty of Gamma contributes, or a note that it was taken as exact."""
    u = parameters.gamma_relative_uncertainty
    if not u > 0:
        note = Finding(
            code="gamma-taken-as-exact", severity="note",
            what=f"Gamma = {gamma:g} K layer^3 was taken as exact; set gamma_relative_uncertainty to what is known of it",
        )  # fmt: skip
        return {}, (), [note]
    name = f"Gamma = {gamma:g} K layer^3, held"
    part = np.nan_to_num((function(1 + u) - function(1 - u)) / 2)
    entry = SourceEntry(name=name, description=f"relative standard uncertainty {u:g}", level="cell")
    return {name: part}, (entry,), []


def _wall(parameters: WallParameters, gamma: float) -> dict[str, Any]:
    half = parameters.half_thickness_nm
    return {
        "gamma": gamma,
        "retardation": "without retardation" if half is None else f"half retarded at {half:g} nm",
    }


_COVERAGE = Port("coverage", "array", "coverage of each row")

THIRD_SOUND_STEPS: tuple[Step, ...] = (
    Step(
        name="third-sound-speed", version=1, function=speed_of_third_sound, parameters=SpeedParameters,
        takes={
            "frequency": Port("frequency", "array", "resonance frequency of each film", optional=True), "flight_time": Port("time", "array", "time of flight", optional=True),
            "path": Port("length", "scalar", "length of the path"), "cell": Port("any", "record", "cell"),
        },
        yields={"speed": Port("velocity", "array", "speed of third sound")},
        sentence="The speed of third sound, {speed}, is from {how}.", citations=("atkins-1959",),
    ),
    Step(
        name="thickness-from-pressure", version=1, function=thickness_from_pressure, parameters=WallParameters,
        takes={
            "relative_pressure": Port("relative_pressure|pressure_ratio", "array", "pressure over saturated pressure at the film's temperature"),
            "temperature": Port("temperature", "number", "temperature of the film"), "substrate": Port("any", "record", "substrate"),
        },
        yields={"thickness": Port("length", "array", "thickness of the whole film")},
        sentence="Thickness, {thickness}, follows from the vapour pressure with Gamma = {gamma} K layer^3 (layers of 0.36 nm), {retardation}.", citations=("cheng-cole-1988",),
    ),
    Step(
        name="areal-density-from-third-sound", version=1, function=areal_density_from_speed, parameters=WallParameters,
        takes={
            "speed": Port("velocity", "array", "speed of third sound"), "thickness": Port("length", "array", "thickness of the whole film"), "coverage": _COVERAGE,
            "substrate": Port("any", "record", "substrate"),
        },
        yields={"superfluid_density": Port("areal_mass_density", "array", "areal superfluid density")},
        sentence="The areal superfluid density is the film's mass times the square of its speed over that of a film that flows whole, with Gamma = {gamma} K layer^3 (layers of 0.36 nm), {retardation}.",
        citations=("atkins-1959", "cheng-cole-1988"),
    ),
    Step(
        name="third-sound-onset", version=1, function=third_sound_onset, parameters=OnsetParameters,
        takes={"coverage": _COVERAGE, "superfluid_density": Port("areal_mass_density", "array", "areal superfluid density"), "temperature": Port("temperature", "number", "temperature of the films")},
        yields={
            "transition_coverage": Port("coverage", "scalar", "coverage at which the areal density is that of the universal jump"),
            "lowest_ratio": Port("number", "scalar", "areal density of the thinnest film with third sound over the universal jump"),
        },
        sentence="At {temperature_K} K the areal density falls to the universal jump at {transition_coverage} (line through {films} readings; extrapolated: {extrapolated}); the thinnest film with third sound has {lowest_ratio} of it.",
        citations=("nelson-kosterlitz-1977",), spread="refit", weights=("superfluid_density",),
    ),
)  # fmt: skip
"""Steps of this module."""

"""Dynamic theory of the two-dimensional superfluid transition: what an oscillator of finite frequency sees.

Rules: responses carry exp(-i w t), so a passive film has Im(1/epsilon) < 0; the free-vortex density is
``F xi_+^-2`` with xi_+ where ``x = 1`` (stiffness 1/pi), and F means nothing without that; L = ln(D/(a^2 w)).
The flow is integrated in closed form by `film_flow`.

References
----------
V. Ambegaokar, B. I. Halperin, D. R. Nelson, E. D. Siggia, Phys. Rev. B 21, 1806 (1980); D. J. Bishop, J. D. Reppy, Phys. Rev. B 22, 5171
(1980): content from memory, the equations derived anew and held against two independent integrations.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import ComplexArray, FloatArray
from archive.physics.film_flow import EDGE, bound_pairs, flow_rate, linear_length, panels
from archive.physics.film_static import STIFFNESS_UNIT, x_minus_log1p

__all__ = [
    "FilmStart",
    "StiffnessSlopes",
    "complex_stiffness",
    "dynamic_areal_density",
    "fixed_start",
    "free_vortex_length",
    "oscillator_response",
    "reduced_response",
    "stiffness_slopes",
    "villain_start",
]

DEBYE = 14.0
"""Number of the pair-relaxation kernel 14 D/r^2, Ambegaokar, Halperin, Nelson, Siggia (1980) (from memory)."""

STEP = 1e-7
"""Step of the invariant for its central difference. The stiffness turns over within 5e-4 of c even at L = 40, so the curvature
leaves some parts in 10^8 of the slope, and rounding less."""

VILLAIN_CRITICAL_STIFFNESS = 0.7478524217720599
"""Critical bare stiffness of the start y_0 = exp(-pi^2 K_0/2); derived from the invariant."""


@dataclass(frozen=True)
class FilmStart:
    """Where the vortex flow starts, for each reduced temperature.

    Attributes
    ----------
    x : ndarray
        2/(pi K_0) - 1, > -1.
    invariant : ndarray
        c; at least ``-2 (x - ln(1 + x))``, below which the fugacity would be imaginary.
    """

    x: FloatArray
    invariant: FloatArray


def fixed_start(ratio: npt.ArrayLike, *, b: float, x0: float = -0.5) -> FilmStart:
    """Return the start with fixed `x0` and ``c = (b/4)^2 (T/T_KT - 1)`` exactly.

    Parameters
    ----------
    ratio : array_like
        T/T_KT, > 0.
    b : float
        Non-universal constant, > 0.
    x0 : float
        Bare distance from the universal stiffness, -1 < x0 < 0; only its combination with the core size is
        measurable, so it is chosen, not fitted.

    Notes
    -----
    Where c would need an imaginary fugacity (far below the transition for large b) the fugacity is zero and the
    stiffness stays at its bare value; the join is continuous.
    """
    ratio = np.asarray(ratio, dtype=np.float64)
    if not b > 0:
        raise ValueError(f"b: found {b}, expected > 0")
    if not -1 < x0 < 0:
        raise ValueError(f"x0: found {x0}, expected -1 < x0 < 0")
    x = np.full(ratio.shape, x0)
    lowest = -2 * float(x_minus_log1p(x0))
    return FilmStart(x, np.maximum((b / 4) ** 2 * (ratio - 1), lowest))


def villain_start(ratio: npt.ArrayLike) -> FilmStart:
    """Return the start of constant bare areal density with ``y_0 = exp(-pi^2 K_0/2)``.

    Parameters
    ----------
    ratio : array_like
        T/T_KT, > 0.

    References
    ----------
    J. V. Jose, L. P. Kadanoff, S. Kirkpatrick, D. R. Nelson, "Renormalization, vortices, and symmetry-breaking
    perturbations in the two-dimensional planar model", Physical Review B 16, 1217 (1977) (from memory).
    """
    ratio = np.asarray(ratio, dtype=np.float64)
    K = VILLAIN_CRITICAL_STIFFNESS / ratio
    x = 2 / (math.pi * K) - 1
    Y = 2 * math.pi * np.exp(-(math.pi**2) * K / 2)
    return FilmStart(x, Y * Y - 2 * x_minus_log1p(x))


def free_vortex_length(start: FilmStart) -> FloatArray:
    """Return ``l_+ = ln(xi_+/a)``, where the flow above the transition reaches ``x = 1``.

    Parameters
    ----------
    start : FilmStart

    Returns
    -------
    ndarray
        Infinite at and below the transition, zero for a start beyond the end.
    """
    c, s0 = _flat(start)
    length = np.full(c.shape, np.inf)
    above = c > 0
    length[above & (s0 >= EDGE)] = 0.0
    run = above & (s0 < EDGE)
    if run.any():
        root = np.sqrt(c[run])
        # ds/(2(s^2 + c)) has its weight at |s| of order sqrt(c), however small: s = sqrt(c) sinh(v) spreads it evenly.
        low, high = np.arcsinh(s0[run] / root), np.arcsinh(EDGE / root)
        nodes, weights = panels(math.ceil(float((high - low).max()) / 1.5), 16)
        v = low[:, np.newaxis] + (high - low)[:, np.newaxis] * nodes
        s = root[:, np.newaxis] * np.sinh(v)
        excess = (flow_rate(s) - 1) / (2 * root[:, np.newaxis] * np.cosh(v))
        linear = linear_length(root, s0[run])
        length[run] = linear + (high - low) * (excess @ weights)
    return length.reshape(start.x.shape)


def complex_stiffness(start: FilmStart, *, L: npt.ArrayLike, F: float = 1.0) -> ComplexArray:
    """Return the dynamic stiffness ``K_0/epsilon(w)``.

    Parameters
    ----------
    start : FilmStart
        From `fixed_start` or `villain_start`.
    L : array_like
        ln(D/(a^2 w)), a number or one for each temperature.
    F : float
        Free-vortex prefactor, >= 0; zero leaves only bound pairs.

    Returns
    -------
    ndarray of complex
        Real part positive, imaginary part at most zero; not a number where the start or `L` is none.

    Raises
    ------
    ValueError
        F below zero, an infinite L, or a start with c <= 0 past the universal stiffness (x > 0), which no film has.

    Notes
    -----
    2/(pi K) = 1 + x_0 + integral of 2 Y^2/(1 - i exp(2(l - l_D))) dl + i (4 pi F/7) exp(2(l_D - l_+)), with
    l_D = (L + ln 14)/2. Good for any temperature, to some parts in 10^12 of either part; the shape far from the peak is only fairly that of
    measured films.

    References
    ----------
    V. Ambegaokar, B. I. Halperin, D. R. Nelson, E. D. Siggia, "Dynamics of superfluid films", Physical Review B 21,
    1806 (1980) (from memory; the equation is re-derived).
    """
    inverse, _, _ = _inverse(start, L, F, slope=False)
    return _stiffness(inverse)


@dataclass(frozen=True)
class StiffnessSlopes:
    """The dynamic stiffness and how it changes.

    Attributes
    ----------
    stiffness : ndarray of complex
    by_invariant : ndarray of complex
        Derivative by c at a fixed start x.
    by_log_diffusivity : ndarray of complex
        Derivative by L = ln(D/(a^2 w)).
    by_prefactor : ndarray of complex
        Derivative by F.
    """

    stiffness: ComplexArray
    by_invariant: ComplexArray
    by_log_diffusivity: ComplexArray
    by_prefactor: ComplexArray


def stiffness_slopes(start: FilmStart, *, L: npt.ArrayLike, F: float = 1.0) -> StiffnessSlopes:
    """Return the dynamic stiffness with its derivatives.

    Parameters
    ----------
    start, L, F
        As in `complex_stiffness`, which says the rest.

    Notes
    -----
    The derivative by c is a central difference, good to some parts in 10^8; the others come from the same nodes.
    """
    c = start.invariant
    # One call for the three: a flow beside another costs little.
    beside = FilmStart(np.stack([start.x] * 3), np.stack([c, c + STEP, c - STEP]))
    three, by_l_D, free = _inverse(beside, np.broadcast_to(L, (3, *c.shape)), F, slope=True)
    here, above, below = _stiffness(three)
    by_inverse = -(math.pi / 2) * here * here
    # d l_D = dL/2, and the free term goes as exp(2 l_D).
    by_log = by_inverse * (by_l_D[0] / 2 + 1j * F * free[0])
    return StiffnessSlopes(here, (above - below) / (2 * STEP), by_log, by_inverse * (1j * free[0]))


def _stiffness(inverse: ComplexArray) -> ComplexArray:
    # Dividing by what is not a number is no fault here.
    with np.errstate(invalid="ignore"):
        return np.asarray((2 / math.pi) / inverse, dtype=np.complex128)


def _inverse(
    start: FilmStart, L: npt.ArrayLike, F: float, *, slope: bool
) -> tuple[ComplexArray, ComplexArray, ComplexArray]:
    """Return 2/(pi K), the slope by l_D of the bound pairs' part, and the free vortices' part over i F."""
    if not F >= 0:
        raise ValueError(f"F: found {F}, expected >= 0")
    if np.any(np.isinf(L)):
        raise ValueError("L: found an infinite value, expected finite ones")
    c, s0 = _flat(start)
    wrong = np.flatnonzero((c <= 0) & (s0 > 0))
    if wrong.size:
        raise ValueError(
            f"start.x[{wrong[0]}]: found above zero with an invariant of {c[wrong[0]]}, expected x < 0 there"
        )
    shape = start.x.shape
    l_D = np.broadcast_to((np.asarray(L, dtype=np.float64) + math.log(DEBYE)) / 2, shape).ravel()
    bound = bound_pairs(c, s0, l_D, slope=slope)
    # Below the exponent's limit a free term of zero is exact to double precision.
    exponent = np.clip(2 * (l_D - bound.l_plus), -700.0, 300.0)
    free = np.where(np.isfinite(bound.l_plus), (4 * math.pi / 7) * np.exp(exponent), 0j)
    inverse = 1 + start.x.ravel() + bound.sum + 1j * F * free
    return inverse.reshape(shape), bound.slope.reshape(shape), free.reshape(shape)


def reduced_response(ratio: npt.ArrayLike, stiffness: npt.ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Return areal density S and dissipation q in units of the universal jump of the same film.

    Parameters
    ----------
    ratio : array_like
        T/T_KT.
    stiffness : array_like of complex
        From `complex_stiffness`.

    Returns
    -------
    S, q : ndarray
        S = observed areal density over its static value at the jump; q = dissipation over twice the fractional period
        drop at the static jump (the two belongs to the period only).
    """
    reduced = (math.pi / 2) * np.asarray(ratio, dtype=np.float64) * np.asarray(stiffness, dtype=np.complex128)
    return reduced.real, -reduced.imag


def dynamic_areal_density(temperature: npt.ArrayLike, stiffness: npt.ArrayLike) -> ComplexArray:
    """Return ``sigma_s0/epsilon``, kg/m^2; its real part is the areal density an oscillator reports.

    Parameters
    ----------
    temperature : array_like
        K.
    stiffness : array_like of complex
    """
    per_stiffness = STIFFNESS_UNIT * np.asarray(temperature, dtype=np.float64)
    return np.asarray(per_stiffness * np.asarray(stiffness, dtype=np.complex128), dtype=np.complex128)


def oscillator_response(
    areal_density: npt.ArrayLike, *, area_per_mass: float, exact: bool = False
) -> tuple[FloatArray, FloatArray]:
    """Return the fractional period drop and the added dissipation of an oscillator that carries the film.

    Parameters
    ----------
    areal_density : array_like of complex
        sigma_s0/epsilon, kg/m^2, from `dynamic_areal_density`.
    area_per_mass : float
        A (1 - chi)/M, m^2/kg, with M = I/R_g^2 of the loaded oscillator.
    exact : bool
        True: solve ``w^2 (1 - A (1 - chi) sigma_s0/(epsilon M)) = const`` for the complex frequency; False: first
        order, 2 dP/P = Re and dQ^-1 = -Im of the same ratio.

    Returns
    -------
    fractional_drop, dissipation : ndarray
        Drop (P_loaded - P)/P_loaded >= 0 and Q^-1 of the film.

    References
    ----------
    D. J. Bishop, J. D. Reppy, "Study of the superfluid transition in two-dimensional 4He films", Physical Review B 22,
    5171 (1980) (from memory; re-derived).
    """
    ratio = area_per_mass * np.asarray(areal_density, dtype=np.complex128)
    if not exact:
        return ratio.real / 2, -ratio.imag
    frequency = np.asarray(1 / np.sqrt(1 - ratio), dtype=np.complex128)
    return 1 - 1 / frequency.real, -2 * frequency.imag / frequency.real


def _flat(start: FilmStart) -> tuple[FloatArray, FloatArray]:
    x = np.asarray(start.x, dtype=np.float64).ravel()
    # An invariant this small is zero: it is the rounding of Y^2 - 2(x - ln(1 + x)).
    c = np.asarray(start.invariant, dtype=np.float64).ravel()
    c = np.where(np.abs(c) < 1e-15, 0.0, c)
    return c, np.sign(x) * np.sqrt(2 * x_minus_log1p(x))

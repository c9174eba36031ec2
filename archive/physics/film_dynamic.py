"""Dynamic theory of the two-dimensional superfluid transition: what an oscillator of finite frequency sees.

Rules: responses carry exp(-i w t), so a passive film has Im(1/epsilon) < 0; the free-vortex density is
``F xi_+^-2`` with xi_+ where ``x = 1`` (stiffness 1/pi), and F means nothing without that; L = ln(D/(a^2 w)).
The flow is integrated in closed form: with s of `film_static.x_of_s`, ``dl = g dv`` where v is the flow time of the
linearised equations, for which s(v) is elementary on both sides of the transition.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import ComplexArray, FloatArray
from archive.physics.film_static import STIFFNESS_UNIT, x_minus_log1p, x_of_s

__all__ = [
    "FilmStart",
    "complex_stiffness",
    "dynamic_areal_density",
    "fixed_start",
    "free_vortex_length",
    "oscillator_response",
    "reduced_response",
    "villain_start",
]

DEBYE = 14.0
"""Number of the pair-relaxation kernel 14 D/r^2, Ambegaokar, Halperin, Nelson, Siggia (1980) (from memory)."""

VILLAIN_CRITICAL_STIFFNESS = 0.7478524217720599
"""Critical bare stiffness of the start y_0 = exp(-pi^2 K_0/2); derived from the invariant."""

X_END = 1.0
"""The flow above the transition ends at half the universal stiffness: this defines xi_+ here."""

EDGE = math.sqrt(2 * (X_END - math.log1p(X_END)))


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
        linear = _linear_length(root, s0[run])
        length[run] = linear + (high - low) * (excess @ weights)
    return length.reshape(start.x.shape)


def complex_stiffness(
    start: FilmStart,
    *,
    L: npt.ArrayLike,
    F: float = 1.0,
    panel_width: float = 1.5,
    order: int = 20,
    tail: float = 20.0,
) -> ComplexArray:
    """Return the dynamic stiffness ``K_0/epsilon(w)``.

    Parameters
    ----------
    start : FilmStart
        From `fixed_start` or `villain_start`.
    L : array_like
        ln(D/(a^2 w)), a number or one for each temperature.
    F : float
        Free-vortex prefactor, >= 0; zero leaves only bound pairs.
    panel_width, order : float, int
        Gauss-Legendre panels in the flow time. The defaults give about 1e-12 relative; a fit takes wider panels.
    tail : float
        How far beyond l_D the flow is followed; the kernel has fallen to exp(-2 tail) there.

    Returns
    -------
    ndarray of complex
        Real part positive, imaginary part at most zero.

    Notes
    -----
    2/(pi K) = 1 + x_0 + integral of 2 Y^2/(1 - i exp(2(l - l_D))) dl + i (4 pi F/7) exp(2(l_D - l_+)), with
    l_D = (L + ln 14)/2. Good for any temperature; the shape far from the peak is only fairly that of measured films.

    References
    ----------
    V. Ambegaokar, B. I. Halperin, D. R. Nelson, E. D. Siggia, "Dynamics of superfluid films", Physical Review B 21,
    1806 (1980) (from memory; the equation is re-derived).
    """
    if F < 0:
        raise ValueError(f"F: found {F}, expected >= 0")
    c, s0 = _flat(start)
    l_D = np.broadcast_to((np.asarray(L, dtype=np.float64) + math.log(DEBYE)) / 2, start.x.shape).ravel()
    l_plus = free_vortex_length(start).ravel()
    end = _end_of_flow(c, s0, l_D + tail)
    bound = np.zeros(c.shape, dtype=np.complex128)
    # Flows above the transition end early; apart from the others they need fewer panels.
    for side in (c > 0, c <= 0):
        run = side & (end > 0)
        if run.any():
            count = max(math.ceil(float(end[run].max()) / panel_width), 1)
            bound[run] = _bound_pairs(c[run], s0[run], l_D[run], end[run], count=count, order=order)
    # Below the exponent's limit a free term of zero is exact to double precision.
    free = np.exp(np.clip(2 * (l_D - l_plus), -700.0, 300.0)) * np.isfinite(l_plus)
    inverse = 1 + start.x.ravel() + bound + 1j * (4 * math.pi * F / 7) * free
    return np.asarray((2 / math.pi) / inverse, dtype=np.complex128).reshape(start.x.shape)


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


def flow_rate(s: FloatArray) -> FloatArray:
    x = x_of_s(s)
    small = np.abs(s) < 1e-4
    ratio = s / np.where(small, 1.0, x)
    # s/x from the series of x(s), whose quotient is smooth through zero.
    ratio = np.where(small, 1 - s / 3 + s * s / 12, ratio)
    return (1 + x) * ratio


def _linear_length(root: FloatArray, s0: FloatArray) -> FloatArray:
    """Return the linearised flow time from s0 to the end, for c = root^2 > 0."""
    return (np.arctan2(EDGE, root) - np.arctan2(s0, root)) / (2 * root)


def _end_of_flow(c: FloatArray, s0: FloatArray, reach: FloatArray) -> FloatArray:
    # g >= g(s0) along the flow for s0 < 0 and g >= 1 beyond, so this flow time reaches at least that length.
    slowest = np.minimum(flow_rate(np.minimum(s0, 0.0)), 1.0)
    end = np.maximum(reach, 0.0) / slowest
    above = c > 0
    if above.any():
        end[above] = np.minimum(end[above], _linear_length(np.sqrt(c[above]), s0[above]))
    return np.where((c > 0) & (s0 >= EDGE), 0.0, end)


def panels(count: int, order: int) -> tuple[FloatArray, FloatArray]:
    """Return nodes and weights of composite Gauss-Legendre quadrature on [0, 1]."""
    x, w = np.polynomial.legendre.leggauss(order)
    nodes = (np.arange(count)[:, np.newaxis] + (x + 1) / 2) / count
    return nodes.ravel(), np.tile(w / 2, count) / count


def _running_integral(order: int) -> FloatArray:
    """Return the matrix that turns values at Gauss-Legendre nodes into integrals from -1 to each node."""
    x, w = np.polynomial.legendre.leggauss(order)
    values = np.polynomial.legendre.legvander(x, order - 1)
    degrees = np.arange(order)
    to_coefficients = ((2 * degrees + 1) / 2)[:, np.newaxis] * (values * w[:, np.newaxis]).T
    higher = np.polynomial.legendre.legvander(x, order)
    integrals = np.empty((order, order))
    integrals[:, 0] = x + 1
    integrals[:, 1:] = (higher[:, 2:] - higher[:, :-2]) / (2 * degrees[1:] + 1)
    return integrals @ to_coefficients


def _bound_pairs(
    c: FloatArray, s0: FloatArray, l_D: FloatArray, end: FloatArray, *, count: int, order: int
) -> ComplexArray:
    nodes, weights = panels(count, order)
    v = end[:, np.newaxis] * nodes
    s = flow(c[:, np.newaxis], s0[:, np.newaxis], v)
    g = flow_rate(s)
    blocks = g.reshape(c.size, count, order)
    width = (end / count)[:, np.newaxis]
    inside = blocks @ _running_integral(order).T * (width[..., np.newaxis] / 2)
    whole = blocks @ (weights[:order] * count) * width
    before = np.cumsum(whole, axis=1) - whole
    length = (inside + before[..., np.newaxis]).reshape(c.size, -1)
    z = np.exp(np.clip(2 * (length - l_D[:, np.newaxis]), -700.0, 300.0))
    fugacity2 = np.maximum(s * s + c[:, np.newaxis], 0.0)
    # (1 + i z)/(1 + z^2), written so that a large z does not overflow.
    small = 1 / (z + 1 / z)
    common = 2 * fugacity2 * g * small
    return np.asarray(((common / z) @ weights + 1j * (common @ weights)) * end, dtype=np.complex128)


def flow(c: FloatArray, s0: FloatArray, v: FloatArray) -> FloatArray:
    """Return s after the linearised flow time v: ds/dv = 2 (s^2 + c), from s0."""
    root = np.sqrt(np.abs(c))
    angle = 2 * root * v
    safe = np.where(root > 0, root, 1.0)
    if np.all(c > 0):
        sine, cosine = np.sin(angle), np.cos(angle)
        return np.asarray((s0 * cosine + root * sine) / (cosine - s0 * sine / safe))
    tangent = np.where(c < 0, np.tanh(angle) / safe, 2 * v)
    below = (s0 + c * tangent) / (1 - s0 * tangent)
    return below if not np.any(c > 0) else np.where(c > 0, flow(np.where(c > 0, c, 1.0), s0, v), below)

"""Static theory of the two-dimensional superfluid transition.

Rules: `x = 2/(pi K) - 1` measures the distance of the stiffness K from its universal value, `c` is the invariant of
the flow; `c < 0` is superfluid, `c = 0` the transition, `c > 0` normal. The small-x hyperbola is never used.

References
----------
J. M. Kosterlitz, J. Phys. C 7, 1046 (1974); D. R. Nelson, J. M. Kosterlitz, Phys. Rev. Lett. 39, 1201 (1977); Phys. Rev. B 21, 1806 (1980)
(all from memory); the invariant and its inverse by the Lambert function are derived here.
"""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt
from scipy.special import lambertw

from archive.physics.arrays import FloatArray
from archive.physics.constants import AVOGADRO, BOLTZMANN, HBAR, MASS_HELIUM4

__all__ = [
    "STIFFNESS_UNIT",
    "UNIVERSAL_JUMP",
    "correlation_length_above",
    "correlation_length_below",
    "flow_invariant",
    "onset_coverage",
    "renormalised_stiffness",
    "static_areal_density",
    "superfluid_areal_density",
    "x_minus_log1p",
    "x_of_s",
]

STIFFNESS_UNIT = MASS_HELIUM4**2 * BOLTZMANN / HBAR**2
"""Areal density per kelvin of a film of stiffness one, m^2 k_B/hbar^2, kg m^-2 K^-1."""

UNIVERSAL_JUMP = 2 * STIFFNESS_UNIT / math.pi
"""Superfluid areal density per kelvin at the static transition, kg m^-2 K^-1.

D. R. Nelson, J. M. Kosterlitz, "Universal jump in the superfluid density of two-dimensional superfluids", Physical
Review Letters 39, 1201 (1977).
"""


def superfluid_areal_density(
    period_drop: npt.ArrayLike, *, period_per_areal_density: float, drag_factor: float
) -> FloatArray:
    """Return the superfluid areal density from the period drop, kg/m^2.

    Parameters
    ----------
    period_drop : array_like
        Period of the fully coupled film minus the period found, s.
    period_per_areal_density : float
        Mass sensitivity dP/dsigma, s m^2/kg, > 0.
    drag_factor : float
        chi, the fraction of the superfluid carried along by a tortuous substrate, in [0, 1).

    Raises
    ------
    ValueError
        A sensitivity at or below zero, or chi outside [0, 1).

    Notes
    -----
    sigma_s = drop / ((dP/dsigma)(1 - chi)). If chi comes from two slopes of a dose run, chi and the slope are
    correlated; propagate the two slopes.

    References
    ----------
    D. J. Bishop, J. D. Reppy, "Study of the superfluid transition in two-dimensional 4He films", Physical Review B
    22, 5171 (1980) (from memory).
    """
    if not period_per_areal_density > 0:
        raise ValueError(f"period_per_areal_density: found {period_per_areal_density}, expected > 0")
    if not 0 <= drag_factor < 1:
        raise ValueError(f"drag_factor: found {drag_factor}, expected 0 <= chi < 1")
    return np.asarray(period_drop, dtype=np.float64) / (period_per_areal_density * (1 - drag_factor))


def onset_coverage(transition_temperature: npt.ArrayLike, *, inert_coverage: float) -> FloatArray:
    """Return the coverage at which a 4He film becomes superfluid at a temperature, mol/m^2.

    Parameters
    ----------
    transition_temperature : array_like
        Static transition temperature, K.
    inert_coverage : float
        Coverage that never becomes superfluid, mol/m^2.

    Notes
    -----
    Inert coverage plus the universal jump alone; thermal depletion and the cusp are not in it.
    """
    per_kelvin = UNIVERSAL_JUMP / (MASS_HELIUM4 * AVOGADRO)
    return inert_coverage + per_kelvin * np.asarray(transition_temperature, dtype=np.float64)


def x_minus_log1p(x: npt.ArrayLike) -> FloatArray:
    """Return ``x - ln(1 + x)`` without cancellation, for x > -1."""
    x = np.asarray(x, dtype=np.float64)
    small = np.abs(x) < 1e-2
    near = np.where(small, x, 0.0)
    # Taylor series; the first term left out is x^9/9, below 1e-16 of the sum here.
    series = (
        near
        * near
        * (
            1 / 2
            - near * (1 / 3 - near * (1 / 4 - near * (1 / 5 - near * (1 / 6 - near * (1 / 7 - near / 8)))))
        )
    )
    far = np.where(small, 1.0, x)
    return np.where(small, series, far - np.log1p(far))


def x_of_s(s: npt.ArrayLike) -> FloatArray:
    """Return x for ``s = sign(x) sqrt(2 (x - ln(1 + x)))``, by the Lambert function.

    Notes
    -----
    Principal branch for s < -1, lower branch for s > 1, completed series in between, where both branches meet.
    """
    shape = np.shape(s)
    s = np.atleast_1d(np.asarray(s, dtype=np.float64))
    half_square = s * s / 2
    x = s * (1 + s * (1 / 3 + s * (1 / 36 + s * (-1 / 270 + s * (1 / 4320 + s / 17010)))))
    far = np.abs(s) > 1
    if far.any():
        branch = np.where(s[far] < 0, 0, -1)
        x[far] = -1 - lambertw(-np.exp(-1 - half_square[far]), branch).real
    # Newton steps complete the series (error 1e-5 at |s| = 1) and repair what the Lambert function loses near its
    # branch point; below 0.02 the series is already exact.
    polished = np.abs(s) >= 0.02
    safe = np.where(polished, x, 1.0)
    for _ in range(2):
        safe = safe - (safe - np.log1p(safe) - half_square) * (1 + safe) / safe
    return np.where(polished, safe, x).reshape(shape)


def flow_invariant(*, x: npt.ArrayLike, fugacity: npt.ArrayLike) -> FloatArray:
    """Return the invariant ``c = Y^2 - 2 (x - ln(1 + x))`` of the vortex flow.

    Parameters
    ----------
    x : array_like
        2/(pi K) - 1.
    fugacity : array_like
        Y = 2 pi y.

    References
    ----------
    J. M. Kosterlitz, "The critical properties of the two-dimensional xy model", Journal of Physics C 7, 1046 (1974)
    (from memory); the exact form of the invariant is derived from the flow equations.
    """
    return np.asarray(fugacity, dtype=np.float64) ** 2 - 2 * x_minus_log1p(x)


def renormalised_stiffness(invariant: npt.ArrayLike) -> FloatArray:
    """Return the stiffness at the end of the flow: at least 2/pi for ``c <= 0``, zero above the transition.

    Parameters
    ----------
    invariant : array_like
        c of `flow_invariant`.
    """
    c = np.asarray(invariant, dtype=np.float64)
    x = x_of_s(-np.sqrt(np.maximum(-c, 0.0)))
    # At the transition c is the rounding of Y^2 - 2(x - ln(1 + x)), of either sign.
    return np.where(c <= 1e-13, (2 / math.pi) / (1 + x), 0.0)


def static_areal_density(
    temperature: npt.ArrayLike, *, transition_temperature: float, b: float
) -> FloatArray:
    """Return the static superfluid areal density of a film, kg/m^2.

    Parameters
    ----------
    temperature : array_like
        K, > 0.
    transition_temperature : float
        Static transition temperature, K, > 0.
    b : float
        Non-universal constant, > 0: ``c = (b/4)^2 (T/T_KT - 1)``.

    Notes
    -----
    Zero above the transition. Near it sigma_s = universal jump times T times (1 + (b/4) sqrt(|t|)); far below, the
    temperature dependence of the bare stiffness is not in this formula.
    """
    T = np.asarray(temperature, dtype=np.float64)
    if not (transition_temperature > 0 and b > 0):
        raise ValueError(f"transition_temperature, b: found {transition_temperature}, {b}, expected > 0")
    c = (b / 4) ** 2 * (T / transition_temperature - 1)
    return STIFFNESS_UNIT * T * renormalised_stiffness(c)


def correlation_length_above(reduced_temperature: npt.ArrayLike, *, core: float, b: float) -> FloatArray:
    """Return the asymptotic correlation length above the transition, ``a exp(2 pi/(b sqrt t))``, in the unit of `core`.

    Notes
    -----
    Not a number for t <= 0. The prefactor depends on where the flow is taken to end; the full flow of `film_dynamic`
    is shorter by a constant in the logarithm. Free-vortex densities use the full flow, never this formula.

    References
    ----------
    V. Ambegaokar, B. I. Halperin, D. R. Nelson, E. D. Siggia, "Dynamics of superfluid films", Physical Review B 21,
    1806 (1980) (from memory).
    """
    t = np.asarray(reduced_temperature, dtype=np.float64)
    root = np.sqrt(np.where(t > 0, t, np.nan))
    with np.errstate(over="ignore"):
        return core * np.exp(2 * math.pi / (b * root))


def correlation_length_below(reduced_temperature: npt.ArrayLike, *, core: float, b: float) -> FloatArray:
    """Return the correlation length below the transition, ``a exp(1/(b sqrt|t|))``, in the unit of `core`.

    Notes
    -----
    Not a number for t >= 0. Reference as in `correlation_length_above`.
    """
    t = np.asarray(reduced_temperature, dtype=np.float64)
    root = np.sqrt(np.where(t < 0, -t, np.nan))
    with np.errstate(over="ignore"):
        return core * np.exp(1 / (b * root))

"""Film thickness from relative pressure and back, and the saturated film above a bath.

Rules: Gamma in kelvin times a length cubed; thickness comes in that same length (layers, angstrom, metre); Gamma is the
substrate's attraction minus helium's own.

References
----------
The slab equation in its usual form (common practice, no source); units and the saturated film derived here.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray
from archive.physics.constants import BOLTZMANN, MASS_HELIUM4, STANDARD_GRAVITY

__all__ = ["film_thickness", "relative_pressure", "saturated_film_thickness", "van_der_waals_strength"]


def film_thickness(
    relative_pressure: npt.ArrayLike,
    *,
    temperature: npt.ArrayLike,
    gamma: float,
    half_thickness: float | None = None,
) -> FloatArray:
    """Return the thickness of a film in equilibrium with its vapour.

    Parameters
    ----------
    relative_pressure : array_like
        p/p_0 at the temperature of the film, 0 < p/p_0 < 1 (with a warm gauge corrected for thermomolecular flow).
    temperature : array_like
        K, > 0.
    gamma : float
        K times length cubed, > 0.
    half_thickness : float, optional
        Where retardation has halved the potential, same length; without it no retardation.

    Returns
    -------
    ndarray
        Thickness, not a number for a relative pressure outside 0 to 1.

    Raises
    ------
    ValueError
        A temperature, gamma or half thickness at or below zero.

    Notes
    -----
    ``T ln(p_0/p) = gamma/(d^3 (1 + d/d_half))``. Good from about three layers; the form without retardation only far below
    the half thickness.

    References
    ----------
    J. Frenkel; G. D. Halsey; T. L. Hill: the slab equation in its usual form. Retardation: E. Cheng, M. W. Cole, "Retardation and
    many-body effects in multilayer-film adsorption", Physical Review B 38, 987 (1988) (from memory).

    Examples
    --------
    >>> float(film_thickness(0.9, temperature=1.5, gamma=27.0).round(4))
    5.5488
    """
    ratio = np.asarray(relative_pressure, dtype=np.float64)
    T = _positive("temperature", temperature)
    _positive("gamma", gamma)
    fair = (ratio > 0) & (ratio < 1)
    cube = np.where(fair, gamma / (T * -np.log(np.where(fair, ratio, 0.5))), np.nan)
    return _thickness(cube, half_thickness)


def relative_pressure(
    thickness: npt.ArrayLike, *, temperature: npt.ArrayLike, gamma: float, half_thickness: float | None = None
) -> FloatArray:
    """Return p/p_0 over a film of given thickness; the inverse of `film_thickness`, with the same arguments.

    Raises
    ------
    ValueError
        A value at or below zero.
    """
    d = _positive("thickness", thickness)
    T = _positive("temperature", temperature)
    _positive("gamma", gamma)
    return np.asarray(np.exp(-gamma / (T * d**3 * _retardation(d, half_thickness))))


def van_der_waals_strength(gamma: npt.ArrayLike) -> FloatArray:
    """Return ``alpha = Gamma k_B/m`` of 4He, m^5/s^2, from Gamma in K m^3."""
    return np.asarray(np.asarray(gamma, dtype=np.float64) * (BOLTZMANN / MASS_HELIUM4))


def saturated_film_thickness(
    height: npt.ArrayLike,
    *,
    gamma: float,
    half_thickness: float | None = None,
    gravity: float = STANDARD_GRAVITY,
) -> FloatArray:
    """Return the thickness of a saturated 4He film above a bath, m.

    Parameters
    ----------
    height : array_like
        Above the liquid, m, > 0.
    gamma : float
        K m^3, > 0.
    half_thickness : float, optional
        m; without it no retardation.
    gravity : float
        m/s^2.
    """
    _positive("gamma", gamma)
    cube = float(van_der_waals_strength(gamma)) / (gravity * _positive("height", height))
    return _thickness(np.asarray(cube), half_thickness)


def _thickness(cube: FloatArray, half_thickness: float | None) -> FloatArray:
    d = np.cbrt(cube)
    if half_thickness is None:
        return np.asarray(d)
    _positive("half_thickness", half_thickness)
    # Newton on the logarithm of d^3 (1 + d/d_half): convex and rising, so it converges from any start; 3 to 4 is its slope.
    for _ in range(60):
        u = d / half_thickness
        error = np.log(d**3 * (1 + u) / cube)
        d = d * np.exp(-error / (3 + u / (1 + u)))
        if not (np.abs(error) > 1e-15).any():
            break
    return np.asarray(d)


def _retardation(d: FloatArray, half_thickness: float | None) -> FloatArray:
    if half_thickness is None:
        return np.ones_like(d)
    return np.asarray(1 + d / _positive("half_thickness", half_thickness))


def _positive(name: str, values: npt.ArrayLike) -> FloatArray:
    array = np.asarray(values, dtype=np.float64)
    if (bad := ~(array > 0)).any():
        index = int(np.argmax(bad))
        raise ValueError(f"{name}[{index}]: found {array.flat[index]}, expected > 0")
    return array

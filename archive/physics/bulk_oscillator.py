"""Oscillator whose plates stand in bulk liquid: from the period to the density of the normal component.

Rules: the inertia comes from the square of the period, since bulk liquid changes it by more than a straight line bears; the part of the
normal liquid that the plates fail to drag along is counted, never assumed away. Time goes as exp(-i w t).

References
----------
Derived here: rigid oscillator, and the wave of shear in a liquid between two plates that move alike. Viscosity and densities: the caller's.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray

__all__ = ["added_inertia", "dragged_fraction", "normal_density_from_inertia", "penetration_depth"]

LEAST_RATIO = 1e-3
"""Below this ratio of half gap to depth the series to fourth order is exact to rounding."""

ROUNDS = 60


def added_inertia(period: npt.ArrayLike, *, empty_period: npt.ArrayLike) -> FloatArray:
    """Return the moment of inertia that the liquid adds, over that of the empty oscillator.

    Parameters
    ----------
    period, empty_period : array_like
        s, > 0, at the same temperature.

    Returns
    -------
    ndarray
        ``(P/P_empty)^2 - 1``.

    Notes
    -----
    Exact for one rigid mode and a rod that does not feel the load. The straight line 2 (P/P_empty - 1) is off by half the result's
    square: 5 per cent of it for an added inertia of a tenth.

    Examples
    --------
    >>> round(float(added_inertia(1.1, empty_period=1.0)), 12)
    0.21
    """
    ratio = np.asarray(period, dtype=np.float64) / np.asarray(empty_period, dtype=np.float64)
    return np.asarray((ratio - 1) * (ratio + 1))


def penetration_depth(
    density: npt.ArrayLike, *, viscosity: npt.ArrayLike, angular_frequency: npt.ArrayLike
) -> FloatArray:
    """Return ``sqrt(2 eta/(rho_n w))``, m; infinite where the density is not above zero.

    Parameters
    ----------
    density : array_like
        Of the normal component, kg/m^3; above the lambda point of the liquid.
    viscosity : array_like
        Pa s.
    angular_frequency : array_like
        rad/s.
    """
    rho = np.asarray(density, dtype=np.float64)
    ratio = 2 * np.asarray(viscosity, dtype=np.float64) / np.asarray(angular_frequency, dtype=np.float64)
    return np.asarray(np.where(rho > 0, np.sqrt(ratio / np.where(rho > 0, rho, 1.0)), np.inf))


def dragged_fraction(half_gap: npt.ArrayLike, *, depth: npt.ArrayLike) -> npt.NDArray[np.complex128]:
    """Return the part of a viscous layer between two plates that moves with them.

    Parameters
    ----------
    half_gap : array_like
        Half the distance of the plates, m.
    depth : array_like
        Viscous penetration depth, m.

    Returns
    -------
    ndarray of complex
        ``tanh(k h)/(k h)`` with ``k = (1 - i)/depth``. The real part counts as inertia; the imaginary part times the mass of the
        layer over that of the oscillator is the inverse quality factor that it adds.

    Notes
    -----
    For ``h << depth`` the inertia is short by the fraction (8/15)(h/depth)^4, and the imaginary part is (2/3)(h/depth)^2: the series of
    tanh. For ``h >> depth`` what moves is a layer of half the depth at each plate.

    Examples
    --------
    >>> found = complex(dragged_fraction(0.1, depth=1.0))
    >>> round((1 - found.real) / 0.1**4, 3), round(found.imag / 0.1**2, 4)
    (0.533, 0.6666)
    """
    x = np.asarray(half_gap, dtype=np.float64) / np.asarray(depth, dtype=np.float64)
    small = x < LEAST_RATIO
    # tanh overflows nowhere, but 0/0 must not be met.
    z = (1 - 1j) * np.where(small, 1.0, x)
    series = 1 + 2j / 3 * x**2 - 8 / 15 * x**4
    return np.asarray(np.where(small, series, np.tanh(z) / z))


def normal_density_from_inertia(
    inertia_per_factor: npt.ArrayLike,
    *,
    density: npt.ArrayLike,
    viscosity: npt.ArrayLike,
    angular_frequency: npt.ArrayLike,
    half_gap: float,
    drag_factor: float = 0.0,
) -> FloatArray:
    """Return the density of the normal component from the density that seems to move with the plates.

    Parameters
    ----------
    inertia_per_factor : array_like
        Added inertia over that of one kg/m^3 that is wholly dragged along, kg/m^3.
    density, viscosity : array_like
        Of the liquid, kg/m^3 and Pa s.
    angular_frequency : array_like
        rad/s.
    half_gap : float
        Half the distance of the plates, m, >= 0.
    drag_factor : float
        Part of the superfluid that the body displaces, in [0, 0.9]; 0 for smooth flat discs that turn about their own axis.

    Returns
    -------
    ndarray
        kg/m^3. Solves ``x G(h/depth(x)) + chi (rho - x) = y``; noise may take it a little below zero or above the liquid's density. NaN in,
        NaN out.

    Raises
    ------
    ValueError
        A half gap or drag factor out of range, or plates so far apart that the equation has no single solution.

    Notes
    -----
    Plates much farther apart than the depth drag a mass that grows as the square root of the normal density only; the inertia that
    is read then hardly tells the density, and beyond h/depth = 2 the value is refused.
    """
    if not half_gap >= 0:
        raise ValueError(f"half_gap: found {half_gap}, expected >= 0")
    if not 0 <= drag_factor <= 0.9:
        raise ValueError(f"drag_factor: found {drag_factor}, expected 0 to 0.9")
    y = np.asarray(inertia_per_factor, dtype=np.float64)
    rho = np.asarray(density, dtype=np.float64)
    target = y - drag_factor * rho
    x = target / (1 - drag_factor)
    for _ in range(ROUNDS):
        depth = penetration_depth(x, viscosity=viscosity, angular_frequency=angular_frequency)
        dragged = dragged_fraction(half_gap, depth=depth).real
        new = target / np.maximum(dragged - drag_factor, 0.05)
        change = np.abs(new - x)
        x = new
        if not np.any(change > 1e-13 * np.abs(rho)):
            break
    ratio = half_gap / penetration_depth(x, viscosity=viscosity, angular_frequency=angular_frequency)
    wide = np.flatnonzero(np.atleast_1d(np.nan_to_num(ratio)) > 2)
    if wide.size:
        raise ValueError(
            f"half_gap: found {np.atleast_1d(ratio)[wide[0]]:.3g} penetration depths at row {wide[0]}, expected at most 2"
        )
    return np.asarray(x)

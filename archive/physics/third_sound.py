"""Speed of third sound, and the superfluid areal density read from it.

Rules: thickness is the whole film, and the mean superfluid fraction is over the whole film with its inert layers.

References
----------
K. R. Atkins, Phys. Rev. 113, 962 (1959); its inverse is derived here.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray

__all__ = ["areal_density_from_third_sound", "mean_superfluid_fraction", "third_sound_speed"]


def third_sound_speed(
    thickness: npt.ArrayLike,
    *,
    strength: float,
    superfluid_fraction: npt.ArrayLike = 1.0,
    half_thickness: float | None = None,
    entropy_over_latent_heat: npt.ArrayLike = 0.0,
) -> FloatArray:
    """Return the speed of third sound, m/s.

    Parameters
    ----------
    thickness : array_like
        Whole film, m, > 0.
    strength : float
        alpha of `frenkel_halsey_hill.van_der_waals_strength`, m^5/s^2.
    superfluid_fraction : array_like
        Mean over the whole film, inert layers included.
    half_thickness : float, optional
        Retardation, m.
    entropy_over_latent_heat : array_like
        T S/L, dimensionless, for thick warm films.

    Returns
    -------
    ndarray
        ``c^2 = f alpha (3 + 4u)/(d^3 (1 + u)^2) (1 + TS/L)^2`` with ``u = d/d_half``; ``3 alpha f/d^3`` without retardation.

    Notes
    -----
    Wavelength much longer than the film is thick, and a frequency low enough for the substrate to stay isothermal. Layer structure
    makes the real speed oscillate with a period of one layer.

    References
    ----------
    K. R. Atkins, "Third and fourth sound in liquid helium II", Physical Review 113, 962 (1959). D. J. Bergman, Physical Review 188,
    370 (1969) (thermal factor, from memory). The retarded form is derived.
    """
    d = np.asarray(thickness, dtype=np.float64)
    u = 0.0 if half_thickness is None else d / half_thickness
    square = (
        np.asarray(superfluid_fraction, dtype=np.float64) * strength * (3 + 4 * u) / (d**3 * (1 + u) ** 2)
    )
    return np.asarray(np.sqrt(square) * (1 + np.asarray(entropy_over_latent_heat, dtype=np.float64)))


def areal_density_from_third_sound(
    speed: npt.ArrayLike, *, thickness: npt.ArrayLike, areal_mass: npt.ArrayLike, strength: float
) -> FloatArray:
    """Return the superfluid areal density ``sigma c^2 d^3/(3 alpha)``, kg/m^2, without retardation.

    Parameters
    ----------
    speed : array_like
        m/s.
    thickness : array_like
        Whole film, m.
    areal_mass : array_like
        Whole film, kg/m^2.
    strength : float
        alpha, m^5/s^2.

    Notes
    -----
    A check on the areal density from an oscillator.
    """
    c, d = np.asarray(speed, dtype=np.float64), np.asarray(thickness, dtype=np.float64)
    return np.asarray(np.asarray(areal_mass, dtype=np.float64) * c**2 * d**3 / (3 * strength))


def mean_superfluid_fraction(
    thickness: npt.ArrayLike,
    *,
    temperature: npt.ArrayLike,
    bulk_fraction: npt.ArrayLike,
    inert_constant: float = 0.5,
    inert_slope: float = 1.13,
) -> FloatArray:
    """Return ``(rho_s/rho)(1 - D/d)`` with ``D = a + b T rho/rho_s``, the usual closure.

    Parameters
    ----------
    thickness : array_like
        Layers.
    temperature : array_like
        K.
    bulk_fraction : array_like
        rho_s/rho of bulk liquid at that temperature, > 0.
    inert_constant, inert_slope : float
        a in layers and b in layers/K.

    Returns
    -------
    ndarray
        Not a number where the film would be all inert.

    References
    ----------
    J. H. Scholtz, E. O. McLean, I. Rudnick, "Third sound and the healing length of He II in films as thin as 2.1 atomic layers",
    Physical Review Letters 32, 147 (1974) (from memory, the coefficients too).
    """
    d, bulk = np.asarray(thickness, dtype=np.float64), np.asarray(bulk_fraction, dtype=np.float64)
    inert = inert_constant + inert_slope * np.asarray(temperature, dtype=np.float64) / bulk
    return np.where(d > inert, bulk * (1 - inert / d), np.nan)

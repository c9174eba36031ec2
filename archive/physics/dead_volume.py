"""Volume that a gas fills in a cell, from expansions of a metered amount, and the gas that such a volume holds.

Rules: the virial equation is cut after its second term and refused where the next would matter; nothing is assumed about the
gas, its second virial coefficient is given by the caller.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray, same_length, series
from archive.physics.constants import GAS_CONSTANT

__all__ = ["LARGEST_CORRECTION", "FreeVolume", "free_volume", "virial_density"]

LARGEST_CORRECTION = 0.1
"""Largest B p/(R T) at which the equation may be cut after B; the density is then within 1.2 per cent for helium below 5 K."""


def virial_density(
    pressure: npt.ArrayLike, temperature: npt.ArrayLike, *, second_virial: npt.ArrayLike
) -> FloatArray:
    """Return the molar density of a gas, the solution of ``p = R T (rho + B rho^2)``, mol/m^3.

    Parameters
    ----------
    pressure : array_like
        Pa, >= 0.
    temperature : array_like
        K, > 0.
    second_virial : array_like
        B, m^3/mol.

    Returns
    -------
    ndarray
        Not a number where the pressure is below zero or abs(B p/(R T)) exceeds `LARGEST_CORRECTION`.

    Notes
    -----
    Its derivative with respect to B is ``-rho^2/(1 + 2 B rho)``.

    Examples
    --------
    >>> round(float(virial_density(13332.2, 295.0, second_virial=11.86e-6) * 10.0), 4)
    54.3523
    """
    p, B = np.asarray(pressure, dtype=np.float64), np.asarray(second_virial, dtype=np.float64)
    ideal = p / (GAS_CONSTANT * np.asarray(temperature, dtype=np.float64))
    fair = (ideal >= 0) & (np.abs(B * ideal) <= LARGEST_CORRECTION)
    return np.where(fair, 2 * ideal / (1 + np.sqrt(np.where(fair, 1 + 4 * B * ideal, 1.0))), math.nan)


@dataclass(frozen=True)
class FreeVolume:
    """Outcome of a run of expansions.

    Attributes
    ----------
    volume, u_volume : float
        m^3, of the line through the origin; the uncertainty is that of the readings alone.
    offset, u_offset : float
        mol at zero density, of the line whose offset is free: gas adsorbed or lost, or a gauge's zero. Not a number for fewer
        than three expansions.
    covariance : float
        Of volume and offset, m^3 mol.
    residuals : ndarray
        Amount less line through the origin, mol.
    """

    volume: float
    u_volume: float
    offset: float
    u_offset: float
    covariance: float
    residuals: FloatArray


def free_volume(
    amount: npt.ArrayLike, density: npt.ArrayLike, *, standard_uncertainty: npt.ArrayLike | None = None
) -> FreeVolume:
    """Return the volume in which a gas has a molar density when it holds an amount: ``n = V rho``.

    Parameters
    ----------
    amount : array_like
        Gas in the volume after each expansion, mol, sums from the first on.
    density : array_like
        Molar density of the gas there, mol/m^3, > 0.
    standard_uncertainty : array_like, optional
        Of each amount less line, mol, > 0. Without it, and where the scatter is larger, the scatter about the line counts.

    Raises
    ------
    ValueError
        Bad arrays.

    Notes
    -----
    Both numbers are linear in the amounts, ``V = a n`` and ``offset = b n``, so what is common to all amounts (metering volume,
    gauge) is propagated by moving them together. One expansion gives a volume without scatter. An adsorbed amount proportional to
    the density is part of the volume found; it shows only by a change with temperature or gas.

    References
    ----------
    Mass balance and least squares through the origin, derived here.
    """
    n, rho = series("amount", amount), series("density", density, positive=True)
    same_length(amount=n, density=rho)
    u = None
    if standard_uncertainty is not None:
        given = np.broadcast_to(np.asarray(standard_uncertainty, dtype=np.float64), n.shape)
        u = series("standard_uncertainty", given, positive=True)
    w = np.ones(n.shape) if u is None else 1 / u**2
    a = w * rho / float(w @ rho**2)
    volume = float(a @ n)
    residuals = n - volume * rho
    factor = _scatter(w, residuals, n.size - 1, stated=u is not None)
    offset, u_offset, covariance = math.nan, math.nan, math.nan
    total, first, second = float(w.sum()), float(w @ rho), float(w @ rho**2)
    determinant = total * second - first**2
    # Expansions to one and the same pressure say nothing of an offset.
    if n.size > 2 and determinant > 1e-9 * total * second:
        b = w * (second - rho * first) / determinant
        offset = float(b @ n)
        slope = float((w * (rho * total - first) / determinant) @ n)
        own = _scatter(w, n - offset - slope * rho, n.size - 2, stated=u is not None)
        u_offset = math.sqrt(own * float(b**2 @ (1 / w)))
        covariance = math.sqrt(own * factor) * float((a * b) @ (1 / w))
    return FreeVolume(
        volume=volume,
        u_volume=math.sqrt(factor * float(a**2 @ (1 / w))),
        offset=offset,
        u_offset=u_offset,
        covariance=covariance,
        residuals=residuals,
    )


def _scatter(w: FloatArray, residuals: FloatArray, dof: int, *, stated: bool) -> float:
    """Return the factor on the variances: what the residuals ask for, and at least one where uncertainties are stated."""
    found = float(w @ residuals**2) / dof if dof else 0.0
    return max(found, 1.0) if stated else found

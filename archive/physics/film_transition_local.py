"""A fit of the dynamic theory moved to slightly changed data, without fitting anew.

Rules: to first order the parameters follow the data by the pseudo-inverse of the weighted Jacobian at the solution, so one
Jacobian serves every source of uncertainty; a few steps with it take up the curvature of the model.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from archive.physics.arrays import FloatArray
from archive.physics.film_curves import curve_slopes, curves
from archive.physics.film_transition import FilmTransition

__all__ = ["LocalSolution", "local_solution", "moved"]

SMALL = 1e-7
"""A step this small against the standard uncertainties is the last."""


@dataclass(frozen=True)
class LocalSolution:
    """Where a fit ended, and how its parameters follow the data from there.

    Attributes
    ----------
    values : dict of str to float
        All parameters, as in `FilmTransition.values`.
    free : tuple of str
        Those that were fitted.
    gain : ndarray, shape (free, 2 points)
        Pseudo-inverse of the weighted Jacobian; drop first, then dissipation.
    u_drop, u_dissipation : ndarray
        The weights, kept while the data move.
    x0 : float
    """

    values: dict[str, float]
    free: tuple[str, ...]
    gain: FloatArray
    u_drop: FloatArray
    u_dissipation: FloatArray
    x0: float


def local_solution(
    found: FilmTransition,
    *,
    temperature: FloatArray,
    u_drop: FloatArray,
    u_dissipation: FloatArray,
    angular_frequency: float,
    x0: float,
) -> LocalSolution:
    """Return how the parameters of a fit follow the data.

    Parameters
    ----------
    found : FilmTransition
    temperature, u_drop, u_dissipation : ndarray
        Those that were fitted: K, and the standard uncertainties.
    angular_frequency, x0 : float
        As fitted.
    """
    free = found.fit.names
    drop, loss = curve_slopes(temperature, found.values, free, angular_frequency=angular_frequency, x0=x0)
    jacobian = np.concatenate([drop / u_drop[:, np.newaxis], loss / u_dissipation[:, np.newaxis]])
    norm = np.linalg.norm(jacobian, axis=0)
    gain = np.linalg.pinv(jacobian / norm) / norm[:, np.newaxis]
    return LocalSolution(dict(found.values), free, gain, u_drop, u_dissipation, x0)


def moved(
    local: LocalSolution,
    *,
    temperature: FloatArray,
    twice_fractional_drop: FloatArray,
    dissipation: FloatArray,
    angular_frequency: float,
    steps: int = 3,
    F: float | None = None,
) -> dict[str, float]:
    """Return the parameters for data that differ a little from those fitted.

    Parameters
    ----------
    local : LocalSolution
    temperature, twice_fractional_drop, dissipation : ndarray
        As many rows as were fitted.
    angular_frequency : float
        1/s.
    steps : int
        Steps with the one Jacobian at most; the first alone is first order.
    F : float, optional
        Another value of a held free-vortex prefactor.

    Notes
    -----
    Good while the changes are small against the width of the transition; the weights stay those of the fit.
    """
    values = local.values | ({} if F is None else {"F": F})
    # The length of a row of the gain is the parameter's standard uncertainty.
    size = np.linalg.norm(local.gain, axis=1)
    for _ in range(steps):
        drop, loss = curves(temperature, values, angular_frequency=angular_frequency, x0=local.x0)
        residuals = np.concatenate(
            [(twice_fractional_drop - drop) / local.u_drop, (dissipation - loss) / local.u_dissipation]
        )
        change = local.gain @ residuals
        values = values | {
            name: values[name] + float(each) for name, each in zip(local.free, change, strict=True)
        }
        if np.max(np.abs(change) / size) < SMALL:
            break
    return values

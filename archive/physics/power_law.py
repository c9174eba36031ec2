"""Power law of the superfluid density below its transition, and the length that goes with it.

Rules: the transition temperature is free; the window is in reduced temperature and follows the fitted transition; the exponent of
one publication is never combined with the amplitude of another.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import BoolArray, FloatArray, same_length, series
from archive.physics.film_static import STIFFNESS_UNIT
from archive.physics.fitting import FitResult, Parameter, fit

__all__ = ["PowerLaw", "bulk_superfluid_fraction", "fit_power_law", "transverse_correlation_length"]

EXPONENT = 0.6717
"""M. Campostrini, M. Hasenbusch, A. Pelissetto, E. Vicari, Physical Review B 74, 144506 (2006): start value."""


@dataclass(frozen=True)
class PowerLaw:
    """Outcome of the power-law fit.

    Attributes
    ----------
    fit : FitResult
        Parameters amplitude (unit of the data), transition_temperature (K), exponent; residuals of the used points.
    used : ndarray of bool
        Which of the given points lie in the window.
    converged : bool
        The fit converged and its window stopped changing.
    message : str
    """

    fit: FitResult
    used: BoolArray
    converged: bool
    message: str


def fit_power_law(
    temperature: npt.ArrayLike,
    density: npt.ArrayLike,
    *,
    start_temperature: float,
    window: tuple[float, float] = (1e-3, 0.1),
    standard_uncertainty: npt.ArrayLike | None = None,
    absolute: bool = False,
) -> PowerLaw:
    """Return the fit of ``A (1 - T/T_c)^zeta`` with free T_c.

    Parameters
    ----------
    temperature : array_like
        K, > 0.
    density : array_like
        Superfluid density or areal density.
    start_temperature : float
        About where the density vanishes, K.
    window : (float, float)
        Range of 1 - T/T_c that is fitted, 0 < low < high < 1; the default is that of work on films in porous glass.
    standard_uncertainty, absolute
        As in `fitting.fit`.

    Raises
    ------
    ValueError
        Bad arrays, a bad window, or fewer than five points in it.

    Notes
    -----
    The window is applied with the start value, then with the fitted T_c, until the points in it stay the same; where it turns in a
    circle, the points that are in it each time count. Give chi-squared
    beside that of the planar dynamic theory; a medium that follows a power law gets no test of the universal jump.

    References
    ----------
    D. J. Bishop, J. E. Berthold, J. M. Parpia, J. D. Reppy, "Superfluid density of thin 4He films adsorbed in porous Vycor glass",
    Physical Review B 24, 5047 (1981) (from memory).
    """
    T = series("temperature", temperature, positive=True)
    rho = series("density", density)
    same_length(temperature=T, density=rho)
    low, high = window
    if not 0 < low < high < 1:
        raise ValueError(f"window: found {window}, expected 0 < low < high < 1")
    u = None
    if standard_uncertainty is not None:
        u = np.broadcast_to(np.asarray(standard_uncertainty, dtype=np.float64), T.shape)
    Tc = start_temperature
    seen: list[bytes] = []
    for _ in range(20):
        t = 1 - T / Tc
        used = (t > low) & (t < high)
        if np.count_nonzero(used) < 5:
            raise ValueError(
                f"temperature: found {np.count_nonzero(used)} points in the window, expected at least 5"
            )
        if used.tobytes() in seen:
            # Points at an edge that come and go with the fit are left out for good.
            turns = seen[seen.index(used.tobytes()) :]
            kept = np.logical_and.reduce([np.frombuffer(each, dtype=np.bool_) for each in turns])
            if len(turns) > 1 and np.count_nonzero(kept) >= 5:
                seen.append(kept.tobytes())
                found = _fit(T[kept], rho[kept], Tc, None if u is None else u[kept], absolute=absolute)
                used = kept
            break
        seen.append(used.tobytes())
        found = _fit(T[used], rho[used], Tc, None if u is None else u[used], absolute=absolute)
        Tc = found.value("transition_temperature")
    settled = used.tobytes() == seen[-1]
    kept = np.frombuffer(seen[-1], dtype=np.bool_)
    message = found.message if settled else "not converged: the window does not settle"
    return PowerLaw(found, kept, found.converged and settled, message)


def _fit(T: FloatArray, rho: FloatArray, Tc: float, u: FloatArray | None, *, absolute: bool) -> FitResult:
    top = float(T.max())
    Tc = max(Tc, top * (1 + 1e-9))
    shape = (1 - T / Tc) ** EXPONENT
    amplitude = float(shape @ rho / (shape @ shape))
    parameters = [
        Parameter("amplitude", amplitude),
        # Beyond the last point 1 - T/T_c would be negative.
        Parameter("transition_temperature", Tc, top, 2 * top, scale=Tc - float(T.min())),
        Parameter("exponent", EXPONENT, 0.01, 5.0),
    ]

    def model(T: FloatArray, p: FloatArray) -> FloatArray:
        return np.asarray(p[0] * np.maximum(1 - T / p[1], 0.0) ** p[2])

    return fit(model, parameters, T, rho, standard_uncertainty=u, absolute=absolute)


def transverse_correlation_length(
    temperature: npt.ArrayLike, *, superfluid_density: npt.ArrayLike
) -> FloatArray:
    """Return ``m^2 k_B T/(hbar^2 rho_s)``, m.

    Parameters
    ----------
    temperature : array_like
        K.
    superfluid_density : array_like
        kg/m^3 (of a porous sample: per volume of the sample).

    Notes
    -----
    Some authors divide by 4 pi, or mean the healing length: name the definition with the number. A slab of thickness d is at its
    static transition where this length is pi d/2.

    References
    ----------
    B. D. Josephson, "Relation between the superfluid density and order parameter for superfluid He near T_c", Physics Letters 21,
    608 (1966); P. C. Hohenberg, A. Aharony, B. I. Halperin, E. D. Siggia, Physical Review B 13, 2986 (1976) (both from memory).
    """
    T = np.asarray(temperature, dtype=np.float64)
    return np.asarray(STIFFNESS_UNIT * T / np.asarray(superfluid_density, dtype=np.float64))


def bulk_superfluid_fraction(temperature: npt.ArrayLike, *, transition_temperature: float) -> FloatArray:
    """Return rho_s/rho of bulk 4He at saturated vapour pressure close below the lambda point.

    Parameters
    ----------
    temperature : array_like
        K.
    transition_temperature : float
        Lambda point on the same scale, K.

    Returns
    -------
    ndarray
        ``k_0 (1 + k_1 t) t^zeta (1 + D t^Delta)`` with ``t = 1 - T/T_lambda``; zero at and above the transition, not a number for
        t >= 0.035, where the expansion ends.

    References
    ----------
    A. Singsaas, G. Ahlers, "Universality of static properties near the superfluid transition in 4He", Physical Review B 30, 5103
    (1984), coefficients as reproduced by Donnelly and Barenghi (1998).
    """
    t = 1 - np.asarray(temperature, dtype=np.float64) / transition_temperature
    positive = np.maximum(t, 0.0)
    fraction = 2.403 * (1 - 1.46 * positive) * positive**0.6717 * (1 + 0.33 * np.sqrt(positive))
    return np.where(t < 0.035, fraction, math.nan)

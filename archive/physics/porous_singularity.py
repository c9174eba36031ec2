"""Singularity of the heat capacity that belongs to a superfluid transition with a given coherence length, and a bound on one.

Rules: the length is that of `power_law.transverse_correlation_length` with the superfluid density per volume of the sample; the
amplitude is that of ``C = (A/alpha) |t|^-alpha + background`` below the transition.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray, same_length, series
from archive.physics.constants import BOLTZMANN
from archive.physics.linear_fit import linear_fit

__all__ = [
    "ALPHA",
    "AMPLITUDE_RATIO",
    "BULK_AMPLITUDE",
    "COMBINATION",
    "COMBINATION_UNCERTAINTY",
    "SingularPart",
    "expected_amplitude",
    "mean_shape",
    "singular_part",
    "upper_bound",
]

ALPHA = -0.0127
AMPLITUDE_RATIO = 1.053
"""Exponent, and amplitude above over below the transition: J. A. Lipa, J. A. Nissen, D. A. Stricker, D. R. Swanson,
T. C. P. Chui, "Specific heat of liquid helium in zero gravity very near the lambda point", Physical Review B 68, 174518 (2003)."""

BULK_AMPLITUDE = 5.6537
"""A^- of bulk liquid at saturated vapour pressure, J/(mol K): the same, coefficients from memory."""

COMBINATION = 0.815
COMBINATION_UNCERTAINTY = 0.010
"""xi_0T (A^-/k_B)^(1/3) by theory: M. Stroesser, M. Moennigmann, V. Dohm, Physica B 284, 41 (2000). About 0.85 is observed in bulk
liquid (common practice, no source)."""


def expected_amplitude(length_amplitude: npt.ArrayLike, *, combination: float = COMBINATION) -> FloatArray:
    """Return the amplitude of the heat capacity below the transition, per volume: ``k_B (R/xi_0T)^3``, J/(K m^3).

    Parameters
    ----------
    length_amplitude : array_like
        Amplitude of the transverse correlation length below the transition, m, > 0.
    combination : float
        R, the two-scale-factor combination, > 0.

    Raises
    ------
    ValueError
        An argument that is not above zero.

    Notes
    -----
    The inverse of `two_scale_factor`: one k_B in a volume of the correlation length, whatever the medium. For a length of 10 nm this
    is about 2e-5 of bulk liquid, whose length is 0.34 nm; a factor of 1e4 to 1e5 below bulk is what dilute films in porous glass
    are said to show (common practice, no source).

    References
    ----------
    P. C. Hohenberg, A. Aharony, B. I. Halperin, E. D. Siggia, "Two-scale-factor universality and the renormalization group",
    Physical Review B 13, 2986 (1976) (from memory).

    Examples
    --------
    >>> round(float(expected_amplitude(3.45e-10, combination=0.85)) * 27.38e-6, 2)
    5.65
    """
    xi = np.asarray(length_amplitude, dtype=np.float64)
    if not (np.all(xi > 0) and combination > 0):
        raise ValueError(
            f"length_amplitude, combination: found {float(np.min(xi))}, {combination}, expected > 0"
        )
    return np.asarray(BOLTZMANN * (combination / xi) ** 3)


def mean_shape(
    reduced: npt.ArrayLike, *, width: npt.ArrayLike, alpha: float = ALPHA, ratio: float = AMPLITUDE_RATIO
) -> FloatArray:
    """Return ``(r |t|^-alpha - 1)/alpha`` averaged over a width in t, with r = 1 below and `ratio` above the transition.

    Parameters
    ----------
    reduced : array_like
        t = T/T_c - 1.
    width : array_like
        Full width of the average, > 0.
    alpha, ratio : float
        Exponent, not zero and below one; amplitude above over below.

    Notes
    -----
    The constant -1/alpha makes it about -ln|t| and leaves the background what it looks like; it changes no amplitude. The integral
    is finite and continuous at the transition, so a reading on T_c itself has a value.
    """
    t, half = np.asarray(reduced, dtype=np.float64), np.asarray(width, dtype=np.float64) / 2

    def integral(at: FloatArray) -> FloatArray:
        size = np.abs(at) ** (1 - alpha) / (alpha * (1 - alpha))
        return np.where(at < 0, -size, ratio * size)

    return np.asarray((integral(t + half) - integral(t - half)) / (2 * half) - 1 / alpha)


@dataclass(frozen=True)
class SingularPart:
    """Outcome of the search for a singularity.

    Attributes
    ----------
    amplitude, standard_uncertainty : float
        A^- in the unit of the data; the uncertainty is that of the readings, or of their scatter where that is larger.
    scatter : float
        Root mean square of the residuals.
    residuals, smooth : ndarray
        Of the points used: data less fit, and the fit's background.
    used : ndarray of bool
        Which points lie in the window.
    reduced_chi2 : float
        Not a number without uncertainties.
    """

    amplitude: float
    standard_uncertainty: float
    scatter: float
    residuals: FloatArray
    smooth: FloatArray
    used: npt.NDArray[np.bool_]
    reduced_chi2: float


def singular_part(
    temperature: npt.ArrayLike,
    heat_capacity: npt.ArrayLike,
    *,
    transition_temperature: float,
    width: npt.ArrayLike,
    window: float = 0.1,
    order: int = 3,
    standard_uncertainty: npt.ArrayLike | None = None,
) -> SingularPart:
    """Return the amplitude of a singularity of known shape and place on a smooth background.

    Parameters
    ----------
    temperature, heat_capacity : array_like
        K, > 0; any unit.
    transition_temperature : float
        K, > 0, from elsewhere.
    width : array_like
        Over which the singularity is blurred in temperature, K, > 0: step of a pulse, uncertainty of T_c.
    window : float
        Greatest distance from T_c, in T_c, in (0, 1).
    order : int
        Degree of the background, >= 1; addenda are part of it.
    standard_uncertainty : array_like, optional
        Of each reading, > 0.

    Raises
    ------
    ValueError
        Bad arrays or numbers, or too few points on a side.

    Notes
    -----
    Linear least squares. A background free enough to follow the singularity leaves its amplitude uncertain, which the uncertainty
    says.
    """
    T, C = series("temperature", temperature, positive=True), series("heat_capacity", heat_capacity)
    same_length(temperature=T, heat_capacity=C)
    if not (transition_temperature > 0 and 0 < window < 1 and order >= 1):
        raise ValueError(
            f"transition_temperature, window, order: found {transition_temperature}, {window}, {order}, expected > 0, in (0, 1), >= 1"
        )
    blur = series("width", np.broadcast_to(np.asarray(width, dtype=np.float64), T.shape), positive=True)
    t = T / transition_temperature - 1
    used = np.abs(t) <= window
    for side, rows in (("below", used & (t < 0)), ("above", used & (t > 0))):
        if np.count_nonzero(rows) < order + 2:
            raise ValueError(
                f"temperature: found {np.count_nonzero(rows)} points {side} the transition in the window, expected at least {order + 2}"
            )
    shape = mean_shape(t[used], width=blur[used] / transition_temperature)
    design = np.column_stack([np.polynomial.chebyshev.chebvander(t[used] / window, order), shape])
    names = (*(f"background_{k}" for k in range(order + 1)), "amplitude")
    u = None
    if standard_uncertainty is not None:
        u = np.broadcast_to(np.asarray(standard_uncertainty, dtype=np.float64), T.shape)[used]
    fit = linear_fit(design, C[used], names=names, standard_uncertainty=u, absolute=u is not None)
    inflation = max(fit.chi2 / fit.dof, 1.0) if u is not None and fit.dof else 1.0
    amplitude = fit.value("amplitude")
    return SingularPart(
        amplitude=amplitude,
        standard_uncertainty=fit.standard_uncertainty("amplitude") * math.sqrt(inflation),
        scatter=float(np.sqrt(np.mean(fit.residuals**2))),
        residuals=fit.residuals,
        smooth=np.asarray(design[:, :-1] @ fit.values[:-1]),
        used=used,
        reduced_chi2=fit.chi2 / fit.dof if u is not None and fit.dof else math.nan,
    )


def upper_bound(value: float, *, standard_uncertainty: float, probability: float = 0.95) -> float:
    """Return what a quantity that cannot be negative does not exceed, with a probability.

    Parameters
    ----------
    value, standard_uncertainty : float
        As measured, with a normal distribution; the value may be negative; the uncertainty is > 0.
    probability : float
        In (0, 1).

    Raises
    ------
    ValueError
        An uncertainty that is not above zero, or a probability outside (0, 1).

    Notes
    -----
    The normal distribution cut off at zero, all true values from zero up alike before the measurement: a value of zero gives 1.96
    uncertainties at 95 per cent, and a negative one does not make the bound arbitrarily small.

    References
    ----------
    JCGM 101:2008, 6.4 (assignment of a distribution to what is known); the quantile is derived here.

    Examples
    --------
    >>> round(upper_bound(0.0, standard_uncertainty=1.0), 2)
    1.96
    """
    from scipy.stats import norm  # a second of imports that few commands need

    if not (standard_uncertainty > 0 and 0 < probability < 1):
        raise ValueError(
            f"standard_uncertainty, probability: found {standard_uncertainty}, {probability}, expected > 0 and in (0, 1)"
        )
    # Upper tails, so that a value many uncertainties below zero keeps its digits.
    tail = norm.sf(-value / standard_uncertainty)
    return float(value + standard_uncertainty * norm.isf((1 - probability) * tail))

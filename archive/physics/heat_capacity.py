"""Heat capacity close to the lambda point: what a heat pulse tells, and the law with its two sides.

Rules: the two great terms A/alpha and B of the law cancel nearly, so they never stand alone; the law is written with
``S = (t^-alpha - 1)/alpha``, which becomes the logarithm -ln t when alpha goes to zero; both sides share alpha and B.

References
----------
J. A. Lipa, J. A. Nissen, D. A. Stricker, D. R. Swanson, T. C. P. Chui, Phys. Rev. B 68, 174518 (2003) (the law); a pulse's heat over its step is the
definition.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray

__all__ = [
    "CONFLUENT_EXPONENT",
    "LambdaLaw",
    "heat_capacity_of_pulse",
    "singular_term",
]

CONFLUENT_EXPONENT: Final = 0.529
"""Delta: J. A. Lipa, J. A. Nissen, D. A. Stricker, D. R. Swanson, T. C. P. Chui, Physical Review B 68, 174518 (2003), coefficients from memory."""


def heat_capacity_of_pulse(
    power: npt.ArrayLike,
    *,
    duration: npt.ArrayLike,
    rise: npt.ArrayLike,
    drift: npt.ArrayLike = 0.0,
) -> FloatArray:
    """Return the mean heat capacity over the step of temperature that a heat pulse makes, J/K.

    Parameters
    ----------
    power : array_like
        Of the heater, W.
    duration : array_like
        Of the pulse, s.
    rise : array_like
        Step of temperature, extrapolated to one instant, K.
    drift : array_like
        Rate of the temperature with the heater off, K/s, where the rise still holds what it added during the pulse; 0 where the rise was
        extrapolated to the middle of the pulse from both sides.

    Returns
    -------
    ndarray
        ``power duration/(rise - drift duration)``; NaN where the step is not above zero.

    Examples
    --------
    >>> round(float(heat_capacity_of_pulse(1e-6, duration=10.0, rise=1e-4)), 12)
    0.1
    """
    t = np.asarray(duration, dtype=np.float64)
    step = np.asarray(rise, dtype=np.float64) - np.asarray(drift, dtype=np.float64) * t
    heat = np.asarray(power, dtype=np.float64) * t
    with np.errstate(invalid="ignore"):
        up = step > 0
    return np.asarray(np.where(up, heat / np.where(up, step, 1.0), np.nan))


def singular_term(reduced_temperature: npt.ArrayLike, *, exponent: float) -> FloatArray:
    """Return ``(t^-alpha - 1)/alpha``, and -ln t for alpha = 0.

    Parameters
    ----------
    reduced_temperature : array_like
        t = |1 - T/T_lambda|, > 0.
    exponent : float
        alpha.

    Notes
    -----
    Written as ``L (exp(alpha L) - 1)/(alpha L)`` with L = -ln t, so that no digit is lost when alpha is small.

    Examples
    --------
    >>> float(singular_term(0.01, exponent=0.0)) == float(singular_term(0.01, exponent=1e-18))
    True
    >>> round(float(singular_term(1e-4, exponent=-0.0127)), 6), round((1e4**-0.0127 - 1) / -0.0127, 6)
    (8.692071, 8.692071)
    """
    L = -np.log(np.asarray(reduced_temperature, dtype=np.float64))
    x = exponent * L
    tiny = np.abs(x) < 1e-12
    safe = np.where(tiny, 1.0, x)
    return np.asarray(L * np.where(tiny, 1 + x / 2, np.expm1(safe) / safe))


@dataclass(frozen=True)
class LambdaLaw:
    """Heat capacity on both sides of the lambda point.

    Below: ``C = (A/alpha) t^-alpha (1 + a t^Delta + b t^(2 Delta)) + B``; above the same with A^+ in place of A. Written here as
    ``A S(t) + K + (E t^Delta + G t^(2 Delta)) t^-alpha`` with ``K = B + A/alpha``, ``E = a A/alpha``, ``G = b A/alpha``, and above
    ``(1 - P alpha)(A S + ...) + K - P A`` with ``P = (1 - A^+/A)/alpha``; all of these stay finite for alpha = 0.

    Attributes
    ----------
    amplitude : float
        A below the transition, J/(mol K).
    exponent : float
        alpha.
    constant : float
        K, J/(mol K).
    asymmetry : float
        P.
    first, second : float
        E and G, J/(mol K).
    confluent_exponent : float
        Delta.

    References
    ----------
    J. A. Lipa, J. A. Nissen, D. A. Stricker, D. R. Swanson, T. C. P. Chui, "Specific heat of liquid helium in zero gravity very near the lambda
    point", Physical Review B 68, 174518 (2003), title from memory: form; that a and b are common to both sides is an assumption of this form.
    """

    amplitude: float
    exponent: float
    constant: float
    asymmetry: float
    first: float = 0.0
    second: float = 0.0
    confluent_exponent: float = CONFLUENT_EXPONENT

    @classmethod
    def from_amplitudes(
        cls,
        *,
        amplitude: float,
        exponent: float,
        background: float,
        amplitude_ratio: float,
        first: float = 0.0,
        second: float = 0.0,
        confluent_exponent: float = CONFLUENT_EXPONENT,
    ) -> LambdaLaw:
        """Return the law from A, alpha, B, A^+/A, a and b as they are published.

        Raises
        ------
        ValueError
            ``exponent`` is zero, where the published form has no meaning.
        """
        if exponent == 0:
            raise ValueError("exponent: found 0, expected a number beside it; B + A/alpha has no value there")
        great = amplitude / exponent
        return cls(amplitude, exponent, background + great, (1 - amplitude_ratio) / exponent, great * first, great * second,
                   confluent_exponent)  # fmt: skip

    @property
    def amplitude_ratio(self) -> float:
        """A above over A below the transition."""
        return 1 - self.asymmetry * self.exponent

    @property
    def background(self) -> float:
        """B, J/(mol K); infinite for a logarithm."""
        return self.constant - self.amplitude / self.exponent if self.exponent else -np.inf * self.amplitude

    def value(self, reduced_temperature: npt.ArrayLike, *, below: npt.ArrayLike) -> FloatArray:
        """Return the heat capacity, J/(mol K).

        Parameters
        ----------
        reduced_temperature : array_like
            |1 - T/T_lambda|, > 0.
        below : array_like of bool
            Whether the temperature lies below the transition.
        """
        t = np.asarray(reduced_temperature, dtype=np.float64)
        power = t**self.confluent_exponent
        corrections = (self.first + self.second * power) * power * t**-self.exponent
        near = self.amplitude * singular_term(t, exponent=self.exponent) + corrections
        above = self.amplitude_ratio * near - self.asymmetry * self.amplitude
        return np.asarray(self.constant + np.where(below, near, above))

"""The forms in which resistance thermometers are calibrated: ln T and its slope as functions of ln R.

Rules: a curve knows the span of its calibration points; a curve that makes no sense is refused. Temperatures are on the
calibration's scale.

References
----------
J. R. Clement, E. H. Quinnell, Rev. Sci. Instrum. 23, 213 (1952) (from memory). Hopping laws with exponent 1/4 and 1/2
are named after Mott and after Efros and Shklovskii.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal, Protocol

import numpy as np
from numpy.polynomial import chebyshev, polynomial
from scipy.interpolate import CubicSpline

from archive.physics.inversion import monotonic_inverse
from archive.physics.ranges import Floats, floats

__all__ = [
    "ChebyshevCurve",
    "ClementQuinnellCurve",
    "HoppingCurve",
    "InverseLogPolynomialCurve",
    "LogPolynomialCurve",
    "ResistanceCurve",
    "SplineCurve",
    "log_polynomial_span",
]


class ResistanceCurve(Protocol):
    """A calibration curve: ln T and its slope as functions of ln R, over a span of resistances in ohm."""

    @property
    def resistance_span(self) -> tuple[float, float]:
        """Smallest and largest resistance of the calibration, ohm."""
        ...

    def log_temperature(self, log_resistance: Floats) -> tuple[Floats, Floats]:
        """Return ln(T/K) and d(ln T)/d(ln R)."""
        ...


def _check_span(span: tuple[float, float], name: str) -> None:
    if not 0 < span[0] < span[1] < math.inf:
        raise ValueError(f"{name}: found {span}, expected two numbers above 0, the smaller first")


@dataclass(frozen=True)
class ChebyshevCurve:
    """T = sum a_i cos(i arccos k) in K, with k = ((Z - ZL) - (ZU - Z))/(ZU - ZL) and Z the logarithm of R.

    Attributes
    ----------
    coefficients : tuple of float
        a_i in K.
    lower, upper : float
        ZL and ZU; they belong to the calibration and usually lie slightly outside its data.
    logarithm : {"ln", "log10"}
        Which logarithm Z is.
    span : tuple of float, optional
        Resistances of the outermost calibration points, ohm; without it ZL and ZU.
    """

    coefficients: tuple[float, ...]
    lower: float
    upper: float
    logarithm: Literal["ln", "log10"]
    span: tuple[float, float] | None = None

    def __post_init__(self) -> None:
        """Refuse limits out of order and a span beyond them, where k would leave -1 to 1."""
        if self.logarithm not in ("ln", "log10"):
            raise ValueError(f"logarithm: found {self.logarithm!r}, expected 'ln' or 'log10'")
        if not self.lower < self.upper:
            raise ValueError(f"upper: found {self.upper}, expected more than lower, {self.lower}")
        if self.span is not None:
            _check_span(self.span, "span")
            low, high = self._limits()
            if self.span[0] < low or self.span[1] > high:
                raise ValueError(
                    f"span: found {self.span}, expected to lie within ZL and ZU, {low:.6g} to {high:.6g} ohm"
                )

    def _limits(self) -> tuple[float, float]:
        base = math.e if self.logarithm == "ln" else 10.0
        return base**self.lower, base**self.upper

    @property
    def resistance_span(self) -> tuple[float, float]:
        """Smallest and largest resistance of the calibration, ohm."""
        return self._limits() if self.span is None else self.span

    def log_temperature(self, log_resistance: Floats) -> tuple[Floats, Floats]:
        """Return ln(T/K) and d(ln T)/d(ln R)."""
        factor = 1.0 if self.logarithm == "ln" else 1 / math.log(10)
        Z = factor * log_resistance
        k = ((Z - self.lower) - (self.upper - Z)) / (self.upper - self.lower)
        T = chebyshev.chebval(k, self.coefficients)
        slope = (
            chebyshev.chebval(k, chebyshev.chebder(self.coefficients))
            * 2
            * factor
            / (self.upper - self.lower)
        )
        with np.errstate(invalid="ignore", divide="ignore"):
            return np.log(T), slope / T


@dataclass(frozen=True)
class LogPolynomialCurve:
    """ln(T/K) = sum b_i x^i with x = (ln(R/ohm) - centre)/scale, over a span of resistances in ohm."""

    coefficients: tuple[float, ...]
    resistance_span: tuple[float, float]
    centre: float = 0.0
    scale: float = 1.0

    def __post_init__(self) -> None:
        """Refuse a span out of order."""
        _check_span(self.resistance_span, "resistance_span")

    def log_temperature(self, log_resistance: Floats) -> tuple[Floats, Floats]:
        """Return ln(T/K) and d(ln T)/d(ln R)."""
        x = (log_resistance - self.centre) / self.scale
        slope = polynomial.polyval(x, polynomial.polyder(self.coefficients)) / self.scale
        return floats(polynomial.polyval(x, self.coefficients)), floats(slope)


def log_polynomial_span(
    coefficients: tuple[float, ...],
    temperature_span: tuple[float, float],
    *,
    centre: float = 0.0,
    scale: float = 1.0,
) -> tuple[float, float]:
    """Return the resistances between which a polynomial ln T(ln R) runs through a span of temperatures.

    Parameters
    ----------
    coefficients, centre, scale
        As in `LogPolynomialCurve`.
    temperature_span : tuple of float
        Lowest and highest temperature of the calibration, K.

    Returns
    -------
    tuple of float
        Ohm.

    Raises
    ------
    ValueError
        When no stretch, or more than one, takes each temperature of the span exactly once: then the certificate's range
        of resistances is needed.
    """
    _check_span(temperature_span, "temperature_span")
    curve = polynomial.Polynomial(coefficients)
    ends = []
    for T in temperature_span:
        roots = (curve - math.log(T)).roots()
        ends.append(roots[np.abs(roots.imag) < 1e-9].real)
    turns = [float(root.real) for root in curve.deriv().roots() if abs(root.imag) < 1e-9]
    spans = [
        (min(a, b), max(a, b))
        for a in ends[0].tolist()
        for b in ends[1].tolist()
        if not any(min(a, b) < turn < max(a, b) for turn in turns)
    ]
    if len(spans) != 1:
        raise ValueError(
            f"coefficients: {len(spans)} stretches of this polynomial run from {temperature_span[0]:g} to "
            f"{temperature_span[1]:g} K without turning, expected one; give the resistances of the outermost points"
        )
    low, high = spans[0]
    return math.exp(centre + scale * low), math.exp(centre + scale * high)


@dataclass(frozen=True)
class InverseLogPolynomialCurve:
    """ln(R/ohm) = sum b_i x^i with x = (ln(T/K) - centre)/scale, over a span of temperatures in K."""

    coefficients: tuple[float, ...]
    temperature_span: tuple[float, float]
    centre: float = 0.0
    scale: float = 1.0

    def __post_init__(self) -> None:
        """Refuse a span out of order or a curve that turns within it, since no inverse exists there."""
        _check_span(self.temperature_span, "temperature_span")
        grid = np.linspace(math.log(self.temperature_span[0]), math.log(self.temperature_span[1]), 400)
        slope = self._log_resistance(grid)[1]
        if not (np.all(slope > 0) or np.all(slope < 0)):
            raise ValueError(
                "coefficients: dR/dT changes sign within temperature_span, so two temperatures fit one resistance"
            )

    def _log_resistance(self, log_temperature: Floats) -> tuple[Floats, Floats]:
        x = (log_temperature - self.centre) / self.scale
        slope = polynomial.polyval(x, polynomial.polyder(self.coefficients)) / self.scale
        return floats(polynomial.polyval(x, self.coefficients)), floats(slope)

    @property
    def resistance_span(self) -> tuple[float, float]:
        """Smallest and largest resistance of the calibration, ohm."""
        ends = np.exp(self._log_resistance(np.log(self.temperature_span))[0])
        return float(ends.min()), float(ends.max())

    def log_temperature(self, log_resistance: Floats) -> tuple[Floats, Floats]:
        """Return ln(T/K) and d(ln T)/d(ln R), by root finding in the span."""
        low, high = np.log(self.temperature_span)
        log_T = floats(monotonic_inverse(self._log_resistance, log_resistance, low=low, high=high))
        return log_T, 1 / self._log_resistance(log_T)[1]


@dataclass(frozen=True)
class SplineCurve:
    """Cubic not-a-knot spline of ln T against ln R through the points, noise included; for dense data only.

    Attributes
    ----------
    resistances, temperatures : tuple of float
        The points in ohm and K, at least 4, resistances all different; in any order.
    """

    resistances: tuple[float, ...]
    temperatures: tuple[float, ...]

    def __post_init__(self) -> None:
        """Refuse points that are too few, not above zero, or two at one resistance."""
        R, T = floats(self.resistances), floats(self.temperatures)
        if R.shape != T.shape or R.size < 4:
            raise ValueError(
                f"temperatures: found {T.size} for {R.size} resistances, expected as many and at least 4"
            )
        if not ((R > 0).all() and (T > 0).all()):
            raise ValueError("resistances, temperatures: every value must be above 0")
        if np.unique(R).size != R.size:
            raise ValueError("resistances: two points have the same resistance; average them first")

    @property
    def resistance_span(self) -> tuple[float, float]:
        """Smallest and largest resistance of the calibration, ohm."""
        return min(self.resistances), max(self.resistances)

    def log_temperature(self, log_resistance: Floats) -> tuple[Floats, Floats]:
        """Return ln(T/K) and d(ln T)/d(ln R)."""
        order = np.argsort(self.resistances)
        spline = CubicSpline(np.log(self.resistances)[order], np.log(self.temperatures)[order])
        return spline(log_resistance), spline(log_resistance, 1)


@dataclass(frozen=True)
class HoppingCurve:
    """ln R = ln R0 + (T0/T)^n: exponent 1/4 (Mott) or 1/2 (Efros-Shklovskii), over a span of temperatures in K."""

    R0: float
    T0: float
    exponent: float
    temperature_span: tuple[float, float]

    def __post_init__(self) -> None:
        """Refuse parameters that are not above zero."""
        _check_span(self.temperature_span, "temperature_span")
        for name, value in (("R0", self.R0), ("T0", self.T0), ("exponent", self.exponent)):
            if not 0 < value < math.inf:
                raise ValueError(f"{name}: found {value}, expected a number above 0")

    @property
    def resistance_span(self) -> tuple[float, float]:
        """Smallest and largest resistance of the calibration, ohm."""
        cold, warm = self.temperature_span
        return self._resistance(warm), self._resistance(cold)

    def _resistance(self, T: float) -> float:
        return self.R0 * math.exp((self.T0 / T) ** self.exponent)

    def log_temperature(self, log_resistance: Floats) -> tuple[Floats, Floats]:
        """Return ln(T/K) and d(ln T)/d(ln R)."""
        excess = log_resistance - math.log(self.R0)
        return math.log(self.T0) - np.log(excess) / self.exponent, -1 / (self.exponent * excess)


@dataclass(frozen=True)
class ClementQuinnellCurve:
    """ln R + K/ln R = A + B/T for carbon resistors, over a span of resistances in ohm, all above 1 ohm."""

    A: float
    B: float
    K: float
    resistance_span: tuple[float, float]

    def __post_init__(self) -> None:
        """Refuse a span where ln R vanishes or T is not above zero."""
        _check_span(self.resistance_span, "resistance_span")
        if self.resistance_span[0] <= 1:
            raise ValueError(
                f"resistance_span: found {self.resistance_span}, expected resistances above 1 ohm"
            )

    def log_temperature(self, log_resistance: Floats) -> tuple[Floats, Floats]:
        """Return ln(T/K) and d(ln T)/d(ln R)."""
        inverse = log_resistance + self.K / log_resistance - self.A
        with np.errstate(invalid="ignore", divide="ignore"):
            return np.log(self.B / inverse), -(1 - self.K / log_resistance**2) / inverse

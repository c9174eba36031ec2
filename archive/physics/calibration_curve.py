"""A thermometer's calibration as numbers: temperature from a reading, and how it answers to each coefficient.

Rules: readings and coefficients are in the calibration's own unit; nothing is extrapolated: outside the readings of the
calibration points there is no temperature. Every form is linear, or linearised, in its coefficients, so that the
uncertainty of each coefficient can be carried into every temperature.

References
----------
JCGM 100:2008 (GUM), 5.2.2: contributions are derivatives times the uncertainty of the input.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.polynomial import chebyshev, polynomial
from numpy.typing import ArrayLike, NDArray
from scipy.interpolate import CubicSpline

from archive.physics.ranges import Floats, floats

__all__ = ["CalibrationCurve", "CurveForm"]

CurveForm = Literal["chebyshev", "log-polynomial", "spline", "curie-weiss"]

# The ends of the span as they come back through text and logarithms.
_ROUNDING = 1e-12


@dataclass(frozen=True)
class CalibrationCurve:
    """A calibration curve with its coefficients.

    Attributes
    ----------
    form : str
        ``chebyshev``: T = sum a_i T_i(x) in K; ``log-polynomial``: ln(T/K) = sum b_i x^i; both with
        x = (ln(reading) - centre)/half_width. ``spline``: not-a-knot cubic spline of ln T against ln(reading), coefficients are
        the temperatures at `knots` in K. ``curie-weiss``: T = theta + C/(reading - M0), coefficients M0, C, theta.
    coefficients : tuple of float
    reading_span : tuple of float
        Smallest and largest reading of the calibration.
    centre, half_width : float
    knots : tuple of float
        Readings of the spline's points, rising.

    Examples
    --------
    >>> curve = CalibrationCurve("curie-weiss", (1.0, 0.1, 0.0), (1.5, 5.0))
    >>> curve.temperature([3.0, 9.0]).tolist()
    [0.05, nan]
    """

    form: CurveForm
    coefficients: tuple[float, ...]
    reading_span: tuple[float, float]
    centre: float = 0.0
    half_width: float = 1.0
    knots: tuple[float, ...] = ()

    def temperature(self, reading: ArrayLike) -> Floats:
        """Return temperatures in K of readings; NaN outside the span and for a missing reading."""
        x, inside = self._inside(reading)
        result = np.full(x.shape, np.nan)
        if inside.any():
            result[inside] = self._temperature(x[inside])
        return result

    def derivatives(self, reading: ArrayLike) -> Floats:
        """Return dT/d(coefficient), one row a reading and one column a coefficient; NaN where there is no temperature."""
        x, inside = self._inside(reading)
        result = np.full((x.size, len(self.coefficients)), np.nan)
        if inside.any():
            result[inside] = self._derivatives(x[inside])
        return result

    def slope(self, reading: ArrayLike) -> Floats:
        """Return dT/d(reading) in K over the unit of the reading; NaN outside the span."""
        x, inside = self._inside(reading)
        result = np.full(x.shape, np.nan)
        if inside.any():
            result[inside] = self._slope(x[inside])
        return result

    def is_monotonic(self, points: int = 2000) -> bool:
        """Return whether dT/d(reading) keeps one sign over the whole span, on a fine grid, and T has no pole in it."""
        low, high = self.reading_span
        if self.form == "curie-weiss" and low <= self.coefficients[0] <= high:
            return False
        grid = np.linspace(low, high, points) if low <= 0 else np.geomspace(low, high, points)
        slope = self._slope(grid[1:-1])
        return bool(np.all(slope > 0) or np.all(slope < 0))

    def contributions(self, reading: ArrayLike, shifts: ArrayLike) -> Floats:
        """Return how temperatures move when the coefficients move, to first order.

        Parameters
        ----------
        reading : array_like, shape (n,)
        shifts : array_like, shape (coefficients,) or (sources, coefficients)
            Signed contribution of one source to each coefficient.

        Returns
        -------
        ndarray, shape (n,) or (sources, n)
            K; 0 where there is no temperature, since nothing is uncertain there.
        """
        return np.nan_to_num(floats(shifts) @ self.derivatives(reading).T)

    def _inside(self, reading: ArrayLike) -> tuple[Floats, NDArray[np.bool_]]:
        x = np.atleast_1d(floats(reading))
        low, high = self.reading_span
        give = _ROUNDING * max(abs(low), abs(high))
        with np.errstate(invalid="ignore"):
            return x, (x >= low - give) & (x <= high + give)

    def _variable(self, x: Floats) -> Floats:
        return floats((np.log(x) - self.centre) / self.half_width)

    def _temperature(self, x: Floats) -> Floats:
        match self.form:
            case "chebyshev":
                return floats(chebyshev.chebval(self._variable(x), self.coefficients))
            case "log-polynomial":
                return floats(np.exp(polynomial.polyval(self._variable(x), self.coefficients)))
            case "spline":
                return floats(np.exp(self._spline(np.log(self.coefficients))(np.log(x))))
            case "curie-weiss":
                offset, constant, theta = self.coefficients
                return floats(theta + constant / (x - offset))

    def _derivatives(self, x: Floats) -> Floats:
        order = len(self.coefficients) - 1
        match self.form:
            case "chebyshev":
                return floats(chebyshev.chebvander(self._variable(x), order))
            case "log-polynomial":
                return floats(
                    polynomial.polyvander(self._variable(x), order) * self._temperature(x)[:, np.newaxis]
                )
            case "spline":
                # The spline is linear in the logarithms of its points: one unit vector after the other.
                each = self._spline(np.eye(len(self.knots)))(np.log(x))
                return floats(each * self._temperature(x)[:, np.newaxis] / floats(self.coefficients))
            case "curie-weiss":
                offset, constant, _ = self.coefficients
                excess = x - offset
                return np.column_stack([constant / excess**2, 1 / excess, np.ones_like(x)])

    def _slope(self, x: Floats) -> Floats:
        match self.form:
            case "chebyshev":
                inner = chebyshev.chebval(self._variable(x), chebyshev.chebder(self.coefficients))
                return floats(inner / (self.half_width * x))
            case "log-polynomial":
                inner = polynomial.polyval(self._variable(x), polynomial.polyder(self.coefficients))
                return floats(inner * self._temperature(x) / (self.half_width * x))
            case "spline":
                return floats(
                    self._spline(np.log(self.coefficients))(np.log(x), 1) * self._temperature(x) / x
                )
            case "curie-weiss":
                offset, constant, _ = self.coefficients
                return floats(-constant / (x - offset) ** 2)

    def _spline(self, values: Floats) -> CubicSpline:
        return CubicSpline(np.log(self.knots), values)

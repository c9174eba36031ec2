"""The vortex flow integrated in closed form, and what bound pairs add to the inverse stiffness along it.

Rules: with s of `film_static.x_of_s` the length is ``dl = g dv``, where v is the flow time of the linearised equations, for
which s(v) and the fugacity are elementary on both sides of the transition, and ``g = dx/ds`` is a power series. Panels are
laid along the flow as wide as the nearest pole of the integrand allows, for each temperature on its own; nothing is
tabulated and nothing is kept between calls.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import BoolArray, ComplexArray, FloatArray
from archive.physics.film_static import x_of_s

__all__ = ["EDGE", "BoundPairs", "bound_pairs", "flow", "flow_rate", "linear_length", "panels"]

X_END = 1.0
"""The flow above the transition ends at half the universal stiffness: this defines xi_+ here."""

EDGE = math.sqrt(2 * (X_END - math.log1p(X_END)))

ORDER = 20
"""Nodes of a panel. With the rules below, two nodes more bring a digit, and these reach 4e-12 of either part of the stiffness
by itself."""

GROWTH = 4.5
"""Distances of a panel's ends from the flow's own poles, before its start and past its end, have this ratio at most: the
ellipse through such a pole has the half axes' sum (sqrt(4.5) + 1)/(sqrt(4.5) - 1) = 2.8."""

CORE = 0.85
"""Half width of the panel across l_D. The kernel's pole is pi/4 off the axis, for a half axes' sum of 2.3."""

APPROACH, RETREAT = 6.0, 11.0
"""Ratio of the distances from l_D of a panel's ends, before and past it; the pole is off the axis, so they may be larger. Past
l_D the kernel falls as exp(-2 l), and one panel reaches beyond `TAIL`."""

TAIL = 8.5
"""Length beyond l_D up to which the flow is followed below the transition; the rest is a series."""

REACH = 20.0
"""The same above the transition, where the flow may still end: exp(-2 REACH) is below double precision."""

BLOCK = 512
"""Flows integrated at once: their nodes stay in the processor's cache."""


def _series(count: int) -> FloatArray:
    """Return the coefficients of ``g(s) = dx/ds``, from ``x dx/ds = s (1 + x)`` term by term."""
    x = [0.0, 1.0]
    for n in range(2, count + 1):
        x.append(x[n - 1] / (n + 1) - sum(x[i] * x[n + 1 - i] for i in range(2, n)) / 2)
    return np.arange(1.0, count + 1) * np.asarray(x[1:], dtype=np.float64)


def _polynomials(*limits: float) -> tuple[tuple[float, FloatArray], ...]:
    """Return, for each limit of |s|, the coefficients of the shortest polynomial in s that keeps double precision there.

    The nearest singularity of g is where s^2/2 = 2 pi i, so the terms go as (|s|/3.54)^n and 54 reach 1.7. In Chebyshev
    polynomials of s/limit they fall off faster, so fewer are needed.
    """
    series, found = _series(54), []
    for limit in limits:
        powers = limit ** np.arange(series.size)
        chebyshev = np.polynomial.chebyshev.poly2cheb(series * powers)
        kept = int(np.flatnonzero(np.abs(chebyshev) > 1e-16)[-1]) + 1
        found.append((limit, np.polynomial.chebyshev.cheb2poly(chebyshev[:kept]) / powers[:kept]))
    return tuple(found)


POLYNOMIALS = _polynomials(0.3, 0.8, 1.2, 1.7)

IndexArray = npt.NDArray[np.intp]


def _running_integral(order: int) -> FloatArray:
    """Return the matrix from values at Gauss-Legendre nodes of [0, 1] to integrals from 0 to each node and to 1."""
    x, w = np.polynomial.legendre.leggauss(order)
    values = np.polynomial.legendre.legvander(x, order - 1)
    degrees = np.arange(order)
    to_coefficients = ((2 * degrees + 1) / 2)[:, np.newaxis] * (values * w[:, np.newaxis]).T
    at = np.append(x, 1.0)
    higher = np.polynomial.legendre.legvander(at, order)
    integrals = np.empty((order + 1, order))
    integrals[:, 0] = at + 1
    integrals[:, 1:] = (higher[:, 2:] - higher[:, :-2]) / (2 * degrees[1:] + 1)
    return np.ascontiguousarray((integrals @ to_coefficients / 2).T)


RUNNING = _running_integral(ORDER)
NODES = np.append((np.polynomial.legendre.leggauss(ORDER)[0] + 1) / 2, 1.0)
WEIGHTS = np.polynomial.legendre.leggauss(ORDER)[1] / 2


def flow_rate(s: FloatArray) -> FloatArray:
    """Return ``g = dl/dv = dx/ds``, which is (1 + x) s/x.

    Parameters
    ----------
    s : ndarray
        sign(x) sqrt(2 (x - ln(1 + x))).
    """
    largest = float(np.max(np.abs(s), initial=0.0))
    for limit, coefficients in POLYNOMIALS:
        if largest <= limit:
            return _horner(coefficients, s)
    near = np.abs(s) <= limit
    x = x_of_s(s)
    return np.where(near, _horner(coefficients, np.where(near, s, 0.0)), (1 + x) * s / np.where(near, 1.0, x))


def _horner(coefficients: FloatArray, s: FloatArray) -> FloatArray:
    result = np.full(s.shape, coefficients[-1])
    for coefficient in coefficients[-2::-1]:
        result *= s
        result += coefficient
    return result


def linear_length(root: FloatArray, s0: FloatArray) -> FloatArray:
    """Return the flow time from s0 to the end, for c = root^2 > 0."""
    return (np.arctan2(EDGE, root) - np.arctan2(s0, root)) / (2 * root)


def panels(count: int, order: int) -> tuple[FloatArray, FloatArray]:
    """Return nodes and weights of composite Gauss-Legendre quadrature on [0, 1]."""
    x, w = np.polynomial.legendre.leggauss(order)
    nodes = (np.arange(count)[:, np.newaxis] + (x + 1) / 2) / count
    return nodes.ravel(), np.tile(w / 2, count) / count


def flow(c: FloatArray, s0: FloatArray, v: FloatArray) -> FloatArray:
    """Return s after the flow time v: ds/dv = 2 (s^2 + c), from s0.

    Parameters
    ----------
    c, s0, v : ndarray
        Invariant, start and flow time; they broadcast.
    """
    shape = np.broadcast_shapes(c.shape, s0.shape, v.shape)
    c, s0, v = (each.ravel() for each in np.broadcast_arrays(c, s0, v))
    order = np.argsort(c, kind="stable")
    tangent, _ = _tangents(c[order, np.newaxis], v[order, np.newaxis])
    s = np.empty(c.size)
    s[order] = (s0[order] + c[order] * tangent[:, 0]) / (1 - s0[order] * tangent[:, 0])
    return s.reshape(shape)


def _tangents(c: FloatArray, v: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return ``tan(2 v sqrt c)/sqrt c``, hyperbolic for c < 0, and one plus c times its square, row by row; c rises."""
    # A root of zero would divide zero by zero; this one gives the limit 2 v exactly.
    root = np.maximum(np.sqrt(np.abs(c)), 1e-100)
    angle = 2 * root * v
    below = int(np.searchsorted(c[:, 0], 0.0, side="right"))
    tangent, square = np.empty(angle.shape), np.empty(angle.shape)
    # Past this the fugacity is below 1e-120 of its start, and squares do not overflow.
    np.sinh(np.minimum(angle[:below], 150.0), out=tangent[:below])
    np.multiply(tangent[:below], tangent[:below], out=square[:below])
    square[:below] += 1
    # One less the tangent's square, which is near one, would lose every digit; this does not.
    np.reciprocal(square[:below], out=square[:below])
    tangent[:below] *= np.sqrt(square[:below])
    np.tan(angle[below:], out=tangent[below:])
    tangent /= root
    np.multiply(tangent[below:], tangent[below:], out=square[below:])
    square[below:] *= c[below:]
    square[below:] += 1
    return tangent, square


@dataclass(frozen=True)
class BoundPairs:
    """What the flow adds to the inverse stiffness.

    Attributes
    ----------
    sum : ndarray of complex
        Integral of ``2 Y^2/(1 - i exp(2 (l - l_D))) dl`` along the flow.
    slope : ndarray of complex
        Its derivative by l_D.
    l_plus : ndarray
        Length at which the flow ends; infinite where it does not, or not within `REACH` of l_D.
    """

    sum: ComplexArray
    slope: ComplexArray
    l_plus: FloatArray


def bound_pairs(c: FloatArray, s0: FloatArray, l_D: FloatArray, *, slope: bool = False) -> BoundPairs:
    """Return the part of the bound pairs, and where the flow ends.

    Parameters
    ----------
    c, s0 : ndarray, shape (flows,)
        Invariant and start of each flow; s0 < 0 where c <= 0.
    l_D : ndarray, shape (flows,)
        Diffusion length as ln(r_D/a).
    slope : bool
        Whether to compute the derivative; otherwise it is zero.

    Notes
    -----
    Below the transition the integral beyond l_D + `TAIL` is ``y/a + y rho'/a^3`` for ``y = Y^2``, its logarithmic slope rho
    and ``a = 2 m - rho``, for the terms i/z (m = 1) and 1/z^2 (m = 2) of the kernel, each by parts.
    """
    total, derivative = np.zeros(c.shape, dtype=np.complex128), np.zeros(c.shape, dtype=np.complex128)
    l_plus = np.where((c > 0) & (s0 >= EDGE), 0.0, np.inf)
    unknown = np.isnan(c) | np.isnan(s0) | np.isnan(l_D)
    total[unknown], derivative[unknown] = math.nan, math.nan
    rows = np.flatnonzero((s0 < EDGE) & (s0 * s0 + c > 0) & ~unknown)
    # Flows of like invariant take like panels, so they are done side by side.
    rows = rows[np.argsort(c[rows], kind="stable")]
    for begin in range(0, rows.size, BLOCK):
        block = rows[begin : begin + BLOCK]
        march = _March(c[block], s0[block], l_D[block], slope=slope)
        march.run()
        total[block], derivative[block], l_plus[block] = march.total, march.derivative, march.l_plus
    return BoundPairs(total, derivative, l_plus)


class _March:
    """Panel after panel along several flows in rising order of c, each flow with its own widths."""

    def __init__(self, c: FloatArray, s0: FloatArray, l_D: FloatArray, *, slope: bool) -> None:
        self.c, self.s0, self.l_D, self.slope = c, s0, l_D, slope
        self.start2 = s0 * s0 + c
        self.above = c > 0
        root = np.sqrt(np.where(self.above, c, 1.0))
        self.end = np.where(self.above, linear_length(root, s0), np.inf)
        # Flow time from the pole of s behind the start; below the transition at least this, which it is at c = 0.
        behind = np.where(s0 < 0, np.arctan2(root, -s0), np.pi / 2) / (2 * root)
        self.left = np.where(self.above, behind, -1 / (2 * np.minimum(s0, -1e-100)))
        self.right = self.end + np.arctan2(root, EDGE) / (2 * root)
        self.limit = np.maximum(l_D, 0.0) + np.where(self.above, REACH, TAIL)
        self.total = np.zeros(c.shape, dtype=np.complex128)
        self.derivative = np.zeros(c.shape, dtype=np.complex128)
        self.l_plus = np.full(c.shape, np.inf)

    def run(self) -> None:
        v, length, rate = np.zeros(self.c.shape), np.zeros(self.c.shape), flow_rate(self.s0)
        rows = np.arange(self.c.size)
        while rows.size:
            width, last = self._width(rows, v, length, rate)
            s, y, rate, inside = self._panel(rows, v, length, width)
            v, length = v + width, length + inside
            ended = last | (length >= self.limit[rows])
            self.l_plus[rows[last]] = length[last]
            below = ended & ~self.above[rows]
            if below.any():
                self._finish(rows[below], s[below], y[below], rate[below], length[below])
            on = ~ended
            rows, v, length, rate = rows[on], v[on], length[on], rate[on]

    def _width(
        self, rows: IndexArray, v: FloatArray, length: FloatArray, rate: FloatArray
    ) -> tuple[FloatArray, BoolArray]:
        """Return the flow time that the next panel may take, and which panel is a flow's last."""
        before = self.l_D[rows] - length
        width = np.where(
            before > CORE * 1.3,
            before - np.maximum(before / APPROACH, CORE),
            np.maximum(before + CORE, -(RETREAT - 1) * before),
        )
        # g runs towards one on the way to s = 0.
        width *= 2 / (1 + rate)
        width = np.minimum(width, (GROWTH - 1) * (v + self.left[rows]))
        rest = self.end[rows] - v
        width = np.minimum(width, (1 - 1 / GROWTH) * (self.right[rows] - v))
        last = width * 1.1 >= rest
        return np.where(last, rest, width), last

    def _panel(
        self, rows: IndexArray, v: FloatArray, length: FloatArray, width: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
        """Add one panel; return s, Y^2 and g at its end, and its length."""
        s0, c = self.s0[rows, np.newaxis], self.c[rows, np.newaxis]
        tangent, fugacity2 = _tangents(c, v[:, np.newaxis] + width[:, np.newaxis] * NODES)
        # In place where it can be: for these sizes fetching memory costs as much as the sums.
        below = s0 * tangent
        np.subtract(1, below, out=below)
        tangent *= c
        s = np.add(tangent, s0, out=tangent)
        s /= below
        below *= below
        fugacity2 /= below
        fugacity2 *= self.start2[rows, np.newaxis]
        g = flow_rate(s)
        inside = g[:, :ORDER] @ RUNNING
        inside *= width[:, np.newaxis]
        z = inside[:, :ORDER] + (length - self.l_D[rows])[:, np.newaxis]
        z *= 2
        if z[:, -1].max() > 340:
            np.minimum(z, 340.0, out=z)
        np.exp(z, out=z)
        kernel = z * z
        kernel += 1
        real = fugacity2[:, :ORDER] * g[:, :ORDER]
        real /= kernel
        imaginary = real * z
        weights = 2 * WEIGHTS
        self.total[rows] += (real @ weights + 1j * (imaginary @ weights)) * width
        if self.slope:
            turn = 2 * z / kernel
            self.derivative[rows] += width * (
                (2 * imaginary * turn) @ weights + 1j * ((imaginary * (turn * z - 2 / kernel)) @ weights)
            )
        return s[:, -1], fugacity2[:, -1], g[:, -1], inside[:, -1]

    def _finish(
        self, rows: IndexArray, s: FloatArray, y: FloatArray, g: FloatArray, length: FloatArray
    ) -> None:
        """Add what lies beyond the last panel, below the transition."""
        z = np.exp(np.minimum(2 * (length - self.l_D[rows]), 340.0))
        slope = 4 * s / g
        bend = 8 * y * (1 - s / g) ** 2
        first, second = (2 * y / (a * z**m) * (1 + bend / a**2) for m in (1, 2) for a in (2 * m - slope,))
        self.total[rows] += second + 1j * first
        self.derivative[rows] += 4 * second + 2j * first

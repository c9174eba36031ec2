"""The dissipation peak of a film: its temperature and height."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from archive.physics.linear_fit import linear_fit
from archive.reduction.background_steps import known_rows, weights
from archive.reduction.estimate import FloatArray
from archive.reduction.row_choice import row_indices
from archive.reduction.step import Covariance, Outcome
from schemas.base import Record

__all__ = ["PeakParameters", "dissipation_peak"]


class PeakParameters(Record):
    """How the maximum of the dissipation is read."""

    share: float = 0.6
    """Rows of at least this share of the maximum are fitted."""
    rows: tuple[int, ...] | None = None
    """The rows to fit, from 1, in place of that rule."""


def dissipation_peak(
    parameters: PeakParameters,
    *,
    temperature: FloatArray,
    dissipation: FloatArray,
    u_dissipation: FloatArray | None,
) -> Outcome:
    """Return the temperature and height of the dissipation peak, from a cubic through its top.

    Raises
    ------
    ValueError
        No peak inside the record.
    """
    rows = known_rows(temperature, dissipation)
    if np.count_nonzero(rows) < 8:
        raise ValueError(f"dissipation: found {np.count_nonzero(rows)} rows, expected at least 8")
    order = np.flatnonzero(rows)[np.argsort(temperature[rows], kind="stable")]
    chosen = (
        row_indices(parameters.rows, temperature.size)
        if parameters.rows
        else _top(temperature[order], dissipation[order], order, parameters.share)
    )
    chosen = chosen[rows[chosen]]
    T, q = temperature[chosen], dissipation[chosen]
    u = weights(u_dissipation, chosen)
    if chosen.size < 5:
        raise ValueError(f"dissipation: found {chosen.size} rows in the top of the peak, expected at least 5")
    low, high = float(T.min()), float(T.max())
    centre, half = (low + high) / 2, (high - low) / 2
    x = (T - centre) / half
    fit = linear_fit(
        np.vander(x, 4, increasing=True),
        q,
        names=("a", "b", "c", "d"),
        standard_uncertainty=u,
        absolute=False,
    )
    _, b, c, d = map(float, fit.values)
    at = _vertex(b, c, d)
    if not -1 < at < 1:
        raise ValueError("dissipation: its maximum lies at the edge of the record; there is no peak")
    curvature = 2 * c + 6 * d * at
    powers = np.array([1.0, at, at**2, at**3])
    slopes = np.array([0.0, 1.0, 2 * at, 3 * at**2])
    # The vertex moves by -(d slope)/curvature; the height to first order by the value alone.
    jacobian = np.vstack([-slopes / curvature * half, powers])
    covariance = jacobian @ fit.covariance @ jacobian.T
    outputs = {"peak_temperature": centre + half * at, "peak_height": float(powers @ fit.values)}
    return Outcome(
        outputs, covariance=Covariance(("peak_temperature", "peak_height"), covariance), held={"rows": tuple(int(row) + 1 for row in chosen)},
        facts={"points": int(chosen.size), "low_K": low, "high_K": high},
    )  # fmt: skip


def _top(T: FloatArray, q: FloatArray, order: npt.NDArray[np.int64], share: float) -> npt.NDArray[np.int64]:
    """Return the rows around the maximum with at least a share of it, smoothed twice: roughly, then finer than the peak."""
    width = max(1, min(T.size // 40, 25))
    first, after = 0, T.size
    for _ in range(3):
        smooth = _smoothed(q, width)
        k = first + int(np.argmax(smooth[first:after]))
        enough = smooth >= share * smooth[k]
        before, behind = np.flatnonzero(~enough[:k]), np.flatnonzero(~enough[k:])
        if not (before.size and behind.size):
            raise ValueError(
                "dissipation: it does not fall to either side of its maximum inside the record; there is no peak"
            )
        first, after = int(before[-1]) + 1, k + int(behind[0])
        width = max(1, min(width, (after - first) // 10))
    return order[first:after]


def _smoothed(q: FloatArray, width: int) -> FloatArray:
    return np.convolve(np.pad(q, width, mode="edge"), np.ones(2 * width + 1) / (2 * width + 1), mode="valid")


def _vertex(b: float, c: float, d: float) -> float:
    """Return the maximum of b x + c x^2 + d x^3 nearest to zero."""
    roots = np.polynomial.polynomial.polyroots(np.trim_zeros(np.array([b, 2 * c, 3 * d]), "b"))
    real = roots.real[(np.abs(roots.imag) < 1e-12) & (2 * c + 6 * d * roots.real < 0)]
    return float(real[np.argmin(np.abs(real))]) if real.size else math.nan

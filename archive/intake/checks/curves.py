"""A channel against temperature, smoothed in bins: where it drops, how wide, and how two of them lie to each other."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from archive.intake.checks.rows import counting, sigma, temperature
from archive.intake.reading import Reading, SweepTable

__all__ = ["Curve", "curve_of", "drop_width", "lag"]

Floats = NDArray[np.float64]

_BINS = 150
_LEAST = 12


@dataclass(frozen=True)
class Curve:
    """Means of a channel in bins of temperature, rising.

    Attributes
    ----------
    table : SweepTable
    temperature, values : ndarray
        K and SI.
    rows : ndarray of int
        First kept row of each bin.
    uncertainty : float
        Standard uncertainty of one mean.
    """

    table: SweepTable
    temperature: Floats
    values: Floats
    rows: NDArray[np.int64]
    uncertainty: float


def curve_of(
    reading: Reading, table: SweepTable, quantity: str, *, direction: str | None = None, bins: int = _BINS
) -> Curve | None:
    """Return a channel of a sweep against temperature; None without both, or with fewer than twelve points.

    Parameters
    ----------
    direction : {"up", "down"}, optional
        Only rows between which the temperature moves that way; for a sweep of one direction all rows.
    """
    name, T = table.of_kind(quantity), temperature(reading, table)
    if name is None or T is None:
        return None
    values = table.columns[name]
    rows = np.flatnonzero(counting(table) & np.isfinite(T) & np.isfinite(values))
    if direction is not None and table.sweep.direction == "both" and len(rows) > _LEAST:
        turned = int(np.argmax(T[rows]))
        rows = rows[: turned + 1] if direction == "up" else rows[turned:]
    if len(rows) < _LEAST or float(np.ptp(T[rows])) <= 0:
        return None
    order = rows[np.argsort(T[rows], kind="stable")]
    parts = np.array_split(order, min(bins, len(order)))
    means_t = np.array([T[part].mean() for part in parts])
    keep = np.concatenate(([True], np.diff(means_t) > 0))
    u = sigma(table, name) / np.sqrt(np.mean([len(part) for part in parts]))
    return Curve(
        table,
        means_t[keep],
        np.array([values[part].mean() for part in parts])[keep],
        np.array([part.min() for part in parts])[keep],
        float(u),
    )


def _steepest(curve: Curve) -> tuple[int, Floats]:
    slope = np.gradient(curve.values, curve.temperature)
    return int(np.argmax(np.abs(slope))), slope


def drop_width(curve: Curve) -> float | None:
    """Return the width in K of a drop: its height over its largest slope; None if there is none above the noise."""
    at, slope = _steepest(curve)
    height = float(np.ptp(curve.values))
    step = abs(float(curve.values[min(at + 1, len(slope) - 1)] - curve.values[max(at - 1, 0)]))
    # Noise is steep too, between neighbouring bins; a drop stands far above it.
    if not (height > 20 * curve.uncertainty and step > 10 * curve.uncertainty):
        return None
    width = height / float(np.max(np.abs(slope)))
    # A drop is a feature only if it is narrow against the sweep; a background is not.
    return width if width < 0.25 * float(np.ptp(curve.temperature)) else None


def lag(up: Curve, down: Curve) -> tuple[float, float] | None:
    """Return the offset in K of the drop of `down` against `up`, and the temperature of the drop; None without a drop.

    Notes
    -----
    With P_down(T) = P_up(T - d) + c the difference P_up - P_down is d P_up'(T) - c to first order; d and c by least
    squares around the steepest place, repeated twice with `up` shifted by what was found (derived here).
    """
    width = drop_width(up)
    if width is None:
        return None
    at, _ = _steepest(up)
    centre = float(up.temperature[at])
    grid = np.linspace(centre - 2 * width, centre + 2 * width, 81)
    offset = 0.0
    for _ in range(3):
        shifted = up.temperature + offset
        low = max(float(shifted[0]), float(down.temperature[0]))
        high = min(float(shifted[-1]), float(down.temperature[-1]))
        inside = grid[(grid >= low) & (grid <= high)]
        if len(inside) < 10:
            return None
        p_up = np.interp(inside, shifted, up.values)
        p_down = np.interp(inside, down.temperature, down.values)
        slope = np.interp(inside, shifted, np.gradient(up.values, up.temperature))
        design = np.column_stack((slope, np.ones(len(inside))))
        solution = np.linalg.lstsq(design, p_up - p_down, rcond=None)[0]
        offset += float(np.clip(solution[0], -width, width))
    return offset, centre

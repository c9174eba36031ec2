"""Largest amplitude up to which a property of an oscillator keeps its small-amplitude value, from a drive sweep.

Rules: no model of the dependence; what is not resolved, or not reached, is said in place of a number; the level that the small-amplitude
value rests on is told.

References
----------
The project's own; the straight line between two levels and its uncertainty are derived here.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray, same_length, series

__all__ = ["Levels", "LinearLimit", "level_means", "linear_limit"]

SAME_LEVEL = 1e-3
"""Relative difference of drives that are one level: rounding and drift of a generator (common practice, no source)."""


@dataclass(frozen=True)
class Levels:
    """Rows of a drive sweep, averaged level by level, by rising drive.

    Attributes
    ----------
    drive, amplitude, value, standard_uncertainty : ndarray
        Means; the uncertainty is that of the mean value.
    rows : ndarray of int
        Rows in each level.
    """

    drive: FloatArray
    amplitude: FloatArray
    value: FloatArray
    standard_uncertainty: FloatArray
    rows: npt.NDArray[np.int64]


@dataclass(frozen=True)
class LinearLimit:
    """Outcome of the search.

    Attributes
    ----------
    state : str
        "found"; "not reached": the property keeps its value up to the largest amplitude; "not resolved": the readings are too
        uncertain for the limit, or the property has left it at the first step above the lowest levels.
    amplitude, standard_uncertainty : float
        Amplitude at which the property has changed by the limit; not a number unless found. The uncertainty is that of the
        property, seen along the amplitude.
    largest : float
        Largest amplitude of the sweep.
    base, base_uncertainty : float
        Small-amplitude value of the property.
    base_amplitude : float
        Largest amplitude of the levels that the base rests on.
    change, change_uncertainty : float
        Change from the base to the largest amplitude.
    """

    state: Literal["found", "not reached", "not resolved"]
    amplitude: float
    standard_uncertainty: float
    largest: float
    base: float
    base_uncertainty: float
    base_amplitude: float
    change: float
    change_uncertainty: float


def level_means(
    drive: npt.ArrayLike,
    amplitude: npt.ArrayLike,
    value: npt.ArrayLike,
    *,
    standard_uncertainty: npt.ArrayLike | None = None,
) -> Levels:
    """Return the means of the rows of each level of drive.

    Parameters
    ----------
    drive, amplitude, value : array_like
        One row for each reading; drives above zero that differ by less than 1e-3 are one level.
    standard_uncertainty : array_like, optional
        Of each value; without it the scatter within the levels, common to all, is taken.

    Raises
    ------
    ValueError
        Bad arrays, or no level with two rows where no uncertainty is stated.
    """
    d = series("drive", drive, least=3, positive=True)
    a, v = series("amplitude", amplitude), series("value", value)
    same_length(drive=d, amplitude=a, value=v)
    order = np.argsort(d, kind="stable")
    starts = np.flatnonzero(np.diff(np.log(d[order])) > SAME_LEVEL) + 1
    groups = np.split(order, starts)
    counts = np.array([group.size for group in groups], dtype=np.int64)
    means = [np.array([float(np.mean(column[group])) for group in groups]) for column in (d, a, v)]
    if standard_uncertainty is not None:
        u = np.broadcast_to(np.asarray(standard_uncertainty, dtype=np.float64), v.shape)
        series("standard_uncertainty", u, positive=True)
        spread = np.array([float(np.sqrt(np.sum(u[group] ** 2))) / group.size for group in groups])
    else:
        degrees = int(counts.sum() - counts.size)
        if degrees < 1:
            raise ValueError(
                "standard_uncertainty: none is stated, and no level has two rows that would show the scatter"
            )
        scatter = math.sqrt(sum(float(np.sum((v[g] - v[g].mean()) ** 2)) for g in groups) / degrees)
        spread = scatter / np.sqrt(counts)
    return Levels(means[0], means[1], means[2], spread, counts)


def linear_limit(levels: Levels, *, limit: float, low_share: float = 1 / 3) -> LinearLimit:
    """Return the largest amplitude up to which a property stays within a limit of its small-amplitude value.

    Parameters
    ----------
    levels : Levels
        At least three.
    limit : float
        Change that counts, in the unit of the value, > 0.
    low_share : float
        Levels below this share of the largest amplitude, and at least the two lowest, give the small-amplitude value.

    Raises
    ------
    ValueError
        Fewer than three levels, a limit at or below zero, or no change of amplitude.

    Notes
    -----
    The crossing of the limit is found on the straight line between the last level within it and the first one beyond, and its
    uncertainty from those of the two levels and of the base. A level is beyond when it is so by its mean and all higher ones are,
    too; a single one that comes back is scatter. A change that grows as the square of the amplitude makes the base wrong by
    about a third of the square of `low_share` of the change at the largest amplitude: 4 per cent for a third.
    """
    if levels.drive.size < 3:
        raise ValueError(f"levels: found {levels.drive.size}, expected at least 3")
    if not limit > 0:
        raise ValueError(f"limit: found {limit}, expected > 0")
    order = np.argsort(levels.amplitude, kind="stable")
    a, v, u = levels.amplitude[order], levels.value[order], levels.standard_uncertainty[order]
    largest = float(a[-1])
    if not largest > a[0] > 0:
        raise ValueError("levels: the amplitude does not change, or is not above zero")
    low = max(2, int(np.count_nonzero(a <= low_share * largest)))
    low = min(low, a.size - 1)
    weight = 1 / u[:low] ** 2
    base, u_base = float(np.average(v[:low], weights=weight)), float(1 / np.sqrt(weight.sum()))
    away = np.abs(v - base)
    spread = np.hypot(u, u_base)
    common = {
        "largest": largest, "base": base, "base_uncertainty": u_base, "base_amplitude": float(a[low - 1]),
        "change": float(v[-1] - base), "change_uncertainty": float(spread[-1]),
    }  # fmt: skip
    within = np.flatnonzero(away <= limit)
    first = int(within[-1]) + 1 if within.size else 0
    if first == a.size:
        resolved = float(spread[-1]) <= limit / 2
        return LinearLimit("not reached" if resolved else "not resolved", math.nan, math.nan, **common)
    if first < low or float(spread[first]) > limit:
        return LinearLimit("not resolved", math.nan, math.nan, **common)
    side = math.copysign(1.0, float(v[first]) - base)
    before, behind = side * (float(v[first - 1]) - base), side * (float(v[first]) - base)
    part = (limit - before) / (behind - before)
    slope = (behind - before) / float(a[first] - a[first - 1])
    # d(part) is -[(1 - part) d(before) + part d(behind)] over the rise; the base moves both alike.
    spread_of = math.hypot((1 - part) * float(u[first - 1]), part * float(u[first]), u_base)
    crossing = float(a[first - 1]) + part * float(a[first] - a[first - 1])
    return LinearLimit("found", crossing, spread_of / slope, **common)

"""Lines in the response of a resonator: found by matched filters, fitted as complex Lorentzians, or refused.

Rules: a line is looked for only where noise alone would not do as well; what a fit does not bear out is told without a number; a line
narrower than the resolution is kept apart, because a steady tone that nobody drove looks the same.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import ComplexArray, FloatArray
from archive.physics.fitting import FitResult
from archive.physics.pulse_response import PulseResponse, smooth_part
from archive.physics.resonance import Resonance, fit_resonance, resonance_curve

__all__ = ["HOPELESS", "Line", "LineSearch", "resonance_lines"]

IntArray = npt.NDArray[np.int64]

UNRESOLVED_SHARE = 0.75
"""Share of a line's power in two neighbouring points from which on it is narrower than one step: a Lorentzian as wide as a step
has that share (derived by summing 1/(1 + 4 k^2))."""

FIT_WIDTHS = 12
"""Half widths on either side of a line that are fitted."""

HOPELESS = 4
"""Lines refused one after the other, from which on a search ends: what is left is not made of resonances (no source). The fits
that come to nothing are the ones that take long."""

EVALUATIONS = 300
"""Of a curve in one fit, after which there is no line: from a filter's frequency and width a resonance takes some ten to fifty."""

WILD = 5.0
"""Residual, in standard deviations, from which on a point is another line's and left out of the fit once (no source)."""


@dataclass(frozen=True)
class Line:
    """One line of a response.

    Attributes
    ----------
    kind : str
        "resonance": fitted, the numbers stand. "unresolved": narrower than the resolution, only the frequency stands, to a
        step. "refused": there is something, and it is no resonance; `reason` says why.
    frequency, frequency_uncertainty : float
        Hz.
    quality_factor : float
        Not a number unless a resonance.
    height : float
        Diameter of the circle, unit of the response; not a number unless a resonance.
    covariance : ndarray, shape (2, 2)
        Of frequency and quality factor, from the fit.
    statistic : float
        Squared signal over noise of the matched filter that found it.
    chance : float
        Chance that noise alone does as well anywhere in the range.
    reason : str
    """

    kind: Literal["resonance", "unresolved", "refused"]
    frequency: float
    frequency_uncertainty: float
    quality_factor: float
    height: float
    covariance: FloatArray
    statistic: float
    chance: float
    reason: str


@dataclass(frozen=True)
class LineSearch:
    """Lines found, the strongest first.

    Attributes
    ----------
    lines : tuple of Line
    threshold : float
        Statistic that noise alone reaches with the chance asked for.
    complete : bool
        False if the search ended because there were as many lines as asked for, or was given up.
    given_up : bool
        Whether it ended because nothing but refused lines was found any more; weaker resonances may be left.
    """

    lines: tuple[Line, ...]
    threshold: float
    complete: bool
    given_up: bool = False


def resonance_lines(response: PulseResponse, *, most: int = 12, false_alarm: float = 1e-3) -> LineSearch:
    """Return the lines of a response, those that are no resonance included.

    Parameters
    ----------
    response : PulseResponse
    most : int
        Lines to look for, >= 1, strongest first; those that are no resonance count.
    false_alarm : float
        Chance, 0 to 1, that noise alone gives one line.

    Raises
    ------
    ValueError
        `most` or `false_alarm` out of range.

    Notes
    -----
    Filter: the correlation with ``1/(1 + i k/w)`` for half widths w of 1, 2, 4, ... steps, normalised; for noise alone its
    squared magnitude is exponential with mean one, so that n trials exceed s with a chance below ``n exp(-s)`` (derived).
    A line found and fitted, on a background that slopes, is subtracted before the feedthrough is estimated anew and the next
    line is looked for; at the end each resonance is fitted once more with all others subtracted. A tone that is not at a
    frequency of the grid leaks as one over the distance; that region is left out. After `HOPELESS` refused lines in a row, as
    the edge of a decay without a pulse gives, the search is given up.
    """
    if most < 1:
        raise ValueError(f"most: found {most}, expected at least 1")
    if not 0 < false_alarm < 1:
        raise ValueError(f"false_alarm: found {false_alarm}, expected between 0 and 1")
    search = _Search(response)
    threshold = math.log(search.trials / false_alarm)
    given_up = False
    while len(search.found) < most and not given_up:
        index, width, statistic = search.strongest()
        if statistic < threshold:
            break
        search.take(index, width, statistic)
        last = search.found[-HOPELESS:]
        given_up = len(last) == HOPELESS and all(each.line.kind == "refused" for each in last)
    complete = (len(search.found) < most and not given_up) or search.strongest()[2] < threshold
    search.refine()
    lines = sorted((each.line for each in search.found), key=lambda line: -line.statistic)
    return LineSearch(tuple(lines), threshold, complete, given_up and not complete)


@dataclass
class _Taken:
    """A line that was taken out, and its curve if it has one."""

    line: Line
    curve: ComplexArray | None = None


class _Search:
    """What is left of a response while lines are taken out of it."""

    def __init__(self, response: PulseResponse) -> None:
        self.response = response
        self.scale = response.standard_uncertainty * math.sqrt(2)
        self.data: ComplexArray = response.response.copy()
        self.left: ComplexArray = (self.data - response.feedthrough) / self.scale
        self.free = np.ones(self.left.size, dtype=np.bool_)
        """Where lines are still looked for."""
        self.clean = self.free.copy()
        """What is fitted: not where a tone is."""
        widest = max(response.window // 12, 1)
        self.filters = [_filter(2**power) for power in range(widest.bit_length())]
        self.trials = self.left.size * len(self.filters)
        self.found: list[_Taken] = []

    def strongest(self) -> tuple[int, int, float]:
        """Return index, half width in steps and statistic of the strongest line left."""
        from scipy.signal import fftconvolve  # a second of imports that few commands need

        best = (0, 1, 0.0)
        for power, kernel in enumerate(self.filters):
            found = np.abs(fftconvolve(self.left, kernel, mode="same")) ** 2
            index = int(np.argmax(np.where(self.free, found, 0.0)))
            if found[index] > best[2] and self.free[index]:
                best = (index, 2**power, float(found[index]))
        return best

    def take(self, index: int, width: int, statistic: float) -> None:
        """Take the line at an index out of what is left, and keep it."""
        near = slice(max(index - 8, 0), index + 9)
        power = np.maximum(np.abs(self.left[near]) ** 2 - 1, 0)
        pairs = power[1:] + power[:-1]
        if width <= 2 and float(pairs.max()) > UNRESOLVED_SHARE * float(power.sum()):
            taken = _Taken(self._unresolved(near, power))
        else:
            taken = self._resonance(float(self.response.frequency[index]), 2 * width * self.response.step)
            self._blank(index, 2 if taken.curve is not None else 2 * width + 2)
            if taken.curve is not None:
                self.data = self.data - taken.curve
                # Where the model is off by a part of a strong line, the rest must not become a line of its own.
                at = int(np.argmin(np.abs(self.response.frequency - taken.line.frequency)))
                wide = taken.line.frequency / taken.line.quality_factor
                self._blank(at, math.ceil(2 * wide / self.response.step))
                smooth = smooth_part(self.data, self.response) / self.scale
                self.left = np.where(self.free, self.data / self.scale - smooth, 0.0)
        chance = min(1.0, self.trials * math.exp(-statistic))
        taken.line = replace(taken.line, statistic=statistic, chance=chance)
        self.found.append(taken)

    def refine(self) -> None:
        """Fit each resonance once more, with all others subtracted."""
        resonances = [each for each in self.found if each.curve is not None]
        for each in resonances if len(resonances) > 1 else ():
            assert each.curve is not None  # noqa: S101 - chosen so above
            self.data = self.data + each.curve
            line = each.line
            again = self._resonance(line.frequency, line.frequency / line.quality_factor)
            if again.curve is not None:
                each.line = replace(again.line, statistic=line.statistic, chance=line.chance)
                each.curve = again.curve
            self.data = self.data - each.curve

    def _resonance(self, frequency: float, width: float) -> _Taken:
        """Return the resonance that is fitted near a frequency, or that there is none."""
        half = max(FIT_WIDTHS * width / 2, 24 * self.response.step)
        rows = np.flatnonzero((np.abs(self.response.frequency - frequency) <= half) & self.clean)
        found, used = self._fitted(rows, (frequency, width))
        if not found.found or found.fit is None:
            return _Taken(_line("refused", frequency, math.nan, found.reason))
        curve = self._curve(found, found.fit)
        left_out = int(rows.size - used.size)
        words = f"; {left_out} points that belong to another line were left out" if left_out else ""
        index = [found.fit.names.index(name) for name in ("frequency", "quality_factor")]
        line = Line(
            kind="resonance",
            frequency=found.frequency,
            frequency_uncertainty=found.fit.standard_uncertainty("frequency"),
            quality_factor=found.quality_factor,
            height=found.fit.value("height"),
            covariance=np.asarray(found.fit.covariance)[np.ix_(index, index)],
            statistic=math.nan,
            chance=math.nan,
            reason=found.reason + words,
        )
        return _Taken(line, curve)

    def _curve(self, found: Resonance, fit: FitResult) -> ComplexArray:
        """Return a fitted resonance at all frequencies, what the record's end cut off included."""
        unit = resonance_curve(
            self.response.frequency, resonance_frequency=found.frequency, quality_factor=found.quality_factor, height=1.0, phase=0.0
        )  # fmt: skip
        size = fit.value("height") * np.exp(1j * fit.value("phase"))
        if not self.response.driven:
            return np.asarray(size * unit)
        after = fit.value("ending_x") + 1j * fit.value("ending_y")
        return np.asarray((size + after / self.response.divisor) * unit)

    def _fitted(self, rows: IntArray, near: tuple[float, float]) -> tuple[Resonance, IntArray]:
        """Return the fit of one resonance, repeated once without points far off it."""
        found = self._fit(rows, near)
        if not found.found or found.fit is None:
            return found, rows
        residual = np.abs(found.fit.residuals.reshape(2, -1)).max(axis=0)
        wild = residual > WILD * max(
            1.0, found.noise / float(np.median(self.response.standard_uncertainty[rows]))
        )
        if not wild.any() or np.count_nonzero(wild) > rows.size // 10:
            return found, rows
        again = self._fit(rows[~wild], (found.frequency, found.width))
        return (again, rows[~wild]) if again.found else (found, rows)

    def _fit(self, rows: IntArray, near: tuple[float, float]) -> Resonance:
        z = self.data[rows]
        return fit_resonance(
            self.response.frequency[rows], z.real, z.imag, background="sloped",
            standard_uncertainty=self.response.standard_uncertainty[rows], near=near, over_noise=0.0,
            ending=1 / self.response.divisor[rows] if self.response.driven else None,
            max_evaluations=EVALUATIONS,
        )  # fmt: skip

    def _unresolved(self, near: slice, power: FloatArray) -> Line:
        frequency = self.response.frequency[near]
        middle = int(np.argmax(power))
        pair = slice(max(middle - 1, 0), middle + 2)
        centre = float(np.average(frequency[pair], weights=power[pair]))
        reach = max(8, math.ceil(math.sqrt(float(power.max()))))
        self._blank(near.start + middle, reach)
        self.clean[max(near.start + middle - reach, 0) : near.start + middle + reach + 1] = False
        # All places within a step alike (JCGM 100:2008, 4.3.7).
        return _line(
            "unresolved", centre, self.response.step / math.sqrt(12), "narrower than one step of frequency"
        )

    def _blank(self, index: int, reach: int) -> None:
        part = slice(max(index - reach, 0), index + reach + 1)
        self.left[part] = 0
        self.free[part] = False


def _line(kind: Literal["unresolved", "refused"], frequency: float, u: float, reason: str) -> Line:
    nan = math.nan
    return Line(kind, frequency, u, nan, nan, np.full((2, 2), nan), nan, nan, reason)


def _filter(width: int) -> ComplexArray:
    """Return the normalised matched filter of a Lorentzian of a half width in steps, to be convolved with."""
    k = np.arange(-8 * width, 8 * width + 1)
    curve = 1 / (1 + 1j * k / width)
    curve = curve / np.sqrt(np.sum(np.abs(curve) ** 2))
    return np.asarray(np.conj(curve)[::-1], dtype=np.complex128)

"""Assigning lines to tracks, spectrum by spectrum, each with its weight against other lines and chance.

Rules: a line is assigned only with a stated confidence; where two would do, none is. What has been followed for three spectra goes before
what has just begun.

References
----------
Y. Bar-Shalom, E. Tse, "Tracking in a cluttered environment with probabilistic data association", Automatica 11, 451 (1975)
(from memory), for the weights of candidates against clutter.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Literal

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray

__all__ = ["FixedLine", "LineSet", "LineTrack", "Motion", "followed"]

State = Literal["assigned", "absent", "ambiguous"]
IntArray = npt.NDArray[np.int64]

DETECTED = 0.9
"""Chance that a line that is there is found (no source)."""

GATE = 4.0
"""Standard deviations of the prediction within which a line is a candidate; a normal deviate is outside with 6e-5."""

SLOPE_SPAN = 0.1
"""Least distance of the two points that give a slope, over the distance to which it is carried on (no source)."""

SAME = 4.0
"""Standard uncertainties within which two frequencies are the same."""


@dataclass(frozen=True)
class Motion:
    """What is expected of a line from one spectrum to the next, before it has been seen.

    Attributes
    ----------
    first_step : float
        Relative change expected (one standard deviation) while fewer than three points are known.
    least_step : float
        The same, at least, later on.
    curvature : float
        Standard deviation of the next step over the step that the last two points predict.
    confidence : float
        Least weight of an assignment, 0.5 to 1.
    height_factor : float
        Factor by which the height of a line may change from one spectrum to the next (one standard deviation of its logarithm), > 1.
    fixed_share : float
        Share of the spectra that a line must be in, at one frequency, and in the first and the last fifth of them, to count as one
        that does not move.
    most_gap : int
        Spectra in a row without the line after which a track ends.
    """

    first_step: float = 0.01
    least_step: float = 0.002
    curvature: float = 1.0
    confidence: float = 0.9
    height_factor: float = 2.0
    fixed_share: float = 0.6
    most_gap: int = 2


@dataclass(frozen=True)
class FixedLine:
    """A line that does not move.

    Attributes
    ----------
    frequency : float
        Hz, weighted mean.
    spectra : int
        In how many spectra it is.
    members : tuple of int
        Its lines.
    """

    frequency: float
    spectra: int
    members: tuple[int, ...]


@dataclass(frozen=True)
class LineTrack:
    """A line followed through the spectra.

    Attributes
    ----------
    members : tuple of int
        For each spectrum, in the order of `Tracking.order`, the line assigned to it, -1 for none.
    confidence : ndarray
        Weight of each assignment, not a number where there is none.
    states : tuple of str
        "assigned", "absent" (no candidate) or "ambiguous" (candidates, none with enough weight).
    moves : float
        Largest change of the frequency over its standard uncertainty.
    """

    members: tuple[int, ...]
    confidence: FloatArray
    states: tuple[State, ...]
    moves: float


class LineSet:
    """All lines; `free` are those that no fixed line has taken."""

    def __init__(
        self, at: FloatArray, position: IntArray, f: FloatArray, u: FloatArray, h: FloatArray
    ) -> None:
        self.at, self.position, self.f, self.u, self.h = at, position, f, u, h
        self.free = list(range(f.size))

    def of(self, place: int) -> list[int]:
        """Return the free lines of a spectrum."""
        return [number for number in self.free if self.position[number] == place]

    def remove(self, numbers: Iterable[int]) -> None:
        """Take lines out of those that are free."""
        gone = set(numbers)
        self.free = [number for number in self.free if number not in gone]

    def fixed(self, motion: Motion) -> list[FixedLine]:
        """Return the lines that are at one frequency in most spectra, from the cold end to the warm one."""
        left = sorted(self.free, key=lambda number: float(self.f[number]))
        found: list[FixedLine] = []
        least = max(3, math.ceil(motion.fixed_share * self.at.size))
        taken: set[int] = set()
        for seed in left:
            if seed in taken:
                continue
            near = [
                number
                for number in left
                if number not in taken
                and abs(self.f[number] - self.f[seed]) <= SAME * math.hypot(self.u[number], self.u[seed])
            ]
            best = {
                int(self.position[number]): number
                for number in sorted(near, key=lambda n: -abs(self.f[n] - self.f[seed]))
            }
            members = sorted(best.values())
            if len(members) >= least and self._throughout(members):
                weight = 1 / self.u[members] ** 2
                taken.update(members)
                found.append(
                    FixedLine(
                        float(np.average(self.f[members], weights=weight)), len(members), tuple(members)
                    )
                )
        return sorted(found, key=lambda each: (-each.spectra, each.frequency))

    def _throughout(self, members: list[int]) -> bool:
        """Whether lines are in the first and in the last fifth of the spectra: one that comes to rest has moved."""
        fifth = max(math.ceil(self.at.size / 5), 1)
        places = self.position[members]
        return bool(places.min() < fifth and places.max() >= self.at.size - fifth)


def followed(lines: LineSet, motion: Motion) -> list[LineTrack]:
    """Return the tracks with at least three assignments among the lines that are free, in no order.

    Parameters
    ----------
    lines : LineSet
        By rising ordinate; what stays has been removed.
    motion : Motion
        What is expected of a line that moves.
    """
    return _Follower(lines, motion).tracks()


class _Follower:
    """Tracks while they are made."""

    def __init__(self, lines: LineSet, motion: Motion) -> None:
        self.lines, self.motion = lines, motion
        span = float(np.ptp(lines.f)) if lines.f.size > 1 else 0.0
        # One line of each spectrum is the one that is there; half a line more, for a count that may be zero.
        extra = max(len(lines.free) - lines.at.size, 0) + 0.5
        self.density = extra / lines.at.size / span if span > 0 else 0.0
        self.open: list[_Track] = []

    def tracks(self) -> list[LineTrack]:
        """Return the tracks with at least three assignments."""
        for place in range(self.lines.at.size):
            self._step(place)
        return [made for track in self.open if (made := track.finished(self.lines)) is not None]

    def _step(self, place: int) -> None:
        candidates = self.lines.of(place)
        wanted: dict[int, list[tuple[_Track, float, float]]] = {}
        for track in self.open:
            if track.ended(self.motion):
                track.add(-1, math.nan, "absent")
                continue
            found, share, likelihood = self._best(track, place, candidates)
            if found >= 0 and share >= self.motion.confidence:
                wanted.setdefault(found, []).append((track, share, likelihood))
            else:
                track.add(-1, math.nan, "ambiguous" if found >= 0 else "absent")
        claimed = {found for found, claims in wanted.items() if self._settled(found, claims)}
        self.open += [_Track(place, number) for number in candidates if number not in claimed]

    def _settled(self, found: int, claims: list[tuple[_Track, float, float]]) -> bool:
        """Give a line to the likeliest of the tracks that claim it, if that is beyond doubt."""
        # What has been followed for three spectra is not disturbed by what may have begun there by chance.
        known = [likelihood for track, _, likelihood in claims if track.established]
        total = sum(known) or sum(likelihood for *_, likelihood in claims)
        given = False
        for track, share, likelihood in claims:
            allowed = track.established or not known
            if allowed and likelihood >= self.motion.confidence * total:
                track.add(found, share * likelihood / total, "assigned")
                given = True
            else:
                track.add(-1, math.nan, "ambiguous")
        return given

    def _best(self, track: _Track, place: int, candidates: list[int]) -> tuple[int, float, float]:
        """Return the best candidate (-1 without any), its weight, and how likely it is of this track."""
        mean, sigma = track.prediction(self.lines, place, self.motion)
        S = sigma**2 + self.lines.u[candidates] ** 2
        square = (self.lines.f[candidates] - mean) ** 2 / S
        inside = square <= GATE**2
        if not inside.any():
            return -1, 0.0, 0.0
        change = np.log(self.lines.h[candidates] / self.lines.h[track.last]) / math.log(
            self.motion.height_factor
        )
        e = np.where(inside, np.exp(-(square + np.where(np.isfinite(change), change, 0.0) ** 2) / 2), 0.0)
        best = int(np.argmax(e))
        missed = 1 - DETECTED * math.erf(GATE / math.sqrt(2))
        b = self.density * math.sqrt(2 * math.pi * float(S[best])) * missed / DETECTED
        return candidates[best], float(e[best] / (b + e.sum())), float(e[best] / math.sqrt(S[best]))


class _Track:
    """One track."""

    def __init__(self, place: int, number: int) -> None:
        self.members = [-1] * place + [number]
        self.weights = [math.nan] * place + [1.0]
        before: list[State] = ["absent"] * place
        self.states: list[State] = [*before, "assigned"]

    def add(self, number: int, weight: float, state: State) -> None:
        """Go on by one spectrum."""
        self.members.append(number)
        self.weights.append(weight)
        self.states.append(state)

    @property
    def established(self) -> bool:
        """Whether at least three lines have been assigned."""
        return sum(1 for number in self.members if number >= 0) >= 3

    @property
    def last(self) -> int:
        """The line assigned last."""
        return next(number for number in reversed(self.members) if number >= 0)

    def ended(self, motion: Motion) -> bool:
        """Whether the line has been missing too often in a row."""
        return all(number < 0 for number in self.members[-motion.most_gap - 1 :])

    def prediction(self, lines: LineSet, place: int, motion: Motion) -> tuple[float, float]:
        """Return frequency and standard deviation expected in a spectrum."""
        known = [(index, number) for index, number in enumerate(self.members) if number >= 0]
        last, line = known[-1]
        f = float(lines.f[line])
        ahead = float(lines.at[place] - lines.at[last])
        # Of two spectra at one temperature, swept up and down, the difference is no slope.
        earlier = [(at, number) for at, number in known if lines.at[last] - lines.at[at] > SLOPE_SPAN * ahead]
        step = 0.0
        if earlier and ahead > 0:
            before, other = earlier[-1]
            step = (f - float(lines.f[other])) / float(lines.at[last] - lines.at[before]) * ahead
        floor = (motion.first_step if len(known) < 3 else motion.least_step) * f
        return f + step, math.hypot(motion.curvature * step, floor)

    def finished(self, lines: LineSet) -> LineTrack | None:
        """Return the track, or None if it is too short to be one."""
        members = [number for number in self.members if number >= 0]
        if len(members) < 3:
            return None
        f, u = lines.f[members], lines.u[members]
        low, high = int(np.argmin(f)), int(np.argmax(f))
        moves = float((f[high] - f[low]) / math.hypot(u[low], u[high]))
        return LineTrack(tuple(self.members), np.array(self.weights), tuple(self.states), moves)

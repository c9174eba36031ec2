"""Lines of many spectra put in order: those that stay where they are, and those that move with temperature, followed one by one.

Rules: a line that stays at one frequency in most spectra is set apart before anything is followed; a line is assigned to a track only
with a stated confidence; where two would do, or none does, the track has no value there and says so. The physics of what moves is no
part of the assignment, so that a comparison with it afterwards is one.

References
----------
The assignment of `line_association`; what stays apart from what moves is the project's own.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import same_length, series
from archive.physics.line_association import FixedLine, LineSet, LineTrack, Motion, followed

__all__ = ["FixedLine", "LineTrack", "Motion", "Tracking", "track_lines"]


@dataclass(frozen=True)
class Tracking:
    """Outcome of the ordering.

    Attributes
    ----------
    order : tuple of int
        Spectra in the order in which they were followed, by rising ordinate.
    fixed : tuple of FixedLine
        The most frequent first.
    tracks : tuple of LineTrack
        Those with at least three assignments: the longest first, of equal ones the lowest in frequency.
    loose : int
        Lines that belong to nothing.
    """

    order: tuple[int, ...]
    fixed: tuple[FixedLine, ...]
    tracks: tuple[LineTrack, ...]
    loose: int


def track_lines(
    ordinate: npt.ArrayLike,
    *,
    spectrum: npt.ArrayLike,
    frequency: npt.ArrayLike,
    standard_uncertainty: npt.ArrayLike,
    height: npt.ArrayLike | None = None,
    motion: Motion | None = None,
) -> Tracking:
    """Return the lines that stay and the lines that move, each followed through the spectra.

    Parameters
    ----------
    ordinate : array_like
        Temperature (or order) of each spectrum, at least three.
    spectrum : array_like of int
        For each line, which spectrum it is of, from 0.
    frequency, standard_uncertainty : array_like
        For each line, Hz, > 0.
    height : array_like, optional
        For each line, one unit; not a number or zero where it is not known.
    motion : Motion, optional

    Returns
    -------
    Tracking

    Raises
    ------
    ValueError
        Fewer than three spectra, arrays of different length, or a spectrum that there is not.

    Notes
    -----
    Prediction: a straight line through the last two assigned points, against the ordinate; of spectra that have nearly the same
    ordinate the last one counts. Its standard deviation is the step that it predicts times `curvature`, with `least_step` (with fewer
    than three points `first_step`) and the uncertainty of the line in quadrature. Weights after the reference: candidate i has
    ``e_i/(b + sum e_j)`` with ``e_i = exp(-nu_i^2/(2 S))``, times ``exp(-(ln(h_i/h)/ln height_factor)^2/2)`` where heights are known, and ``b = lambda sqrt(2 pi S) (1 - P_D P_G)/P_D``, lambda the number of
    lines beyond one in each spectrum that do not stay, per Hz between the lowest and the highest. Where several tracks claim one line, the likeliest has it if its share of their
    likelihoods is `confidence`; else it is ambiguous for all. Tracks of three lines and more go before shorter ones.
    A line seen only where nothing moves yet (all of the spectra within its uncertainty) counts as one that stays.
    """
    at = series("ordinate", ordinate, least=3)
    f = series("frequency", frequency, least=0, positive=True)
    u = series("standard_uncertainty", standard_uncertainty, least=0, positive=True)
    which = np.asarray(spectrum, dtype=np.int64)
    same_length(frequency=f, standard_uncertainty=u, spectrum=which.astype(np.float64))
    if which.size and not (which.min() >= 0 and which.max() < at.size):
        raise ValueError(f"spectrum: found {int(which.max())}, expected 0 to {at.size - 1}")
    order = np.argsort(at, kind="stable")
    position = np.empty(at.size, dtype=np.int64)
    position[order] = np.arange(at.size)
    h = np.full(f.size, math.nan) if height is None else np.asarray(height, dtype=np.float64)
    same_length(frequency=f, height=h)
    lines = LineSet(at[order], position[which], f, u, np.where(h > 0, h, math.nan))
    chosen = motion or Motion()
    fixed = lines.fixed(chosen)
    lines.remove(member for each in fixed for member in each.members)
    tracks = followed(lines, chosen)
    used = {member for track in tracks for member in track.members if member >= 0}
    return Tracking(
        order=tuple(int(each) for each in order),
        fixed=tuple(fixed),
        tracks=tuple(
            sorted(
                tracks, key=lambda each: (-_length(each), float(f[next(m for m in each.members if m >= 0)]))
            )
        ),
        loose=sum(1 for number in lines.free if number not in used),
    )


def _length(track: LineTrack) -> int:
    return sum(1 for number in track.members if number >= 0)

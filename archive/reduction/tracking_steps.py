"""Steps of lines over many spectra: one line followed with temperature, or in the order of the spectra."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import numpy.typing as npt

from archive.physics import line_tracking
from archive.physics.line_tracking import LineTrack, Motion, Tracking
from archive.reduction.estimate import Estimate, FloatArray
from archive.reduction.pulse_steps import SLOTS
from archive.reduction.step import Outcome, Port, Step
from schemas.base import Record
from schemas.finding import Finding

__all__ = ["TRACKING_STEPS", "TrackParameters"]

Columns = dict[str, Any]
"""Arrays and estimates by the name of the port."""

IntArray = npt.NDArray[np.int64]

_PLACES = (*(f"frequency_{k}" for k in range(1, SLOTS + 1)), *(f"tone_{k}" for k in range(1, SLOTS + 1)))

MOVED = 10.0
"""Standard uncertainties that a line must move by to be one that moves (no source)."""


class TrackParameters(Record):
    """Criterion of the assignment, and which track is given."""

    near_hz: float | None = None
    """Frequency at the first spectrum of the track that is wanted; left out: the longest, of equal ones the lowest."""
    first_step: float = 0.01
    """Relative change expected from one spectrum to the next while the motion is not known."""
    least_step: float = 0.002
    """The same, at least, later on."""
    confidence: float = 0.9
    """Least weight of an assignment."""
    fixed_share: float = 0.6
    """Share of the spectra in which a line that does not move must be."""
    assigned: tuple[int, ...] | None = None
    """Which line of each spectrum it is: 1 to 4 a resonance, 5 to 8 a tone, 0 none; held while inputs are shifted, or set by hand."""


def followed_line(
    parameters: TrackParameters,
    *,
    temperature: FloatArray | None,
    **columns: Any,
) -> Outcome:
    """Return one line followed through many spectra, each assignment with its weight.

    Parameters
    ----------
    temperature : ndarray or None
        K, of each spectrum; None: followed in the order of the spectra.
    frequency_1, quality_factor_1, strength_1, tone_1, ..., frequency_1_estimate, tone_1_estimate, ...
        Resonances and tones of each spectrum; the places have no meaning.

    Raises
    ------
    ValueError
        Fewer than three spectra, no line that moves, or none near the frequency asked for.
    """
    f = _table(columns, *_PLACES)
    spectra = f.shape[0]
    facts: dict[str, object] = {"spectra": spectra}
    findings: tuple[Finding, ...] = ()
    if parameters.assigned is None:
        order = np.arange(spectra, dtype=np.float64) if temperature is None else temperature
        tracking, which = _tracked(parameters, columns, f, order)
        track = _chosen(parameters, tracking, f[which])
        assigned, weight = _places(tracking, track, which, spectra)
        findings = _findings(tracking, track, spectra)
        facts |= _facts(tracking, track, f[which], temperature)
    else:
        assigned = np.asarray(parameters.assigned, dtype=np.int64)
        if assigned.size != spectra or not ((assigned >= 0) & (assigned <= f.shape[1])).all():
            raise ValueError(
                f"assigned: found {assigned.size} places, expected {spectra} from 0 to {f.shape[1]}"
            )
        weight = np.where(assigned > 0, 1.0, math.nan)
        facts |= {"by": "as set in the plan", "fixed": "not looked for", "moving": 1, "count": int(np.count_nonzero(assigned)), "least": 1.0}  # fmt: skip
    rows = np.arange(spectra)
    place = np.maximum(assigned - 1, 0)
    given = assigned > 0
    quality = _table(columns, *(f"quality_factor_{k}" for k in range(1, SLOTS + 1)), like=f)
    outputs: dict[str, float | FloatArray] = {
        "frequency": np.where(given, f[rows, place], math.nan),
        "quality_factor": np.where(given, quality[rows, place], math.nan),
        "confidence": weight,
        "assigned": float(np.count_nonzero(given)),
    }
    return Outcome(
        outputs, held={"assigned": tuple(int(each) for each in assigned)}, facts=facts, findings=findings
    )


def _table(columns: Columns, *names: str, like: FloatArray | None = None) -> FloatArray:
    """Return one row for each spectrum and one column for each place; what is not given is not known."""
    rows = columns["frequency_1"].size if like is None else like.shape[0]
    table = np.full((rows, len(_PLACES)), math.nan)
    for k, name in enumerate(names):
        if columns.get(name) is not None:
            table[:, k] = columns[name]
    return table


def _tracked(
    parameters: TrackParameters, columns: Columns, f: FloatArray, order: FloatArray
) -> tuple[Tracking, tuple[IntArray, IntArray]]:
    """Return the tracking of all lines, and spectrum and place of each."""
    u = np.full(f.shape, math.nan)
    for k, name in enumerate(_PLACES):
        estimate = columns.get(f"{name}_estimate")
        if isinstance(estimate, Estimate):
            u[:, k] = estimate.uncertainty
    spectrum, place = np.nonzero(np.isfinite(f) & (u > 0))
    which = spectrum.astype(np.int64), place.astype(np.int64)
    if not np.isfinite(order).all():
        raise ValueError(
            f"temperature[{int(np.argmax(~np.isfinite(order)))}]: found no value, expected one for each spectrum"
        )
    motion = Motion(
        first_step=parameters.first_step, least_step=parameters.least_step, confidence=parameters.confidence,
        fixed_share=parameters.fixed_share,
    )  # fmt: skip
    return line_tracking.track_lines(
        order, spectrum=which[0], frequency=f[which], standard_uncertainty=u[which],
        height=_table(columns, *(f"strength_{k}" for k in range(1, SLOTS + 1)), like=f)[which], motion=motion,
    ), which  # fmt: skip


def _chosen(parameters: TrackParameters, tracking: Tracking, f: FloatArray) -> LineTrack:
    moving = [track for track in tracking.tracks if track.moves >= MOVED]
    if parameters.near_hz is not None:
        wanted = parameters.near_hz
        moving = [track for track in moving if abs(_first(track, f) / wanted - 1) <= 0.01]
    if not moving:
        near = (
            ""
            if parameters.near_hz is None
            else f" that begins within 1 per cent of {parameters.near_hz:.6g} Hz"
        )
        fixed = ", ".join(f"{each.frequency:.2f}" for each in tracking.fixed) or "none"
        raise ValueError(
            f"frequency: found no line{near} that moves by more than {MOVED:g} standard uncertainties in at least 3 spectra; "
            f"lines that stay (Hz): {fixed}"
        )
    return moving[0]


def _first(track: LineTrack, f: FloatArray) -> float:
    return float(f[next(member for member in track.members if member >= 0)])


def _places(
    tracking: Tracking, track: LineTrack, which: tuple[IntArray, IntArray], spectra: int
) -> tuple[IntArray, FloatArray]:
    assigned = np.zeros(spectra, dtype=np.int64)
    weight = np.full(spectra, math.nan)
    for position, member in enumerate(track.members):
        if member >= 0:
            assigned[tracking.order[position]] = which[1][member] + 1
            weight[tracking.order[position]] = track.confidence[position]
    return assigned, weight


def _findings(tracking: Tracking, track: LineTrack, spectra: int) -> tuple[Finding, ...]:
    found = []
    unclear = [tracking.order[k] + 1 for k, state in enumerate(track.states) if state == "ambiguous"]
    absent = spectra - len(unclear) - sum(1 for member in track.members if member >= 0)
    if unclear:
        found.append(
            Finding(
                code="line-ambiguous", severity="warning",
                what=f"in {len(unclear)} of {spectra} spectra (rows {', '.join(map(str, unclear))}) no line could be assigned with enough weight",
                remedy="set `assigned` in a copy of the plan where you know better, or take spectra at temperatures between",
            )
        )  # fmt: skip
    if absent:
        found.append(
            Finding(code="line-absent", severity="note", what=f"in {absent} of {spectra} spectra there is no such line")
        )  # fmt: skip
    return tuple(found)


def _facts(
    tracking: Tracking, track: LineTrack, f: FloatArray, temperature: FloatArray | None
) -> dict[str, object]:
    members = [member for member in track.members if member >= 0]
    others = [_first(each, f) for each in tracking.tracks if each is not track and each.moves >= MOVED]
    return {
        "by": "by temperature" if temperature is not None else "in their order",
        "fixed": ", ".join(f"{each.frequency:.2f} Hz in {each.spectra}" for each in tracking.fixed) or "none",
        "moving": 1 + len(others), "other_tracks_Hz": [round(each, 2) for each in others], "loose": tracking.loose,
        "count": len(members), "least": f"{float(np.nanmin(track.confidence)):.3f}",
    }  # fmt: skip


_FREQUENCIES = {
    name: port
    for k in range(1, SLOTS + 1)
    for name, port in (
        (
            f"frequency_{k}",
            Port("frequency", "array", f"resonance in place {k} of each spectrum", optional=k > 1),
        ),
        (f"quality_factor_{k}", Port("quality_factor", "array", "its quality factor", optional=True)),
        (f"strength_{k}", Port("number", "array", "its signal over noise", optional=True)),
        (f"tone_{k}", Port("frequency", "array", f"tone in place {k} of each spectrum", optional=True)),
    )
}

TRACKING_STEPS: tuple[Step, ...] = (
    Step(
        name="followed-line", version=1, function=followed_line, parameters=TrackParameters,
        takes={"temperature": Port("temperature", "array", "temperature of each spectrum", optional=True), **_FREQUENCIES},
        yields={
            "frequency": Port("frequency", "array", "frequency of the line in each spectrum"), "quality_factor": Port("quality_factor", "array", "its quality factor"),
            "confidence": Port("fraction", "array", "weight of each assignment against other lines and chance"), "assigned": Port("count", "scalar", "spectra with the line"),
        },
        sentence="Lines of {spectra} spectra were followed {by} by probabilistic association: {moving} move, and these stay: {fixed}. "
        "The line given is assigned in {count} spectra, with a weight of at least {least}; its physics was not used for that.",
        spread="refit", estimates=_PLACES, citations=("bar-shalom-1975",),
    ),
)  # fmt: skip
"""Steps of this module."""

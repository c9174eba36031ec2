"""The superfluid fraction from a followed line of fourth sound, with the tabulated one beside it."""

from __future__ import annotations

import math

import numpy as np

from archive.physics import fourth_sound
from archive.physics.helium_liquid import superfluid_fraction
from archive.reduction.estimate import FloatArray
from archive.reduction.step import Outcome, Port, Step
from schemas.base import Record
from schemas.finding import Finding
from schemas.lineage import SourceEntry

__all__ = ["FOURTH_SOUND_STEPS", "FractionParameters"]

TABLE_FRACTION = 1e-3
"""Standard uncertainty of the tabulated superfluid fraction: R. J. Donnelly, C. F. Barenghi, J. Phys. Chem. Ref. Data 27, 1217 (1998)."""

TABLE_SPEED = 5e-3
"""Largest relative error of the tabulated speed of first sound, same source; taken as limits, and the same at all temperatures but the reference."""


class FractionParameters(Record):
    """What the ratio is referred to."""

    reference_row: int | None = None
    """Spectrum whose fraction is taken from the table, from 1; left out: the coldest with the line."""


def fraction_from_line(
    parameters: FractionParameters,
    *,
    frequency: FloatArray,
    temperature: FloatArray,
    temperature_scale: str | None,
) -> Outcome:
    """Return the superfluid fraction from the frequencies of a line of fourth sound, and the tabulated one beside it.

    Parameters
    ----------
    frequency, temperature : ndarray
        Hz; K, T90. Rows without a frequency, or above the lambda point, have no fraction.

    Raises
    ------
    ValueError
        No row with both, or a reference row without.
    """
    rows = np.isfinite(frequency) & np.isfinite(temperature) & (temperature < 2.1768)
    if not rows.any():
        raise ValueError("frequency: found no spectrum with a line and a temperature below the lambda point")
    row = parameters.reference_row
    if row is None:
        row = int(np.flatnonzero(rows)[np.argmin(temperature[rows])]) + 1
    if not (1 <= row <= rows.size and rows[row - 1]):
        raise ValueError(f"reference_row: found {row}, expected a spectrum with a line and a temperature")
    at = np.where(rows, temperature, math.nan)
    fraction = fourth_sound.fraction_from_frequency(
        np.where(rows, frequency, math.nan), temperature=at,
        reference_frequency=float(frequency[row - 1]), reference_temperature=float(temperature[row - 1]),
    )  # fmt: skip
    table = superfluid_fraction(at)
    reference = float(superfluid_fraction(float(temperature[row - 1])))
    sources = (
        SourceEntry(name="tabulated superfluid fraction", description="Donnelly and Barenghi (1998), 0.001", level="laboratory"),
        SourceEntry(name="tabulated speed of first sound", description="Donnelly and Barenghi (1998), good to 0.5 per cent, taken as limits", level="laboratory"),
    )  # fmt: skip
    elsewhere = np.where(temperature == temperature[row - 1], 0.0, 1.0)
    # The error of a speed counts twice; at the reference it is the same one above and below.
    parts = (
        fraction * TABLE_FRACTION / reference if reference < 1 else np.zeros(fraction.shape),
        fraction * elsewhere * 2 * TABLE_SPEED / math.sqrt(3),
    )
    shared = {
        source.name: np.where(rows, part, 0.0)
        for source, part in zip(sources, parts, strict=True)
        if np.any(part > 0)
    }
    difference = fraction - table
    away = np.abs(difference)
    rms = float(np.sqrt(np.nanmean(difference**2)))
    # d(rms) is the sum of difference times its change, over n rms.
    moved = {
        name: float(np.nansum(difference * part)) / (int(rows.sum()) * rms) if rms > 0 else 0.0
        for name, part in shared.items()
    }
    return Outcome(
        {
            "fraction": fraction, "tabulated": np.asarray(table, dtype=np.float64), "difference": difference,
            "rms_difference": rms,
        },
        shared={"fraction": shared, "difference": shared, "rms_difference": moved},
        sources=tuple(source for source in sources if source.name in shared),
        findings=_scale_told(temperature_scale),
        held={"reference_row": row},
        facts={
            "reference_K": f"{float(temperature[row - 1]):.4g}", "reference": reference, "count": int(np.count_nonzero(rows)),
            "largest": f"{float(np.nanmax(away)):.2g}", "largest_K": f"{float(at[int(np.nanargmax(away))]):.4g}",
        },
    )  # fmt: skip


def _scale_told(scale: str | None) -> tuple[Finding, ...]:
    if scale == "ITS-90":
        return ()
    return (
        Finding(
            code="scale-not-of-table", severity="note",
            what=f"the tables are on ITS-90, and the temperatures on {scale or 'a scale that is not recorded'}; they were taken as equal",
        ),
    )  # fmt: skip


FOURTH_SOUND_STEPS: tuple[Step, ...] = (
    Step(
        name="fraction-from-line", version=1, function=fraction_from_line, parameters=FractionParameters,
        takes={"frequency": Port("frequency", "array", "frequency of a line of fourth sound"), "temperature": Port("temperature", "array", "temperature of each")},
        yields={
            "fraction": Port("fraction", "array", "superfluid fraction"), "tabulated": Port("fraction", "array", "tabulated superfluid fraction at these temperatures"),
            "difference": Port("fraction", "array", "superfluid fraction minus the tabulated one"),
            "rms_difference": Port("fraction", "scalar", "root mean square of that difference"),
        },
        sentence="Taking the frequency as that of fourth sound, proportional to the root of the superfluid fraction times the speed of first sound, and the fraction at "
        "{reference_K} K as the tabulated {reference}, {count} frequencies give superfluid fractions; the largest departure from the table is {largest}, at {largest_K} K.",
        spread="refit", citations=("atkins-1959", "donnelly-1998"), scales=("temperature",),
    ),
)  # fmt: skip
"""Steps of this module."""

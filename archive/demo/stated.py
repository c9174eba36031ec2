"""What the invented laboratory believes: the truth plus one seeded normal draw per value.

Rules: the width of every draw is exactly the standard uncertainty that the sheet states, so that a reduction can be
held to its uncertainties.
"""

from __future__ import annotations

import zlib
from dataclasses import dataclass

import numpy as np

from archive.demo.truth import CellTruth

__all__ = ["Stated", "generator"]


def generator(seed: int, *names: str) -> np.random.Generator:
    """Return the random numbers of one named thing, independent of those of every other.

    Parameters
    ----------
    seed : int
        Seed of the whole demonstration, not negative.
    *names : str
        What is to be drawn, e.g. ``"2025-03", "s006"``.
    """
    return np.random.default_rng([seed, *(zlib.crc32(name.encode()) for name in names)])


@dataclass(frozen=True)
class Stated:
    """What the laboratory believes about a cell: the truth plus one draw for each value.

    Attributes
    ----------
    area, doser_volume, gauge_zero, reference_quality, reference_signal : float
        SI units, each off by its stated standard uncertainty times a normal draw.
    gauge_gain : float
        Reading over true pressure; the sheet takes it as one.
    calibration_shift : float
        Relative shift of every calibrated temperature.
    """

    area: float
    doser_volume: float
    gauge_zero: float
    gauge_gain: float
    reference_quality: float
    reference_signal: float
    calibration_shift: float

    @classmethod
    def drawn(
        cls, cell: CellTruth, rng: np.random.Generator, *, calibration: np.random.Generator | None = None
    ) -> Stated:
        """Return one laboratory's beliefs about `cell`.

        Parameters
        ----------
        cell : CellTruth
        rng : numpy.random.Generator
            For everything that belongs to the cell and its gas handling.
        calibration : numpy.random.Generator, optional
            For the calibration, which may change while the rest stays; left out, `rng` is used.
        """
        draw = rng.standard_normal(6)
        shift = float((rng if calibration is None else calibration).standard_normal())
        return cls(
            area=cell.film.area * (1 + cell.area_uncertainty * draw[0]),
            doser_volume=cell.doser_volume * (1 + cell.volume_uncertainty * draw[1]),
            gauge_zero=cell.gauge_zero + cell.zero_uncertainty * draw[2],
            gauge_gain=1 + cell.gauge_gain * draw[3],
            reference_quality=(1 + cell.quality_uncertainty * draw[4]) / cell.oscillator.loss,
            reference_signal=cell.oscillator.signal * (1 + cell.oscillator.signal_noise * draw[5]),
            calibration_shift=cell.sensor.calibration * shift,
        )

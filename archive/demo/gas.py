"""Forward models of the gas handling: metered doses as the gauge read them, and nitrogen isotherms.

Rules: the true amounts are given; what is made is what was written down. Readings are gain x pressure + zero + noise,
the volume and the zero in the sheet are the believed ones. SI units.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from archive.demo.stated import Stated
from archive.demo.truth import CellTruth
from archive.physics.constants import AVOGADRO, GAS_CONSTANT
from archive.physics.helium_gas import molar_density, second_virial

if TYPE_CHECKING:
    import numpy.typing as npt

    Floats = npt.NDArray[np.float64]

__all__ = [
    "NITROGEN_AREA",
    "NITROGEN_PRESSURE",
    "DoseReading",
    "dose_reading",
    "dose_run_readings",
    "isotherm",
    "stated_amount",
]

NITROGEN_AREA: Final = 0.162e-18
"""m^2 a molecule of N2 takes at 77 K by convention (ISO 9277:2022; Thommes et al., Pure Appl. Chem. 87, 1051, 2015)."""

NITROGEN_PRESSURE: Final = 99.85e3
"""Pa, saturation pressure over the nitrogen bath of the invented laboratory on that day."""

ROOM: Final = 295.2
"""K, the dosing volume."""

THERMOMETER: Final = 0.01
"""K, standard uncertainty of a reading of the room thermometer."""

_LEFT: Final = 55.0
"""Pa that stay in the dosing volume after a dose."""


@dataclass(frozen=True)
class DoseReading:
    """One dose as the notebook has it.

    Attributes
    ----------
    amount : float
        True amount in mol.
    before, after : float
        Gauge readings in Pa, zero not subtracted.
    temperature : float
        Reading of the room thermometer in K.
    """

    amount: float
    before: float
    after: float
    temperature: float


def dose_reading(cell: CellTruth, stated: Stated, amount: float, rng: np.random.Generator) -> DoseReading:
    """Return what was written down when `amount` mol left the dosing volume.

    Parameters
    ----------
    cell : CellTruth
    stated : Stated
        Only its gauge gain is used: the gain that the gauge really has.
    amount : float
        mol, > 0.
    rng : numpy.random.Generator
    """
    room = ROOM + 0.4 * rng.standard_normal()
    left = _LEFT * (1 + 0.2 * rng.random())
    density = float(molar_density(left, room)) + amount / cell.doser_volume
    filled = GAS_CONSTANT * room * density * (1 + float(second_virial(room)) * density)
    noise = cell.gauge_reading * rng.standard_normal(2)
    return DoseReading(
        amount=amount,
        before=stated.gauge_gain * filled + cell.gauge_zero + noise[0],
        after=stated.gauge_gain * left + cell.gauge_zero + noise[1],
        temperature=room + THERMOMETER * rng.standard_normal(),
    )


def stated_amount(stated: Stated, reading: DoseReading) -> float:
    """Return the amount in mol that the laboratory computes from its own volume, zero and readings."""
    high, low = reading.before - stated.gauge_zero, reading.after - stated.gauge_zero
    return stated.doser_volume * float(
        molar_density(high, reading.temperature) - molar_density(low, reading.temperature)
    )


def dose_run_readings(
    cell: CellTruth, stated: Stated, coverages: npt.ArrayLike, rng: np.random.Generator
) -> list[DoseReading]:
    """Return the doses that take the empty cell through a list of rising true coverages (mol/m^2)."""
    steps = np.diff(np.asarray(coverages, dtype=np.float64), prepend=0.0) * cell.film.area
    return [dose_reading(cell, stated, float(step), rng) for step in steps]


def isotherm(
    area: float,
    rng: np.random.Generator,
    *,
    points: int,
    heat: float = 60.0,
    pore_amount: float | None = None,
    noise: float = 2.5e-4,
) -> tuple[Floats, Floats]:
    """Return an N2 isotherm: true relative pressure, and the adsorbed amount in mol as measured.

    Parameters
    ----------
    area : float
        True area in m^2 at `NITROGEN_AREA` a molecule.
    rng : numpy.random.Generator
    points : int
        From p/p0 = 0.008 up to 0.35, or to 0.97 if there are pores to fill.
    heat : float
        The constant C of the equation.
    pore_amount : float, optional
        mol when all pores are full; above p/p0 = 0.45 the amount runs smoothly into it.
    noise : float
        Relative standard uncertainty of one amount.

    References
    ----------
    S. Brunauer, P. H. Emmett, E. Teller, "Adsorption of gases in multimolecular layers", Journal of the American
    Chemical Society 60, 309 (1938).
    """
    top = 0.35 if pore_amount is None else 0.97
    x = np.concatenate(
        [np.geomspace(0.008, 0.05, points // 4, endpoint=False), np.linspace(0.05, top, points - points // 4)]
    )
    layer = area / NITROGEN_AREA / AVOGADRO
    within = np.minimum(x, 0.45)
    amount = layer * heat * within / ((1 - within) * (1 + (heat - 1) * within))
    if pore_amount is not None:
        end = layer * heat * 0.45 / (0.55 * (1 + (heat - 1) * 0.45))
        # An S-shaped filling between 0.45 and 0.75 of saturation, then a plateau; only its shape is meant.
        u = np.clip((x - 0.45) / 0.30, 0.0, 1.0)
        amount = amount + (pore_amount - end) * (3 * u**2 - 2 * u**3)
    return x, amount * (1 + noise * rng.standard_normal(x.size))

"""The gas in the volumes of a cell: its second virial coefficient, its density, and the volumes that a sheet states."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from archive.physics.dead_volume import virial_density
from archive.physics.helium_gas import second_virial, second_virial_uncertainty
from archive.reduction.estimate import FloatArray
from archive.reduction.facts import GasBook
from schemas.base import Record
from schemas.lineage import SourceEntry
from schemas.quantity import Quantity
from schemas.substrate import Isotope, Sample

__all__ = ["CellGas", "GasParameters", "StatedVolume", "cell_gas", "stated_volumes"]


class GasParameters(Record):
    """Second virial coefficient of a gas that is not helium; that of helium is known, no other is assumed."""

    second_virial_cm3_mol: float | None = None
    second_virial_uncertainty_cm3_mol: float = 0.0


@dataclass(frozen=True)
class CellGas:
    """Second virial coefficient at each temperature, its uncertainty, and of what."""

    parameters: GasParameters
    isotope: Isotope

    def at(self, temperature: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return B and its standard uncertainty, m^3/mol."""
        if self.isotope == "4He" or self.isotope == "3He":  # noqa: PLR1714 - narrows the type
            return second_virial(temperature, self.isotope), second_virial_uncertainty(
                temperature, self.isotope
            )
        given = self.parameters.second_virial_cm3_mol
        if given is None:
            raise ValueError(
                f"sample: the second virial coefficient of {self.isotope} is not known here; set second_virial_cm3_mol at the cell's temperature in a copy of the plan"
            )
        spread = self.parameters.second_virial_uncertainty_cm3_mol
        return np.full(temperature.shape, given * 1e-6), np.full(temperature.shape, spread * 1e-6)

    def density(self, pressure: FloatArray, temperature: FloatArray, sign: float = 0.0) -> FloatArray:
        """Return the molar density with B moved by so many standard uncertainties; NaN outside the equation's range."""
        known = np.isfinite(pressure) & np.isfinite(temperature)
        found = np.full(np.shape(pressure), math.nan)
        if known.any():
            B, u = self.at(temperature[known])
            # Below zero is noise of the gauge about no gas at all.
            found[known] = virial_density(
                np.maximum(pressure[known], 0.0), temperature[known], second_virial=B + sign * u
            )
        return found

    def source(self, temperature: FloatArray) -> SourceEntry:
        """Return the source of its uncertainty; equal gas and temperature have equal names."""
        T = float(np.nanmedian(temperature))
        return SourceEntry(
            name=f"second virial coefficient of {self.isotope} near {T:.2g} K",
            description="of the gas in the cell", level="laboratory",
        )  # fmt: skip


def cell_gas(parameters: GasParameters, sample: Sample | None) -> CellGas:
    """Return the gas of a run.

    Raises
    ------
    ValueError
        It is not recorded.
    """
    if sample is None:
        raise ValueError("sample: the gas of the run is not recorded; name the sample in the sheet")
    return CellGas(parameters, sample.isotope)


@dataclass(frozen=True)
class StatedVolume:
    """A volume that a sheet states, in m^3 and K; the temperature is NaN where it is the cell's."""

    name: str
    volume: float
    u_volume: float
    temperature: float
    stated: str

    @property
    def source(self) -> SourceEntry:
        """The source of its uncertainty; equal statements have equal names."""
        return SourceEntry(
            name=f"dead volume {self.name}, {self.stated}", description="stated dead volume", level="cell"
        )


def stated_volumes(gas: GasBook) -> tuple[list[StatedVolume], float, float, list[StatedVolume]]:
    """Return the volumes with a temperature of their own, the stated sum of those at the cell's and its uncertainty, and these."""
    warm: list[StatedVolume] = []
    cold: list[StatedVolume] = []
    for each in gas.dead_volumes:
        at = each.temperature.si if isinstance(each.temperature, Quantity) else math.nan
        found = StatedVolume(
            each.name, each.volume.si, each.volume.si_uncertainty or 0.0, at, each.volume.format()
        )
        (cold if math.isnan(at) else warm).append(found)
    return warm, sum(each.volume for each in cold), math.hypot(*(each.u_volume for each in cold)), cold

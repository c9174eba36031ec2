"""What thermometers under calibration and their references of the invented laboratory would have read.

Rules: everything here is invented; SI units; what a sheet states with an uncertainty is off by one normal draw of it, once
for the whole cooldown; every noise is normal with the standard deviation that the sheet states.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from archive.physics import melting_pressure, pressure_head, thermomolecular, vapour_pressure
from archive.physics.paramagnetic import curie_weiss_inductance

if TYPE_CHECKING:
    import numpy.typing as npt

    Floats = npt.NDArray[np.float64]

__all__ = ["BENCH", "BenchTruth", "CalibrationRecord", "Errors", "against_melting_curve", "against_vapour"]


@dataclass(frozen=True)
class BenchTruth:
    """Sensors and references as the sheet describes them; standard uncertainties stand beside.

    Attributes
    ----------
    germanium : tuple of float
        ln(R/Ohm) = sum c_i (ln T/K)^i.
    ruthenium_oxide : tuple of float
        R0 in Ohm, T0 in K and exponent of ln(R/R0) = (T0/T)^n.
    offset, constant, theta : float
        M0 in H, C in H K and theta in K of the paramagnetic salt.
    reading_noise : float
        Of resistances and inductances, relative.
    pressure_noise, gauge_gain, gauge_zero, zero_uncertainty
        Of the vapour pressure gauge: relative noise, relative uncertainty of the gain, zero and its uncertainty in Pa.
    diameter, warm, height, gas : float
        Of the sensing tube: inner diameter in m, warm end in K, height in m, temperature of the gas in K.
    melting_noise, melting_zero : float
        Of the melting pressure gauge, Pa: noise, and uncertainty of its zero.
    """

    germanium: tuple[float, ...] = (6.9, -1.9, 0.35, -0.05)
    ruthenium_oxide: tuple[float, float, float] = (1450.0, 2.1, 0.345)
    offset: float = 820.0e-6
    constant: float = 6.4e-6
    theta: float = 0.6e-3
    reading_noise: float = 1.0e-5
    pressure_noise: float = 5.0e-5
    gauge_gain: float = 2.0e-4
    gauge_zero: float = 0.12
    zero_uncertainty: float = 0.02
    diameter: float = 4.0e-3
    diameter_uncertainty: float = 0.05e-3
    warm: float = 295.0
    height: float = 1.20
    height_uncertainty: float = 0.02
    gas: float = 60.0
    gas_uncertainty: float = 20.0
    melting_noise: float = 3.0
    melting_zero: float = 12.0


BENCH: Final = BenchTruth()
"""The calibration bench of 2024."""


@dataclass(frozen=True)
class Errors:
    """By how much the laboratory is wrong, in units of what it states: one normal draw each.

    Attributes
    ----------
    gain, zero, diameter, height, gas, transpiration, melting_zero : float
    """

    gain: float
    zero: float
    diameter: float
    height: float
    gas: float
    transpiration: float
    melting_zero: float

    @classmethod
    def drawn(cls, rng: np.random.Generator) -> Errors:
        """Return one laboratory's errors."""
        return cls(*(float(each) for each in rng.standard_normal(7)))


@dataclass(frozen=True)
class CalibrationRecord:
    """Rows of a calibration: what is true, the reference's pressure in Pa, and the reading of the sensor in SI units."""

    temperature: Floats
    pressure: Floats
    reading: Floats


def germanium_resistance(temperature: Floats) -> Floats:
    """Return the resistance of the germanium sensor in Ohm."""
    found: Floats = np.exp(np.polynomial.polynomial.polyval(np.log(temperature), BENCH.germanium))
    return found


def against_vapour(bench: BenchTruth, errors: Errors, temperature: Floats, rng: np.random.Generator) -> CalibrationRecord:  # fmt: skip
    """Return a germanium sensor beside a bulb of 4He whose vapour pressure is read at room temperature.

    Parameters
    ----------
    bench, errors
    temperature : ndarray
        Of the block that holds both, K on ITS-90.
    rng : numpy.random.Generator
        For the readings.
    """
    cold = np.asarray(vapour_pressure.pressure_its90(temperature))
    warm_level = _before_transpiration(bench, errors, cold, temperature)
    height = bench.height + bench.height_uncertainty * errors.height
    gas = bench.gas + bench.gas_uncertainty * errors.gas
    # The head is a share of the pressure: what the gauge reads is what is left.
    share = np.asarray(pressure_head.aerostatic_head(1.0, height=height, temperature=gas))
    gauge = warm_level / (1 + share)
    zero = bench.gauge_zero + bench.zero_uncertainty * errors.zero
    read = gauge * (1 + bench.gauge_gain * errors.gain) * (1 + bench.pressure_noise * rng.standard_normal(cold.size)) + zero  # fmt: skip
    reading = germanium_resistance(temperature) * (1 + bench.reading_noise * rng.standard_normal(cold.size))
    return CalibrationRecord(temperature, read, reading)


def _before_transpiration(bench: BenchTruth, errors: Errors, cold: Floats, temperature: Floats) -> Floats:
    """Return the pressure at the warm end that leaves `cold` at the cold end, with the equation's own error."""
    diameter = bench.diameter + bench.diameter_uncertainty * errors.diameter
    warm = cold.copy()
    # Each turn leaves a hundredth of the error before it: the correction is a hundredth of the pressure.
    for _ in range(7):
        nominal = thermomolecular.cold_pressure(
            warm, warm_temperature=bench.warm, cold_temperature=temperature, radius=diameter / 2
        ).pressure
        warm = cold + (1 + 0.10 * errors.transpiration) * (warm - nominal)
    return warm


def against_melting_curve(bench: BenchTruth, errors: Errors, temperature: Floats, rng: np.random.Generator, *, sensor: str) -> CalibrationRecord:  # fmt: skip
    """Return a sensor beside a melting pressure cell of 3He.

    Parameters
    ----------
    bench, errors
    temperature : ndarray
        K on PLTS-2000, on the low branch.
    rng : numpy.random.Generator
    sensor : {"ruthenium oxide", "salt"}
    """
    pressure = np.asarray(melting_pressure.pressure_plts2000(temperature))
    read = (
        pressure
        + bench.melting_zero * errors.melting_zero
        + bench.melting_noise * rng.standard_normal(pressure.size)
    )
    if sensor == "salt":
        clean = np.asarray(
            curie_weiss_inductance(
                temperature, offset=bench.offset, constant=bench.constant, theta=bench.theta
            )
        )
    else:
        R0, T0, n = bench.ruthenium_oxide
        clean = R0 * np.exp((T0 / temperature) ** n)
    noise = 1 + bench.reading_noise * rng.standard_normal(pressure.size)
    return CalibrationRecord(temperature, read, clean * noise)

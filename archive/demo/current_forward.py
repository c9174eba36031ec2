"""What a persistent-current ring of the invented laboratory would have read: films that decay, liquid that does not.

Rules: everything here is invented; SI units; every noise is normal with the standard deviation that the sheet states.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from archive.physics.constants import MOLAR_MASS_HELIUM4
from archive.physics.helium_liquid import density, superfluid_fraction
from archive.physics.persistent_current import angular_momentum, decaying

if TYPE_CHECKING:
    import numpy.typing as npt

    Floats = npt.NDArray[np.float64]

__all__ = ["RING", "CurrentRecord", "RingTruth", "coverage_run", "cycle", "hold"]


@dataclass(frozen=True)
class RingTruth:
    """A packed ring and what flows in it.

    Attributes
    ----------
    volume, area, chi : float
        Open volume in m^3, adsorbing area in m^2, and the part of the superfluid that the powder drags along.
    inert : float
        Coverage that does not flow, mol/m^2.
    film_quanta, liquid_quanta : float
        Circulation of the film's and of the liquid's current, in quanta.
    exponent, decay_time : float
        Of the film's decay at `film_temperature`: m, and one over the relative rate at the beginning, s.
    film_temperature : float
        K.
    noise, temperature_noise : float
        Standard uncertainty of one reading, kg m^2/s and K.
    lost : float
        Share of the current that survives the fast cycle.
    lost_from : float
        Temperature in K from which the fast current is shed.
    """

    volume: float = 8.0e-6
    area: float = 20.0
    chi: float = 0.30
    inert: float = 24.0e-6
    film_quanta: float = 63_000.0
    liquid_quanta: float = 1500.0
    exponent: float = 3.6
    decay_time: float = 2000.0
    film_temperature: float = 0.70
    noise: float = 2.0e-12
    temperature_noise: float = 2.0e-5
    lost: float = 0.62
    lost_from: float = 2.14


RING: Final = RingTruth()
"""A ring packed with powder, 8 cm^3 open."""


@dataclass(frozen=True)
class CurrentRecord:
    """Readings of the ring, one row each.

    Attributes
    ----------
    temperature, angular_momentum : ndarray
        As read: K, kg m^2/s.
    coverage : ndarray or None
        As the measuring program wrote it, mol/m^2.
    """

    temperature: Floats
    angular_momentum: Floats
    coverage: Floats | None = None


def _read(ring: RingTruth, T: Floats, L: Floats, rng: np.random.Generator, coverage: Floats | None = None) -> CurrentRecord:  # fmt: skip
    return CurrentRecord(
        T + ring.temperature_noise * rng.standard_normal(T.size),
        L + ring.noise * rng.standard_normal(T.size),
        coverage,
    )


def film_momentum(ring: RingTruth, coverage: npt.ArrayLike) -> Floats:
    """Return the angular momentum of the film's current at a coverage in mol/m^2, before it decays."""
    flowing = MOLAR_MASS_HELIUM4 * np.maximum(np.asarray(coverage, dtype=np.float64) - ring.inert, 0.0)
    return angular_momentum(quanta=ring.film_quanta, density=flowing, extent=ring.area, drag_factor=ring.chi)


def hold(
    ring: RingTruth, coverage: float, rng: np.random.Generator, *, rows: int = 240, cadence: float = 300.0
) -> CurrentRecord:
    """Return a film's current left alone at one temperature: it decays by a power law in time.

    Parameters
    ----------
    ring : RingTruth
    coverage : float
        mol/m^2.
    rng : numpy.random.Generator
    rows : int
    cadence : float
        Seconds between rows.
    """
    time = cadence * np.arange(rows, dtype=np.float64)
    first = float(film_momentum(ring, coverage))
    L = decaying(time, initial=first, rate=1 / ring.decay_time, exponent=ring.exponent)
    return _read(ring, np.full(rows, ring.film_temperature), L, rng)


def coverage_run(
    ring: RingTruth, coverages: npt.ArrayLike, rng: np.random.Generator, *, each: int = 4
) -> CurrentRecord:
    """Return a slow current while helium is added in small amounts, `each` readings a coverage; too slow to decay."""
    n = np.repeat(np.asarray(coverages, dtype=np.float64), each)
    L = film_momentum(ring, n) / 10
    return _read(ring, np.full(n.size, ring.film_temperature), L, rng, n)


def cycle(
    ring: RingTruth, highest: float, rng: np.random.Generator, *, lowest: float = 1.30, rows: int = 300
) -> CurrentRecord:
    """Return the liquid's current while the ring warms to `highest` and cools again, in K.

    Notes
    -----
    Once the ring is warmer than `ring.lost_from`, all but a share `ring.lost` of the circulation is shed, for good.
    """
    up = np.linspace(lowest, highest, rows // 2)
    T = np.concatenate([up, up[::-1]])
    rho = density(T) * superfluid_fraction(T)
    L = angular_momentum(quanta=ring.liquid_quanta, density=rho, extent=ring.volume, drag_factor=ring.chi)
    shed = np.cumsum(ring.lost_from < T) > 0
    return _read(ring, T, np.where(shed, ring.lost, 1.0) * L, rng)

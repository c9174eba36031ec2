"""What is true of the invented bulk cells, and what their instruments would have read.

Rules: as in `truth` and `forward`; the laws of the liquid are those of the publications that `archive.physics` names, the cells are invented.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from archive.demo.bulk_liquids import SATURATED, LiquidTruth
from archive.physics import helium_liquid, helium_viscosity
from archive.physics.bulk_oscillator import dragged_fraction, penetration_depth
from archive.physics.constants import T_LAMBDA
from archive.physics.heat_capacity import LambdaLaw
from archive.physics.lambda_gravity import lambda_spread
from archive.physics.power_law import bulk_superfluid_fraction

if TYPE_CHECKING:
    import numpy.typing as npt

    Floats = npt.NDArray[np.float64]

__all__ = ["BULK", "BulkTruth", "bulk_period", "pulse_readings", "superfluid_fraction"]

_NEAR: Final = 0.03
_FAR: Final = 0.12
"""Reduced temperatures between which the published law near the transition goes over into the tabulated fraction."""


@dataclass(frozen=True)
class BulkTruth:
    """A stack of discs in the liquid, and a calorimeter.

    Attributes
    ----------
    empty_period, period_slope : float
        Period of the empty cell at 2 K (s) and its change (s/K).
    inertia_per_density : float
        Added inertia over that of the empty cell, for 1 kg/m^3 that is wholly dragged along.
    gap : float
        Between neighbouring discs, m.
    period_noise : float
        s.
    temperature_noise : float
        Of one reading of a sweep, K.
    law : LambdaLaw
        Heat capacity of the liquid.
    amount : float
        mol in the calorimeter.
    height : float
        Of its liquid, m.
    addenda : tuple of float
        Heat capacity of the empty calorimeter as a polynomial in T/K, J/K.
    rise_noise, rise_share : float
        Noise of a step of temperature: K, and a share of the step.
    """

    empty_period: float = 2.401337e-3
    period_slope: float = 1.9e-9
    inertia_per_density: float = 7.0e-5
    gap: float = 1.2e-6
    period_noise: float = 4e-12
    temperature_noise: float = 4e-6
    law: LambdaLaw = SATURATED.law
    amount: float = 0.2184
    height: float = 3.0e-3
    addenda: tuple[float, ...] = (0.02, 0.055, 0.021)
    rise_noise: float = 2e-10
    rise_share: float = 5e-4

    def amount_of(self, liquid: LiquidTruth) -> float:
        """Return the helium in the calorimeter, mol."""
        return self.amount * liquid.density / SATURATED.density

    @property
    def coherence_length(self) -> float:
        """Amplitude of the transverse correlation length, m."""
        return SATURATED.coherence_length

    @property
    def coupled_inertia(self) -> float:
        """Inertia of the wholly coupled liquid at the lambda point over that of the empty cell."""
        return self.inertia_per_density * SATURATED.density


BULK: Final = BulkTruth()


def superfluid_fraction(temperature: npt.ArrayLike, liquid: LiquidTruth = SATURATED) -> Floats:
    """Return the true superfluid fraction: the law of Singsaas and Ahlers near the transition, the tabulated one far below.

    Under pressure both are taken at the same T/T_lambda, and the law has the liquid's own amplitude.
    """
    T = np.asarray(temperature, dtype=np.float64) * (T_LAMBDA / liquid.lambda_temperature)
    t = 1 - T / T_LAMBDA
    tabulated = helium_liquid.superfluid_fraction(T)
    near = np.nan_to_num(bulk_superfluid_fraction(T, transition_temperature=T_LAMBDA))
    edge = T_LAMBDA * (1 - _NEAR)
    ratio = float(bulk_superfluid_fraction(edge, transition_temperature=T_LAMBDA)) / float(
        helium_liquid.superfluid_fraction(edge)
    )
    fade = np.clip((_FAR - t) / (_FAR - _NEAR), 0.0, 1.0)
    saturated = np.where(t <= _NEAR, near, tabulated * (1 + (ratio - 1) * fade))
    return np.asarray(saturated * (1 + (liquid.amplitude_share - 1) * fade))


def bulk_period(temperature: npt.ArrayLike, *, filled: bool, liquid: LiquidTruth = SATURATED) -> Floats:
    """Return the true period, s, of the stack of discs, empty or in the liquid; its viscosity is that of saturated liquid at the same T/T_lambda."""
    T = np.asarray(temperature, dtype=np.float64)
    empty = BULK.empty_period + BULK.period_slope * (T - 2)
    if not filled:
        return empty
    rho = helium_liquid.density(T) if liquid.pressure is None else liquid.density
    rho_n = rho * (1 - superfluid_fraction(T, liquid))
    viscosity = helium_viscosity.viscosity(T * (T_LAMBDA / liquid.lambda_temperature))
    period = empty
    for _ in range(30):
        # The depth depends on the frequency, and that on the inertia.
        depth = penetration_depth(rho_n, viscosity=viscosity, angular_frequency=2 * math.pi / period)
        inertia = BULK.inertia_per_density * rho_n * dragged_fraction(BULK.gap / 2, depth=depth).real
        period = empty * np.sqrt(1 + inertia)
    return np.asarray(period)


def _energy(edges: Floats, liquid: LiquidTruth) -> Floats:
    """Return the heat that the liquid takes up over each step, per mole, J; the lambda point varies over the height."""
    nodes, weights = np.polynomial.legendre.leggauss(12)
    heights, shares = np.polynomial.legendre.leggauss(8)
    spread = float(lambda_spread(BULK.height, density=liquid.density, slope=liquid.slope))
    total = np.zeros(edges.shape[0])
    for height, share in zip(heights, shares, strict=True):
        T_here = liquid.lambda_temperature + height * spread / 2
        middle, half = edges.mean(axis=1), np.diff(edges, axis=1)[:, 0] / 2
        T = middle[:, np.newaxis] + half[:, np.newaxis] * nodes
        t = np.maximum(np.abs(1 - T / T_here), 1e-12)
        total += share / 2 * half * (liquid.law.value(t, below=T_here > T) @ weights)
    return total


def pulse_readings(
    begin: Floats,
    rise: Floats,
    *,
    filled: bool,
    random: np.random.Generator,
    liquid: LiquidTruth = SATURATED,
) -> tuple[Floats, Floats]:
    """Return the power of a 20 s pulse that makes each step, W, and the step as it is read, K.

    Parameters
    ----------
    begin, rise : ndarray
        Temperature before each pulse and the true step, K.
    filled : bool
        Whether helium is in the cell.
    random : numpy.random.Generator
    liquid : LiquidTruth
        Under pressure the same volume holds more.
    """
    edges = np.column_stack([begin, begin + rise])
    integral = np.polynomial.Polynomial(BULK.addenda).integ()
    heat = integral(edges[:, 1]) - integral(edges[:, 0])
    if filled:
        heat = heat + BULK.amount_of(liquid) * _energy(edges, liquid)
    noise = np.hypot(BULK.rise_noise, BULK.rise_share * rise)
    return heat / 20.0, rise + noise * random.standard_normal(rise.size)

"""Pressure that helium in a closed volume reaches when it warms.

Rules: these are estimates that make a person think of it; they are no risk assessment. A result is a caution or says
that the formula does not reach; there is no third state and no word of permission. The rules of the site prevail.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, Literal

import numpy as np
from numpy.typing import ArrayLike

from archive.physics.constants import GAS_CONSTANT
from archive.physics.helium_gas import second_virial
from archive.physics.ranges import floats, within

__all__ = ["TrappedPressure", "connected_volumes_pressure", "trapped_pressure"]

# m^6/mol^2 at 293.15 K, from memory; the equation of state of NISTIR 8474 (2023) gives 108e-12.
_THIRD_VIRIAL: Final = 113e-12
_T_LOW, _T_HIGH = 270.0, 330.0
# The table of B ends here; B falls beyond, so its last value is the unfavourable one (derived here).
_T_LAST_B: Final = 300.0
_LARGEST_PRESSURE: Final = 100e6


@dataclass(frozen=True)
class TrappedPressure:
    """Estimate of the pressure in a closed volume; absolute pressures.

    Attributes
    ----------
    state : str
        "caution", or "outside range of this formula" (then the caution stays, and `note` says more).
    amount, volume, temperature : float
        The unfavourable ends that were used: mol, m^3, K.
    ideal : float
        Ideal gas, Pa.
    real : float or None
        With second and third virial coefficient, Pa; None where they do not apply.
    note : str
        What was assumed, and what lies outside.
    """

    state: Literal["caution", "outside range of this formula"]
    amount: float
    volume: float
    temperature: float
    ideal: float
    real: float | None
    note: str

    @property
    def largest(self) -> float:
        """Return the larger of the two estimates, in Pa absolute."""
        return self.ideal if self.real is None else max(self.ideal, self.real)

    def gauge(self, atmosphere: float) -> float:
        """Return the larger estimate above the local atmospheric pressure, in Pa."""
        return self.largest - atmosphere


def trapped_pressure(
    *,
    amount: float,
    volume: float,
    temperature: float,
    amount_uncertainty: float = 0.0,
    volume_uncertainty: float = 0.0,
) -> TrappedPressure:
    """Return the pressure of 4He that is shut into a volume and warms to one temperature.

    Parameters
    ----------
    amount, amount_uncertainty : float
        mol, and its expanded uncertainty, which is added.
    volume, volume_uncertainty : float
        m^3, the smallest volume that a plug or valve can isolate, and its expanded uncertainty, which is taken off.
    temperature : float
        K, the highest plausible one.

    Returns
    -------
    TrappedPressure
        p = n R T/V and p = n R T/V (1 + B c + C c^2), c = n/V.

    Raises
    ------
    ValueError
        When an argument is not a number above 0, or the volume is not larger than its uncertainty.

    Notes
    -----
    The real-gas form is given from 270 to 330 K: B from the table of `second_virial` (its value at 300 K beyond, which is
    the unfavourable one), C = 113 cm^6/mol^2 at 293.15 K.
    It agrees with an equation of state within 0.05 per cent up to 10 mol/L and is 1.5 per cent low at 31 mol/L; above
    100 MPa it is out of its range. Not covered: other gases frozen in the same volume, gas released from charcoal or
    graphite, 3He, heating by fire.

    Examples
    --------
    >>> estimate = trapped_pressure(amount=3.0e-3, volume=2.0e-6, temperature=293.15)
    >>> estimate.state, round(estimate.ideal / 1e6, 3), round(estimate.largest / 1e6, 3)
    ('caution', 3.656, 3.722)
    """
    n = _positive(amount, "amount") + _not_negative(amount_uncertainty, "amount_uncertainty")
    V = _positive(volume, "volume") - _not_negative(volume_uncertainty, "volume_uncertainty")
    T = _positive(temperature, "temperature")
    if V <= 0:
        raise ValueError(
            f"volume: found {volume:.6g} m^3, expected more than its uncertainty {volume_uncertainty:.6g} m^3"
        )
    c = n / V
    ideal = c * GAS_CONSTANT * T
    if not _T_LOW <= T <= _T_HIGH:
        note = f"real-gas form only from {_T_LOW:g} to {_T_HIGH:g} K; the ideal figure stands alone and may be too low"
        return TrappedPressure("outside range of this formula", n, V, T, ideal, None, note)
    real = ideal * (1 + float(second_virial(min(T, _T_LAST_B))) * c + _THIRD_VIRIAL * c * c)
    if real > _LARGEST_PRESSURE:
        note = "caution: more than 100 MPa, outside range of this formula"
        return TrappedPressure("outside range of this formula", n, V, T, ideal, real, note)
    note = "4He alone, nothing vents, the plug or valve holds, no gas released from adsorbents"
    return TrappedPressure("caution", n, V, T, ideal, real, note)


def connected_volumes_pressure(*, amount: float, volumes: ArrayLike, temperatures: ArrayLike) -> float:
    """Return the pressure of an ideal gas that fills several connected volumes at different temperatures.

    Parameters
    ----------
    amount : float
        mol, above 0; the unfavourable end.
    volumes, temperatures : array_like of the same shape
        m^3 and K, above 0.

    Returns
    -------
    float
        p = n R/sum(V_i/T_i) in Pa absolute, ideal gas.

    Raises
    ------
    ValueError
        When an argument is not above 0 or the shapes differ.

    Examples
    --------
    >>> round(connected_volumes_pressure(amount=1e-3, volumes=[1e-6, 1e-6], temperatures=[4.0, 293.15]) / 1e6, 4)
    0.0328
    """
    tiny = float(np.finfo(float).tiny)
    V = within(volumes, "volumes", low=tiny, high=np.inf, unit="m^3", formula="a volume")
    T = within(temperatures, "temperatures", low=tiny, high=np.inf, unit="K", formula="a temperature")
    if V.shape != T.shape or V.size == 0:
        raise ValueError(
            f"temperatures: found shape {T.shape}, expected that of volumes, {V.shape}, and at least one"
        )
    if np.isnan(V).any() or np.isnan(T).any():
        raise ValueError(
            "volumes, temperatures: found NaN, expected numbers; a missing input is not assessed"
        )
    return float(_positive(amount, "amount") * GAS_CONSTANT / np.sum(floats(V / T)))


def _positive(value: float, name: str) -> float:
    if not (np.isfinite(value) and value > 0):
        raise ValueError(
            f"{name}: found {value!r}, expected a number above 0; a missing input is not assessed"
        )
    return float(value)


def _not_negative(value: float, name: str) -> float:
    if not (np.isfinite(value) and value >= 0):
        raise ValueError(f"{name}: found {value!r}, expected a number of at least 0")
    return float(value)

"""Amount of gas in a dose, running totals, and what the dead volume keeps from the film.

Rules: the second virial coefficient and molar densities are arguments (see `helium_gas`); each volume counts at its own
temperature; pressures are absolute.

References
----------
The virial equation to first order and the balance of amounts, derived here.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray, series
from archive.physics.constants import GAS_CONSTANT

__all__ = ["dose_amount", "dose_uncertainty", "film_amount", "running_total"]

VIRIAL_LIMIT = 0.05
"""Largest |B p/RT| for the first-order form."""


def dose_amount(
    *,
    pressure_before: npt.ArrayLike,
    pressure_after: npt.ArrayLike,
    volume: npt.ArrayLike,
    temperature: npt.ArrayLike,
    temperature_after: npt.ArrayLike | None = None,
    second_virial: npt.ArrayLike = 0.0,
) -> FloatArray:
    """Return the amount that left a dosing volume, mol; negative if gas came back.

    Parameters
    ----------
    pressure_before, pressure_after : array_like
        Pa, >= 0.
    volume : array_like
        m^3, > 0.
    temperature : array_like
        Of the volume, K, > 0; `temperature_after` if it changed.
    second_virial : array_like
        B at that temperature, m^3/mol.

    Raises
    ------
    ValueError
        Values out of range, or ``|B p/RT|`` of 0.05 and more, where the first-order form ends.

    Notes
    -----
    ``n = V (rho(p_1) - rho(p_2))`` with ``rho = p/(RT (1 + B p/RT))``.

    Examples
    --------
    >>> n = dose_amount(
    ...     pressure_before=13332.2, pressure_after=0.0, volume=1e-5, temperature=295.0, second_virial=11.86e-6)
    >>> float(round(n * 1e6, 4))
    54.3523
    """
    after = temperature if temperature_after is None else temperature_after
    size = _positive("volume", volume)
    before_density = _molar_density("pressure_before", pressure_before, temperature, second_virial)
    after_density = _molar_density("pressure_after", pressure_after, after, second_virial)
    return np.asarray(size * (before_density - after_density))


def dose_uncertainty(
    *,
    pressure_before: npt.ArrayLike,
    pressure_after: npt.ArrayLike,
    volume: npt.ArrayLike,
    temperature: npt.ArrayLike,
    u_pressure: npt.ArrayLike,
    u_temperature: npt.ArrayLike = 0.0,
) -> FloatArray:
    """Return the standard uncertainty of one dose from gauge and thermometer, mol, without the volume's.

    Parameters
    ----------
    pressure_before, pressure_after, volume, temperature : array_like
        As in `dose_amount`.
    u_pressure : array_like
        Standard uncertainty of one pressure reading, Pa; the two readings are taken as independent.
    u_temperature : array_like
        Of the temperature, K, common to both readings.

    Notes
    -----
    First order, ideal gas (the virial share changes it by less than 5 per cent of itself). The volume is common to all doses:
    give it to `running_total`.
    """
    V, T = _positive("volume", volume), _positive("temperature", temperature)
    difference = np.asarray(pressure_before, dtype=np.float64) - np.asarray(pressure_after, dtype=np.float64)
    gauge = V / (GAS_CONSTANT * T) * np.sqrt(2) * np.asarray(u_pressure, dtype=np.float64)
    thermal = V * difference / (GAS_CONSTANT * T * T) * np.asarray(u_temperature, dtype=np.float64)
    return np.asarray(np.hypot(gauge, thermal))


def running_total(
    amounts: npt.ArrayLike, *, standard_uncertainty: npt.ArrayLike = 0.0, common_relative: float = 0.0
) -> tuple[FloatArray, FloatArray]:
    """Return the total after each dose and its standard uncertainty, mol.

    Parameters
    ----------
    amounts : array_like
        mol, in order; negative for gas removed.
    standard_uncertainty : array_like
        Independent part of each, mol, >= 0.
    common_relative : float
        Relative uncertainty common to all, as of the dosing volume, >= 0.

    Raises
    ------
    ValueError
        Not one-dimensional, not finite, or a negative uncertainty.
    """
    n = series("amounts", amounts)
    u = series("standard_uncertainty", np.broadcast_to(standard_uncertainty, n.shape))
    if (u < 0).any() or common_relative < 0:
        raise ValueError("standard_uncertainty, common_relative: found a negative value, expected >= 0")
    total = np.cumsum(n)
    return total, np.sqrt(np.cumsum(u**2) + (common_relative * total) ** 2)


def film_amount(
    total: npt.ArrayLike, *, molar_densities: npt.ArrayLike, volumes: npt.ArrayLike
) -> FloatArray:
    """Return what is in the film when vapour fills the dead volumes, mol.

    Parameters
    ----------
    total : array_like, shape (points,) or scalar
        Amount let in, mol.
    molar_densities : array_like, shape (..., volumes)
        Of the vapour in each volume at its own temperature, mol/m^3; last axis runs over the volumes.
    volumes : array_like, shape (volumes,)
        m^3, >= 0.

    Raises
    ------
    ValueError
        A last axis that does not match the volumes.

    Notes
    -----
    Use the measured pressure of an unsaturated film; the saturated density gives the lower bound of the film. Coverage is
    then not constant along a warming run.
    """
    size = series("volumes", volumes)
    density = np.asarray(molar_densities, dtype=np.float64)
    if density.ndim == 0 or density.shape[-1] != size.size:
        raise ValueError(
            f"molar_densities: found shape {density.shape}, expected {size.size} volumes on the last axis"
        )
    return np.asarray(np.asarray(total, dtype=np.float64) - density @ size)


def _positive(name: str, values: npt.ArrayLike) -> FloatArray:
    array = np.asarray(values, dtype=np.float64)
    if (bad := ~(array > 0)).any():
        index = int(np.argmax(bad))
        raise ValueError(f"{name}[{index}]: found {array.flat[index]}, expected > 0")
    return array


def _molar_density(
    name: str, pressure: npt.ArrayLike, temperature: npt.ArrayLike, second_virial: npt.ArrayLike
) -> FloatArray:
    p = np.asarray(pressure, dtype=np.float64)
    if (bad := ~(p >= 0)).any():
        index = int(np.argmax(bad))
        raise ValueError(f"{name}[{index}]: found {p.flat[index]}, expected >= 0")
    ideal = p / (GAS_CONSTANT * _positive("temperature", temperature))
    virial = np.asarray(second_virial, dtype=np.float64) * ideal
    if (bad := ~(np.abs(virial) < VIRIAL_LIMIT)).any():
        index = int(np.argmax(bad))
        found = virial.flat[index]
        raise ValueError(f"{name}[{index}]: found |B p/RT| = {abs(found):.3g}, expected below {VIRIAL_LIMIT}")
    return np.asarray(ideal / (1 + virial))

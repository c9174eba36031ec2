"""The two curves of an oscillator that carries a film, period drop and dissipation, and how they follow the parameters.

Rules: the trajectory is the one with fixed x_0; only ln(D/a^2) counts, never D and a; one accuracy everywhere.

References
----------
V. Ambegaokar, B. I. Halperin, D. R. Nelson, E. D. Siggia, Phys. Rev. B 21, 1806 (1980); D. J. Bishop, J. D. Reppy, Phys. Rev. B 22, 5171
(1980): content from memory, the equations derived anew and held against two independent integrations.
"""

from __future__ import annotations

import math
from collections.abc import Mapping

import numpy as np

from archive.physics.arrays import ComplexArray, FloatArray
from archive.physics.film_dynamic import (
    complex_stiffness,
    dynamic_areal_density,
    fixed_start,
    stiffness_slopes,
)

__all__ = ["PARAMETERS", "curve_slopes", "curves"]

PARAMETERS = (
    "transition_temperature",
    "b",
    "log_diffusivity",
    "F",
    "scale",
    "drop_offset",
    "dissipation_offset",
)


def curves(
    temperature: FloatArray, values: Mapping[str, float], *, angular_frequency: float, x0: float
) -> tuple[FloatArray, FloatArray]:
    """Return twice the fractional period drop, and the dissipation, of the dynamic theory.

    Parameters
    ----------
    temperature : ndarray
        K, > 0.
    values : mapping of str to float
        Every one of `PARAMETERS`: transition_temperature (K, static), b, log_diffusivity (ln of D/a^2 in 1/s), F, scale
        (A (1 - chi)/M, m^2/kg), drop_offset (of 2 dP/P), dissipation_offset.
    angular_frequency : float
        1/s.
    x0 : float
        Bare start of the flow.
    """
    begin = fixed_start(temperature / values["transition_temperature"], b=values["b"], x0=x0)
    stiffness = complex_stiffness(begin, L=_diffusion(values, angular_frequency), F=values["F"])
    drop, loss = _both(values["scale"] * dynamic_areal_density(temperature, stiffness))
    return drop + values["drop_offset"], loss + values["dissipation_offset"]


def curve_slopes(
    temperature: FloatArray,
    values: Mapping[str, float],
    names: tuple[str, ...],
    *,
    angular_frequency: float,
    x0: float,
) -> tuple[FloatArray, FloatArray]:
    """Return the derivatives of the two curves by parameters, each of shape (points, names).

    Parameters
    ----------
    temperature, values, angular_frequency, x0
        As in `curves`.
    names : tuple of str
        Of `PARAMETERS`.
    """
    T, T_KT, b, scale = temperature, values["transition_temperature"], values["b"], values["scale"]
    begin = fixed_start(T / T_KT, b=b, x0=x0)
    L = _diffusion(values, angular_frequency)
    here = stiffness_slopes(begin, L=L, F=values["F"])
    # Where the fugacity would be imaginary the start holds c at its lowest, which no parameter moves.
    held = begin.invariant > (b / 4) ** 2 * (T / T_KT - 1)
    by_c: ComplexArray = np.where(held, 0j, scale * dynamic_areal_density(T, here.by_invariant))
    columns: dict[str, ComplexArray] = {
        # Both act through c = (b/4)^2 (T/T_KT - 1) alone.
        "transition_temperature": -((b / 4) ** 2) * T / T_KT**2 * by_c,
        "b": b / 8 * (T / T_KT - 1) * by_c,
        "log_diffusivity": scale * dynamic_areal_density(T, here.by_log_diffusivity),
        "F": scale * dynamic_areal_density(T, here.by_prefactor),
        "scale": dynamic_areal_density(T, here.stiffness),
        "drop_offset": np.ones(T.shape, dtype=np.complex128),
        # The dissipation is minus the imaginary part.
        "dissipation_offset": np.full(T.shape, -1j),
    }
    return _both(np.stack([columns[name] for name in names], axis=-1))


def _diffusion(values: Mapping[str, float], angular_frequency: float) -> float:
    """Return L = ln(D/(a^2 w))."""
    return values["log_diffusivity"] - math.log(angular_frequency)


def _both(ratio: ComplexArray) -> tuple[FloatArray, FloatArray]:
    return ratio.real, -ratio.imag

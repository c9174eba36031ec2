"""Two-scale-factor combination: the amplitude of the heat capacity in a volume of the correlation length.

Rule: the length is the transverse one by the definition of `power_law.transverse_correlation_length`; with any other the number means
something else.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray
from archive.physics.constants import BOLTZMANN

__all__ = ["two_scale_factor"]


def two_scale_factor(
    length_amplitude: npt.ArrayLike, *, heat_capacity_amplitude: npt.ArrayLike, molar_volume: npt.ArrayLike
) -> FloatArray:
    """Return ``xi_0T (A^-/k_B)^(1/3)``, a pure number.

    Parameters
    ----------
    length_amplitude : array_like
        Amplitude of the transverse correlation length below the transition, m, > 0.
    heat_capacity_amplitude : array_like
        A^- of ``C = (A/alpha) t^-alpha + B`` below the transition, J/(mol K), > 0.
    molar_volume : array_like
        Of the liquid at the transition, m^3/mol, > 0.

    Raises
    ------
    ValueError
        An argument that is not above zero.

    Notes
    -----
    About 0.85 is observed in liquid 4He (common practice, no source); theory gives 0.815(10). Either amplitude depends on the exponent it was
    fitted with. A number outside 0.80 to 0.88 points to another definition of the length or of A.

    References
    ----------
    M. Stroesser, M. Moennigmann, V. Dohm, Physica B 284, 41 (2000): 0.815(10).

    Examples
    --------
    >>> round(float(two_scale_factor(3.45e-10, heat_capacity_amplitude=5.6537, molar_volume=27.38e-6)), 4)
    0.85
    """
    xi, A, V = (
        _positive(name, value)
        for name, value in (
            ("length_amplitude", length_amplitude),
            ("heat_capacity_amplitude", heat_capacity_amplitude),
            ("molar_volume", molar_volume),
        )
    )
    return np.asarray(xi * np.cbrt(A / V / BOLTZMANN))


def _positive(name: str, value: npt.ArrayLike) -> FloatArray:
    array = np.asarray(value, dtype=np.float64)
    if np.any(array <= 0):
        raise ValueError(f"{name}: found {float(np.nanmin(array))}, expected > 0")
    return array

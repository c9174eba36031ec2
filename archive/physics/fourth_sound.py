"""Superfluid fraction from a resonance of confined superfluid, whose frequency follows the speed of fourth sound.

Rule: only a ratio of frequencies is used, so that the size of the resonator does not enter; what the ratio is referred to is said.

References
----------
K. R. Atkins, "Third and fourth sound in liquid helium II", Physical Review 113, 962 (1959). Tabulated values: R. J. Donnelly,
C. F. Barenghi, J. Phys. Chem. Ref. Data 27, 1217 (1998). Temperatures are T90.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray
from archive.physics.helium_liquid import superfluid_fraction
from archive.physics.helium_sound import first_sound

__all__ = ["fourth_sound_ratio", "fraction_from_frequency"]


def fourth_sound_ratio(temperature: npt.ArrayLike, *, reference_temperature: npt.ArrayLike) -> FloatArray:
    """Return the frequency of a fourth-sound resonance over that at a reference temperature, from tabulated values.

    Parameters
    ----------
    temperature, reference_temperature : float or array_like
        T90 in K, 0.1 to 2.1768 K; NaN gives NaN.

    Returns
    -------
    ndarray of float64
        ``sqrt(f_s) c_1`` over the same at the reference, f_s the superfluid fraction, c_1 the speed of first sound.

    Raises
    ------
    ValueError
        When a temperature is outside the tables.

    Notes
    -----
    For liquid in pores or a channel whose normal part is held fast, which takes channels narrow against the viscous penetration
    depth and rigid walls. The further term, the normal fraction times the square of the speed of second sound, is left out: with
    tabulated values it is below 3e-4 of the frequency up to 1.4 K, and 0.17 per cent at 1.8 K.

    Examples
    --------
    >>> round(float(fourth_sound_ratio(1.2, reference_temperature=0.6)), 3)
    0.983
    """
    return np.asarray(
        np.sqrt(superfluid_fraction(temperature) / superfluid_fraction(reference_temperature))
        * first_sound(temperature)
        / first_sound(reference_temperature),
        dtype=np.float64,
    )


def fraction_from_frequency(
    frequency: npt.ArrayLike,
    *,
    temperature: npt.ArrayLike,
    reference_frequency: float,
    reference_temperature: float,
) -> FloatArray:
    """Return the superfluid fraction from the frequency of a fourth-sound resonance.

    Parameters
    ----------
    frequency : array_like
        Hz; NaN gives NaN.
    temperature : array_like
        T90 in K, 0.1 to 2.1768 K, one for each frequency.
    reference_frequency, reference_temperature : float
        Hz and K, of the point where the tabulated fraction is taken; below 0.8 K that is one.

    Returns
    -------
    ndarray of float64
        ``f_s(ref) (f c_1(ref)/(f_ref c_1))^2``.

    Raises
    ------
    ValueError
        A temperature outside the tables, or a reference frequency that is not above zero.

    Notes
    -----
    As in `fourth_sound_ratio`; a relative error of the frequency counts twice.

    Examples
    --------
    >>> ratio = float(fourth_sound_ratio(1.2, reference_temperature=0.6))
    >>> found = fraction_from_frequency(2000.0 * ratio, temperature=1.2, reference_frequency=2000.0, reference_temperature=0.6)
    >>> bool(abs(found - superfluid_fraction(1.2)) < 1e-12)
    True
    """
    if not reference_frequency > 0:
        raise ValueError(f"reference_frequency: found {reference_frequency}, expected > 0")
    f = np.asarray(frequency, dtype=np.float64)
    speeds = first_sound(reference_temperature) / first_sound(temperature)
    return np.asarray(
        superfluid_fraction(reference_temperature) * (f / reference_frequency * speeds) ** 2, dtype=np.float64
    )

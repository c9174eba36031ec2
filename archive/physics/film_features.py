"""Where the features of the dynamic theory lie: the dissipation peak, and the crossing of the universal line.

Rules: the static transition lies below every feature of an oscillator record; these functions say how far.

References
----------
V. Ambegaokar, B. I. Halperin, D. R. Nelson, E. D. Siggia, Phys. Rev. B 21, 1806 (1980); D. J. Bishop, J. D. Reppy, Phys. Rev. B 22, 5171
(1980): content from memory, the equations derived anew and held against two independent integrations.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.optimize import brentq, minimize_scalar

from archive.physics.arrays import FloatArray
from archive.physics.film_dynamic import FilmStart, complex_stiffness, fixed_start, reduced_response

__all__ = ["DissipationPeak", "dissipation_peak", "shift_of_crossing"]

SCAN = np.concatenate([1 + np.geomspace(1e-4, 1.0, 161)])
"""Ratios T/T_KT searched before refining."""


@dataclass(frozen=True)
class DissipationPeak:
    """Maximum of the dissipation.

    Attributes
    ----------
    ratio : float
        T_peak/T_KT.
    q : float
        Dissipation over twice the fractional period drop at the static jump.
    S : float
        Observed areal density at the peak over its static value at the jump.
    """

    ratio: float
    q: float
    S: float


def dissipation_peak(
    start_of: Callable[[FloatArray], FilmStart], *, L: float, F: float = 1.0
) -> DissipationPeak:
    """Return the maximum of the dissipation above the static transition.

    Parameters
    ----------
    start_of : callable
        From T/T_KT to the start of the flow, e.g. ``lambda ratio: fixed_start(ratio, b=5.5)`` or `villain_start`.
    L : float
        ln(D/(a^2 w)).
    F : float
        Free-vortex prefactor.

    Notes
    -----
    For F from 0.5 to 2 the peak is 0.26 to 0.33 high; a measured one outside 0.15 to 0.45 points to a wrong
    calibration, an uneven film, or pores narrower than the diffusion length.
    """

    def response(ratio: FloatArray) -> tuple[FloatArray, FloatArray]:
        return reduced_response(ratio, complex_stiffness(start_of(ratio), L=L, F=F))

    _, q = response(SCAN)
    index = min(max(int(np.argmax(q)), 1), SCAN.size - 2)
    best = minimize_scalar(
        lambda ratio: -float(response(np.array([ratio]))[1][0]),
        bounds=(float(SCAN[index - 1]), float(SCAN[index + 1])),
        method="bounded",
        options={"xatol": 1e-10},
    )
    S, q = response(np.array([float(best.x)]))
    return DissipationPeak(float(best.x), float(q[0]), float(S[0]))


def shift_of_crossing(*, b: float, L: float, F: float = 1.0, x0: float = -0.5) -> float:
    """Return ``T_cross/T_KT - 1``, where the observed areal density meets the universal line.

    Parameters
    ----------
    b, L, F, x0 : float
        As in `film_dynamic`.

    Returns
    -------
    float
        Positive. Divide a crossing temperature by one plus this to get the static transition.

    Raises
    ------
    ValueError
        No crossing up to twice the transition temperature.
    """

    def excess(ratio: float) -> float:
        at = np.array([ratio])
        S, _ = reduced_response(at, complex_stiffness(fixed_start(at, b=b, x0=x0), L=L, F=F))
        return float(S[0]) - ratio

    if excess(1.0) <= 0 or excess(2.0) >= 0:
        raise ValueError(f"b, L, F: found no crossing of the universal line for {b}, {L}, {F}")
    root = brentq(excess, 1.0, 2.0, xtol=1e-12)
    return float(root) - 1 if math.isfinite(root) else math.nan

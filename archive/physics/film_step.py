"""Step approximations to the dynamic theory: for comparison with older work only.

Rules: never fitted with. The period is right to about 1e-4 of the jump up to the transition; the dissipation is low by
up to a third far below it and by 15 per cent on the rise to the peak. Use `film_dynamic`.

References
----------
V. Ambegaokar, B. I. Halperin, D. R. Nelson, E. D. Siggia, Phys. Rev. B 21, 1806 (1980); D. J. Bishop, J. D. Reppy, Phys. Rev. B 22, 5171
(1980): content from memory, the equations derived anew and held against two independent integrations.
"""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import ComplexArray, FloatArray
from archive.physics.film_dynamic import DEBYE, FilmStart, free_vortex_length
from archive.physics.film_flow import EDGE, flow, flow_rate, panels
from archive.physics.film_static import x_minus_log1p, x_of_s

__all__ = ["step_stiffness", "step_stiffness_linear_flow"]


def step_stiffness(start: FilmStart, *, L: npt.ArrayLike, F: float = 1.0) -> ComplexArray:
    """Return the dynamic stiffness with the kernel replaced by a step at l_D, on the full flow.

    Parameters
    ----------
    start : FilmStart
    L : array_like
        ln(D/(a^2 w)), with l_D = (L + ln 14)/2 > 0.
    F : float
        Free-vortex prefactor.

    Notes
    -----
    2/(pi K) = 1 + x(l_D) + i (pi/2) Y^2(l_D) + i (4 pi F/7) exp(2(l_D - l_+)); where the flow ends before l_D the bound
    part stops at its end.

    References
    ----------
    V. Ambegaokar, B. I. Halperin, D. R. Nelson, E. D. Siggia, Physical Review B 21, 1806 (1980) (from memory).
    """
    c = np.asarray(start.invariant, dtype=np.float64)
    x = np.asarray(start.x, dtype=np.float64)
    s0 = np.sign(x) * np.sqrt(2 * x_minus_log1p(x))
    l_D = np.broadcast_to((np.asarray(L, dtype=np.float64) + math.log(DEBYE)) / 2, c.shape)
    l_plus = free_vortex_length(start)
    inside = l_D < l_plus
    time = np.where(inside, l_D, 0.0)
    nodes, weights = panels(max(math.ceil(float(time.max(initial=0.0))), 1), 20)
    # Newton on l(v) = l_D; dl/dv = g is smooth and of order one, so a few steps reach double precision.
    for _ in range(12):
        reached = time * (
            flow_rate(flow(c[..., np.newaxis], s0[..., np.newaxis], time[..., np.newaxis] * nodes)) @ weights
        )
        time = np.maximum(time - np.where(inside, (reached - l_D) / flow_rate(flow(c, s0, time)), 0.0), 0.0)
    s = np.where(inside, flow(c, s0, time), EDGE)
    fugacity2 = np.where(inside, s * s + c, 0.0)
    free = np.where(np.isfinite(l_plus), np.exp(np.clip(2 * (l_D - l_plus), -700.0, 300.0)), 0.0)
    inverse = 1 + x_of_s(s) + 1j * (math.pi / 2 * fugacity2 + (4 * math.pi * F / 7) * free)
    return np.asarray((2 / math.pi) / inverse, dtype=np.complex128)


def step_stiffness_linear_flow(
    reduced_temperature: npt.ArrayLike, *, b: float, L: float, F: float = 1.0
) -> ComplexArray:
    """Return the dynamic stiffness of the step form on the linearised flow from minus infinity.

    Parameters
    ----------
    reduced_temperature : array_like
        T/T_KT - 1.
    b : float
        Non-universal constant, > 0.
    L : float
        ln(D/(a^2 w)).
    F : float
        Free-vortex prefactor.

    Returns
    -------
    ndarray of complex
        Not a number where the flow ends before l_D; the form says nothing there.
    """
    t = np.asarray(reduced_temperature, dtype=np.float64)
    l_D = (L + math.log(DEBYE)) / 2
    B = np.where(t == 0, 1.0, (b / 4) * np.sqrt(np.abs(t)))
    angle = 2 * B * l_D
    ends: FloatArray = (math.pi - np.arctan(B)) / (2 * B)
    x = np.where(t < 0, -B / np.tanh(angle), np.where(t > 0, -B / np.tan(angle), -1 / (2 * l_D)))
    Y = np.where(t < 0, B / np.sinh(angle), np.where(t > 0, B / np.sin(angle), 1 / (2 * l_D)))
    free = np.where(t > 0, np.exp(2 * (l_D - ends)), 0.0)
    inverse = 1 + x + 1j * (math.pi / 2 * Y * Y + (4 * math.pi * F / 7) * free)
    return np.where((t > 0) & (ends <= l_D), complex(math.nan, math.nan), (2 / math.pi) / inverse)

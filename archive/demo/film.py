"""Superfluid part of the invented films: amount per area that decouples, and the loss that goes with it.

The planar film follows the dynamic theory of `archive.physics.film_dynamic` along a trajectory of its own: constant
bare areal density, so that everything above the inert layer flows at T = 0, and a core energy chosen to give the
wanted b at T_KT. The porous film is a power law joined to a plateau.

Simplified: the bare density has no thermal excitations, D does not depend on T, the film does not
evaporate. With bare start x_0 the density at T = 0 is 1/(1 + x_0) times that at the jump, so that
T_KT = (n - n_inert) (1 + x_0)/(universal jump): lower than the estimate that counts the jump alone.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Final

import numpy as np
from scipy.interpolate import CubicSpline

from archive.demo.truth import PlanarFilm, PorousFilm
from archive.physics.constants import MOLAR_MASS_HELIUM4
from archive.physics.film_dynamic import FilmStart, complex_stiffness, reduced_response
from archive.physics.film_static import UNIVERSAL_JUMP, x_minus_log1p

if TYPE_CHECKING:
    import numpy.typing as npt

    Floats = npt.NDArray[np.float64]

__all__ = ["MOLAR_JUMP", "coverage_of_transition", "planar_transition", "response_of", "start_of"]

MOLAR_JUMP: Final = UNIVERSAL_JUMP / MOLAR_MASS_HELIUM4
"""Universal jump as amount: 8.7227 umol m^-2 K^-1."""

_STIFF: Final = 0.24
"""T/T_KT below which vortex pairs are so rare that first order in their density is exact to 1e-7."""

_LAST: Final = 1.45
"""T/T_KT above which nothing of the film's response is left."""


def planar_transition(film: PlanarFilm, coverage: float) -> float:
    """Return T_KT in K at a coverage in mol/m^2; zero where nothing flows."""
    return max(coverage - film.inert, 0.0) * (1 + film.x0) / MOLAR_JUMP


def coverage_of_transition(film: PlanarFilm, temperature: float) -> float:
    """Return the coverage in mol/m^2 whose T_KT is `temperature` in K."""
    return film.inert + temperature * MOLAR_JUMP / (1 + film.x0)


def _fugacity2(film: PlanarFilm, ratio: Floats) -> Floats:
    """Return Y_0^2: thermally activated, critical at T_KT, with the slope that makes dc/dt = (b/4)^2 there."""
    critical = 2 * float(x_minus_log1p(film.x0))
    # dc/dt = d(Y_0^2)/dt - 2 x_0 for x_0(T) of constant bare density, see `start_of`.
    activation = ((film.b / 4) ** 2 + 2 * film.x0) / critical
    return critical * np.exp(-activation * (1 / ratio - 1))


def start_of(film: PlanarFilm, ratio: Floats) -> FilmStart:
    """Return where the vortex flow starts at each T/T_KT.

    Parameters
    ----------
    film : PlanarFilm
    ratio : ndarray
        T/T_KT, > 0.

    Returns
    -------
    FilmStart
        1 + x_0(T) = (1 + x_0) T/T_KT, which is a constant bare areal density.
    """
    x = (1 + film.x0) * ratio - 1
    return FilmStart(x, _fugacity2(film, ratio) - 2 * x_minus_log1p(x))


@dataclass(frozen=True)
class _Curve:
    areal: CubicSpline
    loss: CubicSpline


@lru_cache(maxsize=8)
def _curve(film: PlanarFilm) -> _Curve:
    """Return S and q against T/T_KT: one curve serves every coverage, since D and w do not change."""
    ratio = np.unique(
        np.concatenate(
            [
                np.linspace(_STIFF - 0.01, 0.90, 100),
                np.linspace(0.90, 0.98, 81),
                np.linspace(0.98, 1.06, 401),
                np.linspace(1.06, _LAST + 0.01, 80),
            ]
        )
    )
    stiffness = complex_stiffness(start_of(film, ratio), L=film.log_diffusion, F=film.free_vortices)
    areal, loss = reduced_response(ratio, stiffness)
    return _Curve(CubicSpline(ratio, areal), CubicSpline(ratio, loss))


def _planar(film: PlanarFilm, temperature: Floats, coverage: Floats) -> tuple[Floats, Floats]:
    transition = np.maximum(coverage - film.inert, 0.0) * (1 + film.x0) / MOLAR_JUMP
    flows = transition > 1e-6
    ratio = np.where(flows, temperature / np.where(flows, transition, 1.0), np.inf)
    areal, loss = np.zeros_like(ratio), np.zeros_like(ratio)
    stiff = ratio < _STIFF
    cold = np.where(stiff, np.maximum(ratio, 1e-3), _STIFF)
    x = (1 + film.x0) * cold - 1
    # 2/(pi K) = 1 + x_0 + integral of 2 Y^2 dl, with dY/dl = 2 x_0 Y/(1 + x_0) while x hardly moves.
    inverse = 1 + x + _fugacity2(film, cold) * (1 + x) / (2 * np.abs(x))
    areal = np.where(stiff, cold / inverse, areal)
    middle = ~stiff & (ratio < _LAST)
    curve = _curve(film)
    inside = np.where(middle, ratio, 1.0)
    areal = np.where(middle, curve.areal(inside), areal)
    loss = np.where(middle, np.maximum(curve.loss(inside), 0.0), loss)
    scale = MOLAR_JUMP * transition
    return scale * areal, scale * loss


def _porous(film: PorousFilm, temperature: Floats, coverage: Floats) -> tuple[Floats, Floats]:
    above = np.maximum(coverage - film.inert, 0.0)
    transition = above * film.kelvin_per_coverage
    flows = transition > 0
    away = 1 - np.where(flows, temperature / np.where(flows, transition, 1.0), 1.0)
    t = np.clip(away, 0.0, 1.0)
    law = film.amplitude * t**film.exponent
    # Below the window 1 - (1 - g_w) (T/T_w)^k, with k from the slope of the power law where the two meet.
    w, value = film.window, film.amplitude * film.window**film.exponent
    power = film.exponent * (value / w) * (1 - w) / (1 - value)
    join = 1 - (1 - value) * ((1 - t) / (1 - w)) ** power
    # The small rounded loss maximum at T_c has no theory behind it here: 0.4 per cent of the plateau, 2 per cent wide.
    loss = np.where(flows, 0.004 * above * np.exp(-((away / 0.02) ** 2)), 0.0)
    return above * np.where(t <= w, law, join), loss


def response_of(
    film: PlanarFilm | PorousFilm, temperature: npt.ArrayLike, coverage: npt.ArrayLike
) -> tuple[Floats, Floats]:
    """Return the decoupled amount per area and its dissipative part.

    Parameters
    ----------
    film : PlanarFilm or PorousFilm
    temperature : array_like
        K, > 0.
    coverage : array_like
        mol/m^2, of the same shape or one number.

    Returns
    -------
    real, imaginary : ndarray
        mol/m^2, before the factor 1 - chi; both >= 0. Twice the fractional period drop and the added 1/Q are the same
        multiple of them.
    """
    T, n = np.broadcast_arrays(
        np.asarray(temperature, dtype=np.float64), np.asarray(coverage, dtype=np.float64)
    )
    if isinstance(film, PlanarFilm):
        return _planar(film, T, n)
    return _porous(film, T, n)

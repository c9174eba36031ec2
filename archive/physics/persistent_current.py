"""Persistent currents: angular momentum at fixed circulation, its decay, and whether a record comes back the way it went.

Rules: the circulation is N quanta h/m round a thin annulus; while N is kept, the angular momentum follows the superfluid
density alone; what is lost for good is decay and no density.

References
----------
J. D. Reppy, D. Depatie, Phys. Rev. Lett. 12, 187 (1964) (from memory); decay of films: V. Ambegaokar, B. I. Halperin, D. R. Nelson, E. D. Siggia,
Phys. Rev. B 21, 1806 (1980) (from memory). The closed form of the decay and the ratio of two branches are derived here.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import BoolArray, FloatArray, same_length, series
from archive.physics.constants import MASS_HELIUM4, PLANCK
from archive.physics.fitting import FitResult, Parameter, fit
from archive.physics.linear_fit import linear_fit

__all__ = ["Decay", "Return", "angular_momentum", "branch_ratio", "decaying", "fit_decay"]

LEAST_IN_GROUP = 4
"""Readings of either branch that a comparison needs (common practice, no source)."""


@dataclass(frozen=True)
class Decay:
    """Outcome of the fit of a decay.

    Attributes
    ----------
    found : bool
        Whether the current falls, and the power law is determined.
    reason : str
    fit : FitResult or None
        ``initial`` (kg m^2/s), ``rate`` (1/s, relative, at the beginning), ``exponent`` (m of dv/dt ~ -v^(1 + m)).
    probability : float
        That a constant current scatters as much.
    exponential_chi2 : float
        Of the exponential, the limit m = 0, in the units of `fit.chi2`.
    """

    found: bool
    reason: str
    fit: FitResult | None
    probability: float
    exponential_chi2: float


@dataclass(frozen=True)
class Return:
    """How much is left when a record comes back.

    Attributes
    ----------
    ratio, standard_uncertainty : float
        Later over earlier at equal abscissa.
    chi2, dof : float, int
        Of the groups about their common ratio.
    groups : int
    """

    ratio: float
    standard_uncertainty: float
    chi2: float
    dof: int
    groups: int


def angular_momentum(
    *, quanta: float, density: npt.ArrayLike, extent: float, drag_factor: float = 0.0
) -> FloatArray:
    """Return the angular momentum of N quanta of circulation, kg m^2/s.

    Parameters
    ----------
    quanta : float
        N.
    density : array_like
        Superfluid density in kg/m^3, or areal density of a film in kg/m^2.
    extent : float
        Volume in m^3, or area in m^2, > 0.
    drag_factor : float
        chi, part that the walls drag along.

    Notes
    -----
    L = (N h/(2 pi m)) rho_s V (1 - chi): r v_s is constant round an annulus, so its width does not matter (derived).

    References
    ----------
    J. D. Reppy, D. Depatie, "Persistent currents in superfluid helium", Physical Review Letters 12, 187 (1964) (from memory).

    Examples
    --------
    >>> float(angular_momentum(quanta=1000, density=145.0, extent=1e-6).round(12))
    2.301e-09
    """
    if not extent > 0:
        raise ValueError(f"extent: found {extent}, expected > 0")
    if not 0 <= drag_factor < 1:
        raise ValueError(f"drag_factor: found {drag_factor}, expected 0 to 1")
    moment = quanta * PLANCK / (2 * math.pi * MASS_HELIUM4)
    return np.asarray(moment * np.asarray(density, dtype=np.float64) * extent * (1 - drag_factor))


def decaying(time: npt.ArrayLike, *, initial: float, rate: float, exponent: float) -> FloatArray:
    """Return ``initial (1 + m r t)^(-1/m)``, the solution of dv/dt = -r v (v/initial)^m; an exponential for m = 0.

    Parameters
    ----------
    time : array_like
        s, >= 0.
    initial : float
    rate : float
        r in 1/s, >= 0.
    exponent : float
        m >= 0.
    """
    t = np.asarray(time, dtype=np.float64)
    if exponent < 1e-9:
        return np.asarray(initial * np.exp(-rate * t))
    return np.asarray(initial * np.exp(-np.log1p(exponent * rate * t) / exponent))


def fit_decay(
    time: npt.ArrayLike, values: npt.ArrayLike, *, standard_uncertainty: npt.ArrayLike | None = None
) -> Decay:
    """Return the power law by which a current decays.

    Parameters
    ----------
    time : array_like
        s, at least eight, from the same instant for all.
    values : array_like
        Angular momentum, kg m^2/s, of one sign.
    standard_uncertainty : array_like, optional
        > 0; without it the scatter decides.

    Raises
    ------
    ValueError
        Too few readings, or values of both signs.

    Notes
    -----
    A uniform current in a film below its transition decays by dissociation of vortex pairs, dv_s/dt ~ -v_s^(1 + pi K_R), so
    that m = pi K_R: 2 at the transition, more below it. The law keeps its form when
    time is counted from another reading: initial value and rate are those of the first.

    References
    ----------
    V. Ambegaokar, B. I. Halperin, D. R. Nelson, E. D. Siggia, "Dynamics of superfluid films", Physical Review B 21, 1806
    (1980) (from memory).
    """
    t, y = series("time", time, least=8), series("values", values)
    same_length(time=t, values=y)
    if not (np.all(y > 0) or np.all(y < 0)):
        raise ValueError("values: found both signs or zero, expected a current of one direction")
    u = (
        None
        if standard_uncertainty is None
        else np.broadcast_to(np.asarray(standard_uncertainty, dtype=np.float64), y.shape)
    )
    flat = linear_fit(
        np.ones((t.size, 1)), y, names=("level",), standard_uncertainty=u, absolute=u is not None
    )
    span = float(t.max() - t.min())
    best: FitResult | None = None
    for m in (0.0, 2.0, 8.0):
        one = _fitted(t, y, u, m=m, span=span, free=m > 0)
        if m == 0:
            exponential = one.chi2
        elif best is None or one.chi2 < best.chi2:
            best = one
    assert best is not None  # noqa: S101 - two values of m are tried
    probability = _chance(flat.chi2, best.chi2, 2, t.size - 3, absolute=u is not None)
    if probability > 1e-3 or best.value("rate") <= 0:
        return Decay(
            found=False,
            reason="no decay is seen above the scatter",
            fit=None,
            probability=probability,
            exponential_chi2=exponential,
        )
    if "exponent" in best.at_bound and best.value("exponent") < 1:
        reason = "the current decays, and not more slowly than an exponential"
        return Decay(
            found=False, reason=reason, fit=None, probability=probability, exponential_chi2=exponential
        )
    if not best.converged or not np.isfinite(best.covariance).all() or "exponent" in best.at_bound:
        return Decay(
            found=False,
            reason=f"the current decays, and the power law is not determined ({best.message})",
            fit=None,
            probability=probability,
            exponential_chi2=exponential,
        )
    return Decay(
        found=True, reason="a power law", fit=best, probability=probability, exponential_chi2=exponential
    )


def branch_ratio(
    abscissa: npt.ArrayLike, values: npt.ArrayLike, *, turn: int, standard_uncertainty: npt.ArrayLike | None = None, groups: int = 8
) -> Return | None:  # fmt: skip
    """Return later over earlier values at equal abscissa, for a record that turns back at a row.

    Parameters
    ----------
    abscissa : array_like
        Temperature, coverage or what else was changed, in the order of time.
    values : array_like
        Angular momentum.
    turn : int
        First row of the way back.
    standard_uncertainty : array_like, optional
    groups : int
        Most groups of abscissa.

    Returns
    -------
    Return or None
        None if the two ways do not overlap.

    Notes
    -----
    In each group both ways are fitted by one parabola and its multiple, so that readings need not be at the same places.
    """
    x, y = series("abscissa", abscissa), series("values", values)
    same_length(abscissa=x, values=y)
    later = np.arange(x.size) >= turn
    if not (later.any() and (~later).any()):
        return None
    low = max(x[later].min(), x[~later].min())
    high = min(x[later].max(), x[~later].max())
    inside = np.flatnonzero((x >= low) & (x <= high))
    if inside.size < 4 * LEAST_IN_GROUP or not high > low:
        return None
    u = (
        None
        if standard_uncertainty is None
        else np.broadcast_to(np.asarray(standard_uncertainty, dtype=np.float64), y.shape)
    )
    ratios, variances = [], []
    for group in np.array_split(
        inside[np.argsort(x[inside], kind="stable")], max(1, min(groups, inside.size // 24))
    ):
        back = later[group]
        if min(np.count_nonzero(back), np.count_nonzero(~back)) < LEAST_IN_GROUP:
            continue
        one, spread = _group_ratio(x[group], y[group], back, None if u is None else u[group])
        if math.isfinite(one):
            ratios.append(one)
            variances.append(spread**2)
    if not ratios:
        return None
    ratio, weight = np.array(ratios), 1 / np.array(variances)
    mean = float(np.sum(weight * ratio) / np.sum(weight))
    return Return(mean, float(1 / np.sqrt(np.sum(weight))), float(np.sum(weight * (ratio - mean) ** 2)), len(ratios) - 1, len(ratios))  # fmt: skip


def _group_ratio(x: FloatArray, y: FloatArray, back: BoolArray, u: FloatArray | None) -> tuple[float, float]:
    """Return the multiple by which the readings of the way back follow the parabola of the way there, and its uncertainty."""
    away = x - x.mean()
    design = np.column_stack([np.ones(x.size), away, away**2, back])
    ratio, spread = 1.0, math.nan
    # The way back, divided by the ratio found so far, is shifted by what is still missing; a few rounds leave nothing.
    for _ in range(8):
        scale = np.where(back, ratio, 1.0)
        found = linear_fit(
            design, y / scale, names=("level", "slope", "curve", "change"), standard_uncertainty=None if u is None else u / abs(scale), absolute=u is not None
        )  # fmt: skip
        level, change = found.value("level"), found.value("change")
        if not found.converged or level == 0 or change == -level:
            return math.nan, math.nan
        gradient = np.array([-change / level**2, 0.0, 0.0, 1 / level])
        # Readings without any scatter still have the rounding of their numbers.
        spread = max(abs(ratio) * math.sqrt(max(float(gradient @ found.covariance @ gradient), 0.0)), 1e-15)
        ratio *= 1 + change / level
        if abs(change / level) < 1e-13:
            break
    return ratio, spread


def _fitted(
    t: FloatArray, y: FloatArray, u: FloatArray | None, *, m: float, span: float, free: bool
) -> FitResult:
    first, last = float(np.median(y[: max(3, y.size // 20)])), float(np.median(y[-max(3, y.size // 20) :]))
    fallen = max(first / last - 1, 1e-6) if first * last > 0 else 1.0
    start = math.log1p(fallen) / span if m == 0 else (math.exp(m * math.log1p(fallen)) - 1) / (m * span)
    parameters = [
        Parameter("initial", first),
        Parameter("rate", min(start, 1e4 / span), 0.0, scale=min(start, 1e4 / span)),
    ]
    if free:
        parameters.append(Parameter("exponent", m, 0.0, 200.0))

    def model(x: FloatArray, p: FloatArray) -> FloatArray:
        return decaying(x, initial=float(p[0]), rate=float(p[1]), exponent=float(p[2]) if free else 0.0)

    return fit(model, parameters, t, y, standard_uncertainty=u, absolute=u is not None)


def _chance(before: float, after: float, parameters: int, dof: int, *, absolute: bool) -> float:
    """Return the probability that parameters without meaning lower the sum of squares as much."""
    from scipy.stats import chi2 as chi2_distribution  # a second of imports that few commands need
    from scipy.stats import f as f_distribution

    gain = max(before - after, 0.0)
    if absolute:
        # Scatter larger than stated must not pass for a decay.
        return float(chi2_distribution.sf(gain / max(after / dof, 1.0), parameters))
    if after <= 0:
        return 0.0 if gain > 0 else 1.0
    return float(f_distribution.sf(gain / parameters / (after / dof), parameters, dof))

"""Fit of the dynamic theory to an oscillator's record of a film transition.

Rules: period drop and dissipation are fitted together; the trajectory is the one with fixed x_0; only ln(D/a^2) is
fitted, never D and a; F is held unless freed by name; freeing the scale tests the universal jump.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray, same_length, series
from archive.physics.film_curves import PARAMETERS, curve_slopes, curves
from archive.physics.film_dynamic import complex_stiffness, fixed_start, reduced_response
from archive.physics.fitting import FitResult, Parameter, fit_residuals

__all__ = ["FREE_BY_DEFAULT", "FilmTransition", "fit_film_transition"]

FREE_BY_DEFAULT = ("transition_temperature", "b", "log_diffusivity", "drop_offset", "dissipation_offset")
"""F and the scale trade against the rest and stay fixed unless they are freed by name."""

NEAR, CLOSE = 1e-4, 1e-12
"""Tolerances of fits that only find a start, and of the last: a part in 10^12 of T_KT is below 10^-6 of its uncertainty, where
the model's own rounding still lets the search end by itself."""


@dataclass(frozen=True)
class FilmTransition:
    """Outcome of the fit of the dynamic theory.

    Attributes
    ----------
    fit : FitResult
        Free parameters: transition_temperature (K, static), b, log_diffusivity (ln of D/a^2 in 1/s), F, scale
        (A (1 - chi)/M, m^2/kg), drop_offset (of 2 dP/P), dissipation_offset. Its residuals are weighted, drop first.
    values : dict of str to float
        All parameters, also the fixed ones.
    L : float
        ln(D/(a^2 w)).
    twice_fractional_drop, dissipation : ndarray
        The fitted curves at the data's temperatures.
    chi2_drop, chi2_dissipation : float
        The two shares of chi-squared.
    trajectory : str
        Name of the parametrisation, to be stored with b.
    """

    fit: FitResult
    values: dict[str, float]
    L: float
    twice_fractional_drop: FloatArray
    dissipation: FloatArray
    chi2_drop: float
    chi2_dissipation: float
    trajectory: str

    @property
    def transition_temperature(self) -> float:
        """Static transition temperature, K."""
        return self.values["transition_temperature"]

    def standard_uncertainty(self, name: str) -> float:
        """Return the standard uncertainty of a parameter; zero if it was fixed."""
        return self.fit.standard_uncertainty(name) if name in self.fit.names else 0.0


def fit_film_transition(
    temperature: npt.ArrayLike,
    twice_fractional_drop: npt.ArrayLike,
    dissipation: npt.ArrayLike,
    *,
    standard_uncertainty_drop: npt.ArrayLike,
    standard_uncertainty_dissipation: npt.ArrayLike,
    angular_frequency: float,
    scale: float,
    scale_uncertainty: float | None = None,
    free: tuple[str, ...] = FREE_BY_DEFAULT,
    F: float = 1.0,
    x0: float = -0.5,
    start: dict[str, float] | None = None,
    absolute: bool = True,
    max_evaluations: int = 3000,
) -> FilmTransition:
    """Return the dynamic theory fitted to period drop and dissipation at once.

    Parameters
    ----------
    temperature : array_like
        K, > 0, any order; at least eight points.
    twice_fractional_drop : array_like
        2 (P_loaded - P)/P_loaded.
    dissipation : array_like
        Q^-1 of the film, background removed.
    standard_uncertainty_drop, standard_uncertainty_dissipation : array_like
        Of the two, > 0; a scalar serves all points.
    angular_frequency : float
        w = 2 pi f, 1/s, > 0.
    scale : float
        A (1 - chi)/M, m^2/kg, > 0; from the mass sensitivity: 2 (dP/dsigma)(1 - chi)/P.
    scale_uncertainty : float, optional
        If given and the scale is free, the scale stays within two of these.
    free : tuple of str
        Which parameters to fit.
    F : float
        Free-vortex prefactor, start or fixed value.
    x0 : float
        Bare start of the flow, fixed.
    start : dict, optional
        Start values by name, instead of those taken from the data.
    absolute : bool
        As in `fitting.fit`.
    max_evaluations : int
        Calls of the model before giving up.

    Returns
    -------
    FilmTransition

    Raises
    ------
    ValueError
        Bad data, an unknown parameter name, or values out of range.

    Notes
    -----
    A single frequency separates T_KT, b and ln(D/a^2) badly: read the covariance. Start values: the transition from the
    temperature of the dissipation peak divided by the model's, b = 3, 5 and 9, L = 13; the best of short fits from the three.

    References
    ----------
    V. Ambegaokar, B. I. Halperin, D. R. Nelson, E. D. Siggia, "Dynamics of superfluid films", Physical Review B 21, 1806
    (1980); D. J. Bishop, J. D. Reppy, Physical Review B 22, 5171 (1980) (both from memory; equations re-derived).
    """
    T = series("temperature", temperature, least=8, positive=True)
    drop = series("twice_fractional_drop", twice_fractional_drop)
    loss = series("dissipation", dissipation)
    u_drop = series(
        "standard_uncertainty_drop", np.broadcast_to(standard_uncertainty_drop, T.shape), positive=True
    )
    u_loss = series(
        "standard_uncertainty_dissipation",
        np.broadcast_to(standard_uncertainty_dissipation, T.shape),
        positive=True,
    )
    same_length(temperature=T, twice_fractional_drop=drop, dissipation=loss)
    if not (scale > 0 and angular_frequency > 0):
        raise ValueError(f"scale, angular_frequency: found {scale}, {angular_frequency}, expected > 0")
    unknown = [name for name in (*free, *(start or {})) if name not in PARAMETERS]
    if unknown:
        raise ValueError(f"free, start: found {unknown[0]!r}, expected one of {', '.join(PARAMETERS)}")
    data = _Data(T, drop, loss, u_drop, u_loss, x0, angular_frequency)
    limits = _limits(data, scale=scale, scale_uncertainty=scale_uncertainty)
    values = _first_values(data, limits, free, F=F, scale=scale, given=start or {})
    found = data.fit(
        values, limits, free, absolute=absolute, max_evaluations=max_evaluations, tolerance=CLOSE
    )
    final = _completed(values, found)
    model_drop, model_loss = curves(T, final, angular_frequency=angular_frequency, x0=x0)
    parts = found.residuals[: T.size], found.residuals[T.size :]
    return FilmTransition(
        fit=found,
        values=final,
        L=final["log_diffusivity"] - math.log(angular_frequency),
        twice_fractional_drop=model_drop,
        dissipation=model_loss,
        chi2_drop=float(np.sum(parts[0] ** 2)),
        chi2_dissipation=float(np.sum(parts[1] ** 2)),
        trajectory=f"fixed x0 = {x0:g}, c = (b/4)^2 (T/T_KT - 1)",
    )


@dataclass(frozen=True)
class _Data:
    temperature: FloatArray
    drop: FloatArray
    loss: FloatArray
    u_drop: FloatArray
    u_loss: FloatArray
    x0: float
    angular_frequency: float

    def peak(self) -> float:
        return float(self.temperature[int(np.argmax(self.loss))])

    def thinned(self, most: int) -> _Data:
        """Return every n-th point, at most about `most`, in the order of temperature."""
        order = np.argsort(self.temperature, kind="stable")[:: max(self.temperature.size // most, 1)]
        return _Data(
            self.temperature[order],
            self.drop[order],
            self.loss[order],
            self.u_drop[order],
            self.u_loss[order],
            self.x0,
            self.angular_frequency,
        )

    def fit(
        self,
        values: dict[str, float],
        limits: dict[str, tuple[float, float]],
        free: tuple[str, ...],
        *,
        absolute: bool,
        max_evaluations: int,
        tolerance: float,
    ) -> FitResult:
        sizes = {
            "drop_offset": float(np.ptp(self.drop)) or 1.0,
            "dissipation_offset": float(np.ptp(self.loss)) or 1.0,
            "F": 1.0,
        }
        parameters = [
            _parameter(name, values[name], limits[name], sizes.get(name))
            for name in PARAMETERS
            if name in free
        ]
        names = tuple(parameter.name for parameter in parameters)

        def at(fitted: FloatArray) -> dict[str, float]:
            return values | dict(zip(names, map(float, fitted), strict=True))

        def residuals(fitted: FloatArray) -> FloatArray:
            drop, loss = curves(
                self.temperature, at(fitted), angular_frequency=self.angular_frequency, x0=self.x0
            )
            return np.concatenate([(self.drop - drop) / self.u_drop, (self.loss - loss) / self.u_loss])

        def jacobian(fitted: FloatArray) -> FloatArray:
            drop, loss = curve_slopes(
                self.temperature, at(fitted), names, angular_frequency=self.angular_frequency, x0=self.x0
            )
            return -np.concatenate([drop / self.u_drop[:, np.newaxis], loss / self.u_loss[:, np.newaxis]])

        return fit_residuals(
            residuals,
            parameters,
            absolute=absolute,
            max_evaluations=max_evaluations,
            jacobian=jacobian,
            tolerance=tolerance,
        )


def _completed(values: dict[str, float], found: FitResult) -> dict[str, float]:
    return values | dict(zip(found.names, map(float, found.values), strict=True))


def _first_values(
    data: _Data,
    limits: dict[str, tuple[float, float]],
    free: tuple[str, ...],
    *,
    F: float,
    scale: float,
    given: dict[str, float],
) -> dict[str, float]:
    """Return start values: the best of short fits to a thinned record from three values of b.

    F and the scale open false minima when they are free from the start, so here they are held.
    """
    if set(PARAMETERS) <= set(given):
        return dict(given)
    first = tuple(name for name in free if name not in {"F", "scale"})
    candidates = [_start_values(data, b=b, F=F, scale=scale) | given for b in (3.0, 5.0, 9.0)]
    if not first:
        return candidates[1]
    few = data.thinned(40)
    trials = []
    for values in candidates[1:2] if given else candidates:
        found = few.fit(values, limits, first, absolute=False, max_evaluations=200, tolerance=NEAR)
        trials.append((found.chi2, _completed(values, found)))
    return min(trials, key=lambda trial: trial[0])[1]


def _start_values(data: _Data, *, b: float, F: float, scale: float) -> dict[str, float]:
    L = 13.0
    ratio = 1 + np.geomspace(1e-3, 1.0, 60)
    # Without free vortices the highest dissipation is not above the transition.
    stiffness = complex_stiffness(fixed_start(ratio, b=b, x0=data.x0), L=L, F=max(F, 0.1))
    above = float(ratio[int(np.argmax(reduced_response(ratio, stiffness)[1]))])
    return {
        "transition_temperature": data.peak() / above,
        "b": b,
        "log_diffusivity": L + math.log(data.angular_frequency),
        "F": F,
        "scale": scale,
        "drop_offset": 0.0,
        "dissipation_offset": 0.0,
    }


def _limits(data: _Data, *, scale: float, scale_uncertainty: float | None) -> dict[str, tuple[float, float]]:
    peak, log_w = data.peak(), math.log(data.angular_frequency)
    # The highest reading may sit one point beside the true maximum.
    step = float(np.max(np.diff(np.unique(data.temperature)), initial=0.0))
    room = 2 * scale_uncertainty if scale_uncertainty is not None else math.inf
    return {
        "transition_temperature": (0.8 * peak, peak + step),
        "b": (1.0, 20.0),
        "log_diffusivity": (0.0 + log_w, 40.0 + log_w),
        "F": (0.0, 10.0),
        "scale": (max(scale - room, 0.0), scale + room),
        "drop_offset": (-math.inf, math.inf),
        "dissipation_offset": (-math.inf, math.inf),
    }


def _parameter(name: str, start: float, limits: tuple[float, float], size: float | None) -> Parameter:
    if not limits[0] <= start <= limits[1]:
        raise ValueError(f"start[{name!r}]: found {start}, expected {limits[0]} to {limits[1]}")
    return Parameter(name, start, limits[0], limits[1], scale=size)

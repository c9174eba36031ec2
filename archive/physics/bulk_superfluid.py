"""Superfluid density of bulk 4He close below the lambda point: the power law with its corrections.

Rules: amplitude, exponent and confluent term are strongly correlated, so their covariance goes with them and none is taken from another
publication; the exponent of the confluent term is held.

References
----------
A. Singsaas, G. Ahlers, Phys. Rev. B 30, 5103 (1984), as reproduced by R. J. Donnelly, C. F. Barenghi, J. Phys. Chem. Ref. Data 27, 1217 (1998).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import BoolArray, FloatArray, same_length, series
from archive.physics.fitting import FitResult, Parameter, fit
from archive.physics.linear_fit import straight_line
from archive.physics.power_law import EXPONENT

__all__ = ["CONFLUENT_EXPONENT", "SuperfluidLaw", "fit_superfluid_law", "transition_estimate"]

CONFLUENT_EXPONENT: Final = 0.5
"""Delta as held in the fits of A. Singsaas, G. Ahlers, Physical Review B 30, 5103 (1984)."""

TERMS = ("amplitude", "exponent", "confluent", "regular")


@dataclass(frozen=True)
class SuperfluidLaw:
    """Outcome of the fit ``k_0 (1 + k_1 t) t^zeta (1 + D t^Delta)``.

    Attributes
    ----------
    fit : FitResult
        Parameters amplitude (k_0, unit of the data), exponent (zeta), and as asked for confluent (D), regular (k_1) and
        transition_temperature (K); residuals of the used points.
    transition_temperature : float
        Fitted or held, K.
    used : ndarray of bool
        Which of the given points lie in the window.
    converged : bool
        The fit converged and its window stopped changing.
    message : str
    """

    fit: FitResult
    transition_temperature: float
    used: BoolArray
    converged: bool
    message: str


def transition_estimate(temperature: npt.ArrayLike, fraction: npt.ArrayLike) -> float:
    """Return about where the superfluid fraction vanishes, K.

    Parameters
    ----------
    temperature : array_like
        K.
    fraction : array_like
        Superfluid fraction; at least four rows between 0.02 and 0.25.

    Raises
    ------
    ValueError
        Too few such rows, or a fraction that does not fall.

    Notes
    -----
    Where the straight line through fraction^(1/0.6717) meets zero; a start for a fit, good to about a millikelvin.
    """
    T = series("temperature", temperature)
    f = series("fraction", fraction)
    same_length(temperature=T, fraction=f)
    rows = (f > 0.02) & (f < 0.25)
    if np.count_nonzero(rows) < 4:
        raise ValueError(
            f"fraction: found {np.count_nonzero(rows)} rows between 0.02 and 0.25, expected at least 4"
        )
    line = straight_line(T[rows], f[rows] ** (1 / EXPONENT), absolute=False)
    if not line.value("slope") < 0:
        raise ValueError("fraction: found no fall with temperature, expected a fall to the transition")
    return -line.value("intercept") / line.value("slope")


def fit_superfluid_law(
    temperature: npt.ArrayLike,
    density: npt.ArrayLike,
    *,
    start_temperature: float,
    fixed: bool = False,
    terms: int = 4,
    window: tuple[float, float] = (1e-4, 0.03),
    rows: npt.ArrayLike | None = None,
    standard_uncertainty: npt.ArrayLike | None = None,
    temperature_uncertainty: npt.ArrayLike | None = None,
    absolute: bool = False,
) -> SuperfluidLaw:
    """Return the fit of the power law with its corrections.

    Parameters
    ----------
    temperature : array_like
        K, > 0.
    density : array_like
        Superfluid density or fraction.
    start_temperature : float
        Transition temperature: where to begin, or the value held, K.
    fixed : bool
        Hold it.
    terms : int
        2: amplitude and exponent; 3: the confluent term, too; 4: the regular term, too.
    window : (float, float)
        Range of 1 - T/T_lambda that is fitted, 0 <= low < high <= 0.035, where the form ends.
    rows : array_like of bool, optional
        Rows to fit, in place of the window.
    standard_uncertainty, temperature_uncertainty : array_like, optional
        Of each row; the second counts through the slope zeta rho_s/(t T_lambda).
    absolute : bool
        As in `fitting.fit`.

    Raises
    ------
    ValueError
        Bad arguments, or fewer rows in the window than parameters and two more.

    Notes
    -----
    The rows of the window are chosen anew with each fitted transition until they stay. Give the correlation of amplitude and exponent with them.

    References
    ----------
    A. Singsaas, G. Ahlers, "Universality of static properties near the superfluid transition in 4He", Physical Review B 30, 5103 (1984): form, as
    reproduced by Donnelly and Barenghi (1998).
    """
    T = series("temperature", temperature, positive=True)
    rho = series("density", density)
    same_length(temperature=T, density=rho)
    if not 0 <= window[0] < window[1] <= 0.035:
        raise ValueError(f"window: found {window}, expected 0 <= low < high <= 0.035")
    if terms not in (2, 3, 4):
        raise ValueError(f"terms: found {terms}, expected 2, 3 or 4")
    centre = start_temperature
    seen: list[BoolArray] = []
    settled = False
    chosen = None if rows is None else np.asarray(rows, dtype=np.bool_)
    for _ in range(20):
        t = 1 - T / centre
        used = (t > window[0]) & (t < window[1]) if chosen is None else chosen
        again = next((k for k, each in enumerate(seen) if np.array_equal(each, used)), None)
        if again is not None:
            if settled or again == len(seen) - 1:
                settled = True
                used = seen[-1]
                break
            # A row on the edge goes in and out with the fitted transition: it stays out.
            settled = True
            used = chosen = np.asarray(np.logical_and.reduce(seen[again:]))
        seen.append(used)
        least = terms + (0 if fixed else 1) + 2
        if np.count_nonzero(used) < least:
            raise ValueError(
                f"temperature: found {np.count_nonzero(used)} rows in the window, expected at least {least}"
            )
        u = _uncertainty(
            T[used],
            rho[used],
            centre,
            _rows(standard_uncertainty, used),
            _rows(temperature_uncertainty, used),
        )
        found = _fit(T[used], rho[used], centre, u, terms=terms, fixed=fixed, absolute=absolute)
        centre = centre if fixed else found.value("transition_temperature")
    message = found.message if settled else "not converged: the window does not settle"
    return SuperfluidLaw(found, centre, used, found.converged and settled, message)


def _rows(values: npt.ArrayLike | None, used: BoolArray) -> FloatArray | None:
    return None if values is None else np.broadcast_to(np.asarray(values, dtype=np.float64), used.shape)[used]


def _uncertainty(
    T: FloatArray, rho: FloatArray, centre: float, u: FloatArray | None, u_T: FloatArray | None
) -> FloatArray | None:
    if u is None or u_T is None:
        return u
    t = np.maximum(1 - T / centre, 1e-9)
    return np.asarray(np.hypot(u, EXPONENT * rho / (t * centre) * u_T))


def _fit(
    T: FloatArray,
    rho: FloatArray,
    centre: float,
    u: FloatArray | None,
    *,
    terms: int,
    fixed: bool,
    absolute: bool,
) -> FitResult:
    top = float(T.max())
    centre = max(centre, top * (1 + 1e-9))
    t = 1 - T / centre
    w = np.ones(T.shape) if u is None else 1 / u
    # Linear in amplitude, amplitude times D and amplitude times k_1 to first order: where to begin.
    columns = [t**EXPONENT, t ** (EXPONENT + CONFLUENT_EXPONENT), t ** (EXPONENT + 1)][: terms - 1]
    linear = np.linalg.lstsq(np.column_stack(columns) * w[:, np.newaxis], rho * w, rcond=None)[0]
    amplitude = float(linear[0]) if linear[0] > 0 else float(np.max(rho / t**EXPONENT))
    extra = [float(value) / amplitude for value in linear[1:]]
    starts = [amplitude, EXPONENT, *extra]
    scales = [amplitude, 0.01, 1.0, 1.0]
    parameters = [
        Parameter(name, start, scale=scale) for name, start, scale in zip(TERMS, starts, scales, strict=False)
    ]
    if not fixed:
        # Beyond the last point 1 - T/T_lambda would be negative.
        width = max(centre - top, 1e-9 * top)
        parameters.append(
            Parameter("transition_temperature", centre, top, top + 20 * width + 1e-3 * top, scale=width)
        )

    def model(T: FloatArray, p: FloatArray) -> FloatArray:
        t = np.maximum(1 - T / (centre if fixed else p[terms]), 0.0)
        D = p[2] if terms > 2 else 0.0
        regular = p[3] if terms > 3 else 0.0
        return np.asarray(p[0] * (1 + regular * t) * t ** p[1] * (1 + D * t**CONFLUENT_EXPONENT))

    return fit(model, parameters, T, rho, standard_uncertainty=u, absolute=absolute)

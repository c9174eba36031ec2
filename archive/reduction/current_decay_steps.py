"""Decay of a persistent current at one temperature, and its dependence on coverage.

Rules: a decay is looked for only where temperature and coverage were held; where none is seen, a word stands for the number.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from archive.physics.film_static import UNIVERSAL_JUMP
from archive.physics.linear_fit import straight_line
from archive.physics.persistent_current import fit_decay
from archive.reduction.background_steps import known_rows, weights
from archive.reduction.estimate import FloatArray
from archive.reduction.step import Covariance, Outcome
from schemas.base import Record

__all__ = [
    "CoverageParameters",
    "HeldParameters",
    "current_against_coverage",
    "current_decay",
    "relative_spread",
    "turning_row",
]


class HeldParameters(Record):
    """What counts as one temperature."""

    largest_spread: float = 0.01
    """Largest spread of temperature or coverage (5th to 95th percentile) over its median (common practice, no source)."""


class CoverageParameters(Record):
    """Which coverages lie on the straight line."""

    share: float = 1.0
    """Share of the thickest rows that is fitted."""


def current_decay(
    parameters: HeldParameters,
    *,
    time: FloatArray,
    angular_momentum: FloatArray,
    temperature: FloatArray | None,
    coverage: FloatArray | None,
    u_angular_momentum: FloatArray | None,
) -> Outcome:
    """Return the power law in time by which a current at one temperature decays.

    Parameters
    ----------
    time, angular_momentum : ndarray
        s, kg m^2/s.
    temperature : ndarray or None
        K; a record whose temperature moves has no decay of its own.
    coverage : ndarray or None
        Coverage or thickness; the same holds for it.

    Notes
    -----
    For a film the exponent is pi K_R, so that sigma_s = m T/2 of the universal jump's constant: an areal density that needs no area.
    For bulk liquid the exponent describes the decay and means no more.
    """
    rows = known_rows(time, angular_momentum)
    names = (
        "initial_angular_momentum",
        "decay_time",
        "exponent",
        "stiffness_ratio",
        "areal_density_from_decay",
    )
    facts: dict[str, Any] = {"points": int(np.count_nonzero(rows)), "reason": "", "probability": math.nan, "chi2_exponential": math.nan, "chi2_power": math.nan}  # fmt: skip
    T = math.nan
    if temperature is not None:
        T = float(np.nanmedian(temperature))
        if relative_spread(temperature[np.isfinite(temperature)]) > parameters.largest_spread:
            return _no_decay(
                names, facts, "temperature not held", "the temperature moves, so no decay is looked for"
            )
    if coverage is not None and relative_spread(coverage[np.isfinite(coverage)]) > parameters.largest_spread:
        return _no_decay(names, facts, "coverage not held", "the coverage moves, so no decay is looked for")
    if facts["points"] < 8:
        return _no_decay(names, facts, "too few readings", "fewer than eight readings")
    t, L = time[rows], angular_momentum[rows]
    found = fit_decay(t - t.min(), L, standard_uncertainty=weights(u_angular_momentum, rows))
    facts |= {
        "probability": found.probability,
        "chi2_exponential": found.exponential_chi2,
        "reason": found.reason,
    }
    if not found.found or found.fit is None:
        return _no_decay(names, facts, "no decay law", found.reason)
    fit = found.fit
    facts["chi2_power"] = fit.chi2
    initial, rate, m = (float(value) for value in fit.values)
    jacobian = np.array(
        [
            [1, 0, 0],
            [0, -1 / rate**2, 0],
            [0, 0, 1],
            [0, 0, 0.5],
            [0, 0, 0 if math.isnan(T) else UNIVERSAL_JUMP * T / 2],
        ]
    )
    widened = max(fit.reduced_chi2, 1.0) if fit.absolute else 1.0
    known = names[:4] if math.isnan(T) else names
    covariance = (jacobian @ fit.covariance @ jacobian.T)[: len(known), : len(known)] * widened
    values = (initial, 1 / rate, m, m / 2, UNIVERSAL_JUMP * T * m / 2)
    return Outcome(
        dict(zip(names, values, strict=True)), covariance=Covariance(known, covariance), facts=facts,
        verdicts={} if known == names else {names[4]: "temperature not recorded"},
    )  # fmt: skip


def current_against_coverage(
    parameters: CoverageParameters, *, coverage: FloatArray, angular_momentum: FloatArray, u_angular_momentum: FloatArray | None
) -> Outcome:  # fmt: skip
    """Return the coverage at which a current of kept circulation would vanish, and its slope.

    Parameters
    ----------
    coverage : ndarray
        mol/m^2, or thickness in m.
    angular_momentum : ndarray
        kg m^2/s.

    Raises
    ------
    ValueError
        Fewer than four different coverages, or a current that does not rise with them.

    Notes
    -----
    Far below its transition all of a film above the inert layer flows, so that L rises in proportion to coverage less onset.
    """
    rows = known_rows(coverage, angular_momentum)
    if rows.any() and parameters.share < 1:
        rows &= np.nan_to_num(coverage) >= np.quantile(coverage[rows], 1 - parameters.share)
    n, L, u = coverage[rows], angular_momentum[rows], weights(u_angular_momentum, rows)
    if np.unique(n).size < 4:
        raise ValueError(f"coverage: found {np.unique(n).size} different coverages, expected at least 4")
    middle = float(np.mean(n))
    line = straight_line(n - middle, L, standard_uncertainty=u, absolute=False)
    a, s = line.value("intercept"), line.value("slope")
    if not a * s > 0:
        raise ValueError(
            "angular_momentum: found no rise with coverage, expected one in proportion to coverage less onset"
        )
    gradient = np.array([-1 / s, a / s**2])
    order = [line.names.index(name) for name in ("intercept", "slope")]
    covariance = np.asarray(line.covariance)[np.ix_(order, order)]
    if u is not None and 0 < line.chi2 < line.dof:
        covariance = covariance / (line.chi2 / line.dof)
    return Outcome(
        {"onset_coverage": middle - a / s}, point={"onset_coverage": math.sqrt(float(gradient @ covariance @ gradient))},
        facts={"points": int(n.size), "rms": float(np.sqrt(np.mean(line.residuals**2)))},
    )  # fmt: skip


def turning_row(x: FloatArray) -> int:
    """Return the row at which a record turns back: its highest or lowest one, whichever is further from both ends."""
    return int(max((int(np.argmax(x)), int(np.argmin(x))), key=lambda row: min(row, x.size - row)))


def relative_spread(values: FloatArray) -> float:
    """Return the distance of the 5th and the 95th percentile over the median; infinite about zero."""
    if values.size == 0:
        return 0.0
    low, middle, high = np.quantile(values, [0.05, 0.5, 0.95])
    return float((high - low) / abs(middle)) if middle else math.inf


def _no_decay(names: tuple[str, ...], facts: dict[str, Any], verdict: str, reason: str) -> Outcome:
    return Outcome(
        dict.fromkeys(names, math.nan),
        facts=facts | {"reason": reason},
        verdicts=dict.fromkeys(names, verdict),
    )

"""Tests that compare a fit with its data or with a simpler fit.

Rules: pure statistics, no fitting here; a probability is always the upper tail unless the name says otherwise.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import series

__all__ = ["RunsTest", "aicc", "chi2_probability", "f_test", "runs_test"]


@dataclass(frozen=True)
class RunsTest:
    """Number of runs of equal sign against the number expected of independent residuals.

    Attributes
    ----------
    runs : int
        Runs found.
    expected : float
        Runs expected.
    z : float
        Normal deviate; negative when the residual is structured (too few runs).
    probability : float
        Chance of so few runs or fewer if the residuals were independent.
    """

    runs: int
    expected: float
    z: float
    probability: float


def runs_test(residuals: npt.ArrayLike) -> RunsTest:
    """Return the one-sided runs test of residuals taken in order.

    Parameters
    ----------
    residuals : array_like
        In the order of the independent variable; zeros are left out.

    Returns
    -------
    RunsTest
        A small `probability` means that the residual still has shape. With all signs equal there is one
        run and the probability is that of a fair coin, 2^(1-n).

    Notes
    -----
    Mean and variance as in the reference, with continuity correction; the normal form is fair from about
    ten residuals of each sign up.

    References
    ----------
    A. Wald, J. Wolfowitz, "On a test whether two samples are from the same population", Annals of
    Mathematical Statistics 11, 147 (1940).

    Examples
    --------
    >>> runs_test([1, 2, 1, -1, -2, -1]).runs
    2
    """
    from scipy import stats  # a second of imports that few commands need

    values = series("residuals", residuals)
    signs = values[values != 0] > 0
    n = int(signs.size)
    if n == 0:
        return RunsTest(0, 0.0, 0.0, 1.0)
    plus = int(np.count_nonzero(signs))
    minus = n - plus
    runs = 1 + int(np.count_nonzero(signs[1:] != signs[:-1]))
    if plus == 0 or minus == 0:
        return RunsTest(runs, 1.0, 0.0, math.ldexp(1.0, 1 - n))
    product = 2 * plus * minus
    expected = 1 + product / n
    variance = product * (product - n) / (n * n * (n - 1))
    if variance <= 0:
        return RunsTest(runs, expected, 0.0, 1.0)
    z = (runs + 0.5 - expected) / math.sqrt(variance)
    return RunsTest(runs, expected, z, float(stats.norm.cdf(z)))


def chi2_probability(chi2: float, dof: int) -> float:
    """Return the chance that chi-squared is this large or larger with `dof` degrees of freedom."""
    from scipy import stats  # a second of imports that few commands need

    if dof < 1:
        return math.nan
    return float(stats.chi2.sf(chi2, dof))


def f_test(*, chi2_simple: float, dof_simple: int, chi2_full: float, dof_full: int) -> float:
    """Return the chance that the extra parameters of the fuller, nested model gain this much by luck.

    Parameters
    ----------
    chi2_simple, chi2_full : float
        Weighted residual sums of squares; the same weights in both.
    dof_simple, dof_full : int
        Degrees of freedom, ``dof_simple > dof_full >= 1``.

    Returns
    -------
    float
        Probability; small means that the fuller model is needed.

    Raises
    ------
    ValueError
        Degrees of freedom out of order.

    References
    ----------
    P. R. Bevington, "Data Reduction and Error Analysis for the Physical Sciences" (1969), test of an
    additional term (from memory).
    """
    from scipy import stats  # a second of imports that few commands need

    if not dof_simple > dof_full >= 1:
        raise ValueError(f"dof_full: found {dof_full}, expected 1 to {dof_simple - 1}")
    if chi2_full <= 0:
        return 0.0 if chi2_simple > 0 else 1.0
    extra = dof_simple - dof_full
    ratio = max(chi2_simple - chi2_full, 0.0) / extra / (chi2_full / dof_full)
    return float(stats.f.sf(ratio, extra, dof_full))


def aicc(*, residual_sum: float, points: int, parameters: int) -> float:
    """Return Akaike's information criterion with the small-sample correction, noise unknown.

    Parameters
    ----------
    residual_sum : float
        (Weighted) sum of squared residuals.
    points, parameters : int
        Numbers of residuals and of fitted parameters (the noise variance is counted in addition).

    Returns
    -------
    float
        The lower the better; only differences mean something. Infinite if there are too few points.

    References
    ----------
    C. M. Hurvich, C.-L. Tsai, "Regression and time series model selection in small samples", Biometrika 76,
    297 (1989) (from memory).
    """
    k = parameters + 1
    if points - k - 1 <= 0:
        return math.inf
    if residual_sum <= 0:
        return -math.inf
    return points * math.log(residual_sum / points) + 2 * k + 2 * k * (k + 1) / (points - k - 1)

"""Linear least squares with covariance.

Rules: columns are scaled before the decomposition, so that units do not decide whether a fit succeeds; whether
uncertainties are absolute is always said by the caller.

References
----------
Weighted linear least squares and its covariance: JCGM 100:2008, H.3, and any text on statistics; held against GTC in the tests.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray, same_length, series

__all__ = ["LinearFit", "linear_fit", "straight_line"]


@dataclass(frozen=True)
class LinearFit:
    """Outcome of a linear least-squares fit.

    Attributes
    ----------
    names : tuple of str
        Parameter names, in the order of `values`.
    values, covariance : ndarray
        Best values and their covariance.
    residuals : ndarray
        Observed minus fitted, in the unit of the data.
    chi2 : float
        Weighted sum of squared residuals (unweighted if no uncertainty was given).
    dof : int
        Points minus parameters.
    converged : bool
        False if the columns are linearly dependent; then the values are the shortest solution and the
        covariance is infinite.
    message : str
        What happened, in words.
    absolute : bool
        True: the covariance rests on the given uncertainties; False: it is scaled by chi2/dof.
    """

    names: tuple[str, ...]
    values: FloatArray
    covariance: FloatArray
    residuals: FloatArray
    chi2: float
    dof: int
    converged: bool
    message: str
    absolute: bool

    def value(self, name: str) -> float:
        """Return the best value of a parameter."""
        return float(self.values[self.names.index(name)])

    def standard_uncertainty(self, name: str) -> float:
        """Return the standard uncertainty of a parameter."""
        index = self.names.index(name)
        return float(np.sqrt(self.covariance[index, index]))


def linear_fit(
    design: npt.ArrayLike,
    y: npt.ArrayLike,
    *,
    names: tuple[str, ...],
    standard_uncertainty: npt.ArrayLike | None = None,
    absolute: bool,
) -> LinearFit:
    """Return the weighted linear least-squares solution of ``design @ parameters = y``.

    Parameters
    ----------
    design : array_like, shape (points, parameters)
        One column for each parameter.
    y : array_like, shape (points,)
        Observations.
    names : tuple of str
        One for each column.
    standard_uncertainty : array_like, optional
        Of each observation (a scalar serves all), > 0.
    absolute : bool
        True: the uncertainties are what they say; False: they are relative weights, and the covariance is
        multiplied by chi2/dof.

    Returns
    -------
    LinearFit
        With the covariance; infinite where nothing determines it (dependent columns, or no degrees of
        freedom left with relative weights).

    Raises
    ------
    ValueError
        Shapes that do not fit, fewer points than parameters, or ``absolute=True`` without uncertainties.
    """
    y = series("y", y)
    matrix = np.asarray(design, dtype=np.float64)
    if matrix.shape != (y.size, len(names)):
        raise ValueError(f"design: found shape {matrix.shape}, expected {(y.size, len(names))}")
    if not np.isfinite(matrix).all():
        raise ValueError("design: found a value that is not finite")
    if y.size < len(names):
        raise ValueError(f"y: found {y.size} points, expected at least {len(names)}, one for each parameter")
    weights = reciprocal_uncertainty(y, standard_uncertainty, absolute=absolute)
    weighted = matrix * weights[:, np.newaxis]
    scale = np.linalg.norm(weighted, axis=0)
    scale[scale == 0] = 1.0
    u, singular, vt = np.linalg.svd(weighted / scale, full_matrices=False)
    kept = singular > singular[0] * np.finfo(float).eps * max(matrix.shape)
    inverse = np.where(kept, 1 / np.where(kept, singular, 1.0), 0.0)
    values = (vt.T * inverse) @ (u.T @ (y * weights)) / scale
    residuals = y - matrix @ values
    chi2 = float(np.sum((residuals * weights) ** 2))
    dof = int(y.size - len(names))
    determined = bool(kept.all())
    covariance = (vt.T * inverse**2) @ vt / np.outer(scale, scale)
    if not determined or (not absolute and dof == 0):
        covariance = np.full_like(covariance, np.inf)
    elif not absolute:
        covariance = covariance * (chi2 / dof)
    message = (
        "solved" if determined else "columns are linearly dependent; the data do not determine all parameters"
    )
    return LinearFit(names, values, covariance, residuals, chi2, dof, determined, message, absolute)


def straight_line(
    x: npt.ArrayLike,
    y: npt.ArrayLike,
    *,
    standard_uncertainty: npt.ArrayLike | None = None,
    absolute: bool,
) -> LinearFit:
    """Return the straight line ``intercept + slope x`` through points.

    Parameters
    ----------
    x, y : array_like
        Two or more points.
    standard_uncertainty, absolute
        As in `linear_fit`.

    Raises
    ------
    ValueError
        As in `linear_fit`.

    Examples
    --------
    >>> line = straight_line([0.0, 1.0, 2.0], [1.0, 3.0, 5.0], absolute=False)
    >>> round(line.value("slope"), 12), round(line.value("intercept"), 12)
    (2.0, 1.0)
    """
    x = series("x", x)
    y = series("y", y)
    same_length(x=x, y=y)
    return linear_fit(
        np.column_stack([np.ones_like(x), x]),
        y,
        names=("intercept", "slope"),
        standard_uncertainty=standard_uncertainty,
        absolute=absolute,
    )


def reciprocal_uncertainty(
    y: FloatArray, standard_uncertainty: npt.ArrayLike | None, *, absolute: bool
) -> FloatArray:
    """Return one over the standard uncertainty of each observation, or ones.

    Raises
    ------
    ValueError
        An uncertainty that is not positive and finite, a wrong length, or ``absolute=True`` without any.
    """
    if standard_uncertainty is None:
        if absolute:
            raise ValueError("standard_uncertainty: found none, expected one because absolute=True")
        return np.ones_like(y)
    given = np.asarray(standard_uncertainty, dtype=np.float64)
    spread = np.full(y.shape, float(given)) if given.ndim == 0 else given
    spread = series("standard_uncertainty", spread, positive=True)
    same_length(y=y, standard_uncertainty=spread)
    return 1 / spread

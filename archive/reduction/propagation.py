"""First-order propagation of uncertainty through a step, source by source.

For every source that any input shares, the step is evaluated with all inputs shifted together by plus and by minus
their contributions; half the difference is the output's contribution. That keeps every correlation that has a name.

References
----------
JCGM 100:2008, 5.1.3 note 2 and 5.2.2 (sensitivity coefficients by evaluating the function at x plus and minus u).
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from archive.reduction.estimate import Estimate, FloatArray
from archive.reduction.step import Covariance, Outcome

__all__ = ["Propagated", "fit_contributions", "propagate", "shared_parts"]

Call = Callable[[Mapping[str, FloatArray], Mapping[str, Any]], Outcome]
"""From shifted input values and held choices to an outcome."""


@dataclass(frozen=True)
class Propagated:
    """Outcome of a step with the uncertainty of its outputs.

    Attributes
    ----------
    outcome : Outcome
        With unshifted inputs.
    point : dict
        Point uncertainty of each output.
    shared : dict
        Contributions of each source, by output.
    """

    outcome: Outcome
    point: dict[str, FloatArray]
    shared: dict[str, dict[str, FloatArray]]


def propagate(call: Call, inputs: Mapping[str, Estimate], *, elementwise: bool) -> Propagated:
    """Return the outcome of a call with the uncertainty of its outputs.

    Parameters
    ----------
    call : callable
        Pure; takes input values and the choices to hold.
    inputs : mapping of str to Estimate
    elementwise : bool
        Whether point uncertainties may be found by shifting whole arrays.

    Raises
    ------
    ValueError
        Whatever the call raises; for a shifted call, with the source's name, and only if both directions fail.
    """
    values = {name: estimate.value for name, estimate in inputs.items()}
    outcome = call(values, {})
    shared: dict[str, dict[str, FloatArray]] = {
        name: {
            source: np.asarray(part, dtype=np.float64)
            for source, part in outcome.shared.get(name, {}).items()
        }
        for name in outcome.outputs
    }
    for source, parts in shared_parts(call, inputs, outcome).items():
        for name, part in parts.items():
            shared[name][source] = shared[name].get(source, 0.0) + part
    point = {name: _stated(outcome, name) for name in outcome.outputs}
    if elementwise:
        for name, estimate in inputs.items():
            if estimate.scalar or not np.any(estimate.points > 0):
                continue
            up = call({**values, name: estimate.value + estimate.points}, outcome.held)
            down = call({**values, name: estimate.value - estimate.points}, outcome.held)
            for output in outcome.outputs:
                part = _half_difference(outcome.array(output), up.array(output), down.array(output))
                point[output] = np.hypot(point[output], part)
    return Propagated(outcome, point, shared)


def shared_parts(
    call: Call, inputs: Mapping[str, Estimate], outcome: Outcome
) -> dict[str, dict[str, FloatArray]]:
    """Return the contribution of each source of the inputs to each output."""
    sources = sorted({source for estimate in inputs.values() for source in estimate.shared})
    return {source: _one_source(call, inputs, outcome, source) for source in sources}


def _one_source(
    call: Call, inputs: Mapping[str, Estimate], outcome: Outcome, source: str
) -> dict[str, FloatArray]:
    sides: dict[float, Outcome] = {}
    trouble: list[ValueError] = []
    for sign in (1.0, -1.0):
        moved = {name: estimate.shifted(source, sign) for name, estimate in inputs.items()}
        try:
            sides[sign] = call(moved, outcome.held)
        except ValueError as error:
            trouble.append(error)
    if not sides:
        raise ValueError(
            f"with the inputs moved by the standard uncertainty of '{source}': {trouble[0]}"
        ) from trouble[0]
    # At the edge of a range one direction may be refused; the other one alone is still first order.
    up = sides.get(1.0, outcome)
    down = sides.get(-1.0, outcome)
    return {
        name: _half_difference(outcome.array(name), up.array(name), down.array(name), len(sides))
        for name in outcome.outputs
    }


def _half_difference(centre: FloatArray, up: FloatArray, down: FloatArray, sides: int = 2) -> FloatArray:
    """Return (up - down)/2; where only one side has a value, its distance from the centre."""
    part = (up - down) / sides
    part = np.where(np.isnan(up), centre - down, np.where(np.isnan(down), up - centre, part))
    # Without a value there is nothing to be uncertain about; a source must not spread NaN to its neighbours.
    return np.where(np.isnan(part), 0.0, part)


def _stated(outcome: Outcome, name: str) -> FloatArray:
    value = outcome.array(name)
    return np.array(np.broadcast_to(np.asarray(outcome.point.get(name, 0.0), dtype=np.float64), value.shape))


def fit_contributions(covariance: Covariance) -> list[dict[str, float]]:
    """Return independent sources that together have a covariance, each as contributions by name.

    Parameters
    ----------
    covariance : Covariance
        Symmetric, positive semi-definite.

    Returns
    -------
    list of dict
        Principal axes of the correlation matrix, strongest first; directions without variance are left out.

    Raises
    ------
    ValueError
        A variance that is not finite: the data do not determine the parameter.

    Examples
    --------
    >>> parts = fit_contributions(Covariance(("a", "b"), np.array([[4.0, 2.0], [2.0, 1.0]])))
    >>> len(parts), round(parts[0]["a"], 12), round(parts[0]["b"], 12)
    (1, 2.0, 1.0)
    """
    matrix = np.asarray(covariance.matrix, dtype=np.float64)
    if not np.isfinite(matrix).all():
        bad = int(np.argmax(~np.isfinite(matrix).all(axis=0)))
        raise ValueError(
            f"{covariance.names[bad]}: found no finite uncertainty; the data do not determine it"
        )
    spread = np.sqrt(np.maximum(np.diag(matrix), 0.0))
    # Correlations first, so that a parameter in seconds and one in kelvin weigh alike in the cut below.
    unit = np.where(spread > 0, spread, 1.0)
    variances, axes = np.linalg.eigh(matrix / np.outer(unit, unit))
    found: list[dict[str, float]] = []
    for variance, axis in sorted(zip(variances, axes.T, strict=True), key=lambda pair: -pair[0]):
        if variance <= 1e-12 * max(variances.max(), 1e-300):
            continue
        column = axis * np.sqrt(variance) * unit
        # The sign of an axis is arbitrary: the largest component counts as positive.
        column = column * (1.0 if axis[np.argmax(np.abs(axis))] > 0 else -1.0)
        found.append(dict(zip(covariance.names, map(float, column), strict=True)))
    return found

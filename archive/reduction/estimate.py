"""Values with their uncertainty, kept apart by whom they share it with.

Rules
-----
* `point` is what no other element and no other number shares; each entry of `shared` is the signed first-order
  contribution of one named source, the same source everywhere it appears. Adding contributions of one name before
  squaring is what keeps correlations.
* Scalars carry no point part: the runner names it, so that two results from one scalar stay correlated.
* Point parts of different arrays are taken as independent of each other.

References
----------
JCGM 100:2008, Guide to the expression of uncertainty in measurement, 5.2 (correlated input quantities) and F.1.2.3.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from types import MappingProxyType

import numpy as np
import numpy.typing as npt
from typing_extensions import override

__all__ = ["Estimate", "covariance_between"]

FloatArray = npt.NDArray[np.float64]


@dataclass(frozen=True)
class Estimate:
    """A number or a column of numbers in SI units, with standard uncertainty.

    Parameters
    ----------
    value : ndarray of float64, 0 or 1 dimensions
        NaN where there is no value.
    quantity : str
        Quantity kind, e.g. ``period``.
    point : ndarray, optional
        Standard uncertainty independent from element to element; same shape, >= 0. Default zero.
    shared : mapping of str to ndarray
        Signed contribution of each named source; same shape.
    scale : str, optional
        Temperature scale.

    Examples
    --------
    >>> found = Estimate(np.array(2.0), "length", point=np.array(3.0), shared={"ruler": np.array(-4.0)})
    >>> float(found.uncertainty)
    5.0
    """

    value: FloatArray
    quantity: str
    point: FloatArray | None = None
    shared: Mapping[str, FloatArray] = field(default_factory=dict)
    scale: str | None = None

    def __post_init__(self) -> None:
        """Refuse shapes that do not fit, and leave out sources that contribute nothing."""
        value = np.asarray(self.value, dtype=np.float64)
        if value.ndim > 1:
            raise ValueError(f"value: found {value.ndim} dimensions, expected a number or one column")
        point = np.zeros(value.shape) if self.point is None else np.asarray(self.point, dtype=np.float64)
        if point.shape != value.shape:
            point = np.broadcast_to(point, value.shape).copy()
        shared = {name: _fitting(name, part, value.shape) for name, part in self.shared.items()}
        object.__setattr__(self, "value", value)
        object.__setattr__(self, "point", point)
        object.__setattr__(
            self, "shared", MappingProxyType({n: p for n, p in shared.items() if np.any(p != 0)})
        )

    @override
    def __reduce__(self) -> tuple[type[Estimate], tuple[object, ...]]:
        """Return what makes it again in another process, which cannot be sent a read-only mapping."""
        return Estimate, (self.value, self.quantity, self.point, dict(self.shared), self.scale)

    @property
    def scalar(self) -> bool:
        """Whether this is one number."""
        return self.value.ndim == 0

    @property
    def points(self) -> FloatArray:
        """The point part, never None."""
        assert self.point is not None  # noqa: S101 - set in __post_init__
        return self.point

    @property
    def uncertainty(self) -> FloatArray:
        """Combined standard uncertainty."""
        total = np.square(self.points)
        # In the order of names, so that an estimate read back from an archive gives the same bits.
        for name in sorted(self.shared):
            total = total + np.square(self.shared[name])
        return np.asarray(np.sqrt(total))

    def shifted(self, source: str, sign: float) -> FloatArray:
        """Return the value moved by the signed contribution of one source."""
        part = self.shared.get(source)
        return self.value if part is None else self.value + sign * part

    def with_scale(self, scale: str | None) -> Estimate:
        """Return the same on another scale name."""
        return replace(self, scale=scale)


def _fitting(name: str, part: npt.ArrayLike, shape: tuple[int, ...]) -> FloatArray:
    array = np.asarray(part, dtype=np.float64)
    if array.shape == shape:
        return array
    if array.ndim == 0:
        return np.full(shape, float(array))
    raise ValueError(f"shared[{name!r}]: found shape {array.shape}, expected {shape}")


def covariance_between(first: Estimate, second: Estimate) -> float:
    """Return the covariance of two scalars, from the sources they share.

    Parameters
    ----------
    first, second : Estimate
        Scalars.

    Raises
    ------
    ValueError
        One of them is a column.
    """
    if not (first.scalar and second.scalar):
        raise ValueError("first, second: found a column, expected two numbers")
    return float(
        sum(float(part * second.shared[name]) for name, part in first.shared.items() if name in second.shared)
    )

"""One column of numbers with all that must not be lost beside it."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

__all__ = ["Column", "instants"]

FloatArray = NDArray[np.float64]

# A double holds seconds since 1970 to 0.24 us in this century; finer digits would be invented.
_PER_SECOND = 1_000_000


@dataclass(frozen=True)
class Column:
    """Values of a channel or of an output, with unit, kind and standard uncertainty.

    Attributes
    ----------
    name : str
        As in the sheet or the plan.
    unit : str
        Unit of the values, as stored; `1` for a pure number.
    kind : str
        Kind of quantity, e.g. `period`; `instant` for POSIX time in s.
    values : ndarray of float64
        NaN where there is no value; not to be written to.
    uncertainty : ndarray of float64 or None
        Combined standard uncertainty of each value, in `unit`; None if none is stored with the column.
    description : str
    scale : str or None
        Temperature scale.
    """

    name: str
    unit: str
    kind: str
    values: FloatArray = field(repr=False, compare=False)
    uncertainty: FloatArray | None = field(default=None, repr=False, compare=False)
    description: str = ""
    scale: str | None = None

    @property
    def label(self) -> str:
        """Name over unit, for an axis or a heading, such as `period/us`; the name alone for a pure number.

        Examples
        --------
        >>> Column("period", "us", "period", np.zeros(2)).label
        'period/us'
        """
        if self.unit == "1" or self.kind == "instant":
            return self.name
        unit = f"({self.unit})" if "/" in self.unit or " " in self.unit else self.unit
        return f"{self.name}/{unit}"


def instants(values: FloatArray) -> NDArray[np.datetime64]:
    """POSIX seconds as UTC instants, to the microsecond; NaN becomes `NaT`.

    Examples
    --------
    >>> instants(np.array([0.5, np.nan])).tolist()
    [datetime.datetime(1970, 1, 1, 0, 0, 0, 500000), None]
    """
    known = np.isfinite(values)
    found = np.full(values.shape, np.datetime64("NaT", "us"), dtype="datetime64[us]")
    found[known] = np.round(values[known] * _PER_SECOND).astype(np.int64).astype("datetime64[us]")
    return found

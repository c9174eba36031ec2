"""Which units a kind takes, and the factor to its SI unit.

Rules
-----
* The dimension must fit, and so must what the dimension cannot say: Hz or rad/s, N m or N m/rad, what is counted.
* The unit of a column is read once; its factor is kept.
"""

from __future__ import annotations

from fractions import Fraction
from functools import lru_cache
from typing import TYPE_CHECKING, Any

from schemas.kinds import Kind, kind_of
from schemas.units import Unit, parse_unit

if TYPE_CHECKING:
    from numpy.typing import ArrayLike, NDArray

__all__ = ["accepted_unit", "canonical", "convert_array", "expectation", "unit_factor"]


@lru_cache(maxsize=2048)
def accepted_unit(unit: str, kind_name: str) -> tuple[Unit, Fraction, str]:
    """Return a unit read for a kind, its exact factor to the kind's SI unit, and that SI unit.

    Parameters
    ----------
    unit : str
        Text of the unit; "" is 1 for kinds without a unit.
    kind_name : str
        Name of the kind.

    Returns
    -------
    unit, factor, si : Unit, Fraction, str
        `si` is the canonical unit, or for a union kind the one of the same dimension.

    Raises
    ------
    ValueError
        If the kind does not take the unit; the sentence says what it takes, and why where the reason is known.
    """
    kind = kind_of(kind_name)
    try:
        read = parse_unit(unit if unit.strip() or not kind.pure else "1")
    except ValueError as fault:
        joined = ", here" if "expected" in str(fault) else "; expected"
        raise ValueError(f"{fault}{joined} {expectation(kind)}") from None
    same = [si for si in kind.si if parse_unit(si).dimension == read.dimension]
    for name, sentence in kind.refused:
        if same and name in read.names:
            raise ValueError(f"found unit {read.text}; expected {expectation(kind)}; {sentence}")
    named = (kind.allowed is None or read.names <= kind.allowed) and (
        not kind.required or bool(read.names & kind.required)
    )
    if same and named:
        return read, read.factor, same[0]
    for other, factor in kind.also:
        if parse_unit(other).dimension == read.dimension:
            return read, read.factor * Fraction(factor), kind.si[0]
    for other, sentence in kind.hints:
        if parse_unit(other).dimension == read.dimension:
            raise ValueError(f"found unit {read.text}; expected {expectation(kind)}; {sentence}")
    raise ValueError(f"found unit {read.text}; expected {expectation(kind)}")


def expectation(kind: Kind) -> str:
    """Return what stands after "expected" in a sentence about this kind."""
    if kind.pure:
        return f"{kind.words}, a number without a unit" + (
            " or in %" if kind.allowed and "%" in kind.allowed else ""
        )
    return f"{kind.words} such as {' or '.join(kind.examples)}"


def unit_factor(unit: str, kind: str) -> float:
    """Return the number of SI units of a kind in one of a unit.

    Parameters
    ----------
    unit : str
        Any accepted unit of the kind.
    kind : str
        Name of the kind.

    Returns
    -------
    float
        The factor, correctly rounded.

    Raises
    ------
    ValueError
        If the kind is unknown or does not take the unit.

    Examples
    --------
    >>> unit_factor("umol/m^2", "coverage")
    1e-06
    """
    return float(accepted_unit(unit, kind)[1])


def convert_array(values: ArrayLike, unit: str, kind: str) -> NDArray[Any]:
    """Return the values of a column in the SI unit of its kind.

    Parameters
    ----------
    values : array_like
        Numbers in `unit`, any shape; NaN stays NaN.
    unit, kind : str
        The column's unit and kind.

    Returns
    -------
    ndarray of float64
        Same shape, in the canonical unit.

    Raises
    ------
    ValueError
        If the kind does not take the unit.
    """
    import numpy as np

    return np.asarray(values, dtype=np.float64) * unit_factor(unit, kind)


def canonical(kind: str) -> str:
    """Return the canonical SI unit of a kind, e.g. ``mol/m^2`` for a coverage."""
    return kind_of(kind).si[0]

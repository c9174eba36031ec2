"""Which columns a small plot shows when nobody says which."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from archive.lab.views.column import Column

__all__ = ["abscissa_kinds", "hours", "pair"]

# What a sweep of a kind is read against; by kind of quantity, the first that is there.
_ABSCISSAE: dict[str, tuple[str, ...]] = {
    "isotherm": ("relative_pressure", "pressure"),
    "drive-sweep": ("drive", "instant"),
    "frequency-sweep": ("frequency",),
    "ringdown": ("instant",),
    "pulse-response": ("instant",),
    "drive-pulse": ("instant",),
    "dose-run": ("instant",),
    "log": ("instant",),
    "persistent-current": ("instant",),
}
_OTHERWISE = ("temperature", "resistance", "frequency", "instant")
_ORDINATES = (
    "areal_mass_density",
    "mass_density",
    "heat_capacity",
    "specific_amount",
    "amount",
    "period",
    "frequency",
    "amplitude",
    "resistance",
    "pressure",
)


def abscissa_kinds(kind: str) -> tuple[str, ...]:
    """Kinds of quantity that a sweep of a kind is read against, in order of liking."""
    return (*_ABSCISSAE.get(kind, ()), *_OTHERWISE)


def pair(kind: str, columns: Mapping[str, Column], name: str | None = None) -> tuple[Column, Column] | None:
    """Abscissa and ordinate for a plot, or None if there are not two columns with numbers.

    Parameters
    ----------
    kind : str
        Kind of the sweep.
    columns : mapping of str to Column
    name : str, optional
        The ordinate.

    Examples
    --------
    >>> T = Column("T", "K", "temperature", np.array([0.1, 0.2]))
    >>> P = Column("P", "us", "period", np.array([1.0, 1.1]))
    >>> [each.name for each in pair("temperature-sweep", {"P": P, "T": T})]
    ['T', 'P']
    """
    full = [each for each in columns.values() if np.count_nonzero(np.isfinite(each.values)) > 1]
    asked = None if name is None else columns.get(name)
    others = [each for each in full if asked is None or (each is not asked and _beside(each, asked))]
    abscissa = _first(others, abscissa_kinds(kind))
    if abscissa is None:
        return None
    rest = [
        each for each in full if each is not abscissa and each.kind != "instant" and _beside(each, abscissa)
    ]
    ordinate = asked or _first(rest, _ORDINATES) or next(iter(rest), None)
    return None if ordinate is None or not np.isfinite(ordinate.values).any() else (abscissa, ordinate)


def _beside(first: Column, second: Column) -> bool:
    """Whether two columns have the same rows: a reduction may hold a curve beside them."""
    return first.values.size == second.values.size


def _first(columns: list[Column], kinds: tuple[str, ...]) -> Column | None:
    return next((each for kind in kinds for each in columns if each.kind == kind), None)


def hours(column: Column) -> Column:
    """Instants as hours since the first; any other column as it is.

    Examples
    --------
    >>> hours(Column("time", "s", "instant", np.array([3600.0, 7200.0]))).values.tolist()
    [0.0, 1.0]
    """
    if column.kind != "instant":
        return column
    since = np.nanmin(column.values)
    return Column(
        column.name, "h", "time", (column.values - since) / 3600.0, description="since the first row"
    )

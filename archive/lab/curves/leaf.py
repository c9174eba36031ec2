"""What one sweep or reduction has to draw: its columns by name, and which of them are drawn when nobody says which.

Beside the channels of a sweep stand the arrays of its current reductions, under `NAME@PLAN.NUMBER`, where they have as many
rows; what has other rows is drawn on the page of its reduction.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from archive.errors import UnknownAddress
from archive.lab.curves.columns import DrawnColumn, columns_of_reduction, columns_of_sweep, facts_of
from archive.lab.source import LabSource
from archive.lab.views.choice import abscissa_kinds
from schemas.address import Address, parse_address
from schemas.lineage import ReductionDocument

__all__ = ["Leaf", "leaf_of", "usual_abscissa", "usual_ordinates"]

_MOST_CHANNELS = 2
_MOST_ARRAYS = 3
# What a reduction may have made to be read against, where nothing that was recorded serves.
_MADE = ("time", "amount")
# They describe the state of the cell row by row; nobody looks at them first.
_STATE = frozenset({"temperature", "amount", "coverage", "number", "length", "time", "instant"})


@dataclass(frozen=True)
class Leaf:
    """Columns of one sweep or reduction.

    Attributes
    ----------
    address : str
        Of the sweep, or of the reduction.
    sweep, kind : str
        Address and kind of the sweep.
    columns : mapping of str to DrawnColumn
    elsewhere : tuple of str
        Addresses of arrays that have other rows.
    """

    address: str
    sweep: str
    kind: str
    columns: Mapping[str, DrawnColumn]
    elsewhere: tuple[str, ...] = ()

    def column(self, name: str) -> DrawnColumn:
        """A column by name.

        Raises
        ------
        UnknownAddress
            If there is none of that name.
        """
        if name not in self.columns:
            names = ", ".join(self.columns)
            raise UnknownAddress(f"{self.address} has no column {name}", expected=f"one of: {names}")
        return self.columns[name]

    def beside(self, abscissa: DrawnColumn) -> list[str]:
        """Names of the columns that can be drawn against one."""
        return [
            name for name, each in self.columns.items() if each is not abscissa and each.rows == abscissa.rows
        ]


def leaf_of(source: LabSource, address: str) -> Leaf:
    """Columns of a sweep or of a reduction; a part of either stands for the whole.

    Raises
    ------
    UnknownAddress
        If the archive holds no such thing, or the address is that of something else.
    """
    parsed = _parsed(address)
    if parsed.sweep is None:
        raise UnknownAddress(
            f"{address} has no curves", expected="a sweep such as 2026-03/s017, or a reduction of one"
        )
    facts = facts_of(source, parsed.sweep)
    if parsed.reduction is not None:
        document = source.reduction(parsed.reduction)
        return Leaf(document.address, parsed.sweep, facts.entry.kind, columns_of_reduction(source, document))
    columns = columns_of_sweep(source, facts)
    elsewhere: list[str] = []
    for document in _current(source, parsed.sweep):
        tail = document.address.partition("@")[2]
        for name, column in columns_of_reduction(source, document).items():
            if column.counts:
                continue
            if column.rows == facts.entry.rows:
                columns[f"{name}@{tail}"] = column
            else:
                elsewhere.append(column.address)
    return Leaf(parsed.sweep, parsed.sweep, facts.entry.kind, columns, tuple(elsewhere))


def _parsed(address: str) -> Address:
    try:
        return parse_address(address)
    except ValueError as error:
        raise UnknownAddress(str(error)) from None


def _current(source: LabSource, sweep: str) -> list[ReductionDocument]:
    """Current reductions of a sweep, those that rest on most first."""
    rows = [row for row in source.index.reductions(sweep=sweep, newest_only=True) if not row.withdrawn]
    found = [source.reduction(row.address) for row in rows]
    return sorted(found, key=lambda each: (-len(each.plan.needs), each.plan.name))


def usual_abscissa(leaf: Leaf, beside: DrawnColumn | None = None) -> str:
    """Name of the column that a sweep of this kind is usually read against; the number of the row where there is none.

    Parameters
    ----------
    leaf : Leaf
    beside : DrawnColumn, optional
        What is to be drawn against it: only columns of as many rows are looked at.

    Raises
    ------
    UnknownAddress
        If there is no column at all.
    """
    able = {
        name: column
        for name, column in leaf.columns.items()
        if column is not beside and (beside is None or column.rows == beside.rows)
    }
    for kind in (*abscissa_kinds(leaf.kind), *_MADE):
        for name, column in able.items():
            if column.kind == kind and column.rows > 1 and not column.why_not and not _flat(column):
                return name
    if not able:
        raise UnknownAddress(f"{leaf.address} has no columns to draw")
    return next((name for name, column in able.items() if column.counts), next(iter(able)))


def usual_ordinates(leaf: Leaf, abscissa: str) -> list[str]:
    """Names of the columns that are drawn first: what was recorded, then the last that was made of it."""
    along = leaf.column(abscissa)
    able = [
        name
        for name in leaf.beside(along)
        if not leaf.columns[name].why_not and not _flat(leaf.columns[name]) and not leaf.columns[name].counts
    ]
    channels = [
        name for name in able if "#" in leaf.columns[name].address and leaf.columns[name].owner == leaf.sweep
    ]
    arrays = [name for name in able if name not in channels]
    told = _liked(leaf, channels, along)[:_MOST_CHANNELS]
    first = next(iter(arrays), None)
    own = [name for name in arrays if first and leaf.columns[name].owner == leaf.columns[first].owner]
    made = [
        name
        for name in own
        if leaf.columns[name].kind not in _STATE and not name.partition("@")[0].endswith("_kept")
    ]
    residuals = [name for name in own if "residual" in name]
    chosen = (made + [name for name in residuals if name not in made])[-_MOST_ARRAYS:]
    return [*told, *chosen] or _liked(leaf, able, along)[:1] or able[:1]


def _liked(leaf: Leaf, names: Iterable[str], along: DrawnColumn) -> list[str]:
    return [
        name
        for name in names
        if leaf.columns[name].kind not in ("instant", "drive", along.kind)
        and not leaf.columns[name].thermometer
    ]


def _flat(column: DrawnColumn) -> bool:
    return column.low is not None and column.low == column.high

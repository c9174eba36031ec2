"""A chart: panels one below the other along one abscissa, of one sweep or reduction and of others laid over it.

All that a picture, a page and a download say of curves comes from here, so that they agree.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from archive.errors import ArchiveError, BadRequest
from archive.lab.curves.columns import DrawnColumn
from archive.lab.curves.laying import laid, partner
from archive.lab.curves.leaf import Leaf, leaf_of, usual_abscissa, usual_ordinates
from archive.lab.curves.reading import ends, points
from archive.lab.source import LabSource
from archive.reports.axis_units import AxisUnit, axis_unit, symbol

__all__ = ["Asked", "Chart", "Curve", "Member", "Outline", "Panel", "chart", "outline"]

FloatArray = NDArray[np.float64]

# More curves than this on one axis are told apart by nobody.
_MOST_OVER = 12
_MOST_PANELS = 12
# Beyond these the place of a point on an axis is no number any more, or that of the point beside it.
_FARTHEST, _NARROWEST = 1e100, 1e-12
_PURE = ("number", "fraction")


@dataclass(frozen=True)
class Asked:
    """What is to be drawn.

    Attributes
    ----------
    address : str
        A sweep, a reduction, or a channel or array of one.
    against : str or None
        Name of the abscissa; the usual one of the kind of sweep if left out.
    columns : tuple of str
        Names of the ordinates, one panel each; the usual ones if empty.
    over : tuple of str
        Addresses of sweeps or reductions to lay over.
    low, high : float or None
        Ends of the view along the abscissa, as its axis is written.
    most : int
        Most points of a curve.
    """

    address: str
    against: str | None = None
    columns: tuple[str, ...] = ()
    over: tuple[str, ...] = ()
    low: float | None = None
    high: float | None = None
    most: int = 5600


@dataclass(frozen=True)
class Curve:
    """One curve of a panel, as its axes are written.

    Attributes
    ----------
    owner, address : str
        Sweep or reduction that it was asked for by, and the column itself.
    look : int
        Which mark and line: the place of the owner on the pile, from 0.
    x, y : ndarray
    u : ndarray or None
        Standard uncertainty of y, coverage factor 1.
    thinned : bool
        Whether rows are left out.
    line : bool
        Whether x never falls, so that a line may join the points.
    """

    owner: str
    address: str
    look: int
    x: FloatArray = field(repr=False, compare=False)
    y: FloatArray = field(repr=False, compare=False)
    u: FloatArray | None = field(repr=False, compare=False)
    thinned: bool
    line: bool


@dataclass(frozen=True)
class Panel:
    """One ordinate and its curves.

    Attributes
    ----------
    name, words : str
        Name of the column, and that for people.
    axis : AxisUnit
    low, high : float
        Ends of all rows, as the axis is written; NaN where there is no value.
    log : bool
    scale : str or None
    curves : tuple of Curve
    """

    name: str
    words: str
    axis: AxisUnit
    low: float
    high: float
    log: bool
    scale: str | None
    curves: tuple[Curve, ...]


@dataclass(frozen=True)
class Chart:
    """Panels along one abscissa.

    Attributes
    ----------
    address : str
    against, against_words : str
    across : AxisUnit
    scale : str or None
        Temperature scale of the abscissa.
    since : tuple of (str, float)
        Where the abscissa is time: POSIX seconds of the first row of each owner.
    low, high : float
        Ends of all rows along the abscissa, as its axis is written; NaN where there is no value.
    view : (float, float) or None
        Part that is shown; None for all of it.
    panels : tuple of Panel
    owners : tuple of str
        In the order of their looks.
    told : tuple of str
        What was converted, refused or left out, one sentence each.
    """

    address: str
    against: str
    against_words: str
    across: AxisUnit
    scale: str | None
    since: tuple[tuple[str, float], ...]
    low: float
    high: float
    view: tuple[float, float] | None
    panels: tuple[Panel, ...]
    owners: tuple[str, ...]
    told: tuple[str, ...]


@dataclass(frozen=True)
class Member:
    """One leaf of the pile with its abscissa on the first one's axis.

    Attributes
    ----------
    leaf : Leaf
    x : DrawnColumn
    factor : float
        From the unit of x to that of the first one's.
    origin : float
        First instant, s, where x is time; else zero.
    look : int
        Place on the pile, from 0.
    """

    leaf: Leaf
    x: DrawnColumn
    factor: float
    origin: float
    look: int


@dataclass(frozen=True)
class Outline:
    """What a chart is made of.

    Attributes
    ----------
    members : tuple of Member
        The pile, the first at the bottom.
    panels : tuple of (str, tuple)
        Name of each ordinate, and the members that have it, each with its column and the factor to the first one's unit.
    told : tuple of str
    """

    members: tuple[Member, ...]
    panels: tuple[tuple[str, tuple[tuple[Member, DrawnColumn, float], ...]], ...]
    told: tuple[str, ...]

    @property
    def against(self) -> str:
        """Name of the abscissa."""
        first = self.members[0]
        return _name_in(first.leaf, first.x)


def chart(source: LabSource, asked: Asked) -> Chart:
    """Draw what is asked for.

    Parameters
    ----------
    source : LabSource
    asked : Asked

    Raises
    ------
    UnknownAddress
        If there is no such sweep, reduction or column.
    BadRequest
        If columns have different rows, the view is empty, or too much is laid over.
    """
    found = outline(source, asked)
    members, view = found.members, _view(asked)
    first = members[0]
    x_low, x_high = _ends_of(members)
    across = _clock(x_high - x_low) if first.x.kind == "instant" else _axis(x_low, x_high, first.x)
    return Chart(
        address=first.leaf.address,
        against=_name_in(first.leaf, first.x),
        against_words="time" if first.x.kind == "instant" else first.x.words,
        across=across,
        scale=first.x.scale,
        since=tuple((each.leaf.address, each.origin) for each in members if each.x.kind == "instant"),
        low=(x_low - across.offset) * across.factor,
        high=(x_high - across.offset) * across.factor,
        view=view,
        panels=tuple(_panel(first, name, drawn, across, view, asked.most) for name, drawn in found.panels),
        owners=tuple(each.leaf.address for each in members),
        told=found.told,
    )


def outline(source: LabSource, asked: Asked) -> Outline:
    """Work out which columns stand in which panel, and what is to be said of them; no column of numbers is read for it.

    Parameters
    ----------
    source : LabSource
    asked : Asked

    Raises
    ------
    UnknownAddress, BadRequest
        As `chart`.
    """
    told: list[str] = []
    members, names = _members(source, asked, told)
    absent: dict[str, list[str]] = {}
    panels = tuple((name, _matched(members, name, told, absent)) for name in names)
    told += [
        f"{address} has nothing that answers to {', '.join(what)}: not laid over there."
        for address, what in absent.items()
    ]
    return Outline(tuple(members), panels, tuple(dict.fromkeys(told)))


def _matched(
    members: Sequence[Member], name: str, told: list[str], absent: dict[str, list[str]]
) -> tuple[tuple[Member, DrawnColumn, float], ...]:
    """Members of one panel, each with its column and the factor to the unit of the first."""
    first = members[0].leaf.column(name)
    drawn: list[tuple[Member, DrawnColumn, float]] = []
    for each in members:
        y = first if each.look == 0 else partner(each.leaf, name, first)
        if y is None or y.rows != each.x.rows:
            absent.setdefault(each.leaf.address, []).append(first.words)
            continue
        fits = laid(first, y)
        if fits.told:
            told.append(fits.told)
        if fits.factor is not None:
            drawn.append((each, y, fits.factor))
    return tuple(drawn)


def _members(source: LabSource, asked: Asked, told: list[str]) -> tuple[list[Member], list[str]]:
    """Leaves of the pile with their abscissae, and the names of the ordinates."""
    first = leaf_of(source, asked.address)
    named = list(dict.fromkeys(asked.columns)) or _parts(first, asked)
    beside = first.column(named[0]) if named else None
    along = first.column(asked.against or usual_abscissa(first, beside))
    if len(asked.over) > _MOST_OVER or len(asked.columns) > _MOST_PANELS:
        raise BadRequest(
            f"{len(asked.over)} sweeps are to be laid over, with {len(asked.columns)} panels",
            expected=f"at most {_MOST_OVER} sweeps and {_MOST_PANELS} panels",
        )
    names = named or usual_ordinates(first, _name_in(first, along))
    for name in names:
        if first.column(name).rows != along.rows:
            raise BadRequest(
                f"{first.column(name).address} has {first.column(name).rows} rows, {along.address} {along.rows}",
                expected="two columns of equal length",
                remedy=f"draw it against one of: {', '.join(first.beside(first.column(name)))}",
            )
    members = [Member(first, along, 1.0, _origin(along), 0)]
    for address in dict.fromkeys(each for each in asked.over if each != first.address):
        try:
            other = leaf_of(source, address)
        except ArchiveError as problem:
            told.append(f"{address} is not laid over: {problem}")
            continue
        x = partner(other, _name_in(first, along), along)
        if x is None:
            told.append(f"{address} is not laid over: it has nothing that answers to {along.address}.")
            continue
        fits = laid(along, x)
        if fits.told:
            told.append(fits.told)
        if fits.factor is not None:
            members.append(Member(other, x, fits.factor, _origin(x), len(members)))
    return members, names


def _name_in(leaf: Leaf, column: DrawnColumn) -> str:
    return next(name for name, each in leaf.columns.items() if each is column)


def _parts(leaf: Leaf, asked: Asked) -> list[str]:
    part = asked.address.partition("#")[2]
    return [part] if part in leaf.columns else []


def _origin(column: DrawnColumn) -> float:
    """First instant; zero for anything that is no instant."""
    if column.kind != "instant":
        return 0.0
    low = ends(column)[0]
    return 0.0 if math.isnan(low) else low


def _ends_of(members: Sequence[Member]) -> tuple[float, float]:
    """Ends of all abscissae in the unit of the first, from their origins."""
    found = [(np.array(ends(each.x)) - each.origin) * each.factor for each in members]
    known = np.array([each for each in found if np.isfinite(each).all()])
    return (float(known.min()), float(known.max())) if known.size else (math.nan, math.nan)


def _axis(low: float, high: float, column: DrawnColumn) -> AxisUnit:
    if math.isnan(low):
        return AxisUnit(1.0, 0.0, column.unit, column.words)
    found = axis_unit(low, high, column.kind, column.unit)
    if column.kind in _PURE:
        # The kind says nothing; the column's own name does.
        return replace(found, name=found.name.replace(symbol(column.kind), column.words, 1))
    return found


def _clock(span: float) -> AxisUnit:
    for unit, size, least in (("d", 86400.0, 4 * 86400.0), ("h", 3600.0, 7200.0), ("min", 60.0, 300.0)):
        if span >= least:
            return AxisUnit(1 / size, 0.0, unit, f"t / {unit}")
    return AxisUnit(1.0, 0.0, "s", "t / s")


def _view(asked: Asked) -> tuple[float, float] | None:
    if asked.low is None and asked.high is None:
        return None
    low = -math.inf if asked.low is None else asked.low
    high = math.inf if asked.high is None else asked.high
    if not low < high:
        raise BadRequest(f"the view from {low:g} to {high:g} is empty", expected="from less than to")
    given = [abs(each) for each in (low, high) if math.isfinite(each)]
    if max(given) > _FARTHEST or high - low < _NARROWEST * max(given):
        raise BadRequest(
            f"the view from {low:g} to {high:g} cannot be drawn",
            expected="ends that a double can tell apart, along the axis as it is written",
        )
    return low, high


def _panel(
    member: Member,
    name: str,
    drawn: Sequence[tuple[Member, DrawnColumn, float]],
    across: AxisUnit,
    view: tuple[float, float] | None,
    most: int,
) -> Panel:
    first = member.leaf.column(name)
    spans = np.array([np.array(ends(y, each.x)) * factor for each, y, factor in drawn])
    known = spans[np.isfinite(spans).all(axis=1)]
    low, high = (float(known.min()), float(known.max())) if known.size else (math.nan, math.nan)
    axis = _axis(low, high, first)
    return Panel(
        name=name,
        words=first.words,
        axis=axis,
        low=(low - axis.offset) * axis.factor,
        high=(high - axis.offset) * axis.factor,
        log=member.leaf.kind == "ringdown" and low > 0 and high > 10 * low,
        scale=first.scale,
        curves=tuple(_curve(each, y, factor, across, axis, view, most) for each, y, factor in drawn),
    )


def _curve(
    member: Member,
    y: DrawnColumn,
    factor: float,
    across: AxisUnit,
    axis: AxisUnit,
    view: tuple[float, float] | None,
    most: int,
) -> Curve:
    def stored(shown: float) -> float:
        return (shown / across.factor + across.offset) / member.factor + member.origin

    low, high = (-math.inf, math.inf) if view is None else (stored(view[0]), stored(view[1]))
    found = points(member.x, y, low, high, most)
    return Curve(
        owner=member.leaf.address,
        address=y.address,
        look=member.look,
        x=((found.x - member.origin) * member.factor - across.offset) * across.factor,
        y=(found.y * factor - axis.offset) * axis.factor,
        u=None if found.u is None else found.u * abs(factor * axis.factor),
        thinned=found.thinned,
        line=found.rising,
    )

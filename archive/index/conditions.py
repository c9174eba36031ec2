"""Conditions of the queries: what a search asks, as expressions with bound values.

Rules: no value is ever written into SQL; a `LIKE` pattern is escaped; every condition means the same on SQLite and PostgreSQL.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from sqlalchemy import ColumnElement, and_, exists, func, or_, select

from archive.errors import BadRequest
from archive.index.answers import ResultCondition, SearchQuery
from archive.index.columns import utc_text
from archive.index.found import column_found, newest_reduction, newest_sweep
from archive.index.searchable import folded
from archive.index.tables import Channel, Output, Reduction, Sweep, SweepThermometer

__all__ = ["named", "part_of", "search_conditions"]

# SQLite bounds the length of a pattern and the depth of an expression; a search by hand is far below either.
_LONGEST_WORD = 1000
_MOST_WORDS = 100


def named(column: Any, reference: str) -> ColumnElement[bool]:
    """Whether a column holds a record: that revision for an address (`TO-4.r2`), any revision for a name."""
    if "." in reference:
        exact: ColumnElement[bool] = column == reference
        return exact
    # Names hold no dot and "s" follows "r", so this range is every revision and can use an index.
    return or_(column == reference, and_(column >= f"{reference}.r", column < f"{reference}.s"))


def part_of(column: Any, address: str) -> ColumnElement[bool]:
    """Whether a column holds an address or one of its parts: channel, output or raw file; for a name, a revision."""
    parts = [column == address]
    # "$" follows "#" and ";" follows ":" in the order of bytes.
    parts += [
        and_(column >= f"{address}{mark}", column < f"{address}{after}")
        for mark, after in (("#", "$"), (":", ";"))
    ]
    if "." not in address and "/" not in address:
        parts.append(named(column, address))
    return or_(*parts)


def search_conditions(query: SearchQuery, *, amended: bool) -> Iterator[ColumnElement[bool]]:
    """Conditions of a search, all of which must hold.

    Parameters
    ----------
    query : SearchQuery
    amended : bool
        Whether `sweep` is joined to `amended_sweep`; see `archive.index.found`.

    Raises
    ------
    BadRequest
        If a time has no offset, or the text is too long to search for.
    """
    yield newest_sweep(withdrawn_too=query.withdrawn)
    for column, value in ((Sweep.kind, query.kind), (Sweep.cooldown, query.cooldown)):
        if value is not None:
            yield column == value
    for name, reference in (
        ("cell", query.cell),
        ("substrate", query.substrate),
        ("sample", query.sample),
    ):
        if reference is not None:
            yield named(column_found(name, amended=amended), reference)
    if query.empty_cell is not None:
        yield column_found("empty_cell", amended=amended) == int(query.empty_cell)
    if query.thermometer is not None:
        yield exists().where(
            _same_sweep(SweepThermometer), named(SweepThermometer.thermometer, query.thermometer)
        )
    if query.scale is not None:
        yield or_(
            Sweep.scale == query.scale, exists().where(_same_sweep(Channel), Channel.scale == query.scale)
        )
    if query.plan is not None:
        followed = Reduction.plan_address if "." in query.plan else Reduction.plan
        yield exists().where(Reduction.sweep == Sweep.address, followed == query.plan)
    yield from _ranges(query, amended=amended)
    yield from _times(query)
    yield from (_result(condition) for condition in query.results)
    words = folded(query.text or "").split()
    if len(words) > _MOST_WORDS or max(map(len, words), default=0) > _LONGEST_WORD:
        raise BadRequest(
            "the text to search for is too long",
            field="text",
            expected=f"at most {_MOST_WORDS} words of at most {_LONGEST_WORD} characters",
        )
    for word in words:
        yield Sweep.text.contains(word, autoescape=True)


def _same_sweep(table: type[SweepThermometer | Channel]) -> ColumnElement[bool]:
    return and_(table.accession == Sweep.accession, table.sweep == Sweep.name)


def _ranges(query: SearchQuery, *, amended: bool) -> Iterator[ColumnElement[bool]]:
    if query.coverage is not None:
        low, high = query.coverage
        coverage = column_found("coverage_mol_per_m2", amended=amended)
        yield coverage.is_not(None)
        if low is not None:
            yield coverage >= low
        if high is not None:
            yield coverage <= high
    if query.temperature is not None:
        low, high = query.temperature
        lowest = column_found("temperature_low_K", amended=amended)
        highest = column_found("temperature_high_K", amended=amended)
        # A sweep of which only one end is known is a point.
        coldest = func.coalesce(lowest, highest)
        warmest = func.coalesce(highest, lowest)
        yield coldest.is_not(None)
        if low is not None:
            yield warmest >= low
        if high is not None:
            yield coldest <= high


def _times(query: SearchQuery) -> Iterator[ColumnElement[bool]]:
    for field, moment in (("since", query.since), ("until", query.until)):
        if moment is None:
            continue
        try:
            utc_text(moment)
        except (ValueError, OverflowError) as fault:
            raise BadRequest(
                "that is no instant to search from or to",
                field=field,
                found=moment.isoformat(),
                expected="a time with its offset from UTC, such as 2026-03-02T09:10:00+02:00",
            ) from fault
    if query.since is not None:
        yield func.coalesce(Sweep.end, Sweep.begin) >= query.since
    if query.until is not None:
        yield func.coalesce(Sweep.begin, Sweep.end) <= query.until


def _result(condition: ResultCondition) -> ColumnElement[bool]:
    bounds: list[ColumnElement[bool]] = [Output.value_si.is_not(None)]
    if condition.low is not None:
        bounds.append(Output.value_si >= condition.low)
    if condition.high is not None:
        bounds.append(Output.value_si <= condition.high)
    # A set made once: asked for each sweep anew, SQLite goes through every result of that name each time
    # (10 000 sweeps and reductions: 80 s).
    return Sweep.address.in_(
        select(Reduction.sweep)
        .join(Output, Output.reduction == Reduction.address)
        .where(Output.name == condition.name, Output.rows.is_(None), newest_reduction(), *bounds)
    )

"""A search as a person writes it, in the fields of `schemas.search_fields`, as a query of the index."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import TYPE_CHECKING, Any

from archive.errors import BadRequest, told
from archive.index import ResultCondition, SearchQuery
from archive.lab.layers import layer_of
from schemas.layers import LAYER_WORDS, no_substrate
from schemas.quantity import Quantity
from schemas.ranges import Bounds, named_range, point_in_time, si_bounds

if TYPE_CHECKING:
    from archive.lab.door import Archive

__all__ = ["search_query"]

Spelt = Callable[[str], str]


def search_query(
    lab: Archive,
    asked: Mapping[str, Any],
    *,
    spelt: Spelt = lambda name: name,
    limit: int | None = None,
    offset: int = 0,
    after: str | None = None,
) -> SearchQuery:
    """Query that the fields of a search ask for.

    Parameters
    ----------
    lab : Archive
        Knows the results and the substrates that are asked about.
    asked : mapping
        By names of `SEARCH_FIELDS`: texts; for `result` a sequence of them; flags as bool. What is missing, None or empty is not asked for.
    spelt : callable
        How a person knows a field by its name: as an option on the command line.
    limit, offset, after
        See `SearchQuery`.

    Raises
    ------
    BadRequest
        If a field cannot be read; it is named.
    UnknownAddress
        If layers are counted on a substrate that is not there.
    """
    given = {name: value for name, value in asked.items() if value not in (None, "", ())}
    results = tuple(_condition(lab, text, spelt) for text in given.pop("result", ()))
    for name in ("since", "until"):
        if name in given:
            with told(spelt(name)):
                given[name] = point_in_time(given[name], end_of_day=name == "until")
    if "coverage" in given:
        with told(spelt("coverage")):
            given["coverage"] = _coverage(lab, given["coverage"], given.get("substrate"), spelt)
    if "temperature" in given:
        with told(spelt("temperature")):
            given["temperature"] = _bounds(given["temperature"], "temperature", spelt)
    return SearchQuery(
        results=results,
        text=given.pop("words", None),
        limit=limit,
        offset=offset,
        after=after,
        **given,
    )


def _bounds(text: str, kind: str, spelt: Spelt) -> Bounds:
    return si_bounds(text, lambda number, unit: _si(number, unit, kind, spelt))


def _si(number: str, unit: str, kind: str, spelt: Spelt) -> float:
    quantity = Quantity.parse(f"{number} {unit}".strip(), kind)
    if quantity.scale is not None:
        raise ValueError(
            f"found a scale behind the range; temperatures are compared as numbers, each on its own scale: "
            f"leave it out, or choose sweeps by {spelt('scale')} {quantity.scale}"
        )
    return quantity.si


def _coverage(lab: Archive, text: str, substrate: str | None, spelt: Spelt) -> Bounds:
    def to_si(number: str, unit: str) -> float:
        if unit not in LAYER_WORDS:
            return _si(number, unit, "coverage", spelt)
        if substrate is None:
            raise ValueError(no_substrate(f"{spelt('substrate')} NAME"))
        return _si(number, "", "number", spelt) * layer_of(substrate, lab).coverage.si

    return si_bounds(text, to_si)


def _condition(lab: Archive, text: str, spelt: Spelt) -> ResultCondition:
    with told(spelt("result")):
        name, bounds = named_range(text)
    known = set(lab.result_quantities(name))
    if len(known) > 1:
        known = {row.quantity for row in lab.results(name)}
    if not known:
        others = ", ".join(sorted({row.name for row in lab.results()})) or "none yet"
        raise BadRequest(
            f"no reduction here has a result {name}", field=spelt("result"), expected=f"one of: {others}"
        )
    if bounds is None:
        return ResultCondition(name)
    if len(known) > 1:
        raise BadRequest(
            f"{name} is not the same quantity in all reductions ({', '.join(sorted(known))})", field=spelt("result"),
            remedy=f"narrow the search with {spelt('plan')} and look at the list",
        )  # fmt: skip
    with told(spelt("result")):
        return ResultCondition(name, *_bounds(bounds, known.pop(), spelt))

"""Sweeps with what belongs to them, put together from a few queries, however many sweeps there are."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence

from sqlalchemy import Connection

from archive.index import queries
from archive.index.answers import SweepResult, SweepRow

__all__ = ["sweep_rows"]

# Below every engine's bound on values in one statement (SQLite before 3.32: 999).
_AT_ONCE = 500


def sweep_rows(connection: Connection, query: queries.Query) -> list[SweepRow]:
    """Sweeps of a query, in its order, each with its thermometers, channels and newest results.

    Parameters
    ----------
    connection : Connection
        In one reading transaction, so that the parts fit each other.
    query : Select
        One of `queries.search` and `queries.sweeps`.
    """
    found = list(connection.execute(query).mappings())
    addresses = [row["address"] for row in found]
    thermometers: dict[tuple[str, str], list[str]] = defaultdict(list)
    channels: dict[tuple[str, str], list[str]] = defaultdict(list)
    results: dict[str, list[SweepResult]] = defaultdict(list)
    for some in _pieces(addresses):
        for accession, address, thermometer in connection.execute(queries.thermometers(some)):
            thermometers[accession, address].append(thermometer)
        for accession, address, channel in connection.execute(queries.channel_names(some)):
            channels[accession, address].append(channel)
        for address, *result in connection.execute(queries.sweep_results(some)):
            results[address].append(SweepResult(*result))
    return [
        SweepRow(
            **{str(name): value for name, value in row.items()},
            thermometers=tuple(thermometers[row["accession"], row["address"]]),
            channels=tuple(channels[row["accession"], row["address"]]),
            results=tuple(results[row["address"]]),
        )
        for row in found
    ]


def _pieces(addresses: Sequence[str]) -> Iterator[Sequence[str]]:
    for begin in range(0, len(addresses), _AT_ONCE):
        yield addresses[begin : begin + _AT_ONCE]

"""Sweeps with what belongs to them, put together from a few queries, however many sweeps there are."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence

from sqlalchemy import Connection

from archive.index import act_queries, queries, sweep_queries
from archive.index.act_answers import WithdrawalRow
from archive.index.answers import SweepResult, SweepRow
from archive.index.flags import flagged_now

__all__ = ["results_of", "sweep_rows"]

# Below every engine's bound on values in one statement (SQLite before 3.32: 999).
_AT_ONCE = 500


def sweep_rows(connection: Connection, query: queries.Query) -> list[SweepRow]:
    """Sweeps of a query, in its order, each with its thermometers, channels and newest results.

    Parameters
    ----------
    connection : Connection
        In one reading transaction, so that the parts fit each other.
    query : Select
        One of `sweep_queries.search` and `sweep_queries.sweeps`.
    """
    found = list(connection.execute(query).mappings())
    addresses = [row["address"] for row in found]
    thermometers: dict[tuple[str, str], list[str]] = defaultdict(list)
    channels: dict[tuple[str, str], list[str]] = defaultdict(list)
    results = results_of(connection, addresses)
    amended: dict[str, list[str]] = defaultdict(list)
    withdrawn = (
        _withdrawn(connection) if connection.execute(sweep_queries.anything_withdrawn()).first() else {}
    )
    flagged = flagged_now(connection) if withdrawn else {}
    for some in _pieces(addresses):
        for accession, address, thermometer in connection.execute(sweep_queries.thermometers(), some):
            thermometers[accession, address].append(thermometer)
        for accession, address, channel in connection.execute(sweep_queries.channel_names(), some):
            channels[accession, address].append(channel)
        for address, amendment in connection.execute(act_queries.amendments_of_sweeps(some=True), some):
            amended[address].append(amendment)
    return [
        SweepRow(
            **{str(name): value for name, value in row.items()},
            thermometers=tuple(thermometers[row["accession"], row["address"]]),
            channels=tuple(channels[row["accession"], row["address"]]),
            results=tuple(results.get(row["address"], ())),
            amended=tuple(amended[row["address"]]),
            flagged=tuple(flagged.get(row["address"], ())),
            withdrawn=next(
                (
                    withdrawn[row[name]]
                    for name in ("address", "accession", "cooldown")
                    if row[name] in withdrawn
                ),
                None,
            ),
        )
        for row in found
    ]


def results_of(connection: Connection, addresses: Sequence[str]) -> dict[str, list[SweepResult]]:
    """Results of the newest reductions of some sweeps, headline ones first, by sweep.

    Parameters
    ----------
    connection : Connection
        In a reading transaction.
    addresses : sequence of str
    """
    results: dict[str, list[SweepResult]] = defaultdict(list)
    for some in _pieces(addresses):
        for address, *result in connection.execute(sweep_queries.sweep_results(), some):
            results[address].append(SweepResult(*result))
    return dict(results)


def _withdrawn(connection: Connection) -> dict[str, str]:
    """Why each withdrawn thing is withdrawn, by its address."""
    rows = connection.execute(act_queries.withdrawals(counting=True)).mappings()
    found = [WithdrawalRow(**{str(name): value for name, value in row.items()}) for row in rows]
    return {row.target: row.sentence() for row in found}


def _pieces(addresses: Sequence[str]) -> Iterator[dict[str, Sequence[str]]]:
    for begin in range(0, len(addresses), _AT_ONCE):
        yield {"addresses": addresses[begin : begin + _AT_ONCE]}

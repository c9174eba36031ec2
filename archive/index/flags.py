"""What rests on something withdrawn, however far down."""

from __future__ import annotations

from sqlalchemy import Connection

from archive.index import act_queries

__all__ = ["flagged", "flagged_now"]

_AT_ONCE = 500  # as in `sweep_rows`


def flagged(connection: Connection) -> dict[str, tuple[str, ...]]:
    """Reductions that rest on something withdrawn, each with the addresses of what that is.

    Parameters
    ----------
    connection : Connection
        In a reading transaction.

    Notes
    -----
    Without a withdrawal nothing is asked for but that.
    """
    found: dict[str, set[str]] = {}
    targets = dict.fromkeys(row.target for row in connection.execute(act_queries.withdrawals(counting=True)))
    for target in targets:
        seen: set[str] = set()
        waiting = [target]
        while waiting:
            for (reduction,) in connection.execute(act_queries.resting_on(waiting.pop())):
                if reduction not in seen:
                    seen.add(reduction)
                    found.setdefault(reduction, set()).add(target)
                    waiting.append(reduction)
    return {address: tuple(sorted(found[address])) for address in sorted(found)}


def flagged_now(connection: Connection) -> dict[str, list[str]]:
    """Current reductions that rest on something withdrawn, by sweep."""
    every = list(flagged(connection))
    found: dict[str, list[str]] = {}
    for begin in range(0, len(every), _AT_ONCE):
        for sweep, address in connection.execute(act_queries.newest_among(every[begin : begin + _AT_ONCE])):
            found.setdefault(sweep, []).append(address)
    return found

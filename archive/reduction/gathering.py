"""Results of several reductions taken together as one column, as a step with its own record.

Each result keeps its address and its sources, so that what the reductions share stays shared from row to row, and a trace
leads from the column to every reduction behind it.
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from archive.reduction.step import Outcome, Port, Step
from schemas.base import Record

__all__ = ["GATHERING_STEPS", "GatherParameters", "gathering_step"]

_PORT = "from_"


class GatherParameters(Record):
    """Which output is taken, and from where; filled in by the runner."""

    output: str = ""
    reductions: tuple[str, ...] = ()


def gathered(parameters: GatherParameters, **results: float | None) -> Outcome:
    """Return results as one column, NaN where a reduction has none."""
    values = np.full(len(parameters.reductions), math.nan)
    for port, value in results.items():
        if value is not None:
            values[int(port.removeprefix(_PORT)) - 1] = value
    return Outcome(
        {"values": values},
        facts={
            "known": int(np.count_nonzero(np.isfinite(values))),
            "total": values.size,
            "plans": " and ".join(dict.fromkeys(_plan(each) for each in parameters.reductions)),
            "what": _words(parameters.output),
        },
    )


def _words(output: str) -> str:
    """Return the name of a result as it is read: a symbol such as T_KT stays one."""
    symbol, _, rest = output.partition("_by_")
    return (
        f"{symbol} by {rest.replace('_', ' ')}"
        if rest
        else output.replace("_", " ")
        if output[1:2] != "_"
        else output
    )


def _plan(address: str) -> str:
    return address.partition("@")[2].rpartition(".")[0]


_GATHER = Step(
    name="gather-results", version=1, function=gathered, parameters=GatherParameters,
    takes={f"{_PORT}1": Port("any", "scalar", "result of a reduction", optional=True)},
    yields={"values": Port("any", "array", "the result of each reduction")},
    sentence="Taken from {known} of {total} reductions by {plans}: {what}.",
)  # fmt: skip


def gathering_step(count: int, *, output: str, quantity: str) -> Step:
    """Return the step that takes a result of a kind from so many reductions; its inputs are from_1, from_2 and so on.

    Parameters
    ----------
    count : int
        Of reductions, >= 1.
    output : str
        Name of the result.
    quantity : str
        Quantity kind of the result.
    """
    port = Port(quantity, "scalar", "result of a reduction", optional=True)
    return replace(
        _GATHER,
        takes={f"{_PORT}{k}": port for k in range(1, count + 1)},
        yields={"values": Port(quantity, "array", f"{output} of each reduction")},
    )


GATHERING_STEPS: tuple[Step, ...] = (_GATHER,)
"""Steps of this module."""

"""Where a figure's numbers come from: outputs of a reduction, and exactly those columns that its steps took.

Rule: what is not held raises `NoFigure` with the reason in words; nothing is made up in its place.
"""

from __future__ import annotations

import math

import numpy as np

from archive.reports.figure_style import Column, NoFigure
from archive.reports.scope import Scope
from schemas.lineage import OutputEntry, ReductionDocument, StepRecord
from schemas.quantity import unit_factor

__all__ = [
    "channel_of",
    "column_of",
    "fact",
    "output_of",
    "outputs_with",
    "scalar",
    "spread_of",
    "step_of",
    "taken",
    "told",
    "values_at",
    "wanted",
]


def column_of(scope: Scope, reduction: ReductionDocument, name: str) -> Column | None:
    """Return the values of an output (``x``, ``x.point``, ``x.uncertainty``) in SI units, or None where the archive holds none."""
    if not any(each.rows and each.name == name.partition(".")[0] for each in reduction.outputs):
        return None
    return scope.holdings_of(reduction).column(reduction.address, name)


def wanted(scope: Scope, reduction: ReductionDocument, name: str) -> Column:
    """Return the values of an output.

    Raises
    ------
    NoFigure
        The archive holds none.
    """
    found = column_of(scope, reduction, name)
    if found is None or found.ndim != 1:
        raise NoFigure(f"the reduction has no {_words(name)}")
    return found


def spread_of(scope: Scope, reduction: ReductionDocument, name: str) -> tuple[Column | None, float]:
    """Return the standard uncertainty of each point alone, and the largest share of a value that all points have in common.

    Parameters
    ----------
    scope : Scope
    reduction : ReductionDocument
    name : str
        An output that is an array.

    Returns
    -------
    ndarray or None
        None where none is kept.
    float
        Common part over value, where the value is largest; 0 where there is none.
    """
    values = column_of(scope, reduction, name)
    whole, point = (column_of(scope, reduction, f"{name}.{kind}") for kind in ("uncertainty", "point"))
    if values is None or whole is None or whole.shape != values.shape:
        return point, 0.0
    if point is None or point.shape != values.shape:
        point = np.zeros(values.shape)
    size = np.where(np.isfinite(values), np.abs(values), -1.0)
    k = int(np.argmax(size)) if size.size else 0
    if not size.size or size[k] <= 0:
        return point, 0.0
    common = math.sqrt(max(float(whole[k]) ** 2 - float(point[k]) ** 2, 0.0))
    return point, common / float(size[k])


def output_of(reduction: ReductionDocument, name: str) -> OutputEntry | None:
    """Return a scalar output, or None."""
    return next((each for each in reduction.outputs if each.name == name and each.rows is None), None)


def outputs_with(reduction: ReductionDocument, *names: str) -> dict[str, OutputEntry]:
    """Return those of some scalar outputs that have a value."""
    found = {name: output_of(reduction, name) for name in names}
    return {name: each for name, each in found.items() if each is not None and each.value is not None}


def scalar(reduction: ReductionDocument, name: str) -> float:
    """Return the value of a scalar output, SI.

    Raises
    ------
    NoFigure
        The reduction has none, or a word in its place.
    """
    found = output_of(reduction, name)
    if found is None:
        raise NoFigure(f"the reduction has no {_words(name)}")
    if found.value is None or not math.isfinite(found.value):
        raise NoFigure(f"{_words(name)}: {found.verdict or 'no value'}")
    return found.value


def step_of(reduction: ReductionDocument, name: str, *, gives: str | None = None) -> StepRecord:
    """Return the record of a step; where it was done several times, that one which gave an output.

    Raises
    ------
    NoFigure
        The reduction has no such step.
    """
    for step in reduction.steps:
        if step.name == name and (gives is None or gives in step.outputs):
            return step
    raise NoFigure(f"step {name} was not carried out")


def fact(step: StepRecord, name: str) -> float:
    """Return a number that a step says beyond its outputs; not a number where it does not."""
    found = step.facts.get(name)
    return float(found) if isinstance(found, int | float) else math.nan


def taken(scope: Scope, reduction: ReductionDocument, step: StepRecord, port: str) -> Column:
    """Return what a step took, in SI units.

    Raises
    ------
    NoFigure
        It took nothing there, or what it took is not at hand.
    """
    entry = step.inputs.get(port)
    if entry is None:
        raise NoFigure(f"step {step.name} took no {_words(port)}")
    return values_at(scope, entry.address)


def values_at(scope: Scope, address: str) -> Column:
    """Return a column by its address, in SI units: a channel ``2026-03/s017#period`` or an output.

    Raises
    ------
    NoFigure
        It is not at hand.
    """
    place, _, name = address.partition("#")
    held = scope.cooldowns.get(place.partition("/")[0])
    found = held.column(place, name) if held is not None and name else None
    if held is None or found is None or found.ndim != 1:
        raise NoFigure(f"{address} is not at hand")
    if "@" in place:
        return found
    sweep = place.partition("/")[2]
    entry = next((each.entry for each in held.sweeps if each.sheet.name == sweep), None)
    channel = None if entry is None else next((each for each in entry.channels if each.name == name), None)
    if channel is None:
        raise NoFigure(f"{address} is not described")
    if channel.quantity == "instant":
        return found
    return np.asarray(found * unit_factor(channel.unit or "1", channel.quantity))


def channel_of(scope: Scope, reduction: ReductionDocument, quantity: str) -> Column | None:
    """Return the first recorded channel of a quantity kind that may be used, in SI units, or None."""
    entry = scope.taken_of(reduction).entry
    for channel in () if entry is None else entry.channels:
        if channel.quantity == quantity and channel.use:
            try:
                return values_at(scope, f"{reduction.sweep}#{channel.name}")
            except NoFigure:
                return None
    return None


def told(scope: Scope, reduction: ReductionDocument, **names: str) -> str:
    """Return results for a caption, ``Results: T_KT = 458.79(48) mK on PLTS-2000, b = 5.61(18).``; "" where there is none.

    Parameters
    ----------
    scope : Scope
    reduction : ReductionDocument
    **names : str
        Name of an output, and how the caption names it; those without a value are left out.
    """
    found = [
        f"{words} = {scope.text(output)}"
        for name, words in names.items()
        if (output := output_of(reduction, name)) is not None and output.value is not None
    ]
    return f"Results: {', '.join(found)}." if found else ""


def _words(name: str) -> str:
    return name.replace("_", " ")

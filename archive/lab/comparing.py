"""Two reductions side by side: parameters, inputs, results with the significance of their change, arrays."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np

from archive.errors import BadRequest, UnknownAddress
from archive.lab.source import LabSource
from schemas.address import parse_address
from schemas.lineage import InputEntry, OutputEntry, ReductionDocument, StepRecord
from schemas.quantity import unit_factor

__all__ = ["ArrayChange", "Comparison", "InputChange", "ParameterChange", "ResultChange", "compare"]


@dataclass(frozen=True)
class ParameterChange:
    """A parameter of a step, or a step, that differs; None where one side has none."""

    step: str
    parameter: str
    first: Any
    second: Any


@dataclass(frozen=True)
class InputChange:
    """An input that differs: its address on each side, and whether its bytes differ."""

    role: str
    first: str | None
    second: str | None
    same_bytes: bool


@dataclass(frozen=True)
class ResultChange:
    """One result on both sides.

    Attributes
    ----------
    name, unit, scale : str
        Unit and scale of the first.
    first, second : float or None
        Values in that unit.
    first_uncertainty, second_uncertainty : float or None
    change : float or None
        Second less first.
    change_uncertainty : float or None
        Standard uncertainty of the change.
    significance : float or None
        Change over that uncertainty.
    remark : str
        Why there is no change to speak of, or how its uncertainty was taken.
    """

    name: str
    unit: str
    scale: str | None
    first: float | None
    second: float | None
    first_uncertainty: float | None = None
    second_uncertainty: float | None = None
    change: float | None = None
    change_uncertainty: float | None = None
    significance: float | None = None
    remark: str = ""


@dataclass(frozen=True)
class ArrayChange:
    """One array on both sides: the largest difference, in the first's unit and over the largest value."""

    name: str
    unit: str
    rows: tuple[int | None, int | None]
    largest: float | None = None
    relative: float | None = None
    at_row: int | None = None
    remark: str = ""


@dataclass(frozen=True)
class Comparison:
    """Two reductions side by side.

    Attributes
    ----------
    first, second : str
        Addresses.
    same_data : bool
        Whether both reduce the same sweep with the same bytes in every channel that both took.
    plans : (str, str)
    parameters, inputs : tuple
        What differs.
    results, arrays : tuple
        All of them.
    software : dict
        Name to (first, second), where versions differ.
    """

    first: str
    second: str
    same_data: bool
    plans: tuple[str, str]
    parameters: tuple[ParameterChange, ...]
    inputs: tuple[InputChange, ...]
    results: tuple[ResultChange, ...]
    arrays: tuple[ArrayChange, ...]
    software: dict[str, tuple[str, str]]


def compare(source: LabSource, first: str, second: str) -> Comparison:
    """Return two reductions side by side.

    Parameters
    ----------
    source : LabSource
    first, second : str
        Addresses of reductions; of one sweep or of two.

    Raises
    ------
    BadRequest
        If an address is not that of a reduction.
    UnknownAddress
        If the archive does not hold it.

    Notes
    -----
    The uncertainty of a change counts what both results share only once. Sources of one name move both together, so their
    contributions are subtracted before they are squared (GUM 5.2 and F.1.2.3). What only one element has is independent for
    two sweeps; for the same raw bytes it is common too, and then the change is set against the second result's own
    uncertainty instead, since nothing but the way of reducing differs.
    """
    one, two = _reduction(source, first), _reduction(source, second)
    same = _same_data(one, two)
    return Comparison(
        first=one.address,
        second=two.address,
        same_data=same,
        plans=(one.plan.address, two.plan.address),
        parameters=tuple(_parameters(one, two)),
        inputs=tuple(_inputs(one, two)),
        results=tuple(_results(one, two, same_data=same)),
        arrays=tuple(_arrays(source, one, two)),
        software=_software(one, two),
    )


def _reduction(source: LabSource, text: str) -> ReductionDocument:
    try:
        parsed = parse_address(text)
    except ValueError as error:
        raise BadRequest(str(error)) from None
    if parsed.reduction is None:
        raise BadRequest(
            f"{text} is no reduction",
            expected="an address such as 2026-03/s017@film-transition.2",
            remedy=f"stillroom show {text} tells what there is of it",
        )
    if not source.store.contains(parsed.reduction):
        raise UnknownAddress(f"there is no reduction {parsed.reduction} in this archive")
    return source.reduction(parsed.reduction)


def _same_data(one: ReductionDocument, two: ReductionDocument) -> bool:
    if one.sweep != two.sweep:
        return False
    digests = {
        entry.address: entry.digest for entry in one.inputs if entry.address.startswith(f"{one.sweep}#")
    }
    return all(digests.get(entry.address, entry.digest) == entry.digest for entry in two.inputs)


def _steps(document: ReductionDocument) -> dict[str, StepRecord]:
    """Steps by what they give: the same place in two plans, wherever it stands."""
    return {f"{step.name} ({', '.join(step.outputs)})": step for step in document.steps}


def _parameters(one: ReductionDocument, two: ReductionDocument) -> Iterator[ParameterChange]:
    before, after = _steps(one), _steps(two)
    for name in dict.fromkeys([*before, *after]):
        old, new = before.get(name), after.get(name)
        if old is None or new is None:
            yield ParameterChange(
                name, "step", old and f"version {old.version}", new and f"version {new.version}"
            )
            continue
        if old.version != new.version:
            yield ParameterChange(name, "version", old.version, new.version)
        for key in dict.fromkeys([*old.parameters, *new.parameters]):
            if old.parameters.get(key) != new.parameters.get(key):
                yield ParameterChange(name, key, old.parameters.get(key), new.parameters.get(key))


def _inputs(one: ReductionDocument, two: ReductionDocument) -> Iterator[InputChange]:
    before = {entry.address: entry for entry in one.inputs}
    after = {entry.address: entry for entry in two.inputs}
    unmatched = [entry for address, entry in after.items() if address not in before]
    for address, entry in before.items():
        other = after.get(address)
        if other is not None:
            if other.digest != entry.digest:
                yield InputChange(entry.role, address, address, same_bytes=False)
            continue
        partner = next((each for each in unmatched if _alike(entry, each)), None)
        if partner is not None:
            unmatched.remove(partner)
        yield InputChange(
            entry.role, address, None if partner is None else partner.address,
            same_bytes=partner is not None and partner.digest is not None and partner.digest == entry.digest,
        )  # fmt: skip
    for entry in unmatched:
        yield InputChange(entry.role, None, entry.address, same_bytes=False)


def _alike(one: InputEntry, two: InputEntry) -> bool:
    """Whether two inputs serve the same need: the same role, and the same part of their owners."""
    return one.role == two.role and one.address.partition("#")[2] == two.address.partition("#")[2]


def _results(one: ReductionDocument, two: ReductionDocument, *, same_data: bool) -> Iterator[ResultChange]:
    before = {entry.name: entry for entry in one.outputs if entry.rows is None}
    after = {entry.name: entry for entry in two.outputs if entry.rows is None}
    for name in dict.fromkeys([*before, *after]):
        if name not in after:
            yield _only(name, before[name], first=True)
        elif name not in before:
            yield _only(name, after[name], first=False)
        else:
            yield _result(name, before[name], after[name], same_data=same_data)


def _only(name: str, entry: OutputEntry, *, first: bool) -> ResultChange:
    remark = f"in the {'first' if first else 'second'} only"
    before, after = (entry.value, entry.uncertainty), (None, None)
    (first_value, first_u), (second_value, second_u) = (before, after) if first else (after, before)
    return ResultChange(
        name, entry.unit, entry.scale, first_value, second_value, first_u, second_u, remark=remark
    )


def _result(name: str, old: OutputEntry, new: OutputEntry, *, same_data: bool) -> ResultChange:
    if old.quantity != new.quantity or old.scale != new.scale:
        what = "temperature scales" if old.quantity == new.quantity else "quantity kinds"
        return ResultChange(
            name, old.unit, old.scale, old.value, None, old.uncertainty, None,
            remark=f"not compared: different {what} ({old.scale or old.quantity}, {new.scale or new.quantity})",
        )  # fmt: skip
    factor = unit_factor(new.unit, new.quantity) / unit_factor(old.unit, old.quantity)
    value = None if new.value is None else new.value * factor
    spread = None if new.uncertainty is None else new.uncertainty * factor
    if old.value is None or value is None:
        words = " / ".join(
            str(each.verdict or "no value" if each.value is None else "a value") for each in (old, new)
        )
        return ResultChange(
            name, old.unit, old.scale, old.value, value, old.uncertainty, spread, remark=words
        )
    change = value - old.value
    if same_data:
        u, remark = spread, "same raw bytes: against the second's own uncertainty"
    else:
        sources = {*old.shared, *new.shared}
        shared = [new.shared.get(each, 0.0) * factor - old.shared.get(each, 0.0) for each in sources]
        own = [old.point or 0.0, (new.point or 0.0) * factor]
        u = math.hypot(*shared, *own) if old.uncertainty is not None and spread is not None else None
        remark = (
            "" if sources.isdisjoint(set(old.shared) & set(new.shared)) else "common sources counted once"
        )
    significance = change / u if u else None
    return ResultChange(
        name, old.unit, old.scale, old.value, value, old.uncertainty, spread, change, u, significance,
        remark if change else "",
    )  # fmt: skip


def _arrays(source: LabSource, one: ReductionDocument, two: ReductionDocument) -> Iterator[ArrayChange]:
    before = {entry.name: entry for entry in one.outputs if entry.rows is not None}
    after = {entry.name: entry for entry in two.outputs if entry.rows is not None}
    for name in dict.fromkeys([*before, *after]):
        if name not in after:
            yield ArrayChange(name, before[name].unit, (before[name].rows, None), remark="in the first only")
            continue
        if name not in before:
            yield ArrayChange(name, after[name].unit, (None, after[name].rows), remark="in the second only")
            continue
        old, new = before[name], after[name]
        rows = (old.rows, new.rows)
        if old.digest == new.digest and old.unit == new.unit:
            yield ArrayChange(name, old.unit, rows, 0.0, 0.0, remark="equal bit for bit")
        elif old.rows != new.rows:
            yield ArrayChange(name, old.unit, rows, remark="not compared: the numbers of rows differ")
        elif old.quantity != new.quantity or old.scale != new.scale:
            yield ArrayChange(name, old.unit, rows, remark="not compared: different quantity kinds or scales")
        else:
            yield _array(source, one, two, old, new)


def _array(
    source: LabSource, one: ReductionDocument, two: ReductionDocument, old: OutputEntry, new: OutputEntry
) -> ArrayChange:
    factor = unit_factor(new.unit, new.quantity) / unit_factor(old.unit, old.quantity)
    a = source.values(one.address, old.name)
    b = source.values(two.address, new.name) * factor
    gaps = int((np.isnan(a) != np.isnan(b)).sum())
    remark = f"{gaps} rows have a value on one side only" if gaps else ""
    apart = np.abs(b - a)
    if np.isnan(apart).all():
        return ArrayChange(old.name, old.unit, (old.rows, new.rows), remark=remark or "no row has a value")
    row = int(np.nanargmax(apart))
    size = float(np.nanmax(np.abs(a), initial=0.0))
    largest = float(apart[row])
    return ArrayChange(
        old.name, old.unit, (old.rows, new.rows), largest, largest / size if size else None, row + 1, remark
    )


def _software(one: ReductionDocument, two: ReductionDocument) -> dict[str, tuple[str, str]]:
    sides = [
        {"stillroom": each.stillroom, "python": each.python, "platform": each.platform, **each.packages}
        for each in (one.software, two.software)
    ]
    return {
        name: (sides[0].get(name, "none"), sides[1].get(name, "none"))
        for name in dict.fromkeys([*sides[0], *sides[1]])
        if sides[0].get(name) != sides[1].get(name)
    }

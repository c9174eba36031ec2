"""Views made from what the archive holds; see `archive.lab.views`."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np

from archive.errors import UnknownAddress
from archive.index import CooldownRow
from archive.lab.marks import marks_of
from archive.lab.source import LabSource
from archive.lab.views.arrays import ReductionView, SweepView
from archive.lab.views.column import Column
from archive.lab.views.html import described, fragment
from archive.lab.views.result import Result
from archive.lab.views.rows import RowList
from schemas.address import Address, parse_address
from schemas.lineage import OutputEntry, ReductionDocument

__all__ = ["archive_html", "reduction_view", "result", "sweep_view"]


def _address(text: str, kind: str, expected: str) -> Address:
    try:
        parsed = parse_address(text)
    except ValueError as error:
        raise UnknownAddress(str(error)) from None
    if parsed.kind != kind:
        noun = {"item": "sweep", "output": "result"}.get(kind, kind)
        raise UnknownAddress(f"{text} is no {noun}", expected=f"an address such as {expected}")
    return parsed


def sweep_view(source: LabSource, address: str) -> SweepView:
    """Channels of a sweep, as stored.

    Raises
    ------
    UnknownAddress
        If the archive holds no such sweep.
    """
    parsed = _address(address, "item", "2026-03/s017")
    item = parsed.item or ""
    document = source.holding(parsed.head, item)
    entry = next(each for each in document.sweeps if each.name == item)
    columns = [
        Column(
            name=channel.name,
            unit=channel.unit,
            kind=channel.quantity,
            values=np.asarray(source.column(document.address, item, channel.name), dtype=np.float64),
            description=channel.description,
            scale=channel.scale,
        )
        for channel in entry.channels
    ]
    return SweepView(address, entry.kind, columns, marks=_marks(source, parsed))


def reduction_view(source: LabSource, address: str) -> ReductionView:
    """Arrays and results of a reduction.

    Raises
    ------
    UnknownAddress
        If the archive holds no such reduction.
    """
    parsed = _address(address, "reduction", "2026-03/s017@film-transition.2")
    document = source.reduction(address)
    marks = _marks(source, parsed)
    columns = [_column(source, document, output) for output in document.outputs if output.rows is not None]
    results = [
        Result(f"{address}#{output.name}", output, marks)
        for output in document.outputs
        if output.rows is None
    ]
    return ReductionView(address, _kind(source, parsed), columns, marks, results=results)


def _kind(source: LabSource, parsed: Address) -> str:
    entry = source.holding(parsed.head, parsed.item or "").sweeps
    return next(each.kind for each in entry if each.name == parsed.item)


def _column(source: LabSource, document: ReductionDocument, output: OutputEntry) -> Column:
    estimate = source.output(document.address, output.name)
    return Column(
        name=output.name,
        unit=output.unit,
        kind=output.quantity,
        values=estimate.value,
        uncertainty=estimate.uncertainty,
        description=output.description,
        scale=output.scale,
    )


def result(source: LabSource, address: str) -> Result:
    """One scalar result.

    Raises
    ------
    UnknownAddress
        If the archive holds no such result.
    """
    parsed = _address(address, "output", "2026-03/s017@film-transition.2#T_KT")
    document = source.reduction(parsed.reduction or "")
    scalars = {output.name: output for output in document.outputs if output.rows is None}
    if parsed.part not in scalars:
        raise UnknownAddress(
            f"{document.address} has no result {parsed.part}",
            expected=f"one of: {', '.join(scalars) or 'none'}",
        )
    return Result(address, scalars[parsed.part], _marks(source, parsed))


def _marks(source: LabSource, address: Address) -> tuple[str, ...]:
    return tuple(_sentences(marks_of(source, address)))


def _sentences(marks: Mapping[str, Any]) -> Iterator[str]:
    for name, said in marks.items():
        words = name.replace("_", " ")
        yield f"{words}: {said if isinstance(said, str) else '; '.join(map(str, said))}"


def archive_html(name: str, root: str, counts: Mapping[str, int], cooldowns: RowList[CooldownRow]) -> str:
    """Archive as a piece of a page: its name, where it lies, what it holds."""
    held = described({"folder": root, **{key.replace("_", " "): value for key, value in counts.items()}})
    return fragment(name, held, cooldowns._repr_html_())

"""Taking away what a chart shows: all rows of the view, as CSV or as HDF5, with what the numbers mean beside them.

Rules: values are those stored, in the unit stored, digit for digit, except where a curve was laid over in another unit: then
they are in that of the first, as the chart says. Every heading carries its unit, every file the addresses and digests.
"""

from __future__ import annotations

import csv
import io
import json
import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from archive.lab.curves.chart import Asked, Chart, Member, chart, outline
from archive.lab.curves.columns import DrawnColumn
from archive.lab.source import LabSource
from archive.store.interface import Column
from archive.store.sealed import SealedWriter
from schemas.units import ucum

__all__ = ["csv_blocks", "hdf5_file"]

FloatArray = NDArray[np.float64]

_BLOCK = 1 << 16


@dataclass(frozen=True)
class _Taken:
    """One column that is taken away, and what its values are multiplied with."""

    column: DrawnColumn
    factor: float
    unit: str
    name: str

    @property
    def heading(self) -> str:
        """Name and unit."""
        if self.column.kind == "instant":
            return f"{self.name}/s"
        return (
            self.name
            if self.unit in ("", "1")
            else f"{self.name}/({self.unit})"
            if "/" in self.unit or " " in self.unit
            else f"{self.name}/{self.unit}"
        )


@dataclass(frozen=True)
class _Table:
    """Columns of one sweep or reduction; the first is the abscissa."""

    owner: str
    member: Member
    columns: tuple[_Taken, ...]
    ends: tuple[float, float]


def _tables(source: LabSource, asked: Asked) -> tuple[Chart, list[_Table]]:
    drawn, found = chart(source, asked), outline(source, asked)
    first = found.members[0]
    called = _called([drawn.against, *(name for name, _ in found.panels)])
    view = drawn.view or (-math.inf, math.inf)
    tables = []
    for member in found.members:
        taken = [_Taken(member.x, member.factor, first.x.unit, called[drawn.against])]
        for name, panel in found.panels:
            unit = first.leaf.column(name).unit
            taken += [_Taken(y, factor, unit, called[name]) for each, y, factor in panel if each is member]
        low, high = (
            (end / drawn.across.factor + drawn.across.offset) / member.factor + member.origin for end in view
        )
        tables.append(_Table(member.leaf.address, member, tuple(taken), (low, high)))
    return drawn, tables


def _called(names: Sequence[str]) -> dict[str, str]:
    """What columns are called in a heading: an array by its own name, with its reduction only where two have one name."""
    plain = [name.partition("@")[0] for name in names]
    return {
        name: short if plain.count(short) == 1 else name for name, short in zip(names, plain, strict=True)
    }


def _blocks(table: _Table) -> Iterator[list[tuple[FloatArray, FloatArray | None]]]:
    """Values and uncertainties of all columns, block by block, of the rows in the view."""
    rows = table.member.x.rows
    for start in range(0, rows, _BLOCK):
        stop = min(start + _BLOCK, rows)
        x = table.member.x.read(start, stop)
        low, high = table.ends
        inside = (
            np.ones(x.size, dtype=bool) if low == -math.inf and high == math.inf else (x >= low) & (x <= high)
        )
        if not inside.any():
            continue
        block = []
        for each in table.columns:
            values = each.column.read(start, stop)
            spread = each.column.spread(start, stop, values)
            times = abs(each.factor)
            block.append(
                (
                    values[inside] if each.factor == 1.0 else values[inside] * each.factor,
                    None if spread is None else (spread[inside] if times == 1.0 else spread[inside] * times),
                )
            )
        yield block


def _with_spread(table: _Table) -> list[bool]:
    """Which columns have a standard uncertainty, from their first row."""
    found = []
    for each in table.columns:
        values = each.column.read(0, min(1, each.column.rows))
        found.append(each.column.spread(0, values.size, values) is not None)
    return found


def csv_blocks(source: LabSource, asked: Asked) -> Iterator[str]:
    r"""CSV (RFC 4180) of what a chart shows, in pieces.

    Parameters
    ----------
    source : LabSource
    asked : Asked

    Yields
    ------
    str
        Lines that begin with ``#`` and say what the numbers are; headings with units; rows. A cell without a value is empty.
        With several sweeps the first column names the one of each row.

    Raises
    ------
    UnknownAddress, BadRequest
        As `archive.lab.curves.chart.chart`.
    """
    drawn, tables = _tables(source, asked)
    several = len(tables) > 1
    yield "".join(f"# {line}\r\n" for line in _comments(drawn, tables))
    names = {each.name: each.heading for table in tables for each in table.columns}
    spreads = {
        each.name
        for table in tables
        for each, has in zip(table.columns, _with_spread(table), strict=True)
        if has
    }
    head = ["sweep"] if several else []
    for name, heading in names.items():
        head += [heading] + ([heading.replace(name, f"{name}_uncertainty", 1)] if name in spreads else [])
    yield _lines([head])
    for table in tables:
        for block in _blocks(table):
            found = {each.name: pair for each, pair in zip(table.columns, block, strict=True)}
            rows = block[0][0].size
            cells: list[list[str]] = [[table.owner] * rows] if several else []
            for name in names:
                values, spread = found.get(name, (np.full(rows, np.nan), None))
                cells.append(_texts(values))
                if name in spreads:
                    cells.append(_texts(np.full(rows, np.nan) if spread is None else spread))
            yield _lines(zip(*cells, strict=True))


def _texts(values: FloatArray) -> list[str]:
    """The shortest decimals that read back as the same numbers."""
    return [repr(each) if math.isfinite(each) else "" for each in values.tolist()]


def _lines(rows: Sequence[Sequence[str]] | Iterator[Sequence[str]]) -> str:
    stream = io.StringIO(newline="")
    csv.writer(stream, lineterminator="\r\n").writerows(rows)
    return stream.getvalue()


def _comments(drawn: Chart, tables: Sequence[_Table]) -> Iterator[str]:
    """What the numbers are. Names, addresses, units and digests only: nothing that a spreadsheet could take for a formula."""
    yield f"rows that the archive holds of {' and '.join(table.owner for table in tables)}"
    if drawn.view is not None:
        yield f"view: {drawn.across.name} from {drawn.view[0]:.10g} to {drawn.view[1]:.10g}"
    for table in tables:
        for each in table.columns:
            column = each.column
            said = [
                f"{each.name}: {column.address}" if not column.counts else f"{each.name}: number of the row"
            ]
            said += [f"on {column.scale}"] if column.scale else []
            said += [column.convention] if column.convention else []
            said += ["seconds since 1970-01-01T00:00:00Z"] if column.kind == "instant" else []
            said += [f"stored in {column.unit}"] if each.factor != 1.0 else []
            said += [f"sha256 {column.digest}"] if column.digest else []
            yield "; ".join(said)
    yield "columns NAME_uncertainty: standard uncertainty, coverage factor 1"


def hdf5_file(source: LabSource, asked: Asked, path: Path) -> None:
    """Write what a chart shows as an HDF5 file that describes itself, laid out like a sealed file.

    Parameters
    ----------
    source : LabSource
    asked : Asked
    path : Path
        Where nothing lies yet.

    Raises
    ------
    UnknownAddress, BadRequest
        As `archive.lab.curves.chart.chart`.
    """
    drawn, tables = _tables(source, asked)
    writer = SealedWriter(path, drawn.address)
    try:
        for number, table in enumerate(tables, 1):
            spreads = _with_spread(table)
            columns = [
                made
                for each, has in zip(table.columns, spreads, strict=True)
                for made in _declared(each, has=has)
            ]
            group = writer.table(f"shown/{number:02d}", columns, index=table.columns[0].name)
            for block in _blocks(table):
                filled = {}
                for each, has, (values, spread) in zip(table.columns, spreads, block, strict=True):
                    filled[each.name] = values
                    if has:
                        filled[f"{each.name}_uncertainty"] = (
                            np.full(values.size, np.nan) if spread is None else spread
                        )
                group.append(filled)
        writer.document(json.dumps(_told(drawn, tables), indent=1))
        writer.finish()
    finally:
        writer.close()


def _declared(each: _Taken, *, has: bool) -> Iterator[Column]:
    column = each.column
    unit = "s" if column.kind == "instant" else each.unit
    code = ucum(unit) if unit else ""
    yield Column(each.name, "float64", unit, code, column.kind, column.description)
    if has:
        yield Column(
            f"{each.name}_uncertainty", "float64", unit, code, column.kind,
            f"standard uncertainty of {each.name}, coverage factor 1", each.name,
        )  # fmt: skip


def _told(drawn: Chart, tables: Sequence[_Table]) -> dict[str, object]:
    return {
        "format": "stillroom-shown/1",
        "view": None if drawn.view is None else {"axis": drawn.across.name, "from": drawn.view[0], "to": drawn.view[1]},
        "told": list(drawn.told),
        "tables": [
            {
                "path": f"shown/{number:02d}",
                "of": table.owner,
                "columns": [
                    {
                        "name": each.name, "address": each.column.address, "sha256_of_all_rows": each.column.digest or None,
                        "scale": each.column.scale, "convention": each.column.convention, "stored_unit": each.column.unit,
                    }
                    for each in table.columns
                ],
            }
            for number, table in enumerate(tables, 1)
        ],
    }  # fmt: skip

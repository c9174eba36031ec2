"""Lists of sweeps: as a table, as JSON, as CSV."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from archive.commands.machine import Cell, quantity, write_csv, write_json
from archive.commands.numbers import readable, shown_number
from archive.commands.terminal import say, table, wide_output

if TYPE_CHECKING:
    from archive.index import SweepResult, SweepRow

__all__ = ["say_sweeps", "write_sweeps_csv", "write_sweeps_json"]

# Coverage is shown as this trade reads it; SI in JSON and CSV.
_UMOL = 1e6


def say_sweeps(rows: Sequence[SweepRow]) -> None:
    """Write a table of sweeps, and how many there are."""
    wide = wide_output()
    columns = ["sweep", "kind", *(("begin", "cell") if wide else ()), "umol/m^2", "K", "results"]
    marked = any(_marks(row) for row in rows)
    columns += ["mark"] if marked else []
    if rows:
        lines = (_line(row, wide=wide) + ([_marks(row)] if marked else []) for row in rows)
        table(columns, lines, right=("umol/m^2", "K"))
    say(f"{len(rows) or 'No'} sweep{'' if len(rows) == 1 else 's'}.")


def _line(row: SweepRow, *, wide: bool) -> list[str | tuple[str, ...]]:
    more = (row.begin.strftime("%Y-%m-%d") if row.begin is not None else "-", row.cell or "-")
    return [
        row.address,
        row.kind,
        *(more if wide else ()),
        "empty" if row.empty_cell else _coverage(row),
        _temperatures(row),
        tuple(_result(result) for result in row.results[:3]),
    ]


def _marks(row: SweepRow) -> tuple[str, ...]:
    """What was said of a sweep after it was sealed."""
    marks = [f"WITHDRAWN: {row.withdrawn}"] if row.withdrawn else []
    marks += [f"amended by {', '.join(row.amended)}"] if row.amended else []
    marks += [f"{each} RESTS ON SOMETHING WITHDRAWN" for each in row.flagged]
    return tuple(marks)


def _coverage(row: SweepRow) -> str:
    if row.coverage is None:
        return "-"
    spread = None if row.coverage_uncertainty is None else row.coverage_uncertainty * _UMOL
    return shown_number(row.coverage * _UMOL, spread)


def _temperatures(row: SweepRow) -> str:
    ends = [f"{end:.4g}" for end in (row.temperature_low, row.temperature_high) if end is not None]
    return "-" if not ends else "-".join(dict.fromkeys(ends))


def _result(result: SweepResult) -> str:
    return f"{result.name} = {result.verdict or readable(result.value, result.uncertainty, result.unit)}"


def write_sweeps_json(rows: Sequence[SweepRow]) -> None:
    """Write sweeps as a JSON list."""
    write_json([_content(row) for row in rows])


def _content(row: SweepRow) -> dict[str, Any]:
    return {
        "address": row.address,
        "cooldown": row.cooldown,
        "name": row.name,
        "kind": row.kind,
        "accession": row.accession,
        "cell": row.cell,
        "substrate": row.substrate,
        "sample": row.sample,
        "empty_cell": row.empty_cell,
        "after_dose": row.after_dose,
        "begin": row.begin,
        "end": row.end,
        "direction": row.direction,
        "rows": row.rows,
        "coverage": quantity(row.coverage, row.coverage_uncertainty, "mol/m^2"),
        "temperature_low": quantity(row.temperature_low, None, "K", scale=row.scale),
        "temperature_high": quantity(row.temperature_high, None, "K", scale=row.scale),
        "thermometers": row.thermometers,
        "channels": row.channels,
        "results": {
            result.name: {
                "value": result.value,
                "uncertainty": result.uncertainty,
                "unit": result.unit,
                **({"verdict": result.verdict} if result.verdict else {}),
            }
            for result in row.results
        },
        "withdrawn": row.withdrawn,
        "amended_by": row.amended,
        "rests_on_withdrawn": row.flagged,
    }


def write_sweeps_csv(rows: Sequence[SweepRow]) -> None:
    """Write sweeps as CSV, each result that occurs in two columns: value and standard uncertainty, in its unit."""
    found = list(dict.fromkeys((result.name, result.unit) for row in rows for result in row.results))
    header = [
        "address", "cooldown", "kind", "cell", "substrate", "sample", "empty_cell", "begin", "end", "rows",
        "coverage (mol/m^2)", "u(coverage) (mol/m^2)", "temperature_low (K)", "temperature_high (K)", "scale",
        *(("mark",) if any(_marks(row) for row in rows) else ()),
        *(text for name, unit in found for text in (f"{name} ({unit})", f"u({name}) ({unit})")),
    ]  # fmt: skip
    marked = "mark" in header
    write_csv(header, (_cells(row, found, marked=marked) for row in rows))


def _cells(row: SweepRow, found: Sequence[tuple[str, str]], *, marked: bool) -> list[Cell]:
    results = {(result.name, result.unit): result for result in row.results}
    cells: list[Cell] = [
        row.address, row.cooldown, row.kind, row.cell, row.substrate, row.sample, row.empty_cell, row.begin, row.end,
        row.rows, row.coverage, row.coverage_uncertainty, row.temperature_low, row.temperature_high, row.scale,
        *(("; ".join(_marks(row)),) if marked else ()),
    ]  # fmt: skip
    for key in found:
        result = results.get(key)
        cells += [None, None] if result is None else [result.verdict or result.value, result.uncertainty]
    return cells

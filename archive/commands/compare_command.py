"""`stillroom compare`: two reductions side by side."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from archive.commands import opening
from archive.commands.machine import write_json
from archive.commands.numbers import readable, shown_number
from archive.commands.opening import archive_option, json_option, require_address
from archive.commands.terminal import Progress, say, table
from archive.errors import BadRequest

if TYPE_CHECKING:
    from archive.lab.comparing import ArrayChange, Comparison, ResultChange

__all__ = ["compare"]


@click.command(short_help="Set two reductions side by side.")
@click.argument("first")
@click.argument("second")
@click.option(
    "-o", "--output", "target", type=click.Path(dir_okay=False, path_type=Path), metavar="FILE",
    help="Write a figure of both, as .pdf or .svg.",
)  # fmt: skip
@archive_option
@json_option
def compare(*, first: str, second: str, target: Path | None, archive_dir: Path | None, as_json: bool) -> None:
    """Set two reductions side by side: parameters, inputs, results with the significance of each change, arrays.

    What both results share is counted once in the uncertainty of a change.

    \b
    Examples:
      stillroom compare 2026-03/s017@film-transition.1 2026-03/s017@film-transition.2
      stillroom compare 2025-03/s006@film-transition.1 2026-03/s017@film-transition.1 -o both.pdf
    """
    require_address(first)
    require_address(second)
    if target is not None and target.suffix not in (".pdf", ".svg"):
        raise BadRequest(
            "a figure cannot be written so", file=str(target), expected="a name that ends in .pdf or .svg"
        )
    with opening.open_archive(archive_dir) as lab, Progress("comparing"):
        found = lab.compare(first, second)
        if target is not None:
            figure = lab.compare_figure(found, kind=target.suffix[1:])
            lab.write_reports({target.name: figure}, target.parent, of=[first, second])
            opening.say_notices(lab)
    if as_json:
        write_json(found)
        return
    _say(found)
    if target is not None:
        say(str(target))


def _say(found: Comparison) -> None:
    plans = found.plans[0] if found.plans[0] == found.plans[1] else f"{found.plans[0]} and {found.plans[1]}"
    data = "the same raw bytes" if found.same_data else "different raw bytes"
    say(f"{found.first} and {found.second}: by {plans}, from {data}.")
    _say_differences(found)
    say()
    table(
        ("result", "first", "second", "change", "in its u", "remark"),
        [_result(each) for each in found.results],
        right=("in its u",),
    )
    if found.arrays:
        say()
        table(
            ("array", "rows", "largest difference", "relative", "at row", "remark"),
            [_array(each) for each in found.arrays],
            right=("relative", "at row"),
        )


def _say_differences(found: Comparison) -> None:
    if found.parameters:
        say()
        table(
            ("step", "parameter", "first", "second"),
            [(each.step, each.parameter, _text(each.first), _text(each.second)) for each in found.parameters],
        )
    if found.inputs:
        say()
        table(
            ("input", "first", "second", "bytes"),
            [
                (each.role, each.first or "-", each.second or "-", "equal" if each.same_bytes else "differ")
                for each in found.inputs
            ],
        )
    if not found.parameters and not found.inputs:
        say("Steps, parameters and inputs are the same.")
    for name, (before, after) in found.software.items():
        say(f"{name}: {before} and {after}.")


def _text(value: Any) -> str:
    return "-" if value is None else str(value)


def _result(each: ResultChange) -> tuple[str, ...]:
    change = "-" if each.change is None else readable(each.change, each.change_uncertainty, each.unit)
    first, second = (
        "-" if value is None else readable(value, u, each.unit)
        for value, u in ((each.first, each.first_uncertainty), (each.second, each.second_uncertainty))
    )
    return (
        each.name,
        first,
        second,
        "0" if each.change == 0 else change,
        "-" if each.significance is None else f"{each.significance:+.2f}",
        each.remark,
    )


def _array(each: ArrayChange) -> tuple[str, ...]:
    rows = (
        str(each.rows[0]) if each.rows[0] == each.rows[1] else f"{_text(each.rows[0])}, {_text(each.rows[1])}"
    )
    far = "-" if each.largest is None else f"{shown_number(each.largest)} {each.unit}".removesuffix(" 1")
    return (
        each.name,
        rows,
        "0" if each.largest == 0 else far,
        "-" if not each.relative else f"{each.relative:.2g}",
        _text(each.at_row),
        each.remark,
    )

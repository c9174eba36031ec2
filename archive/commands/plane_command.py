"""`stillroom plane`: coverage against temperature as a figure for a talk or the wall."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import click

from archive.commands import opening
from archive.commands.machine import quantity, write_json
from archive.commands.opening import archive_option, json_option
from archive.commands.search_command import option_of
from archive.commands.terminal import Progress, say
from archive.errors import BadRequest
from schemas.search_fields import SEARCH_FIELDS

if TYPE_CHECKING:
    from archive.reports.plane_view import Bar, PlaneView, Strip, Window

__all__ = ["plane"]

# The ranges of a search are the sides of the picture here, and its order is that of the plane.
_FILTERS: Final = tuple(
    field for field in SEARCH_FIELDS if field.form not in ("words", "range", "flag") and field.name != "sort"
)
_AXES: Final = ("coverage", "pressure", "cell")
_STATES: Final = ("any", "reduced", "not reduced", "stale", "withdrawn")


def _filters(function: Callable[..., Any]) -> Callable[..., Any]:
    for field in reversed(_FILTERS):
        function = option_of(field)(function)
    return function


@click.command(short_help="Draw all sweeps over temperature.")
@click.option(
    "-o", "--output", "target", type=click.Path(dir_okay=False, path_type=Path), metavar="FILE",
    help="Where to write the figure, as .pdf or .svg.",
)  # fmt: skip
@click.option("--axis", type=click.Choice(_AXES), default="coverage", show_default=True, help="What stands against temperature.")  # fmt: skip
@click.option("--state", type=click.Choice(_STATES), default="any", show_default=True, help="Sweeps by their state; withdrawn ones only if asked for.")  # fmt: skip
@click.option(
    "--temperature", metavar="RANGE", help='Temperatures to show, such as "0:1 K"; with the other side.'
)
@click.option("--coverage", metavar="RANGE", help='Coverages to show, such as "20:40 umol/m^2".')
@click.option("--pressure", metavar="RANGE", help='Pressures to show, such as "1:100 kPa".')
@click.option("--lanes", metavar="RANGE", help="Lanes of cells to show, counted from below.")
@_filters
@archive_option
@json_option
def plane(
    *,
    target: Path | None,
    axis: Any,
    state: Any,
    temperature: str | None,
    archive_dir: Path | None,
    as_json: bool,
    **asked: Any,
) -> None:
    """Draw every sweep as a bar over its temperatures, at its coverage, with the transitions that were found.

    Broken lines are the universal jump above each cell's inert layer. For bulk and porous systems, take the pressure or the cell as
    the axis. What the picture leaves out is told.

    \b
    Examples:
      stillroom plane -o plane.pdf
      stillroom plane --cell TO-4 --temperature "0:1 K" --coverage "25:40 umol/m^2" -o films.svg
      stillroom plane --axis cell --since 2026-01-01 -o year.pdf
    """
    if target is None and not as_json:
        raise click.UsageError("name a file with -o, or ask for the numbers with --json")
    if target is not None and target.suffix not in (".pdf", ".svg"):
        raise BadRequest(
            "a figure cannot be written so", file=str(target), expected="a name that ends in .pdf or .svg"
        )
    from archive.lab.asking import search_query
    from archive.lab.plane_asking import HEIGHTS, plane_window
    from archive.reports.plane_remarks import line_remarks, remarks

    ranges = {field: asked.pop(field) for field in HEIGHTS.values()}
    for field, text in ranges.items():
        if text is not None and field != HEIGHTS[axis]:
            raise BadRequest(f"with --axis {axis} the other side is --{HEIGHTS[axis]}", field=f"--{field}")
    window = plane_window(axis, temperature=temperature, height=ranges[HEIGHTS[axis]], spelt="--{}".format)
    with opening.open_archive(archive_dir) as lab, Progress("drawing"):
        query = search_query(lab, asked, spelt="--{}".format)
        view = lab.plane(query, axis=axis, state=state, window=window)
        if target is not None:
            lab.write_reports({target.name: lab.plane_figure(view, kind=target.suffix[1:])}, target.parent)
    if as_json:
        write_json(_content(view))
        return
    for sentence in (*remarks(view), *line_remarks(view)):
        say(sentence)
    say(str(target))


def _content(view: PlaneView) -> dict[str, Any]:
    """What is on the plane, for programs; heights are coverages or pressures, or numbers of lanes."""
    unit = {"coverage": "mol/m^2", "pressure": "Pa"}.get(view.axis, "1")

    def reach(each: Bar | Strip | Window) -> dict[str, Any]:
        ends = {"temperature_low": each.cold, "temperature_high": each.warm}
        found = {name: quantity(value, None, "K") for name, value in ends.items()}
        return found | {"low": quantity(each.bottom, None, unit), "high": quantity(each.top, None, unit)}

    return {
        "axis": view.axis,
        "window": reach(view.window),
        "sweeps": view.sweeps,
        "outside": view.outside,
        "unplaced": dict(view.unplaced),
        "bars": [
            {"address": bar.address, "kind": bar.kind, "cell": bar.cell, "begin": bar.begin, **reach(bar), "uncertainty": quantity(bar.uncertainty, None, unit), "marks": bar.marks}
            for bar in view.bars
        ],
        "strips": [{"cell": strip.cell, "sweeps": strip.count, **reach(strip)} for strip in view.strips],
        "transitions": [
            {
                "address": point.address, "cell": point.cell, "temperature": quantity(point.temperature, point.temperature_uncertainty, "K"),
                "height": quantity(point.height, point.height_uncertainty, unit),
            }
            for point in view.points
        ],
        "lines": [
            {"cell": line.cell, "inert": quantity(line.inert, line.inert_uncertainty, "mol/m^2"), "source": line.source}
            for line in view.lines
        ],
    }  # fmt: skip

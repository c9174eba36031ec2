"""`stillroom search`: sweeps by what they are, and by what was found in them."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any, Final

import click
from typing_extensions import override

from archive.commands import opening
from archive.commands.joined_units import joined_units
from archive.commands.opening import archive_option, json_option
from archive.commands.sweep_lists import say_sweeps, write_sweeps_csv, write_sweeps_json
from archive.commands.terminal import note, say
from archive.commands.terminal_plot import say_plot
from schemas.layers import LAYER_WORDS
from schemas.search_fields import SEARCH_FIELDS, SearchField

__all__ = ["option_of", "search"]

_PLOTTED: Final = 6
# Lines with points of each of several plots.
_LINES: Final = 7
_RANGES: Final = frozenset(f"--{each.name}" for each in SEARCH_FIELDS if each.form in ("range", "result"))
_METAVARS: Final = {
    "range": "RANGE",
    "result": "NAME=RANGE",
    "name": "NAME",
    "moment": "TIME",
}


def option_of(field: SearchField) -> Callable[[Callable[..., Any]], Callable[..., Any]]:
    """Option of the command line for a field of a search; words are an argument."""
    if field.form == "words":
        return click.argument(field.name, nargs=-1)
    if field.form == "either":
        yes, no = field.choices
        return click.option(f"--{yes}/--{no}", field.name, default=None, help=field.help)
    if field.form == "flag":
        return click.option(f"--{field.name}", is_flag=True, help=field.help)
    if field.form == "choice":
        default = field.default or None
        return click.option(
            f"--{field.name}", type=click.Choice(field.choices), help=field.help, default=default, show_default=bool(default),
            metavar=None if default else field.name.upper(),
        )  # fmt: skip
    metavar = "SCALE" if field.name == "scale" else "PLAN" if field.name == "plan" else _METAVARS[field.form]
    return click.option(f"--{field.name}", metavar=metavar, multiple=field.several, help=field.help)


def _every_field(function: Callable[..., Any]) -> Callable[..., Any]:
    for field in reversed(SEARCH_FIELDS):
        function = option_of(field)(function)
    return function


class _SearchCommand(click.Command):
    """Command whose ranges may be followed by their unit as a word of its own."""

    @override
    def parse_args(self, ctx: click.Context, args: list[str]) -> list[str]:
        return super().parse_args(ctx, joined_units(args, _RANGES, _is_unit))


def _is_unit(word: str) -> bool:
    from schemas.units import parse_unit

    if word in LAYER_WORDS:
        return True
    try:
        return parse_unit(word).text != "1"
    except ValueError:
        return False


@click.command(cls=_SearchCommand, short_help="Find sweeps.")
@_every_field
@click.option("--limit", type=click.IntRange(min=1), default=200, show_default=True, help="At most so many.")
@click.option("--offset", type=click.IntRange(min=0), default=0, help="After so many left out.")
@click.option("--csv", "as_csv", is_flag=True, help="Write CSV, with units in the header.")
@click.option("--plot", is_flag=True, help=f"Draw small plots of the first {_PLOTTED} sweeps, as recorded.")
@archive_option
@json_option
def search(
    *,
    words: tuple[str, ...],
    limit: int,
    offset: int,
    as_csv: bool,
    plot: bool,
    as_json: bool,
    archive_dir: Path | None,
    **asked: Any,
) -> None:
    """Find sweeps; everything that is given must hold. WORDS are looked for in names, notes and descriptions.

    A range is LOW:HIGH with a unit, ends included; one end may be left open ("20: umol/m^2").

    \b
    Examples:
      stillroom search --coverage "20:35 umol/m^2" --cell TO-4
      stillroom search --coverage "2:3 layers" --substrate PI-2200
      stillroom search --result "T_KT=0.4:0.6 K" --sort coverage
      stillroom search polyimide --kind temperature-sweep --since 2026-01-01 --csv
    """
    if as_csv and as_json:
        raise click.UsageError("--csv and --json exclude each other")
    if plot and (as_csv or as_json):
        raise click.UsageError("--plot goes with the table only, not with --csv or --json")
    from archive.lab.asking import search_query

    with opening.open_archive(archive_dir) as lab:
        # One more than is shown, to know whether there are more.
        asked["words"] = " ".join(words)
        query = search_query(lab, asked, spelt=lambda name: f"--{name}", limit=limit + 1, offset=offset)
        found = lab.search(query)
        views = [lab.sweep(row.address) for row in found[: min(limit, _PLOTTED)]] if plot else []
    more, rows = len(found) > limit, found[:limit]
    if as_json:
        write_sweeps_json(rows)
    elif as_csv:
        write_sweeps_csv(rows)
    else:
        say_sweeps(rows)
        for view in views:
            say()
            say_plot(view, height=_LINES)
    if more:
        note(f"note: only the first {limit} are listed; ask for more with --limit or --offset")

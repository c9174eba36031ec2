"""`stillroom search`: sweeps by what they are, and by what was found in them."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import click
from typing_extensions import override

from archive.commands import opening
from archive.commands.failures import told
from archive.commands.layers import LAYER_WORDS, NO_SUBSTRATE, layer_of
from archive.commands.opening import archive_option, json_option
from archive.commands.sweep_lists import say_sweeps, write_sweeps_csv, write_sweeps_json
from archive.commands.terminal import note, say
from archive.commands.terminal_plot import say_plot
from archive.errors import BadRequest
from schemas.ranges import Bounds, joined_units, named_range, point_in_time, si_bounds

if TYPE_CHECKING:
    from archive.index import ResultCondition, SearchQuery
    from archive.lab import Archive

__all__ = ["SWEEP_KINDS", "search"]

SWEEP_KINDS: Final = (
    "temperature-sweep",
    "dose-run",
    "drive-sweep",
    "frequency-sweep",
    "ringdown",
    "pulse-response",
    "drive-pulse",
    "isotherm",
    "heat-capacity",
    "persistent-current",
    "calibration",
    "log",
)
"""The kinds of `schemas.sweep`, written out here so that the help needs no schemas."""

_PLOTTED: Final = 6
# Lines with points of each of several plots.
_LINES: Final = 7
_RANGES: Final = frozenset({"--coverage", "--temperature", "--result"})


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
@click.argument("words", nargs=-1)
@click.option(
    "--coverage",
    metavar="RANGE",
    help='Coverage during the sweep, such as "20:35 umol/m^2"; any coverage unit.',
)
@click.option(
    "--temperature", metavar="RANGE", help='Temperatures that the sweep reaches into, such as "0.4:0.8 K".'
)
@click.option("--result", "results", metavar="NAME=RANGE", multiple=True,
              help='A result of the newest reductions, such as "T_KT=0.4:0.6 K"; the name alone: it is there. Repeatable.')  # fmt: skip
@click.option("--cell", metavar="NAME", help="Cell, by name (all revisions) or address (TO-4.r2).")
@click.option(
    "--substrate", metavar="NAME", help="Substrate, by name or address; also what layers are counted on."
)
@click.option("--sample", metavar="NAME", help="Gas, by name or address.")
@click.option("--thermometer", metavar="NAME", help="Thermometer, by name or address.")
@click.option("--scale", metavar="SCALE", help="Temperature scale, such as PLTS-2000.")
@click.option(
    "--kind", type=click.Choice(SWEEP_KINDS), metavar="KIND", help=f"Kind of sweep: {', '.join(SWEEP_KINDS)}."
)
@click.option("--plan", metavar="PLAN", help="Plan that a reduction of the sweep followed.")
@click.option("--cooldown", metavar="NAME", help="Only this cooldown.")
@click.option(
    "--empty-cell/--with-gas", "empty_cell", default=None, help="Only runs of the empty cell, or only others."
)
@click.option(
    "--since", metavar="TIME", help="Sweeps that end at or after a date (from midnight UTC) or RFC 3339 time."
)
@click.option(
    "--until", metavar="TIME", help="Sweeps that begin at or before it; a date alone counts to its end."
)
@click.option("--sort", type=click.Choice(["date", "coverage", "temperature", "cell", "name"]), default="date",
              show_default=True, help="Order of the list.")  # fmt: skip
@click.option("--descending", is_flag=True, help="Largest, or latest, first.")
@click.option("--withdrawn", is_flag=True, help="Withdrawn sweeps too, marked.")
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
    with opening.open_archive(archive_dir) as lab:
        # One more than is shown, to know whether there are more.
        found = lab.search(_query(lab, words, limit + 1, asked))
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


def _query(lab: Archive, words: tuple[str, ...], limit: int, asked: dict[str, Any]) -> SearchQuery:
    from archive.index import SearchQuery

    given = dict(asked)
    for name in ("since", "until"):
        if given[name] is not None:
            with told(f"--{name}"):
                given[name] = point_in_time(given[name], end_of_day=name == "until")
    if given["coverage"] is not None:
        given["coverage"] = _coverage(lab, given["coverage"], given["substrate"])
    if given["temperature"] is not None:
        with told("--temperature"):
            given["temperature"] = _bounds(given["temperature"], "temperature")
    results = tuple(_condition(lab, text) for text in given.pop("results"))
    return SearchQuery(results=results, text=" ".join(words) or None, limit=limit, **given)


def _bounds(text: str, kind: str) -> Bounds:
    return si_bounds(text, lambda number, unit: _si(number, unit, kind))


def _si(number: str, unit: str, kind: str) -> float:
    from schemas.quantity import Quantity

    quantity = Quantity.parse(f"{number} {unit}".strip(), kind)
    if quantity.scale is not None:
        raise ValueError(
            f"found a scale behind the range; temperatures are compared as numbers, each on its own scale: "
            f"leave it out, or choose sweeps by --scale {quantity.scale}"
        )
    return quantity.si


def _coverage(lab: Archive, text: str, substrate: str | None) -> Bounds:
    def to_si(number: str, unit: str) -> float:
        if unit not in LAYER_WORDS:
            return _si(number, unit, "coverage")
        if substrate is None:
            raise ValueError(NO_SUBSTRATE)
        return _si(number, "", "number") * layer_of(substrate, lab).coverage.si

    with told("--coverage"):
        return si_bounds(text, to_si)


def _condition(lab: Archive, text: str) -> ResultCondition:
    from archive.index import ResultCondition

    with told("--result"):
        name, bounds = named_range(text)
    known = {row.quantity for row in lab.results(name)}
    if not known:
        others = ", ".join(sorted({row.name for row in lab.results()})) or "none yet"
        raise BadRequest(
            f"no reduction here has a result {name}", field="--result", expected=f"one of: {others}"
        )
    if bounds is None:
        return ResultCondition(name)
    if len(known) > 1:
        raise BadRequest(
            f"{name} is not the same quantity in all reductions ({', '.join(sorted(known))})", field="--result",
            remedy="narrow the search with --plan and look at the list",
        )  # fmt: skip
    with told("--result"):
        return ResultCondition(name, *_bounds(bounds, known.pop()))

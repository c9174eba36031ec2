"""Commands on one address: show it, trace it, compute it again."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from archive.commands import opening
from archive.commands.describing import describe
from archive.commands.failures import EXIT_WARNINGS
from archive.commands.machine import plain, write_json
from archive.commands.opening import archive_option, jobs_option, json_option, require_address, strict_option
from archive.commands.terminal import Progress, clean, draw, say
from archive.commands.terminal_plot import say_plot, view_of
from archive.commands.uncertainty_tables import say_budget, say_monte_carlo
from archive.errors import EXIT_BAD_INPUT, EXIT_DAMAGE, ArchiveError, BadRequest

if TYPE_CHECKING:
    from rich.tree import Tree

    from archive.lab import ReplayReport
    from archive.reduction.trace import TraceNode

__all__ = ["replay", "show", "trace"]


@click.command(short_help="Show whatever has an address.")
@click.argument("address")
@click.option(
    "--plot", is_flag=True, help="Draw a small plot of a sweep, channel or reduction behind the text."
)
@archive_option
@json_option
def show(*, address: str, plot: bool, archive_dir: Path | None, as_json: bool) -> None:
    """Show everything the archive knows of whatever has ADDRESS.

    \b
    Examples:
      stillroom show 2026-03                              a cooldown
      stillroom show 2026-03/s017                         a sweep, or a dose
      stillroom show --plot 2026-03/s017#period           a channel, drawn
      stillroom show 2026-03/s017@film-transition.2       a reduction
      stillroom show 2026-03/s017@film-transition.2#T_KT  a result
      stillroom show TO-4.r2                              a record, or a plan
      stillroom show 2026-03.a1:raw/ts05.csv              a raw file
    """
    if plot and as_json:
        raise click.UsageError("--plot and --json exclude each other")
    with opening.open_archive(archive_dir) as lab:
        content = lab.show(address)
        drawn = view_of(lab, address) if plot else None
    if as_json:
        write_json(content)
        return
    run = content.pop("monte_carlo", None)
    rows = content.pop("budget", None)
    describe({**content, "sources": None, "shared": None} if rows else content)
    if rows:
        say_budget({**content, "budget": rows})
    if run is not None:
        entries = content["outputs"] if content["what"] == "reduction" else [content]
        say_monte_carlo(run, {each["name"]: each for each in entries})
    if drawn is not None:
        say()
        say_plot(*drawn)


@click.command(short_help="Trace a number down to raw bytes, or what rests on it.")
@click.argument("address")
@click.option("--forward", is_flag=True, help="Show all that rests on ADDRESS instead of what it rests on.")
@click.option(
    "--svg",
    "picture",
    type=click.Path(dir_okay=False, path_type=Path),
    help="Write the lineage as a picture.",
)
@archive_option
@json_option
def trace(
    *, address: str, forward: bool, picture: Path | None, archive_dir: Path | None, as_json: bool
) -> None:
    """Trace a result, array, sentence or figure down to raw files, their digests and lines; or forwards.

    ADDRESS is anything that `stillroom show` knows; the mark behind a sentence or figure of an appendix, with the folder of
    the appendix before it; a step as an appendix cites it, or the whole comment above a sentence; or the file of a figure
    beside its appendix.json.

    \b
    Examples:
      stillroom trace 2026-03/s017@film-transition.2#T_KT
      stillroom trace "2026-03/s017@film-transition.2 step 4"
      stillroom trace "thesis/appendix#s17"
      stillroom trace appendix/figures/background-2026-03-s001.pdf
      stillroom trace --forward RX-2-cal.r1
      stillroom trace --forward 2026-03.a1:raw/ts05.csv --svg what-rests-on-it.svg
    """
    from archive.lab.cited import is_mark, parts_of

    # What is pasted out of an appendix is told apart there; anything else must be an address.
    pasted = (
        address.endswith((".pdf", ".png", ".svg")) or address.lstrip().startswith("%") or is_mark(address)
    )
    if forward or not pasted:
        for part in [address] if forward else parts_of(address) or [address]:
            require_address(part.partition(" step ")[0])
    with opening.open_archive(archive_dir) as lab, Progress("tracing"):
        node = lab.trace(address, forward=forward)
    if picture is not None:
        from archive.reports.lineage_graph import trace_graph
        from archive.store.durable import write_whole

        write_whole(picture, trace_graph(node, forwards=forward).encode(), replace=True)
        if not as_json:
            say(str(picture))
            return
    if as_json:
        write_json(node.to_dict())
        return
    if forward and not node.children:
        say(f"Nothing in this archive rests on {address}.")
        return
    draw(_tree(node))


def _tree(node: TraceNode, above: Tree | None = None) -> Tree:
    from rich.text import Text
    from rich.tree import Tree

    label = Text(clean(node.label))
    tree = Tree(label) if above is None else above.add(label)
    for child in node.children:
        _tree(child, tree)
    return tree


@click.command(short_help="Compute a reduction again and compare.")
@click.argument("address", required=False)
@click.option("--all", "everything", is_flag=True, help="Compute every reduction of the archive again.")
@click.option(
    "--within",
    "fraction",
    type=click.FloatRange(min=0),
    default=0.1,
    show_default=True,
    metavar="FRACTION",
    help="How far a result may move, as a fraction of its standard uncertainty.",
)
@jobs_option
@archive_option
@json_option
@strict_option
def replay(
    *,
    address: str | None,
    everything: bool,
    fraction: float,
    jobs: int,
    executor: str | None,
    archive_dir: Path | None,
    as_json: bool,
    strict: bool,
) -> None:
    """Compute a reduction again from raw bytes and compare every output with what was sealed. Nothing is stored.

    On the platform that made it every bit agrees; elsewhere the largest differences are told.

    \b
    Examples:
      stillroom replay 2026-03/s017@film-transition.2
      stillroom replay --all --within 0.01 --jobs 4

    Exit code: 3 if a result moves by more than FRACTION of its standard uncertainty, or is there no more; 2 if a reduction
    cannot be computed again; with --strict 1 if any output differs at all.
    """
    if everything == (address is not None):
        raise BadRequest(
            "nothing is asked for" if address is None else "an address and --all exclude each other",
            expected="one address such as 2026-03/s017@film-transition.2, or --all",
        )
    told: list[ReplayReport] = []
    failed: list[tuple[str, ArchiveError]] = []
    with opening.open_archive(archive_dir) as lab, Progress("computing again") as progress:
        if address is not None:
            require_address(address)
            told.append(lab.replay(address))
        else:
            for each, outcome in lab.replay_all(jobs=jobs, executor=executor, progress=progress.count):
                if isinstance(outcome, ArchiveError):
                    failed.append((each, outcome))
                else:
                    told.append(outcome)
    if as_json:
        content = [
            *map(plain, told),
            *({"address": each, "problem": str(problem)} for each, problem in failed),
        ]
        write_json(content if everything else content[0])
    else:
        _say_replays(told, failed, fraction, everything=everything)
    _leave(told, failed, fraction, strict=strict)


def _leave(
    told: list[ReplayReport], failed: list[tuple[str, ArchiveError]], fraction: float, *, strict: bool
) -> None:
    context = click.get_current_context()
    if any(report.moved(fraction) for report in told):
        context.exit(EXIT_DAMAGE)
    if failed:
        context.exit(EXIT_BAD_INPUT)
    if strict and not all(report.identical for report in told):
        context.exit(EXIT_WARNINGS)


def _say_replays(
    told: list[ReplayReport], failed: list[tuple[str, ArchiveError]], fraction: float, *, everything: bool
) -> None:
    for report in told:
        if report.identical:
            if not everything:
                drawn = ", and so is its Monte Carlo run" if report.monte_carlo_identical else ""
                say(
                    f"All {report.outputs} outputs of {report.address} are bit for bit what was sealed{drawn}."
                )
            continue
        say(f"Of {report.outputs} outputs of {report.address}, these differ from what was sealed:")
        beyond = report.moved(fraction)
        for name in sorted({*report.largest_difference, *report.shifts, *beyond}):
            mark = f"  more than {fraction:g} of it" if name in beyond else ""
            far = _how_far(report.largest_difference.get(name), report.shifts.get(name))
            say(f"  {name}{far}{mark}")
        if report.monte_carlo_identical is False:
            say("  the Monte Carlo run did not find the same")
        if report.changed_inputs:
            say(f"  inputs that are not as they were: {', '.join(report.changed_inputs)}")
        for name, (before, now) in report.changed_software.items():
            say(f"  {name} was {before}, is {now}")
    for address, problem in failed:
        say(f"{address} cannot be computed again: {problem}")
    if everything:
        same = sum(report.identical for report in told)
        total = len(told) + len(failed)
        rest = "" if same == total else f", {total - same} are not"
        say(f"Of {total} reductions, {same} are bit for bit what was sealed{rest}.")


def _how_far(relative: float | None, shift: float | None) -> str:
    told = [] if relative is None else [f"largest relative difference {relative:.2g}"]
    told += [] if shift is None else [f"shifted by {shift:.2g} of its standard uncertainty"]
    return f": {', '.join(told)}" if told else ""

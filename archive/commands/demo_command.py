"""`stillroom demo`: the whole way of the data on invented cooldowns."""

from __future__ import annotations

import shlex
from collections.abc import Callable
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING, Final

import click

from archive.commands.findings import counts
from archive.commands.reduce_commands import say_outcomes
from archive.commands.sweep_lists import say_sweeps
from archive.commands.terminal import Progress, note, say, styled
from archive.errors import EXIT_BAD_INPUT, BadRequest

if TYPE_CHECKING:
    from archive.lab import Archive

__all__ = ["demo"]

_DATA: Final = "cooldowns"
_ARCHIVE: Final = "archive"
_REPORTS: Final = "reports"
# What is searched for: a range of coverages (mol/m^2) that films of two cells share, and one cell.
_COVERAGES: Final = ("28:33 umol/m^2", 28e-6, 33e-6)
_CELL: Final = "TO-4"
_RESULT: Final = "T_KT"


@click.command(short_help="See it all work on invented data.")
@click.argument("folder", metavar="[DIR]", default="stillroom-demo", type=click.Path(path_type=Path))
def demo(*, folder: Path) -> None:
    """Show the whole way of the data on invented cooldowns: raw files, check, ingest, reduce, search, reports.

    Makes DIR (default ./stillroom-demo) with the raw data in DIR/cooldowns, an archive in DIR/archive and reports in
    DIR/reports. Laboratory and numbers are invented; the same every time. Takes a minute or two.

    \b
    Examples:
      stillroom demo
      stillroom demo ~/try-stillroom

    DIR must be new or empty.
    """
    _refuse_full(folder)
    problems = _run(folder)
    if problems:
        steps = "1 step" if problems == 1 else f"{problems} steps"
        note(f"{steps} of the demonstration failed, as told above")
        click.get_current_context().exit(EXIT_BAD_INPUT)


def _refuse_full(folder: Path) -> None:
    if not folder.exists() or (folder.is_dir() and not any(folder.iterdir())):
        return
    if (folder / _DATA).is_dir():
        raise BadRequest(
            "an earlier demonstration is here; it is left as it is",
            file=str(folder),
            remedy=f"look at it with: stillroom --archive {_quoted(folder / _ARCHIVE)} search; to run it afresh, name another "
            "folder, or remove this one yourself",
        )
    raise BadRequest("this folder is not empty", file=str(folder), remedy="name a new or an empty folder")


def _run(folder: Path) -> int:
    from archive.demo.scenario import make_folders
    from archive.lab import Archive

    folder.mkdir(parents=True, exist_ok=True)
    _head("Raw data of invented cooldowns")
    with Progress("making raw data"):
        cooldowns = make_folders(folder / _DATA)
    files = sum(each.is_file() for made in cooldowns for each in made.rglob("*"))
    say(f"  {len(cooldowns)} cooldowns, {files} files, in {folder / _DATA}")
    with Archive.create(folder / _ARCHIVE, name="Invented low-temperature group") as lab:
        problems = _take_in(lab, cooldowns) + _reduce(lab)
        _search(lab)
        problems += _report(lab, folder / _REPORTS)
        _close(lab, folder)
    return problems


def _head(text: str) -> None:
    say()
    click.echo(styled(text, "cyan", bold=True))


def _take_in(lab: Archive, cooldowns: list[Path]) -> int:
    _head("Check and ingest")
    refused = 0
    for made in cooldowns:
        with Progress(f"reading {made.name}") as progress:
            report = lab.check(made, progress=progress.sentence)
        with Progress(f"taking in {made.name}") as progress:
            outcome = lab.ingest(made, progress=progress.sentence)
        if outcome.address is None:
            refused += 1
            for finding in outcome.report.findings:
                if finding.severity == "error":
                    note(f"error: {finding.sentence()}")
        else:
            say(f"  {made.name}: {counts(report)}; {outcome.state} as {outcome.address}")
    say(f"  See what was found with: stillroom check {_quoted(cooldowns[0].parent / 'NAME')}")
    return refused


def _reduce(lab: Archive) -> int:
    problems = 0
    for row in lab.cooldowns():
        _head(f"Reduce {row.name}")
        with Progress(f"reducing {row.name}") as progress:
            outcomes = lab.reduce(row.name, progress=progress.sentence)
        say_outcomes(outcomes)
        problems += sum(outcome.problem is not None for outcome in outcomes)
    return problems


def _search(lab: Archive) -> None:
    from archive.index import SearchQuery

    text, low, high = _COVERAGES
    _head(f'Search by coverage: stillroom search --coverage "{text}"')
    say_sweeps(lab.search(SearchQuery(coverage=(low, high), sort="coverage")))
    _head(f"Search by cell: stillroom search --cell {_CELL} --kind temperature-sweep")
    say_sweeps(lab.search(SearchQuery(cell=_CELL, kind="temperature-sweep")))


def _report(lab: Archive, target: Path) -> int:
    from archive.errors import ArchiveError

    _head("Reports")
    problems = 0
    names = [row.name for row in lab.cooldowns()]
    jobs: list[tuple[str, Path, list[str], Callable[[], dict[str, bytes]]]] = [
        (f"run sheet of {name}", target, [name], partial(lab.run_sheet, name)) for name in names
    ]
    jobs.append(("methods appendix", target / "appendix", names, partial(lab.appendix, names)))
    made: dict[Path, list[str]] = {}
    for what, place, told, make in jobs:
        try:
            with Progress(what):
                written = lab.write_reports(make(), place, of=told)
        except ArchiveError as error:
            problems += 1
            note(f"{what}: {error}")
        else:
            made.setdefault(place, []).extend(path.relative_to(place).as_posix() for path in written)
    for place, files in made.items():
        what = f"run sheets of {len(names)} cooldowns" if place == target else "methods appendix"
        say(f"  {what}: {', '.join(files[:3])} and {len(files) - 3} more in {place}")
    return problems


def _close(lab: Archive, folder: Path) -> None:
    holds = lab.statistics()
    _head("What was made")
    say(f"  {folder / _DATA}: the raw data, with a sheet, cooldown.toml, in each folder")
    say(
        f"  {folder / _ARCHIVE}: the archive: {holds['accessions']} accessions, {holds['sweeps']} sweeps, "
        f"{holds['reductions']} reductions"
    )
    say(
        f"  {folder / _REPORTS}: run sheets (open the .html or .pdf) and the appendix (compile appendix-alone.tex)"
    )
    say()
    archive = _quoted(folder / _ARCHIVE)
    say("Look further:")
    # The transition temperature tells most about lineage; a demonstration without one still has other results.
    results = sorted((row for row in lab.results() if row.headline), key=lambda row: row.name != _RESULT)
    if results:
        address = f"{results[0].reduction}#{results[0].name}"
        say(f"  stillroom --archive {archive} show {address}")
        say(f"  stillroom --archive {archive} trace {address}")
        say(f"  stillroom --archive {archive} replay {results[0].reduction}")
    say(f"  stillroom --archive {archive} search --help")
    say(f"  stillroom --archive {archive} fixity")


def _quoted(path: Path) -> str:
    return shlex.quote(str(path)) if " " not in str(path) else f'"{path}"'

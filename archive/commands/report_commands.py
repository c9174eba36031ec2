"""Commands that make the two reports."""

from __future__ import annotations

from pathlib import Path

import click

from archive.commands import opening
from archive.commands.machine import write_json
from archive.commands.opening import archive_option, json_option, require_address
from archive.commands.terminal import Progress, say

__all__ = ["appendix", "run_sheet"]


@click.command("run-sheet", short_help="Write the run sheet of a cooldown.")
@click.argument("cooldown")
@click.option(
    "-o",
    "--output",
    "target",
    metavar="DIR",
    default=".",
    type=click.Path(path_type=Path),
    help="Folder; here if left out.",
)
@click.option(
    "--paper",
    type=click.Choice(["a4", "us-letter"]),
    default="a4",
    show_default=True,
    help="Paper of the PDF.",
)
@archive_option
@json_option
def run_sheet(*, cooldown: str, target: Path, paper: str, archive_dir: Path | None, as_json: bool) -> None:
    """Write the run sheet of COOLDOWN as HTML, PDF and JSON.

    It tells what was run, in what, with what gas and where that gas is; the thermometry, every finding and waiver, the
    reductions and their results. It holds nothing that the archive does not hold.

    \b
    Example:
      stillroom run-sheet 2026-03 -o reports
    """
    with opening.open_archive(archive_dir) as lab, Progress(f"run sheet of {cooldown}"):
        written = lab.write_reports(lab.run_sheet(cooldown, paper=paper), target, of=[cooldown])
        opening.say_notices(lab)
    _say_written(written, as_json=as_json)


@click.command(short_help="Write a methods appendix in LaTeX.")
@click.argument("addresses", metavar="ADDRESS...", nargs=-1, required=True)
@click.option(
    "-o", "--output", "target", metavar="DIR", required=True, type=click.Path(path_type=Path), help="Folder."
)
@click.option("--title", help="Title of the appendix.")
@click.option("--level", type=click.Choice(["chapter", "section", "subsection"]), default="section", show_default=True,
              help="Sectioning command that it begins with.")  # fmt: skip
@archive_option
@json_option
def appendix(
    *,
    addresses: tuple[str, ...],
    target: Path,
    title: str | None,
    level: str,
    archive_dir: Path | None,
    as_json: bool,
) -> None:
    """Write the methods appendix behind cooldowns, sweeps, reductions or results: LaTeX, bibliography, figures.

    \b
    Examples:
      stillroom appendix 2026-03/s017@film-transition.2 -o thesis/appendix
      stillroom appendix 2025-03 2026-02 -o thesis/appendix --level chapter

    Then in the thesis: \\input{appendix/appendix-preamble} before, \\input{appendix/appendix} where it belongs.
    """
    for address in addresses:
        require_address(address)
    with opening.open_archive(archive_dir) as lab, Progress("writing the appendix"):
        files = lab.appendix(addresses, title=title, level=level)
        written = lab.write_reports(files, target, of=addresses)
        opening.say_notices(lab)
    _say_written(written, as_json=as_json)


def _say_written(written: list[Path], *, as_json: bool) -> None:
    if as_json:
        write_json({"written": [str(path) for path in written]})
        return
    for path in written:
        say(str(path))

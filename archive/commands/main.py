"""`stillroom`: the command line.

Rules: a command turns arguments into calls of `archive.lab` and answers into text, and does nothing else; what is heavy
is imported inside the commands, so that `--help` answers at once.
"""

from __future__ import annotations

import os
import sys
from pathlib import Path
from typing import Final

import click
from typing_extensions import override

from archive import __version__
from archive.commands import (
    acts_commands,
    archive_commands,
    bench_commands,
    calibration_commands,
    compare_command,
    completion,
    demo_command,
    exchange_commands,
    intake_commands,
    keeping_commands,
    lineage_commands,
    plane_command,
    reduce_commands,
    report_commands,
    search_command,
    serve_command,
    tour_command,
)
from archive.commands.failures import EXIT_INTERRUPTED, GuardedGroup
from archive.commands.offered import offer
from archive.commands.terminal import note

__all__ = ["main", "stillroom"]

_COMMANDS: Final = (
    demo_command.demo,
    tour_command.tour,
    archive_commands.init,
    intake_commands.schema,
    intake_commands.draft,
    intake_commands.check,
    intake_commands.ingest,
    reduce_commands.plans,
    reduce_commands.reduce,
    acts_commands.stale,
    acts_commands.revise,
    acts_commands.amend,
    acts_commands.withdraw,
    search_command.search,
    plane_command.plane,
    serve_command.serve,
    lineage_commands.show,
    lineage_commands.trace,
    lineage_commands.replay,
    compare_command.compare,
    calibration_commands.calibration,
    calibration_commands.drift,
    report_commands.run_sheet,
    report_commands.appendix,
    archive_commands.journal,
    exchange_commands.prov,
    exchange_commands.export,
    exchange_commands.import_,
    archive_commands.fixity,
    archive_commands.rebuild_index,
    archive_commands.roles,
    keeping_commands.mirror,
    keeping_commands.mend,
    bench_commands.convert,
    bench_commands.helium,
    completion.completion,
)


class _InOrder(GuardedGroup):
    @override
    def list_commands(self, ctx: click.Context) -> list[str]:
        """Names in the order in which a laboratory meets them."""
        return list(self.commands)


@click.group(
    cls=_InOrder,
    name="stillroom",
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
    epilog="Exit codes: 0 fine; 1 warnings under --strict; 2 bad input, or findings of error level; 3 damage; "
    "4 busy, or not an archive.",
)
@click.version_option(__version__, prog_name="stillroom")
@click.option(
    "--archive",
    "archive_dir",
    type=click.Path(path_type=Path),
    metavar="DIR",
    help="The archive; else STILLROOM_ARCHIVE, else the current folder and its parents.",
)
def stillroom(archive_dir: Path | None) -> None:
    """Archive of a low-temperature laboratory: finished cooldowns, kept whole, reduced with uncertainties, found again.

    \b
    See it work on invented data:   stillroom demo, or be shown around: stillroom tour
    Begin an archive:               stillroom init lab-archive
    Describe a finished cooldown:   stillroom draft FOLDER, then fill in what it marks
    See every fault at once:        stillroom check FOLDER
    Take it in and reduce it:       stillroom ingest FOLDER, stillroom reduce 2026-03
    Correct it afterwards:          stillroom amend SHEET.toml, stillroom stale, stillroom reduce --stale
    Find and cite:                  stillroom search --coverage "20:35 umol/m^2"
    Look at it in a browser:        stillroom serve --open
    At the bench:                   stillroom convert "31.4 umol/m^2" --to atoms/nm^2

    `stillroom COMMAND --help` explains each, with examples.
    """


for _command in _COMMANDS:
    stillroom.add_command(_command)
offer(stillroom)


def main() -> None:
    """Run the command line and leave the process with its exit code."""
    # Streams that were closed before the start (>&-) are None; what is written to them is lost, as was asked for.
    sys.stdout = sys.stdout or Path(os.devnull).open("w", encoding="utf-8")  # noqa: SIM115 - open to the end
    sys.stderr = sys.stderr or Path(os.devnull).open("w", encoding="utf-8")  # noqa: SIM115 - as above
    for stream in (sys.stdout, sys.stderr):
        # A sign that the terminal's code page lacks is written as an escape, never as a traceback.
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="backslashreplace")
    if completion.VARIABLE in os.environ:
        completion.prepare()
    try:
        stillroom(prog_name="stillroom")
    except KeyboardInterrupt:
        note("stopped")
        sys.exit(EXIT_INTERRUPTED)

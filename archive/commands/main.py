"""`stillroom`: the command line.

Rules: a command turns arguments into calls of `archive.lab` and answers into text, and does nothing else; what is heavy
is imported inside the commands, so that `--help` answers at once.
"""

from __future__ import annotations

import os
import sys
from importlib import import_module
from pathlib import Path
from typing import Final

import click
from typing_extensions import override

from archive import __version__
from archive.commands.failures import EXIT_INTERRUPTED, GuardedGroup
from archive.commands.offered import VARIABLE, offer
from archive.commands.terminal import note

__all__ = ["main", "stillroom"]

_COMMANDS: Final = {
    "demo": ("demo_command", "demo", "See it all work on invented data."),
    "tour": ("tour_command", "tour", "Be shown around in five steps."),
    "init": ("archive_commands", "init", "Make a new archive."),
    "schema": ("intake_commands", "schema", "Print the JSON Schema of the sheet, or of another."),
    "draft": ("intake_commands", "draft", "Write a first sheet from a folder's files."),
    "check": ("intake_commands", "check", "Report every fault of a cooldown folder."),
    "ingest": ("intake_commands", "ingest", "Take a cooldown folder into the archive."),
    "plans": ("reduce_commands", "plans", "List the plans, or show one."),
    "reduce": ("reduce_commands", "reduce", "Carry out plans on a cooldown."),
    "stale": ("acts_commands", "stale", "List reductions that newer inputs have overtaken."),
    "revise": ("acts_commands", "revise", "Add a revision of a record or plan."),
    "amend": ("acts_commands", "amend", "Amend a sealed cooldown."),
    "withdraw": ("acts_commands", "withdraw", "Mark something as not to be used any more."),
    "search": ("search_command", "search", "Find sweeps."),
    "plane": ("plane_command", "plane", "Draw all sweeps over temperature."),
    "serve": ("serve_command", "serve", "Look at the archive in a browser."),
    "show": ("lineage_commands", "show", "Show whatever has an address."),
    "trace": ("lineage_commands", "trace", "Trace a number down to raw bytes, or what rests on it."),
    "replay": ("lineage_commands", "replay", "Compute a reduction again and compare."),
    "compare": ("compare_command", "compare", "Set two reductions side by side."),
    "calibration": (
        "calibration_commands",
        "calibration",
        "Write the calibration record that a reduction found.",
    ),
    "drift": ("calibration_commands", "drift", "Show how a thermometer's calibrations drifted."),
    "run-sheet": ("report_commands", "run_sheet", "Write the run sheet of a cooldown."),
    "appendix": ("report_commands", "appendix", "Write a methods appendix in LaTeX."),
    "journal": ("archive_commands", "journal", "Tell what was done to the archive."),
    "prov": ("exchange_commands", "prov", "Write provenance in the terms of W3C PROV."),
    "export": ("exchange_commands", "export", "Write a package that leaves the archive."),
    "import": ("exchange_commands", "import_", "Take a package into the archive."),
    "fixity": ("archive_commands", "fixity", "Prove that every sealed byte is as it was."),
    "rebuild-index": ("archive_commands", "rebuild_index", "Make the index anew from sealed files."),
    "roles": ("archive_commands", "roles", "Print the database roles of a shared index."),
    "mirror": ("keeping_commands", "mirror", "Keep a copy of the archive in another place."),
    "mend": ("keeping_commands", "mend", "Bring damaged files back from another copy."),
    "convert": ("bench_commands", "convert", "Convert units, scales, layers."),
    "helium": ("bench_commands", "helium", "Properties of liquid 4He and its vapour."),
    "completion": ("completion", "completion", "Write the completion script of a shell."),
}
"""Module, function and short help of each command, so that the list of them is there without any of their modules."""


class _InOrder(GuardedGroup):
    """Group whose commands are imported when they are asked for."""

    @override
    def list_commands(self, ctx: click.Context) -> list[str]:
        """Names in the order in which a laboratory meets them."""
        return list(_COMMANDS)

    @override
    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """Return a command, from its module; None for a name that no command has."""
        if cmd_name not in self.commands and cmd_name in _COMMANDS:
            module, function, _ = _COMMANDS[cmd_name]
            command: click.Command = getattr(import_module(f"archive.commands.{module}"), function)
            offer(cmd_name, command)
            self.add_command(command, cmd_name)
        return self.commands.get(cmd_name)

    @override
    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        """Write the list of commands, as every group does, from the short help that stands here."""
        with formatter.section("Commands"):
            formatter.write_dl([(name, short_help) for name, (_, _, short_help) in _COMMANDS.items()])


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


def main() -> None:
    """Run the command line and leave the process with its exit code."""
    # Streams that were closed before the start (>&-) are None; what is written to them is lost, as was asked for.
    sys.stdout = sys.stdout or Path(os.devnull).open("w", encoding="utf-8")  # noqa: SIM115 - open to the end
    sys.stderr = sys.stderr or Path(os.devnull).open("w", encoding="utf-8")  # noqa: SIM115 - as above
    for stream in (sys.stdout, sys.stderr):
        # A sign that the terminal's code page lacks is written as an escape, never as a traceback.
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="backslashreplace")
    if VARIABLE in os.environ:
        from archive.commands.completion import prepare

        prepare()
    try:
        stillroom(prog_name="stillroom")
    except KeyboardInterrupt:
        note("stopped")
        sys.exit(EXIT_INTERRUPTED)

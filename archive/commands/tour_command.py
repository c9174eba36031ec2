"""`stillroom tour`: five commands on a demonstration, each with what it is for and with its real output."""

from __future__ import annotations

import shlex
import sys
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Final

import click

from archive.commands import opening
from archive.commands.demo_command import demo
from archive.commands.terminal import note, say, styled
from archive.errors import EXIT_BAD_INPUT, BadRequest

__all__ = ["tour"]

_DEMONSTRATION: Final = Path("stillroom-demo")
# What a newcomer asks after first: the transition temperature of a film, if the demonstration has one.
_RESULT: Final = "T_KT"


@dataclass(frozen=True)
class _Stop:
    """One command of the tour, and why anybody would give it."""

    title: str
    why: str
    words: tuple[str, ...]


@click.command(short_help="Be shown around in five steps.")
@click.argument("folder", metavar="[DIR]", required=False, type=click.Path(path_type=Path))
def tour(*, folder: Path | None) -> None:
    """Be shown around in five steps: check, search, show, trace, replay, each with its real output.

    DIR is a folder that `stillroom demo` made, or a new one to make a demonstration in; without it ./stillroom-demo if it
    is there, else a temporary folder that is removed afterwards. Making a demonstration takes about a minute. On a
    terminal each step waits for Enter; Ctrl-C ends the tour.

    \b
    Examples:
      stillroom tour
      stillroom tour ~/try-stillroom
    """
    with _demonstration(folder) as place:
        failed = [stop.title for stop in _walk(_stops(place))]
    if failed:
        note(f"not everything went as it should: {', '.join(failed)}")
        click.get_current_context().exit(EXIT_BAD_INPUT)
    say()
    say(
        "That was the tour. Next, with data of your own: stillroom init lab-archive, then stillroom draft FOLDER"
    )


@contextmanager
def _demonstration(folder: Path | None) -> Iterator[Path]:
    """Folder of a demonstration, made first if need be."""
    if folder is None and not _made(_DEMONSTRATION):
        with tempfile.TemporaryDirectory(prefix="stillroom-tour-") as temporary:
            yield _new(Path(temporary) / "demo")
        return
    place = folder or _DEMONSTRATION
    yield place if _made(place) else _new(place)


def _made(folder: Path) -> bool:
    return (folder / "archive" / "stillroom.toml").is_file() and (folder / "cooldowns").is_dir()


def _new(folder: Path) -> Path:
    note("there is no demonstration yet; it is made first, which takes about a minute")
    click.get_current_context().invoke(demo, folder=folder)
    return folder


def _stops(folder: Path) -> list[_Stop]:
    with opening.open_archive(folder / "archive") as lab:
        results = sorted((row for row in lab.results() if row.headline), key=lambda row: row.name != _RESULT)
        cooldowns = sorted(row.name for row in lab.cooldowns())
    if not results or not cooldowns:
        raise BadRequest(
            "this demonstration holds no results", file=str(folder), remedy="make another: name a new folder"
        )
    first = results[0]
    number = f"{first.reduction}#{first.name}"
    archive = ("--archive", str(folder / "archive"))
    data = str(folder / "cooldowns" / first.cooldown)
    return [
        _Stop("Check a folder of raw data",
              "A sheet, cooldown.toml, says what the raw files mean. Everything that is wrong or doubtful is told at once.",
              (*archive, "check", data)),
        _Stop("Search", "By coverage, cell, temperature, or by what the reductions found.",
              (*archive, "search", "--cooldown", first.cooldown, "--result", first.name, "--plot", "--limit", "2")),
        _Stop("Look at a number", "With its uncertainty, and what that consists of.", (*archive, "show", number)),
        _Stop("Trace it", "From the number through every step down to lines of raw files and their digests.",
              (*archive, "trace", number)),
        _Stop("Compute it again", "From raw bytes, and compared bit by bit with what was sealed.",
              (*archive, "replay", first.reduction)),
    ]  # fmt: skip


def _walk(stops: list[_Stop]) -> Iterator[_Stop]:
    """Carry out the stops one after the other; yield those that ended with an error."""
    root = click.get_current_context().find_root().command
    for number, stop in enumerate(stops, 1):
        say()
        click.echo(styled(f"{number} of {len(stops)}: {stop.title}", "cyan", bold=True))
        say(stop.why)
        say(f"$ stillroom {shlex.join(stop.words)}")
        _wait()
        if root.main(list(stop.words), prog_name="stillroom", standalone_mode=False):
            yield stop


def _wait() -> None:
    """Wait for Enter where somebody can press it."""
    if sys.stdin is not None and sys.stdin.isatty() and sys.stdout.isatty():
        click.echo("Press Enter to see it ", nl=False)
        sys.stdin.readline()

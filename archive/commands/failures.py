"""What becomes of everything that stops a command: one sentence and an exit code.

| code | meaning |
|---|---|
| 0 | fine |
| 1 | warnings, where `--strict` was asked for |
| 2 | bad input, findings of error level, or a fault of Stillroom itself (its traceback is in the file that is named) |
| 3 | damage |
| 4 | busy, or not an archive |
| 130 | stopped by the person |
"""

from __future__ import annotations

import os
import sys
from typing import Any

import click
from typing_extensions import override

from archive.commands.terminal import note, styled
from archive.errors import EXIT_BAD_INPUT, ArchiveError, kept_traceback

__all__ = ["EXIT_INTERRUPTED", "EXIT_WARNINGS", "GuardedGroup", "stopped"]

EXIT_WARNINGS = 1
EXIT_INTERRUPTED = 130


class GuardedGroup(click.Group):
    """Group of commands that ends every failure in one sentence."""

    @override
    def invoke(self, ctx: click.Context) -> Any:
        """Carry out a command."""
        try:
            result = super().invoke(ctx)
            sys.stdout.flush()
        except click.exceptions.Exit:
            _flushed()
            raise
        except (click.ClickException, click.Abort):
            raise
        except BaseException as error:  # noqa: BLE001 - the one place where everything ends in a sentence
            ctx.exit(stopped(error))
        return result


def stopped(error: BaseException) -> int:
    """Exit code of what stopped a command, after its sentence was written to stderr."""
    if isinstance(error, SystemExit):
        raise error
    if isinstance(error, BrokenPipeError):
        _quieten()
        return 0
    if isinstance(error, KeyboardInterrupt):
        how_far = f": {error}" if str(error) else ""
        note(
            f"stopped{how_far}; nothing half-written counts: the next command on this archive sweeps it away"
        )
        return EXIT_INTERRUPTED
    if isinstance(error, ArchiveError):
        _say(str(error))
        return error.exit_code
    if isinstance(error, OSError) and error.strerror:
        place = f"{error.filename}: " if error.filename else ""
        _say(f"{place}{error.strerror[:1].lower()}{error.strerror[1:]}")
        return EXIT_BAD_INPUT
    _say(f"this is a fault of Stillroom, not yours; the details are in {kept_traceback(error)}")
    return EXIT_BAD_INPUT


def _say(sentence: str) -> None:
    click.echo(styled("stillroom:", "red", bold=True) + " ", nl=False, err=True)
    note(sentence)


def _flushed() -> None:
    try:
        sys.stdout.flush()
    except BrokenPipeError:
        _quieten()


def _quieten() -> None:
    # The reader of the pipe has gone; what is left in the buffer must not complain when the interpreter ends.
    try:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    except (OSError, ValueError):
        return

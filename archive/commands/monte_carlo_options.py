"""Options that ask for a Monte Carlo run, and what they ask for."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any, Final, TypeVar

import click
from click.core import ParameterSource

from archive.errors import BadRequest

if TYPE_CHECKING:
    from archive.reduction.monte_carlo import Request

__all__ = ["monte_carlo_options", "requested"]

_Command = TypeVar("_Command", bound=Callable[..., Any])

_OPTIONS: Final = (
    click.option(
        "--monte-carlo",
        "trials",
        metavar="N|adaptive",
        help="Repeat each plan N times with drawn inputs (JCGM 101), or as often as it needs; sealed with the reduction.",
    ),
    click.option("--seed", type=int, default=1, show_default=True, help="Of the drawn numbers."),
    click.option(
        "--digits",
        type=click.IntRange(1, 2),
        default=1,
        show_default=True,
        help="Digits of the uncertainty that first order is held to.",
    ),
    click.option(
        "--workers",
        type=click.IntRange(1, 1024),
        default=1,
        show_default=True,
        help="Processes for the trials; the numbers do not depend on it.",
    ),
)


def monte_carlo_options(command: _Command) -> _Command:
    """Give a command the options --monte-carlo, --seed, --digits and --workers."""
    for option in reversed(_OPTIONS):
        command = option(command)
    return command


def requested(trials: str | None, *, seed: int, digits: int, workers: int) -> Request | None:
    """Return what is asked for with --monte-carlo; nothing if it is not."""
    from archive.reduction.monte_carlo import Request

    if trials is None:
        given = [
            f"--{name}"
            for name in ("seed", "digits", "workers")
            if click.get_current_context().get_parameter_source(name) is ParameterSource.COMMANDLINE
        ]
        if given:
            raise BadRequest(
                f"without --monte-carlo these mean nothing: {', '.join(given)}",
                remedy="add --monte-carlo with a number of trials, or adaptive",
            )
        return None
    # Python refuses to read thousands of digits.
    if trials != "adaptive" and not (trials.isascii() and trials.isdigit() and len(trials) < 20):
        raise BadRequest(
            "--monte-carlo takes a number of trials, or adaptive", found=trials[:40], expected="such as 20000"
        )
    return Request(None if trials == "adaptive" else int(trials), seed=seed, digits=digits, workers=workers)

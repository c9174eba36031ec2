"""Commands after the fact: revise a record, amend a sealed cooldown, withdraw, and see what is stale by it."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from archive.commands import opening
from archive.commands.findings import say_findings
from archive.commands.machine import write_json
from archive.commands.opening import archive_option, json_option, require_address
from archive.commands.terminal import note, say, table
from archive.errors import EXIT_BAD_INPUT

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from archive.lab import ActOutcome, Stale
    from schemas.acts import Difference

__all__ = ["amend", "revise", "stale", "withdraw"]

_ROLE_HELP = "Role of whoever does it, such as `data steward`; else what the sheet says, else STILLROOM_ROLE."


def _by_option(function: Callable[..., Any]) -> Callable[..., Any]:
    return click.option("--by", metavar="ROLE", help=_ROLE_HELP)(function)


def _dry_option(function: Callable[..., Any]) -> Callable[..., Any]:
    return click.option(
        "--dry-run",
        "dry_run",
        is_flag=True,
        help="Show what differs and what would become stale; write nothing.",
    )(function)


@click.command(short_help="Add a revision of a record or plan.")
@click.argument("sheet", metavar="RECORD.toml", type=click.Path(path_type=Path))
@_by_option
@_dry_option
@archive_option
@json_option
def revise(*, sheet: Path, by: str | None, dry_run: bool, archive_dir: Path | None, as_json: bool) -> None:
    """Add a new revision of a cell, substrate, sample, thermometer, calibration, cryostat or plan, outside a cooldown.

    Shows field by field what differs from the newest revision, and which reductions become stale. Earlier revisions
    stay, and sheets that name them still mean them; a revision that says which one it supersedes holds in its place.

    \b
    RECORD.toml, for instance:
      format = "stillroom-revision/1"
      by = "data steward"
      because = "the fixed points were measured again"
      supersedes = "RX-2-cal.r1"             (left out: for cooldowns to come)
      [[record.calibration]]
      name = "RX-2-cal"
      revision = 2
      ...
    A plan stands in [plan], or in a file as `stillroom plans NAME --toml` prints it.

    \b
    Examples:
      stillroom revise RX-2-cal.toml --dry-run
      stillroom revise RX-2-cal.toml --by "data steward"
      stillroom revise our-film.toml --by "graduate student"

    Exit code: 2 if the sheet is refused; nothing is stored then.
    """
    with opening.open_archive(archive_dir) as lab:
        outcome = lab.revise(sheet, by=by, dry_run=dry_run)
    _tell(outcome, as_json=as_json)


@click.command(short_help="Amend a sealed cooldown.")
@click.argument("sheet", metavar="AMENDMENT.toml", type=click.Path(path_type=Path))
@_by_option
@_dry_option
@archive_option
@json_option
def amend(*, sheet: Path, by: str | None, dry_run: bool, archive_dir: Path | None, as_json: bool) -> None:
    """Correct what the sheet of a sealed cooldown says; what was sealed stays, and the reports show both.

    Reductions made from now on take the amended values; `stillroom stale` lists those that rest on the old ones.

    \b
    AMENDMENT.toml, for instance:
      format = "stillroom-amendment/1"
      cooldown = "2026-03"
      by = "data steward"
      because = "the notebook was misread"
      [[change]]                              a value of the sheet
      address = "2026-03/d03"                 (a dose, sweep, channel or the cooldown)
      field = "pressure_before"
      value = "21.4(1) Torr"
      [[calibration]]                         another calibration in this cooldown
      thermometer = "RX-2"
      use = "RX-2-cal.r2"
      [[use]]                                 another revision of a cell, substrate, ...
      instead_of = "TO-4.r1"
      use = "TO-4.r2"
      [[left_out]]                            rows not to be reduced with
      sweep = "s017"
      rows = [120, 145]
      reason = "helium transfer"

    \b
    Examples:
      stillroom amend dose-3.toml --dry-run
      stillroom amend dose-3.toml --by "graduate student"

    Exit code: 2 if the sheet is refused; nothing is stored then.
    """
    with opening.open_archive(archive_dir) as lab:
        outcome = lab.amend(sheet, by=by, dry_run=dry_run)
    _tell(outcome, as_json=as_json)


@click.command(short_help="Mark something as not to be used any more.")
@click.argument("address")
@click.option(
    "--why", metavar="TEXT", required=True, help="Why; a sentence for whoever finds it in ten years."
)
@_by_option
@archive_option
@json_option
def withdraw(*, address: str, why: str, by: str | None, archive_dir: Path | None, as_json: bool) -> None:
    """Mark a cooldown, accession, sweep, reduction, record revision or amendment as withdrawn; nothing is deleted.

    Searches and results leave it out, what is shown of it says so, no new reduction uses it, and all that rests on it
    is flagged. A withdrawal is taken back by withdrawing it.

    \b
    Examples:
      stillroom withdraw 2026-03/s017 --why "the drive was off" --by "graduate student"
      stillroom withdraw RX-2-cal.r1 --why "wrong fixed point" --by "data steward"
      stillroom withdraw 2026-03.w1 --why "the drive was on after all" --by "data steward"
    """
    require_address(address)
    with opening.open_archive(archive_dir) as lab:
        outcome = lab.withdraw(address, why=why, by=by)
    if as_json:
        write_json(outcome)
        return
    if outcome.restored is not None:
        say(f"{address} is taken back ({outcome.address}): {outcome.restored} counts again.")
        return
    say(f"{address} is withdrawn ({outcome.address}). It stays in the archive, marked.")
    if outcome.resting:
        say(
            f"{_count(len(outcome.resting), 'reduction')} rest{'s' if len(outcome.resting) == 1 else ''} on it:"
        )
        for each in outcome.resting:
            say(f"  {each}")
        note("Those that count are listed by `stillroom stale`, and made anew by `stillroom reduce --stale`.")


@click.command(short_help="List reductions that newer inputs have overtaken.")
@click.argument("cooldown", required=False)
@archive_option
@json_option
def stale(*, cooldown: str | None, archive_dir: Path | None, as_json: bool) -> None:
    """List reductions that rest on something read otherwise now: revised, amended, ingested anew, reduced anew, withdrawn.

    What others rest on comes first; `stillroom reduce --stale` makes them anew in this order.

    \b
    Examples:
      stillroom stale
      stillroom stale 2026-03 --json
    """
    with opening.open_archive(archive_dir) as lab:
        found = lab.stale(cooldown)
    if as_json:
        write_json([_stale_content(each) for each in found])
        return
    if not found:
        say("No reduction is stale.")
        return
    _stale_table(found)
    say(f"{_count(len(found), 'stale reduction')}; make them anew with: stillroom reduce --stale")


def _stale_content(each: Stale) -> dict[str, Any]:
    reasons = [
        {"kind": reason.kind, "used": reason.used or None, "now": reason.now, "text": reason.text}
        for reason in each.reasons
    ]
    return {"reduction": each.reduction, "sweep": each.sweep, "plan": each.plan, "reasons": reasons}


def _stale_table(found: Sequence[Stale]) -> None:
    rows = [(each.reduction, tuple(reason.text for reason in each.reasons)) for each in found]
    table(("reduction", "because"), rows)


def _tell(outcome: ActOutcome, *, as_json: bool) -> None:
    """Write what a revision or amendment did, or would do, or why it was refused."""
    if as_json:
        write_json(
            {
                "state": outcome.state,
                "address": outcome.address,
                "previous": outcome.previous,
                "differences": outcome.differences,
                "sweeps": outcome.sweeps,
                "stale": [_stale_content(each) for each in outcome.stale],
                "findings": outcome.findings,
                "raised": outcome.raised,
            }
        )
    else:
        _tell_people(outcome)
    if outcome.state == "refused":
        click.get_current_context().exit(EXIT_BAD_INPUT)


def _tell_people(outcome: ActOutcome) -> None:
    if outcome.state == "refused":
        for finding in outcome.findings:
            note(f"error: {finding.sentence()}")
        note("Nothing was stored.")
        return
    if outcome.differences:
        _differences(outcome.differences, outcome.previous)
    elif outcome.previous is not None:
        say(f"No field differs from {outcome.previous}.")
    if outcome.sweeps:
        say(f"It bears on {', '.join(outcome.sweeps)}.")
    if outcome.stale:
        say("Reductions that become stale by it:" if outcome.state == "shown" else "Stale now:")
        _stale_table(outcome.stale)
    else:
        say("No reduction becomes stale by it.")
    for cooldown, found in outcome.raised.items():
        say(
            f"The checks of {cooldown}, run again, found {'what they had not found before:' if found else 'nothing new.'}"
        )
        say_findings(found)
    if outcome.state == "shown":
        say(f"This would be {outcome.address}; nothing was written.")
        return
    say(f"{outcome.address} is in the archive.")
    if outcome.stale:
        note("Make what is stale anew with: stillroom reduce --stale")


def _differences(found: Sequence[Difference], previous: str | None) -> None:
    before = previous or "before"
    rows = [(each.field, each.before or "-", each.after or "-") for each in found]
    table(("field", before, "now"), rows)


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}{'' if number == 1 else 's'}"

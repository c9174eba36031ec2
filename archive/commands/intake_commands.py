"""Commands on a cooldown folder: draft its sheet, check it, take it in."""

from __future__ import annotations

from pathlib import Path
from shlex import quote

import click

from archive.commands import opening
from archive.commands.failures import EXIT_WARNINGS
from archive.commands.findings import counts, report_content, say_cautions, say_findings
from archive.commands.machine import write_json
from archive.commands.opening import archive_option, json_option, strict_option
from archive.commands.terminal import Progress, note, say
from archive.errors import EXIT_BAD_INPUT
from schemas.visible_text import visible

__all__ = ["check", "draft", "ingest", "schema"]

_FOLDER = click.Path(path_type=Path)


_SHEETS = ("sheet", "plan", "revision", "amendment", "calibration")


@click.command(short_help="Print the JSON Schema of the sheet, or of another.")
@click.argument("thing", type=click.Choice(_SHEETS), default="sheet", metavar=f"[{'|'.join(_SHEETS)}]")
def schema(*, thing: str) -> None:
    """Print the JSON Schema (2020-12) of the cooldown sheet, for editors that complete and check TOML.

    Or that of a plan, of what `stillroom revise` and `stillroom amend` take, or of what `stillroom calibration` writes.

    \b
    Examples:
      stillroom schema > cooldown.schema.json
      stillroom schema amendment > amendment.schema.json
    """
    from archive.intake.json_schema import json_schema

    write_json(json_schema(thing))


@click.command(short_help="Write a first sheet from a folder's files.")
@click.argument("folder", type=_FOLDER)
@click.option("--print", "only_print", is_flag=True, help="Write the draft to stdout and no file.")
def draft(*, folder: Path, only_print: bool) -> None:
    """Write cooldown.toml for FOLDER from what its files show.

    Files, dialects, columns, units and time spans are guessed, each with its reason beside it. What only a person knows
    is left blank and marked "to fill in"; nothing is made up. A sheet that is there already is never overwritten.

    \b
    Examples:
      stillroom draft data/2026-03
      stillroom check data/2026-03        (names every blank that is left)
    """
    from archive.intake.draft import draft_text, write_draft

    with Progress("reading files") as progress:
        if only_print:
            drafted = draft_text(folder, progress=progress.sentence)
        else:
            path, drafted = write_draft(folder, progress=progress.sentence)
    if only_print:
        click.echo(visible(drafted.text), nl=False)
        return
    say(f"{path} is written, with {drafted.tables} tables described and {drafted.blanks} places to fill in.")
    for doubt in drafted.doubts:
        say(f"  look at {doubt}")
    say(
        f'Fill in what is marked "to fill in", look at what is marked "guessed", then: stillroom check {quote(str(folder))}'
    )


@click.command(short_help="Report every fault of a cooldown folder.")
@click.argument("folder", type=_FOLDER)
@archive_option
@json_option
@strict_option
def check(*, folder: Path, archive_dir: Path | None, as_json: bool, strict: bool) -> None:
    """Report everything that can be said of a cooldown FOLDER, in one pass; nothing is stored.

    Where an archive is found, its records, its limits and earlier runs of the same cell count too. A warning is
    accepted by a [[waiver]] in the sheet, with the reason; an error has to be corrected.

    \b
    Examples:
      stillroom check data/2026-03
      stillroom check data/2026-03 --strict --json

    Exit codes: 0 no errors; 1 warnings, with --strict; 2 errors.
    """
    lab = opening.archive_or_none(archive_dir)
    with Progress("reading the folder") as progress:
        if lab is None:
            from archive.lab.checking import check_folder

            report = check_folder(folder, progress=progress.sentence)
        else:
            with lab:
                report = lab.check(folder, progress=progress.sentence)
    if as_json:
        write_json(report_content(report))
    else:
        say_findings(report.findings)
        say_cautions(report.cautions)
        read = report.summary
        say(
            f"Read: {read.get('sweeps', 0)} sweeps, {read.get('rows', 0)} rows, {read.get('files', 0)} files."
        )
        say(f"Found: {counts(report)}. Nothing was stored.")
        if lab is None:
            note("note: no archive was found, so records and earlier runs of an archive were not looked at")
        if not report.errors:
            say(f"Next: stillroom ingest {quote(str(folder))}")
    _leave(errors=report.errors, warnings=report.warnings, strict=strict)


@click.command(short_help="Take a cooldown folder into the archive.")
@click.argument("folder", type=_FOLDER)
@archive_option
@json_option
@strict_option
def ingest(*, folder: Path, archive_dir: Path | None, as_json: bool, strict: bool) -> None:
    """Take a cooldown FOLDER into the archive, whole or not at all.

    Every raw byte is kept with its digest. If a finding is an error, nothing is stored. A folder that is there already
    and has grown or been corrected becomes a supplement; if nothing differs, nothing is done.

    \b
    Example:
      stillroom ingest data/2026-03

    Exit codes: 0 taken in, or nothing to do; 1 warnings, with --strict (it is taken in all the same); 2 refused;
    4 another process is writing.
    """
    with opening.open_archive(archive_dir) as lab, Progress("reading the folder") as progress:
        outcome = lab.ingest(folder, progress=progress.sentence)
        notices = list(lab.notices)
    for sentence in notices:
        note(f"note: {sentence}")
    report = outcome.report
    if as_json:
        content = report_content(report)
        write_json(
            {
                "state": outcome.state,
                "address": outcome.address,
                "differences": outcome.differences,
                **content,
            }
        )
    else:
        say_findings(report.findings)
        say_cautions(report.cautions)
        for difference in outcome.differences:
            say(f"  {difference}")
        say(
            {
                "ingested": f"Taken in as {outcome.address}: {counts(report)}.",
                "supplement": f"Taken in as supplement {outcome.address}: {counts(report)}.",
                "already": f"The archive holds all of this already, as {outcome.address}; nothing was stored.",
                "refused": f"Refused: {counts(report)}. Nothing was stored; correct the errors and ingest again.",
            }[outcome.state]
        )
        if outcome.address is not None and outcome.state != "already":
            say(f"Next: stillroom reduce {outcome.address.partition('.')[0]}")
    refused = outcome.state == "refused"
    _leave(errors=max(report.errors, refused), warnings=report.warnings, strict=strict)


def _leave(*, errors: int, warnings: int, strict: bool) -> None:
    context = click.get_current_context()
    if errors:
        context.exit(EXIT_BAD_INPUT)
    if warnings and strict:
        context.exit(EXIT_WARNINGS)

"""Commands on an archive as a whole: make it, prove it, tell its acts, make its index anew."""

from __future__ import annotations

from pathlib import Path
from shlex import quote

import click

from archive.commands import opening
from archive.commands.failures import EXIT_WARNINGS
from archive.commands.machine import write_json
from archive.commands.opening import archive_option, json_option, strict_option
from archive.commands.terminal import Progress, say, styled, table
from archive.errors import EXIT_DAMAGE

# Damaged things that are no sealed files.
_BESIDE = {"index", "journal.jsonl"}

__all__ = ["fixity", "init", "journal", "rebuild_index", "roles"]


@click.command(short_help="Make a new archive.")
@click.argument("folder", metavar="[DIR]", default=".", type=click.Path(path_type=Path))
@click.option("--name", help="Name of the archive, as reports print it; the folder's name if left out.")
@click.option(
    "--index", metavar="ADDRESS", help="Address of the index; a SQLite file in the folder if left out."
)
@json_option
def init(*, folder: Path, name: str | None, index: str | None, as_json: bool) -> None:
    """Make a new archive in DIR, a new or empty folder.

    \b
    Examples:
      stillroom init lab-archive --name "Low-temperature group"
      stillroom init lab-archive --index postgresql+psycopg://archive@server/stillroom
    """
    from archive.lab import Archive

    with Archive.create(folder, name=name, index=index) as lab:
        if as_json:
            write_json({"root": str(lab.root), "name": lab.name})
            return
        say(f"There is now an empty archive, {lab.name}, in {lab.root}")
        say(
            f"Next: stillroom --archive {quote(str(lab.root))} ingest FOLDER, or set STILLROOM_ARCHIVE to that folder."
        )


@click.command(short_help="Print the database roles of a shared index.")
def roles() -> None:
    """Print the SQL that makes roles for an index in PostgreSQL: one that reads, one that also records.

    \b
    Example:
      stillroom roles | psql "postgresql://owner@server/stillroom"
    """
    from importlib.resources import files

    say((files("archive.index") / "roles.sql").read_text(encoding="utf-8").rstrip("\n"))


@click.command(short_help="Prove that every sealed byte is as it was.")
@archive_option
@json_option
@strict_option
def fixity(*, archive_dir: Path | None, as_json: bool, strict: bool) -> None:
    """Read every sealed file again and name what is damaged, missing, or there without being recorded; follow the journal.

    \b
    Example:
      stillroom fixity

    Exit codes: 3 if anything is damaged or missing; with --strict 1 if something is there that is not recorded.
    """
    with opening.open_archive(archive_dir) as lab, Progress("reading sealed files") as progress:
        files = lab.statistics()["sealed_files"]
        damage = lab.fixity(enter=True, progress=progress.count)
    hurt = [each for each in damage if each.kind != "stray"]
    if as_json:
        write_json({"sealed_files": files, "whole": not hurt, "damage": damage})
    else:
        for each in damage:
            place = f"{each.key}, {each.dataset}" if each.dataset else each.key
            colour = "yellow" if each.kind == "stray" else "red"
            click.echo(styled(each.kind, colour, bold=True) + " ", nl=False)
            say(f"{place}: {each.what}{_differing(each.expected, each.found)}")
        sealed = sum(each.key not in _BESIDE for each in hurt)
        say(_verdict(files, sealed, len(hurt) - sealed, len(damage) - len(hurt)))
    context = click.get_current_context()
    if hurt:
        context.exit(EXIT_DAMAGE)
    if damage and strict:
        context.exit(EXIT_WARNINGS)


def _differing(expected: str | None, found: str | None) -> str:
    return "".join(
        f"; {word} {value}" for word, value in (("expected", expected), ("found", found)) if value is not None
    )


def _verdict(files: int, hurt: int, beside: int, stray: int) -> str:
    strays = f"; {stray} not recorded" if stray else ""
    if hurt:
        return (
            f"{hurt} faults in {files} recorded files{strays}. Keep this archive as it is and bring the files named above back "
            "from a copy: stillroom mend --from COPY. The index is not the cause."
        )
    whole = f"All {files} recorded files are byte for byte as they were sealed{strays}."
    return f"{whole} The faults named above are in the index or the journal." if beside else whole


@click.command(short_help="Tell what was done to the archive.")
@click.argument("address", required=False)
@click.option("--last", type=click.IntRange(min=1), metavar="N", help="Only the last N acts.")
@archive_option
@json_option
def journal(*, address: str | None, last: int | None, archive_dir: Path | None, as_json: bool) -> None:
    """Tell what was done to the archive: when, by which role, to what, by which version of Stillroom.

    With ADDRESS only acts on it or on a part of it. Each line of the journal holds the digest of the line before it, and
    `stillroom fixity` follows that chain. Set STILLROOM_ROLE to your role, such as "data steward", before you write.

    \b
    Examples:
      stillroom journal
      stillroom journal 2026-03 --last 10
    """
    with opening.open_archive(archive_dir) as lab:
        entries = lab.journal()
    if address is not None:
        # What was given away may be several things.
        entries = [
            each for each in entries if any(one.startswith(address) for one in each.act.what.split(", "))
        ]
    entries = entries[-last:] if last is not None else entries
    if as_json:
        write_json(entries)
        return
    table(
        ("no.", "at", "act", "what", "by", "version", "note"),
        [
            (
                str(each.number),
                each.at,
                each.act.act,
                each.act.what,
                each.act.by,
                each.stillroom,
                each.act.note or "",
            )
            for each in entries
        ],
    )


@click.command("rebuild-index", short_help="Make the index anew from sealed files.")
@archive_option
@json_option
def rebuild_index(*, archive_dir: Path | None, as_json: bool) -> None:
    """Make the index anew from the sealed files alone; the old one is set aside, not overwritten.

    Use it when the index is lost or damaged. No sealed file is changed.

    \b
    Example:
      stillroom rebuild-index

    Exit code 3 if a sealed file is damaged; the old index stays then.
    """
    from archive.lab import Archive

    with Progress("reading sealed files") as progress:
        counts = Archive.rebuild_index(archive_dir, progress=progress.count)
    if as_json:
        write_json(counts)
        return
    say("The index was made anew from the sealed files. It holds:")
    width = max((len(str(count)) for count in counts.values()), default=1)
    for name, count in counts.items():
        say(f"  {count:>{width}} {name.replace('_', ' ')}")

"""Commands that keep an archive alive: a mirror in another place, and mending from one."""

from __future__ import annotations

from pathlib import Path

import click

from archive.commands import opening
from archive.commands.machine import write_json
from archive.commands.opening import archive_option, json_option
from archive.commands.terminal import Progress, note, say
from archive.errors import EXIT_DAMAGE

__all__ = ["mend", "mirror"]


@click.command(short_help="Keep a copy of the archive in another place.")
@click.argument("target", metavar="TARGET", type=click.Path(file_okay=False, path_type=Path))
@click.option(
    "--thorough", is_flag=True, help="Read again what the mirror holds already, not only what is new."
)
@archive_option
@json_option
def mirror(*, target: Path, thorough: bool, archive_dir: Path | None, as_json: bool) -> None:
    """Copy what TARGET, a folder on another disk, does not hold yet, with the index, the journal and the settings.

    Each file is read back and compared with its recorded digest before it has its name in TARGET; nothing there is
    overwritten. Stopped at any point, the next call goes on. The mirror is an archive like any other and can be opened,
    searched and proved; do not write to it. To restore: mirror it to where the archive is to be.

    \b
    Examples:
      stillroom mirror /media/vault/lab-archive
      stillroom --archive /media/vault/lab-archive fixity

    Exit code: 3 if something is damaged here or in the mirror.
    """
    with opening.open_archive(archive_dir) as lab, Progress("mirroring") as progress:
        outcome = lab.mirror(target, thorough=thorough, progress=progress.count)
        opening.say_notices(lab)
    for sentence in outcome.swept:
        note(f"note: {sentence}")
    if as_json:
        write_json(outcome)
    else:
        for each in outcome.damage:
            say(f"{each.kind} {each.key}: {each.what}")
        say(
            f"{outcome.target} holds {outcome.present + len(outcome.copied)} sealed files, {len(outcome.copied)} of them new; "
            f"its index was {outcome.index}."
        )
    if outcome.damage:
        click.get_current_context().exit(EXIT_DAMAGE)


@click.command(short_help="Bring damaged files back from another copy.")
@click.option(
    "--from", "other", required=True, type=click.Path(exists=True, file_okay=False, path_type=Path), metavar="COPY",
    help="Another copy of the archive: a mirror, a backup, or the folder of its sealed files.",
)  # fmt: skip
@archive_option
@json_option
def mend(*, other: Path, archive_dir: Path | None, as_json: bool) -> None:
    """Read every sealed file and bring back what is damaged or missing from COPY, if the bytes there are the sealed ones.

    The damaged file is moved to the folder `set-aside` of the archive, never deleted. A damaged index is not mended from a
    copy; it is made anew by `stillroom rebuild-index`.

    \b
    Example:
      stillroom mend --from /media/vault/lab-archive

    Exit code: 3 if anything could not be brought back.
    """
    with opening.open_archive(archive_dir) as lab, Progress("mending") as progress:
        outcomes = lab.mend(other, progress=progress.count)
    if as_json:
        write_json(outcomes)
    elif not outcomes:
        say("No sealed file is damaged or missing.")
    else:
        for each in outcomes:
            aside = "" if each.set_aside is None else f"; the damaged one is now {each.set_aside}"
            say(f"{each.key} {'is whole again' if each.mended else 'is not mended'}: {each.why}{aside}")
    if not all(each.mended for each in outcomes):
        click.get_current_context().exit(EXIT_DAMAGE)

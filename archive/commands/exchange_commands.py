"""Commands by which data leave an archive and come into one: packages, and provenance in open terms."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from archive.commands import opening
from archive.commands.findings import say_findings
from archive.commands.machine import write_json
from archive.commands.opening import archive_option, json_option, require_address
from archive.commands.terminal import Progress, note, say
from archive.errors import EXIT_BAD_INPUT, EXIT_DAMAGE, BadRequest

if TYPE_CHECKING:
    from archive.lab.exchanging import ExportOutcome, ImportOutcome

__all__ = ["export", "import_", "prov"]


@click.command(short_help="Write provenance in the terms of W3C PROV.")
@click.argument("address")
@click.option(
    "-o",
    "--output",
    "target",
    metavar="FILE",
    type=click.Path(path_type=Path),
    help="File; the terminal if left out.",
)
@click.option(
    "--format",
    "notation",
    type=click.Choice(["json", "provn"]),
    default="json",
    show_default=True,
    help="PROV-JSON, or the notation for people, PROV-N.",
)
@archive_option
def prov(*, address: str, target: Path | None, notation: str, archive_dir: Path | None) -> None:
    """Write how a thing came about, as entities, activities and agents (W3C PROV, 2013).

    Of a cooldown everything is told, of a sweep, reduction or result what lies behind it, down to raw files, plans and the
    program with its versions. What contradicts itself, such as a step that ends before it begins, is named on stderr.

    \b
    Examples:
      stillroom prov 2026-03 -o 2026-03.prov.json
      stillroom prov 2026-03/s017@film-transition.2#T_KT --format provn
    """
    require_address(address)
    with opening.open_archive(archive_dir) as lab, Progress("tracing"):
        found = lab.provenance(address, notation=notation)
        if target is not None:
            lab.write_reports({target.name: found.text.encode()}, target.parent, of=[address])
            opening.say_notices(lab)
    for sentence in found.contradictions:
        note(f"warning: {sentence}")
    if target is None:
        say(found.text.rstrip("\n"))
    else:
        say(str(target))


@click.command(short_help="Write a package that leaves the archive.")
@click.argument("addresses", metavar="[ADDRESS...]", nargs=-1)
@click.option("--all", "everything", is_flag=True, help="The whole archive.")
@click.option(
    "-o",
    "--output",
    "target",
    metavar="DIR",
    required=True,
    type=click.Path(path_type=Path),
    help="New or empty folder.",
)
@click.option(
    "--appendix", is_flag=True, help="Put the methods appendix of what is asked for beside the run sheets."
)
@click.option("--without-reports", is_flag=True, help="Leave out the run sheets.")
@archive_option
@json_option
def export(
    *,
    addresses: tuple[str, ...],
    everything: bool,
    target: Path,
    appendix: bool,
    without_reports: bool,
    archive_dir: Path | None,
    as_json: bool,
) -> None:
    """Write a package of cooldowns, sweeps, reductions or results, with all that they rest on, to be kept or deposited.

    It is a bag (RFC 8493) around an RO-Crate: the sealed files byte for byte; beside them sheets, documents, plans, results
    and provenance that any program reads; run sheets; and, when stillroom.toml names authors and publisher under
    [exchange], records for a repository (datacite.json) and for a citation (CITATION.cff).

    \b
    Examples:
      stillroom export 2026-03 -o packages/2026-03
      stillroom export 2026-03/s017@film-transition.2 --appendix -o packages/figure-3
      stillroom export --all -o packages/everything

    Exit code 3 if a sealed file is damaged; nothing stands under DIR then.
    """
    if everything == bool(addresses):
        raise BadRequest(
            "name what to export, or --all", expected="addresses such as 2026-03, or --all, one of both"
        )
    for address in addresses:
        require_address(address)
    with opening.open_archive(archive_dir) as lab, Progress("writing the package") as progress:
        outcome = lab.export(
            addresses, target, reports=not without_reports, appendix=appendix, progress=progress.count
        )
        opening.say_notices(lab)
    for sentence in outcome.swept:
        note(f"note: {sentence}")
    if as_json:
        write_json(
            {
                "path": str(outcome.path),
                "asked": outcome.asked,
                "sealed_files": outcome.files,
                "bytes": outcome.size,
                "files": outcome.number,
                "sha256": outcome.sha256,
                "missing": outcome.missing,
            }
        )
        return
    _say_export(outcome)


def _say_export(outcome: ExportOutcome) -> None:
    say(
        f"{outcome.path}: {len(outcome.files)} sealed files, {outcome.number} files in all, {_bytes(outcome.size)}"
    )
    say(f"sha256 of its manifest-sha256.txt, to cite it by: {outcome.sha256}")
    also = outcome.also
    if also:
        say("In it because something rests on them:")
        width = max(len(address) for address in also)
        for address, because in also.items():
            say(f"  {address:<{width}}  {because}")
    for each in outcome.missing:
        note(f"not stated, so left out: {each}")


def _bytes(size: int) -> str:
    return f"{size / 1e6:.1f} MB" if size >= 100_000 else f"{size} bytes"


@click.command("import", short_help="Take a package into the archive.")
@click.argument("folder", metavar="DIR", type=click.Path(path_type=Path))
@click.option("--dry-run", is_flag=True, help="Find out everything and write nothing.")
@archive_option
@json_option
def import_(*, folder: Path, dry_run: bool, archive_dir: Path | None, as_json: bool) -> None:
    """Take a package that `stillroom export` made into this archive: all of it or nothing.

    Every digest of the bag is compared, every sealed file read completely and held against its document. Sealed files come
    in byte for byte, under their addresses, with their lineage. What the archive holds already stays; a name that is taken
    by other bytes, or something missing that a file rests on, refuses the whole package, and every fault is named.

    \b
    Example:
      stillroom import packages/2026-03

    Exit codes: 0 taken in, or all of it was here; 2 refused; 3 refused because bytes are damaged or missing.
    """
    with opening.open_archive(archive_dir) as lab, Progress("reading the package") as progress:
        outcome = lab.import_package(folder, dry_run=dry_run, progress=progress.count)
        opening.say_notices(lab)
    if as_json:
        write_json(
            {
                "state": outcome.state,
                "taken": outcome.taken,
                "held": outcome.held,
                "findings": outcome.findings,
            }
        )
    else:
        _say_import(outcome)
    if outcome.state == "refused":
        click.get_current_context().exit(EXIT_DAMAGE if outcome.damaged else EXIT_BAD_INPUT)


def _say_import(outcome: ImportOutcome) -> None:
    say_findings(outcome.findings)
    for address in outcome.taken:
        say(f"  {address}")
    held = f"; {len(outcome.held)} were here already, byte for byte" if outcome.held else ""
    say(
        {
            "imported": f"Taken in: {len(outcome.taken)} sealed files{held}.",
            "would-import": f"Would be taken in: {len(outcome.taken)} sealed files{held}. Nothing was written.",
            "already": f"The archive holds all {len(outcome.held)} sealed files of this package already; nothing was done.",
            "refused": f"Refused: {len(outcome.findings)} fault{'s' * (len(outcome.findings) != 1)}. Nothing was stored.",
        }[outcome.state]
    )

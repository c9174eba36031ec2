"""Commands on calibrations: the record that a reduction found, and what drifted between two of them."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from archive.commands import opening
from archive.commands.machine import write_json
from archive.commands.opening import archive_option, json_option, require_address
from archive.commands.terminal import note, say, table
from schemas.visible_text import visible

if TYPE_CHECKING:
    from archive.reduction.calibration_comparison import Drift

__all__ = ["calibration", "drift"]


@click.command(short_help="Write the calibration record that a reduction found.")
@click.argument("address")
@click.option("-o", "--output", "target", metavar="FILE", type=click.Path(path_type=Path), help="New file; else stdout.")  # fmt: skip
@click.option("--name", help="Name of the record; the thermometer's with -cal behind it if left out.")
@click.option("--revision", type=click.IntRange(min=1), help="One more than the newest in the archive if left out.")  # fmt: skip
@click.option("--alone", is_flag=True, help="As a sheet of its own, which stillroom revise takes in at once.")
@archive_option
@json_option
def calibration(
    *,
    address: str,
    target: Path | None,
    name: str | None,
    revision: int | None,
    alone: bool,
    archive_dir: Path | None,
    as_json: bool,
) -> None:
    """Write the calibration that reduction ADDRESS found as a table for the cooldown sheet that will use it.

    The record names the reduction in made_from: a sheet that takes it is held against the archive, and a temperature
    is traced through it down to the rows of the calibration.

    \b
    Examples:
      stillroom calibration 2024-11/c01@thermometer-calibration.1
      stillroom calibration 2024-11/c01@thermometer-calibration.1 -o GE-7-cal.toml --alone
    """
    require_address(address)
    with opening.open_archive(archive_dir) as lab:
        record = lab.calibration(address, name=name, revision=revision)
    from archive.reduction.calibration_record import calibration_text

    if as_json and target is None:
        write_json(record.model_dump(mode="json", exclude_none=True))
        return
    use = "take it in with `stillroom revise`" if alone else "put it into cooldown.toml as it is"
    head = 'format = "stillroom-revision/1"\n\n' if alone else ""
    text = f"# {record.address}: made from {address} by Stillroom; {use}.\n{head}{calibration_text(record)}"
    if target is None:
        click.echo(visible(text), nl=False)
        return
    _write_new(target, text)
    if as_json:
        write_json({"written": [str(target)]})
    else:
        say(f"{record.address} stands in {target}; {use}.")


def _write_new(target: Path, text: str) -> None:
    from archive.errors import BadRequest

    try:
        with target.open("x", encoding="utf-8") as stream:
            stream.write(text)
    except FileExistsError:
        raise BadRequest(
            "this file is there already; nothing was written",
            file=str(target),
            remedy="name another file, or move this one away",
        ) from None
    except OSError as error:
        raise BadRequest(
            f"the file cannot be written: {error.strerror}",
            file=str(target),
            remedy="name a file in a folder that can be written to",
        ) from None


@click.command(short_help="Show how a thermometer's calibrations drifted.")
@click.argument("thermometer")
@archive_option
@json_option
def drift(*, thermometer: str, archive_dir: Path | None, as_json: bool) -> None:
    """Show by how much each calibration of THERMOMETER differs from the one before it, in mK, over their common range.

    The uncertainty is that of the difference: what both calibrations share cancels.

    \b
    Example:
      stillroom drift RX-2
    """
    with opening.open_archive(archive_dir) as lab:
        found = lab.calibration_drift(thermometer)
    if as_json:
        write_json([_content(each) for each in found])
        return
    if not found:
        say(f"The archive holds fewer than two calibrations of {thermometer}; there is nothing to compare.")
    for each in found:
        _tell(each)


def _content(each: Drift) -> dict[str, Any]:
    told: dict[str, Any] = {"earlier": each.earlier, "later": each.later, "scale": each.scale}
    if each.found is None:
        return {**told, "not_compared": each.why_not}
    return {
        **told, "conversion": each.conversion, "temperature_K": each.found.temperature.tolist(), "difference_K": each.found.difference.tolist(),
        "uncertainty_K": each.found.uncertainty.tolist(), "largest_over_uncertainty": each.found.significance,
    }  # fmt: skip


def _tell(each: Drift) -> None:
    from archive.commands.numbers import shown_number

    if each.found is None:
        note(f"{each.later} was not compared with {each.earlier}: {each.why_not}")
        return
    found = each.found
    converted = f" ({each.conversion})" if each.conversion else ""
    say(f"{each.later} minus {each.earlier}, on {each.scale}{converted}:")
    # Every third point tells the course; the largest is told in any case.
    rows = sorted({*range(0, found.difference.size, 3), found.difference.size - 1, found.worst})
    table(
        ["T / K", "difference / mK", "over its uncertainty"],
        [
            (f"{found.temperature[k]:.4g}", shown_number(1e3 * float(found.difference[k]), 1e3 * float(found.uncertainty[k])), _ratio(found.difference[k], found.uncertainty[k]))
            for k in rows
        ],
        right=["T / K", "difference / mK", "over its uncertainty"],
    )  # fmt: skip
    say(f"Largest: {found.significance:.3g} times its standard uncertainty, at {found.temperature[found.worst]:.4g} K.")  # fmt: skip


def _ratio(difference: float, uncertainty: float) -> str:
    return f"{difference / uncertainty:.2g}" if uncertainty > 0 else "-"

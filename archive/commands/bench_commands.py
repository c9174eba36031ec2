"""Two commands for the bench that need no archive: `convert` and `helium`."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from archive.commands import opening
from archive.commands.machine import quantity, write_json
from archive.commands.opening import archive_option, json_option
from archive.commands.terminal import say, table
from archive.errors import BadRequest, told

if TYPE_CHECKING:
    from archive.commands.conversion import Converted
    from schemas.layers import Layer

__all__ = ["convert", "helium"]

# A value such as -3 K begins like an option; what is none is taken as a word.
_NEGATIVE_NUMBERS = {"ignore_unknown_options": True}


@click.command(context_settings=_NEGATIVE_NUMBERS, short_help="Convert units, scales, layers.")
@click.argument("words", metavar="QUANTITY", nargs=-1, required=True)
@click.option(
    "--to",
    "target",
    metavar="UNIT|SCALE",
    help='Unit ("V peak" to change the convention) or temperature scale.',
)
@click.option("--scale", metavar="SCALE", help="Temperature scale that QUANTITY is on.")
@click.option(
    "--substrate", metavar="NAME", help="Substrate of the archive whose record says what a layer is."
)
@click.option(
    "--kind", metavar="KIND", help="Kind of quantity, where the unit leaves it open; see the schema."
)
@archive_option
@json_option
def convert(
    *,
    words: tuple[str, ...],
    target: str | None,
    scale: str | None,
    substrate: str | None,
    kind: str | None,
    archive_dir: Path | None,
    as_json: bool,
) -> None:
    """Convert a QUANTITY, with its uncertainty, to another unit, convention or temperature scale.

    What has no fixed relation is refused, with the reason. Without --to the usual units of its kind are listed. Layers
    need --substrate, and so an archive; nothing else does.

    \b
    Examples:
      stillroom convert "31.4 umol/m^2" --to atoms/nm^2
      stillroom convert "1.234(5) Torr" --to Pa
      stillroom convert "2.1720 K" --scale T58 --to ITS-90
      stillroom convert "2.4 layers" --substrate PI-2200 --to umol/m^2
      stillroom convert "5 mV rms" --to "mV peak"
    """
    text = " ".join(words).strip()
    if any(word.startswith("--") for word in words):
        raise click.UsageError(f"there is no option {next(word for word in words if word.startswith('--'))}")
    from archive.commands.conversion import converted, in_display_units
    from schemas.layers import LAYER_WORDS

    if target is None:
        if scale is not None or text.endswith(tuple(LAYER_WORDS)):
            raise BadRequest("say what to convert to", field="--to", expected="a unit or a temperature scale")
        with told():
            results = in_display_units(text, kind=kind)
    else:
        layer = None if substrate is None else lambda: _layer(substrate, archive_dir)
        with told():
            results = [converted(text, target, scale=scale, kind=kind, layer=layer)]
    if as_json:
        contents = [_content(result) for result in results]
        write_json(contents if target is None else contents[0])
        return
    for result in results:
        say(f"{result.before} = {result.after}")
    for method in dict.fromkeys(result.method for result in results if result.method):
        say(f"  {method}")


def _layer(substrate: str, folder: Path | None) -> Layer:
    from archive.lab.layers import layer_of

    with opening.open_archive(folder) as lab:
        return layer_of(substrate, lab)


def _content(result: Converted) -> dict[str, Any]:
    found = quantity(result.value, result.uncertainty, result.unit, scale=result.scale) or {}
    extra = {"convention": result.convention, "method": result.method}
    return {**found, "kind": result.kind, **{name: text for name, text in extra.items() if text}}


@click.command(context_settings=_NEGATIVE_NUMBERS, short_help="Properties of liquid 4He and its vapour.")
@click.argument("words", metavar="TEMPERATURE", nargs=-1, required=True)
@json_option
def helium(*, words: tuple[str, ...], as_json: bool) -> None:
    """Print the properties of liquid 4He and its vapour on the saturation line, each with its range and source.

    The temperature counts on ITS-90 unless it names another scale. What is not tabulated there is said to be missing;
    nothing is extrapolated.

    \b
    Examples:
      stillroom helium "1.5 K"
      stillroom helium "2.1720 K on T58" --json

    Exit code 2 if nothing at all is known at that temperature.
    """
    from archive.commands.conversion import on_its90
    from archive.physics.helium_properties import properties

    with told("TEMPERATURE"):
        temperature, method = on_its90(" ".join(words))
        rows = properties(temperature.si)
    if all(row.value is None for row in rows):
        raise BadRequest(
            f"no property of 4He is tabulated at {temperature.format()}",
            expected="; ".join(f"{row.name}: {row.range}" for row in rows),
        )
    if as_json:
        write_json(
            {
                "temperature": quantity(temperature.value, temperature.uncertainty, temperature.unit, scale="ITS-90"),
                "fluid": "4He at saturated vapour pressure",
                "properties": [
                    {"name": row.name, "value": row.value, "uncertainty": None, "unit": row.unit, "range": row.range,
                     "source": row.source, "note": row.note}
                    for row in rows
                ],
            }
        )  # fmt: skip
        return
    say(f"4He at saturated vapour pressure, {temperature.format()}")
    if method:
        say(f"  {method}")
    say()
    cells = [
        (
            row.name,
            "-" if row.value is None else f"{row.value:.5g}",
            "" if row.unit == "1" else row.unit,
            row.range,
            row.note,
        )
        for row in rows
    ]
    table(("property", "value", "unit", "range", "remark"), cells, right=("value",))
    say()
    say("Sources:")
    for source in dict.fromkeys(row.source for row in rows):
        names = "; ".join(row.name for row in rows if row.source == source)
        say(f"  {source}: {names}")

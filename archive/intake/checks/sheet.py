"""What the sheet leaves unsaid, and texts in it that cannot be read."""

from __future__ import annotations

import os
from collections.abc import Iterator
from zoneinfo import ZoneInfo

import numpy as np
from pydantic import BaseModel

from archive.intake.checks.rows import bound, stated_uncertainty, tables
from archive.intake.checks.telling import listed, on_sheet, on_sweep
from archive.intake.paths import folder_files
from archive.intake.reading import Reading, SweepTable
from archive.intake.thresholds import Thresholds
from schemas.cooldown import EFFECTS
from schemas.finding import Finding
from schemas.quantity import Quantity
from schemas.sweep import Channel, Correction

__all__ = [
    "effects_not_stated",
    "files_not_named",
    "origins_not_stated",
    "texts_unreadable",
    "time_zone_unknown",
]


def time_zone_unknown(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find time zones that do not exist."""
    places: list[tuple[str | None, tuple[str | int, ...]]] = [(reading.sheet.time_zone, ("time_zone",))]
    places += [
        (layout.dialect.time_zone, ("layout", name, "dialect", "time_zone"))
        for name, layout in reading.sheet.layout.items()
    ]
    places += [
        (sweep.dialect.time_zone, ("sweep", number, "dialect"))
        for number, sweep in enumerate(reading.sheet.sweep)
        if sweep.dialect is not None
    ]
    for zone, path in places:
        if zone is not None and not _exists(zone):
            yield on_sheet(
                reading,
                "time-zone-unknown",
                "error",
                f"the time zone {zone!r} does not exist",
                *path,
                expected="a name of the IANA time zone database, such as Europe/Helsinki",
                remedy="correct the name",
            )


def _exists(zone: str) -> bool:
    try:
        ZoneInfo(zone)
    except (ValueError, OSError, KeyError):
        return False
    return True


def effects_not_stated(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Note the known effects that the sheet says nothing of."""
    stated = {effect.effect for effect in reading.sheet.effect}
    silent = [effect for effect in EFFECTS if effect not in stated]
    if silent:
        yield on_sheet(
            reading,
            "effects-not-stated",
            "note",
            f"{len(silent)} of {len(EFFECTS)} known effects have no state: {', '.join(silent)}",
            "effect",
            remedy='they will be printed as "not examined"; say what was done about them in [[effect]]',
        )


def origins_not_stated(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Note how many values do not say how they are known."""
    count = _unstated(reading.sheet)
    if count:
        yield on_sheet(
            reading,
            "origin-not-stated",
            "note",
            f"{count} value(s) do not say how they are known",
            remedy='write them as { quantity = "4.31(6) m^2", known = "measured", source = "..." } where it matters',
        )


def _unstated(value: object) -> int:
    if isinstance(value, Quantity):
        return int(value.known == "not stated")
    if isinstance(value, BaseModel):
        return sum(_unstated(getattr(value, name)) for name in type(value).model_fields)
    if isinstance(value, dict):
        return sum(_unstated(each) for each in value.values())
    if isinstance(value, tuple):
        return sum(_unstated(each) for each in value)
    return 0


def files_not_named(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Note files of the folder that the sheet does not name: they are not archived."""
    if not reading.folder.is_dir():
        return
    sheet = reading.sheet
    named = {
        reading.sheet_reading.file,
        *sheet.other_files,
        *(name for sweep in sheet.sweep for name in sweep.files),
    }
    named = {os.path.normpath(name).replace(os.sep, "/") for name in named}
    rest = [name for name in folder_files(reading.folder) if name not in named]
    if rest:
        yield on_sheet(
            reading,
            "files-not-named",
            "note",
            f"{len(rest)} file(s) of the folder are not named by the sheet and will not be archived: {listed(rest)}",
            "other_files",
            remedy="name them in a sweep or in other_files, or leave them",
        )


def texts_unreadable(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find uncertainties, full scales, corrections and bounds that are texts in the sheet and cannot be read."""
    seen: set[tuple[str | None, str]] = set()
    for table in tables(reading):
        for finding in (*_channel_texts(reading, table), *_sweep_texts(reading, table)):
            if (finding.field, finding.what) not in seen:
                seen.add((finding.field, finding.what))
                yield finding


def _channel_texts(reading: Reading, table: SweepTable) -> Iterator[Finding]:
    for name, channel in table.channels.items():
        readers = {
            "uncertainty": lambda each: stated_uncertainty(each, np.zeros(1)),
            "full_scale": _full_scale,
        }
        for key, read in readers.items():
            try:
                read(channel)
            except ValueError as error:
                what = f"{key} of channel {name}: {error}"
                yield on_sweep(
                    reading, table, "text-unreadable", "error", what, channel=name, remedy=f"correct {key}"
                )


def _full_scale(channel: Channel) -> float | None:
    return None if channel.full_scale is None else bound(channel.full_scale, channel)


def _sweep_texts(reading: Reading, table: SweepTable) -> Iterator[Finding]:
    for correction in table.sweep.corrections:
        try:
            _correction(correction, table.channels.get(correction.channel))
        except ValueError as error:
            yield on_sweep(
                reading,
                table,
                "text-unreadable",
                "error",
                f"a correction of channel {correction.channel}: {error}",
                key="corrections",
                remedy="write a quantity: of the channel for zero, a number for gain, an angle for phase, a time for clock",
            )
    for left_out in table.sweep.left_out:
        channel = table.channels.get(left_out.channel or "")
        try:
            for text in (left_out.low, left_out.high):
                if channel is not None and text is not None:
                    bound(text, channel)
        except ValueError as error:
            yield on_sweep(
                reading,
                table,
                "text-unreadable",
                "error",
                f"a bound of what is left out: {error}",
                key="left_out",
                remedy="write a quantity of that channel, or a time with its offset",
            )


def _correction(correction: Correction, channel: Channel | None) -> Quantity | None:
    """Return a correction as a quantity of the kind it must be; None for a channel that is not known."""
    if channel is None:
        return None
    kinds = {"zero": channel.quantity, "gain": "number", "phase": "phase", "clock": "time"}
    kind = kinds[correction.correct]
    return Quantity.parse(correction.value, "temperature_difference" if kind == "temperature" else kind)

"""What the sheet says of the run as a whole: its span, its doses in time, and what it leaves unsaid."""

from __future__ import annotations

import os
from collections.abc import Iterator
from datetime import UTC, datetime
from zoneinfo import ZoneInfo

import numpy as np
from pydantic import BaseModel

from archive.intake.checks.rows import bound, stated_uncertainty, tables, time_span
from archive.intake.checks.telling import listed, on_row, on_sheet, on_sweep
from archive.intake.folder import folder_files
from archive.intake.reading import Reading, SweepTable
from archive.intake.thresholds import Thresholds
from schemas.cooldown import EFFECTS
from schemas.finding import Finding
from schemas.quantity import Quantity
from schemas.sweep import Channel, Correction

__all__ = [
    "data_outside_cooldown",
    "dose_order",
    "doses_outside_cooldown",
    "effects_not_stated",
    "events_during_sweeps",
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


def data_outside_cooldown(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find sweeps with time stamps before the begin or after the end of the run."""
    begin, end = reading.sheet.begin, reading.sheet.end
    for table in tables(reading):
        name, span = table.of_kind("instant"), time_span(table)
        if name is None or span is None or table.time is None:
            continue
        for limit, at, word in (
            (begin, span[0], "before the cooldown begins"),
            (end, span[1], "after the cooldown ends"),
        ):
            if limit is None:
                continue
            if (at < limit.timestamp()) if limit is begin else (at > limit.timestamp()):
                row = int(np.nanargmin(table.time) if limit is begin else np.nanargmax(table.time))
                yield on_row(
                    table,
                    "time-outside-cooldown",
                    "warning",
                    f"a time stamp of {table.name} lies {word}",
                    row,
                    channel=name,
                    found=_instant(at),
                    expected=limit.isoformat(),
                    remedy="correct the clock by a correction, the time zone, or begin and end of the sheet",
                )


def _instant(seconds: float) -> str:
    return datetime.fromtimestamp(seconds, UTC).isoformat(timespec="seconds")


def doses_outside_cooldown(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find doses before the begin or after the end of the run."""
    begin, end = reading.sheet.begin, reading.sheet.end
    for number, dose in enumerate(reading.sheet.dose):
        early, late = begin is not None and dose.at < begin, end is not None and dose.at > end
        if early or late:
            yield on_sheet(
                reading,
                "dose-outside-cooldown",
                "warning",
                f"dose {dose.name} lies {'before the cooldown begins' if early else 'after the cooldown ends'}",
                "dose",
                number,
                "at",
                place=dose.name,
                found=dose.at.isoformat(),
                expected=str(begin.isoformat() if early and begin else end.isoformat() if end else ""),
                remedy="correct the time of the dose, or begin and end",
            )


def dose_order(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find doses that stand out of order, and sweeps that name their doses out of order."""
    doses = reading.sheet.dose
    for number in range(1, len(doses)):
        before, after = doses[number - 1], doses[number]
        if after.at < before.at:
            yield on_sheet(
                reading,
                "dose-order",
                "warning",
                f"dose {after.name} stands after {before.name} and is earlier",
                "dose",
                number,
                "at",
                place=after.name,
                found=after.at.isoformat(),
                expected=f"after {before.at.isoformat()}",
                remedy="correct the time, or put the doses in the order in which they were given",
            )
    at = {dose.name: dose.at for dose in doses}
    for number, sweep in enumerate(reading.sheet.sweep):
        times = [at[name] for name in sweep.doses if name in at]
        if times != sorted(times):
            yield on_sheet(
                reading,
                "dose-order",
                "warning",
                f"the doses of {sweep.name} are not named in the order of time",
                "sweep",
                number,
                "doses",
                place=sweep.name,
                remedy="name them in the order in which they were given",
            )
    yield from _dose_after_data(reading, at)


def _dose_after_data(reading: Reading, at: dict[str, datetime]) -> Iterator[Finding]:
    """Find sweeps that began before the dose they are said to follow, or after a later one."""
    counted = [dose for dose in reading.sheet.dose if dose.crossed_out is None]
    for table in tables(reading):
        after = table.sweep.after_dose
        span = time_span(table)
        if span is None or table.sweep.gas != "helium":
            continue
        begin = span[0]
        given = [dose.name for dose in counted if dose.at.timestamp() <= begin and dose.act != "recover"]
        wrong = None
        if after in at and begin < at[after].timestamp():
            wrong = f"{table.name} begins before dose {after}, which it is said to follow"
        elif after in given and given[-1] != after and table.sweep.kind != "dose-run":
            wrong = f"{table.name} is said to follow dose {after}, and {given[-1]} was given before it began"
        elif table.sweep.empty_cell and given:
            wrong = f"{table.name} is said to be of the empty cell, and {given[-1]} was given before it began"
        if wrong is not None:
            yield on_sweep(
                reading,
                table,
                "dose-order",
                "warning",
                wrong,
                key="empty_cell" if table.sweep.empty_cell else "after_dose",
                found=_instant(begin),
                remedy="correct after_dose, the time of the dose, or the clock of the sweep",
            )


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


def events_during_sweeps(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Note events that fall into a sweep which neither they nor its disturbances name."""
    for number, event in enumerate(reading.sheet.event):
        at = event.at.timestamp()
        hit = []
        for table in tables(reading):
            span = time_span(table)
            if span is None or not span[0] <= at <= span[1]:
                continue
            if table.sweep.kind != "log" and table.name not in event.sweeps and not table.sweep.disturbances:
                hit.append(table.name)
        if hit:
            yield on_sheet(
                reading,
                "event-during-sweep",
                "note",
                f"{event.what} at {event.at.isoformat()} falls into {listed(hit)}",
                "event",
                number,
                place=hit[0],
                remedy="name the sweeps in the event, or add a disturbance to them",
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

"""Names of the sheet that name nothing, stand twice, or do not fit together."""

from __future__ import annotations

import difflib
from collections import Counter
from collections.abc import Iterable, Iterator, Sequence
from itertools import pairwise

from archive.intake.checks.telling import listed, on_sheet
from archive.intake.reading import Reading
from archive.intake.thresholds import Thresholds
from schemas.cell import (
    AdsorptionCell,
    Calorimeter,
    Cryostat,
    PersistentCurrentRing,
    ResonatorCell,
    ThirdSoundRing,
    TorsionalOscillator,
)
from schemas.finding import Finding
from schemas.lineage import AnyRecord
from schemas.substrate import Sample, Substrate
from schemas.sweep import Channel
from schemas.thermometer import Calibration, Thermometer

__all__ = ["names_twice", "record_revisions", "unknown_names"]

_CELLS = (
    TorsionalOscillator,
    Calorimeter,
    PersistentCurrentRing,
    ThirdSoundRing,
    AdsorptionCell,
    ResonatorCell,
)
_RECORDS: dict[str, tuple[type, ...]] = {
    "cryostat": (Cryostat,),
    "cell": _CELLS,
    "substrate": (Substrate,),
    "sample": (Sample,),
    "thermometer": (Thermometer,),
    "calibration": (Calibration,),
}


def unknown_names(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find references that name nothing, or a thing of another kind."""
    sheet = reading.sheet
    doses = [dose.name for dose in sheet.dose]
    gauges, dosers = [gauge.name for gauge in sheet.gauge], [doser.name for doser in sheet.doser]
    sweeps = [sweep.name for sweep in sheet.sweep]
    for key in ("cryostat", "cell", "sample"):
        yield from _record(reading, key, getattr(sheet, key), key)
    for number, sweep in enumerate(sheet.sweep):
        path: tuple[str | int, ...] = ("sweep", number)
        for key in ("cell", "sample"):
            yield from _record(reading, key, getattr(sweep, key), *path, key, place=sweep.name)
        yield from _one(reading, "dose", sweep.after_dose, doses, *path, "after_dose", place=sweep.name)
        for named in sweep.doses:
            yield from _one(reading, "dose", named, doses, *path, "doses", place=sweep.name)
        channels = list(sheet.channels_of(sweep))
        if sweep.layout is None or sweep.layout in sheet.layout:
            yield from _one(
                reading, "channel", sweep.thermometer, channels, *path, "thermometer", place=sweep.name
            )
            for left_out in sweep.left_out:
                yield from _one(
                    reading, "channel", left_out.channel, channels, *path, "left_out", place=sweep.name
                )
            for correction in sweep.corrections:
                yield from _one(
                    reading, "channel", correction.channel, channels, *path, "corrections", place=sweep.name
                )
    yield from _of_channels(reading, gauges)
    for number, dose in enumerate(sheet.dose):
        path = ("dose", number)
        yield from _one(reading, "doser", dose.doser, dosers, *path, "doser", place=dose.name)
        yield from _one(reading, "gauge", dose.gauge, gauges, *path, "gauge", place=dose.name)
        yield from _record(reading, "sample", dose.sample, *path, "sample", place=dose.name)
    for number, event in enumerate(sheet.event):
        for sweep_name in event.sweeps:
            yield from _one(reading, "sweep", sweep_name, sweeps, "event", number, "sweeps")
    for kind, key in (("cell", "substrate"), ("calibration", "thermometer")):
        for number, record in enumerate(getattr(sheet.record, kind)):
            yield from _record(
                reading, key, getattr(record, key), "record", kind, number, key, place=record.address
            )


def _of_channels(reading: Reading, gauges: list[str]) -> Iterator[Finding]:
    """Find unknown names in the channels of layouts and sweeps."""
    sheet = reading.sheet
    places: list[tuple[tuple[str | int, ...], str | None, Iterable[tuple[str, Channel]]]] = [
        (("layout", name, "channels"), None, layout.channels.items()) for name, layout in sheet.layout.items()
    ]
    places += [
        (("sweep", n, "channels"), sweep.name, sweep.channels.items()) for n, sweep in enumerate(sheet.sweep)
    ]
    for path, sweep_name, channels in places:
        for name, channel in channels:
            place = None if sweep_name is None else f"{sweep_name}#{name}"
            for key in ("thermometer", "calibration"):
                yield from _record(reading, key, getattr(channel, key), *path, name, key, place=place)
            yield from _one(reading, "gauge", channel.gauge, gauges, *path, name, "gauge", place=place)


def _record(
    reading: Reading, kind: str, reference: str | None, *path: str | int, place: str | None = None
) -> Iterator[Finding]:
    if reference is None:
        return
    record = reading.record(reference)
    if record is None:
        known = [each.name for each in reading.records.values() if isinstance(each, _RECORDS[kind])]
        yield _unknown(reading, kind, reference, known, *path, place=place)
    elif not isinstance(record, _RECORDS[kind]):
        yield on_sheet(
            reading,
            "unknown-name",
            "error",
            f"{reference} is a {_kind(record)}, and a {kind} is to be named here",
            *path,
            place=place,
            remedy=f"name a {kind}",
        )


def _one(
    reading: Reading,
    kind: str,
    name: str | None,
    known: Sequence[str],
    *path: str | int,
    place: str | None = None,
) -> Iterator[Finding]:
    if name is not None and name not in known:
        yield _unknown(reading, kind, name, known, *path, place=place)


def _unknown(
    reading: Reading, kind: str, name: str, known: Sequence[str], *path: str | int, place: str | None
) -> Finding:
    close = difflib.get_close_matches(name, known, n=1)
    return on_sheet(
        reading,
        "unknown-name",
        "error",
        f"the {kind} {name!r} is not known",
        *path,
        place=place,
        expected=listed(list(dict.fromkeys(known))) or f"a {kind} that the sheet or the archive describes",
        remedy=f"did you mean {close[0]}?"
        if close
        else f"describe the {kind}, correct its name, or name the archive that holds it with --archive",
    )


def _kind(record: AnyRecord) -> str:
    return next(kind for kind, types in _RECORDS.items() if isinstance(record, types))


def names_twice(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find names that stand for two things."""
    sheet = reading.sheet
    for kind in ("sweep", "dose", "gauge", "doser", "dead_volume"):
        names = [each.name for each in getattr(sheet, kind)]
        for name, count in Counter(names).items():
            if count > 1:
                last = len(names) - 1 - names[::-1].index(name)
                yield on_sheet(
                    reading,
                    "name-twice",
                    "error",
                    f"the name {name} stands for {count} {kind.replace('_', ' ')}s",
                    kind,
                    last,
                    "name",
                    place=name,
                    remedy="give each its own name",
                )


def record_revisions(reading: Reading, thresholds: Thresholds) -> Iterator[Finding]:
    """Find revisions of one record that do not fit together."""
    by_name: dict[str, list[AnyRecord]] = {}
    for record in reading.records.values():
        by_name.setdefault(record.name, []).append(record)
    for name, records in by_name.items():
        records.sort(key=lambda record: record.revision)
        kinds = {_kind(record) for record in records}
        if len(kinds) > 1:
            yield _revision(
                reading,
                records[-1],
                "error",
                f"{name} names a {' and a '.join(sorted(kinds))}",
                "give each thing its own name",
            )
            continue
        for before, after in pairwise(records):
            if (
                before.valid_from is not None
                and after.valid_from is not None
                and after.valid_from < before.valid_from
            ):
                yield _revision(
                    reading,
                    after,
                    "warning",
                    f"{after.address} holds from {after.valid_from}, earlier than {before.address} ({before.valid_from})",
                    "correct the days or the revision numbers",
                )
    for record in reading.sheet.records:
        if record.revision > 1 and not record.changed:
            yield _revision(
                reading,
                record,
                "note",
                f"{record.address} does not say what changed since the revision before",
                'add changed = "..."',
            )


def _revision(reading: Reading, record: AnyRecord, severity: str, what: str, remedy: str) -> Finding:
    kind = _kind(record)
    written = list(getattr(reading.sheet.record, kind))
    path: tuple[str | int, ...] = ("record", kind, written.index(record)) if record in written else ()
    return on_sheet(reading, "record-revisions", severity, what, *path, place=record.address, remedy=remedy)  # type: ignore[arg-type]

"""The words by which a sweep is found: one text per sweep, gathered from everything that was written about it."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping

from pydantic import JsonValue

from schemas.lineage import AccessionDocument, SweepEntry

__all__ = ["folded", "searchable_text"]

# Fields of a record that say in words what the thing is; numbers and references are searched for by their own columns.
_WORDS = (
    "description",
    "changed",
    "material",
    "form",
    "preplating",
    "gas_source",
    "isotope",
    "kind",
    "place",
    "serial",
    "against",
)


def folded(words: str) -> str:
    """Text in which case does not count (Unicode default case folding), the same on every database engine."""
    return words.casefold().replace("\x00", " ")


def searchable_text(document: AccessionDocument, sweep: SweepEntry) -> str:
    """Folded text of all that was written about a sweep: names, purpose, notes, events, descriptions."""
    return folded("\n".join(part for part in _parts(document, sweep) if part))


def _parts(document: AccessionDocument, entry: SweepEntry) -> Iterator[str | None]:
    sheet = document.sheet
    yield from (f"{document.cooldown}/{entry.name}", entry.kind, *entry.files)
    yield from (sheet.purpose, sheet.next_step, sheet.cryostat, *sheet.operators)
    for channel in entry.channels:
        yield from (
            channel.name,
            channel.quantity,
            channel.description,
            channel.thermometer,
            channel.calibration,
        )
    for note in sheet.note:
        yield note.text
    for happening in sheet.event:
        if not happening.sweeps or entry.name in happening.sweeps:
            yield from (happening.what, happening.text)
    for sweep in sheet.sweep:
        if sweep.name == entry.name:
            yield from (sweep.notes, sweep.settled)
            yield from (left_out.reason for left_out in sweep.left_out)
            yield from (correction.source for correction in sweep.corrections)
            yield from (disturbance.what for disturbance in sweep.disturbances)
    content = {record.address: record.content for record in document.records}
    for address in _cited(entry):
        yield address
        yield from _words(content.get(address, {}))


def _cited(entry: SweepEntry) -> Iterable[str]:
    cited = [entry.cell, entry.substrate, entry.sample, *entry.thermometers]
    cited += [channel.calibration for channel in entry.channels]
    return dict.fromkeys(address for address in cited if address is not None)


def _words(content: Mapping[str, JsonValue]) -> Iterator[str]:
    for field in _WORDS:
        said = content.get(field)
        if isinstance(said, str):
            yield said

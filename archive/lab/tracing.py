"""Lineage as a person asks for it: from a result, a step, a sentence or a figure of a report back to lines of raw files.

The tree of `archive.reduction.trace` ends at records and at facts of the sheet; here both are led on to the line of the
raw sheet they stand in.
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import replace
from pathlib import Path

from archive.errors import ArchiveError, BadRequest
from archive.intake.sheet import LineMap
from archive.lab.cited import is_mark, parts_of, sources_of_figure, sources_of_mark
from archive.lab.effective import EffectiveSource
from archive.lab.source import LabSource, key_of
from archive.reduction.source import Source
from archive.reduction.trace import TraceNode, trace, trace_step
from schemas.address import parse_address
from schemas.lineage import AccessionDocument, RawFileEntry

__all__ = ["backward"]

_STEP = re.compile(r"^(?P<reduction>\S+@\S+?) step (?P<number>[1-9][0-9]{0,3})\Z")
_NAME = re.compile(r"^[A-Za-z0-9][A-Za-z0-9_-]{0,63}\Z")
_ACCESSION = re.compile(r"\.a[1-9][0-9]*$")


class _Sheet:
    """The raw sheet of an accession, with the lines of its tables."""

    def __init__(self, source: LabSource, document: AccessionDocument) -> None:
        self.document = document
        text = b"".join(source.store.raw(key_of(document.address), document.sheet_file)).decode(
            "utf-8", errors="replace"
        )
        self.lines = LineMap(text)
        self.content = document.sheet
        self.sha256 = source.store.raw_digest(key_of(document.address), document.sheet_file)

    def where(self, about: str) -> list[int]:
        """Lines of the known effect or the waiver that is meant; the first line if it is neither."""
        word, _, rest = about.partition(" ")
        effects, waivers = self.content.effect, self.content.waiver
        found = [("effect", n) for n, each in enumerate(effects) if (word, each.effect) == ("effect", rest)]
        found += [("waiver", n) for n, each in enumerate(waivers) if (each.check, each.place) == (word, rest)]
        return [self.lines.line(each) for each in found] or [1]

    def node(self, what: str, lines: Iterable[int]) -> TraceNode:
        """Return the raw file with the lines where something stands."""
        told = sorted(set(lines))
        where = f"line {told[0]}" if len(told) == 1 else f"lines {', '.join(map(str, told))}"
        address = f"{self.document.address}:{self.document.sheet_file}"
        return TraceNode(
            address, "raw-file", f"{address}, {what} at {where}, sha256 {self.sha256}",
            {"sha256": self.sha256, "lines": list(told)},
        )  # fmt: skip


def backward(source: LabSource, text: str) -> TraceNode:
    """Return the lineage tree of whatever a report cites.

    Parameters
    ----------
    source : LabSource
    text : str
        An address, a step (``2026-03/s017@film-transition.2 step 4``), or several of them with `;` between, as the comment
        before each sentence of a methods appendix gives them; the mark behind a sentence or figure with the folder of the
        appendix before it (``appendix#s17``); or the path of a figure beside its ``appendix.json``.

    Raises
    ------
    BadRequest
        If it is nothing of these.
    UnknownAddress
        If the archive does not hold it.
    """
    if is_mark(text):
        said = sources_of_mark(text)
        below = tuple(_led_home(source, _one(source, each), {}) for each in said.sources)
        return TraceNode(text, "citation", f"{text.rpartition('#')[2]}: {said.text}", {}, below)
    if text.endswith((".pdf", ".png", ".svg")):
        cited = sources_of_figure(Path(text))
        label = f"figure {Path(text).name}"
    else:
        cited = parts_of(text)
        label = f"{len(cited)} sources"
    nodes = [_led_home(source, _one(source, each), {}) for each in cited]
    if len(nodes) == 1:
        return nodes[0]
    if not nodes:
        raise BadRequest(
            "nothing is asked for", expected="an address such as 2026-03/s017@film-transition.2#T_KT"
        )
    return TraceNode("", "citation", label, {}, tuple(nodes))


def _one(source: LabSource, text: str) -> TraceNode:
    step = _STEP.match(text)
    if step is not None:
        read = _as_recorded(source, step["reduction"])
        return trace_step(step["reduction"], int(step["number"]), read)
    return _told_by_sheets(source, text) or trace(text, _as_recorded(source, text))


def _told_by_sheets(source: LabSource, text: str) -> TraceNode | None:
    """What an appendix says of a whole cooldown, of one of its known effects or findings, or of a thing in any revision."""
    if text.startswith("the "):
        return TraceNode("", "citation", f"{text}, all of them; ask for a sentence about one thing", {})
    head, _, about = text.partition(" ")
    if head in source.cooldowns():
        sheets = [_Sheet(source, each) for each in source.accessions(head)]
        below = [each.node(about or "the whole sheet", each.where(about)) for each in sheets]
        place = about.rpartition(" ")[2]
        return TraceNode(head, "cooldown", text, {}, (*below, *_place(source, head, place)))
    if text in {row.address for row in source.index.accessions(text.rpartition(".a")[0])}:
        sheet = _Sheet(source, source.accession(text))
        files = [each for each in sheet.document.raw_files if each.name != sheet.document.sheet_file]
        below = [sheet.node("the whole sheet", [1]), *(_raw(text, each) for each in files)]
        return TraceNode(text, "accession", text, {}, tuple(below))
    record = None if about or not _NAME.match(head) else source.find_record(head)
    return None if record is None else trace(record.address, source)


def _raw(accession: str, entry: RawFileEntry) -> TraceNode:
    address = f"{accession}:{entry.name}"
    return TraceNode(address, "raw-file", f"{address}, sha256 {entry.sha256}", {"sha256": entry.sha256})


def _place(source: LabSource, cooldown: str, place: str) -> list[TraceNode]:
    """The lineage of the sweep, channel or record that a finding is about, if it is one."""
    for address in (f"{cooldown}/{place}", place):
        try:
            return [_led_home(source, trace(address, source), {})]
        except (ArchiveError, ValueError):
            continue
    return []


def _as_recorded(source: LabSource, text: str) -> Source:
    """The archive as the reduction that an address names read it: with its own amendments and revisions."""
    try:
        reduction = parse_address(text).reduction
    except ValueError:
        return source
    return source if reduction is None else EffectiveSource(source, recorded=source.reduction(reduction))


def _led_home(source: LabSource, node: TraceNode, seen: dict[str, _Sheet]) -> TraceNode:
    """Return the tree with sheet lines below records and facts of a sheet."""
    children = tuple(_led_home(source, child, seen) for child in node.children)
    try:
        if node.kind == "value" and _ACCESSION.search(node.address):
            children += tuple(_facts_of(source, node, seen))
        elif node.kind == "record":
            children += tuple(_home_of_record(source, node, seen))
    except ArchiveError as problem:
        children += (TraceNode(node.address, "value", f"the sheet cannot be read: {problem}"),)
    return replace(node, children=children)


def _sheet(source: LabSource, address: str, seen: dict[str, _Sheet]) -> _Sheet:
    if address not in seen:
        seen[address] = _Sheet(source, source.accession(address))
    return seen[address]


def _facts_of(source: LabSource, node: TraceNode, seen: dict[str, _Sheet]) -> list[TraceNode]:
    """Where the facts that a step took from the sheet stand: doses and vessels for the gas, else the named table."""
    sheet = _sheet(source, node.address, seen)
    port = node.label.partition(":")[0]
    if port == "gas":
        doses = [sheet.lines.line(("dose", place)) for place in range(len(sheet.content.dose))]
        vessels = [
            sheet.lines.line((table, place))
            for table in ("doser", "gauge", "dead_volume")
            for place in range(len(getattr(sheet.content, table)))
        ]
        found = [sheet.node("doses", doses)] if doses else []
        return [*found, sheet.node("dosers, gauges and dead volumes", vessels)] if vessels else found
    path: tuple[str, ...] = ("detection", port)
    place = sheet.lines.line(path)
    return [sheet.node("detection" if port == "detection" else port.replace("_", " "), [place])]


def _home_of_record(source: LabSource, node: TraceNode, seen: dict[str, _Sheet]) -> list[TraceNode]:
    parsed = parse_address(node.address)
    row = next(
        (each for each in source.index.records(name=parsed.head) if each.address == node.address), None
    )
    if row is not None and row.accession is None:
        return _home_of_revision(source, row.address)
    if row is None or row.accession is None or not _ACCESSION.search(row.accession):
        return []
    sheet = _sheet(source, row.accession, seen)
    written = getattr(sheet.content.record, row.kind, ())
    for place, each in enumerate(written):
        if (each.name, each.revision) == (row.name, row.revision):
            return [sheet.node(row.kind, [sheet.lines.line(("record", row.kind, place))])]
    return []


def _home_of_revision(source: LabSource, address: str) -> list[TraceNode]:
    """The sheet that a revision came in with, outside a cooldown, kept in the revision's own sealed file."""
    document = source.revision(address)
    if document is None:
        return []
    key = key_of(address)
    sha256 = source.store.raw_digest(key, document.sheet_file)
    label = f"{key}, raw/{document.sheet_file}, by the {document.by}, {document.made.date()}, sha256 {sha256}"
    return [TraceNode(f"{address} {document.sheet_file}", "raw-file", label, {"sha256": sha256})]

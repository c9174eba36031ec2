"""Lineage as a person asks for it: from a result, a step, a sentence or a figure of a report back to lines of raw files.

The tree of `archive.reduction.trace` ends at records and at facts of the sheet; here both are led on to the line of the
raw sheet they stand in.
"""

from __future__ import annotations

import json
import re
from collections.abc import Iterable
from dataclasses import replace
from pathlib import Path

from archive.errors import ArchiveError, BadRequest
from archive.intake.sheet import LineMap
from archive.lab.effective import EffectiveSource
from archive.lab.source import LabSource, key_of
from archive.reduction.source import Source
from archive.reduction.trace import TraceNode, trace, trace_step
from schemas.address import parse_address
from schemas.lineage import AccessionDocument

__all__ = ["backward", "parts_of", "sources_of_figure"]

_STEP = re.compile(r"^(?P<reduction>\S+@\S+?) step (?P<number>[1-9][0-9]{0,3})$")
_CITED = re.compile(r"^\s*%\s*R[0-9]+\s*\|\s*")
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
        before each sentence of a methods appendix gives them; or the path of a figure beside its ``appendix.json``.

    Raises
    ------
    BadRequest
        If it is nothing of these.
    UnknownAddress
        If the archive does not hold it.
    """
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


def parts_of(text: str) -> list[str]:
    """Addresses and steps that a text cites; a raw file may have a semicolon in its name.

    Examples
    --------
    >>> parts_of("% R21 | 2026-03/s017@film-transition.2 step 4; 2026-03/s001@empty-cell.1 step 1")
    ['2026-03/s017@film-transition.2 step 4', '2026-03/s001@empty-cell.1 step 1']
    >>> parts_of("2026-03.a1:raw/first;second.csv")
    ['2026-03.a1:raw/first;second.csv']
    """
    try:
        parse_address(text)
    except ValueError:
        return [part.strip() for part in _CITED.sub("", text).split(";") if part.strip()]
    return [text]


def sources_of_figure(path: Path) -> list[str]:
    """Addresses of the reductions that a figure of a methods appendix was drawn from.

    Parameters
    ----------
    path : Path
        The figure's file, in the folder of its ``appendix.json`` or one below.

    Raises
    ------
    BadRequest
        If no ``appendix.json`` is there, it cannot be read, or it does not tell of the figure.
    """
    folder = path.resolve().parent
    listing = next(
        (each / "appendix.json" for each in (folder, folder.parent) if (each / "appendix.json").is_file()),
        None,
    )
    if listing is None:
        raise BadRequest(
            "this figure's appendix is not there", file=str(path), expected="appendix.json beside it or one folder up",
            remedy="give the figure's path inside the folder that `stillroom appendix` wrote, or an address",
        )  # fmt: skip
    try:
        sections = json.loads(listing.read_text(encoding="utf-8"))["sections"]
        figures = [figure for section in sections for figure in section["figures"]]
        told = next(
            (figure["reductions"] for figure in figures if Path(figure["file"]).name == path.name), None
        )
    except (OSError, ValueError, KeyError, TypeError) as error:
        raise BadRequest("this is no appendix of Stillroom", file=str(listing), found=str(error)) from None
    if not told:
        raise BadRequest("the appendix does not tell of this figure", file=str(listing), found=path.name)
    return [str(each) for each in told]


def _one(source: LabSource, text: str) -> TraceNode:
    step = _STEP.match(text)
    if step is not None:
        read = _as_recorded(source, step["reduction"])
        return trace_step(step["reduction"], int(step["number"]), read)
    return trace(text, _as_recorded(source, text))


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

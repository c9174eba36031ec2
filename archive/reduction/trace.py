"""Lineage of an address as a tree: result, step, inputs, and so on down to raw files with their digests."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field

from pydantic import JsonValue

from archive.errors import BadRequest, UnknownAddress
from archive.reduction.facts import accession_of
from archive.reduction.source import Source
from schemas.address import Address, parse_address
from schemas.lineage import (
    AccessionDocument,
    AnyRecord,
    OutputEntry,
    ReductionDocument,
    StepRecord,
    SweepEntry,
)
from schemas.thermometer import Calibration

__all__ = ["TraceNode", "trace", "trace_step"]


@dataclass(frozen=True)
class TraceNode:
    """One node of a lineage tree.

    Attributes
    ----------
    address : str
    kind : str
        result, array, step, channel, raw-file, record, sweep, reduction, accession, value.
    label : str
        One line for a person.
    facts : mapping
        Digests, parameters, values.
    children : tuple of TraceNode
        What it was made from.
    """

    address: str
    kind: str
    label: str
    facts: Mapping[str, JsonValue] = field(default_factory=dict)
    children: tuple[TraceNode, ...] = ()

    def to_dict(self) -> dict[str, JsonValue]:
        """Return the tree as JSON values."""
        return {
            "address": self.address, "kind": self.kind, "label": self.label, "facts": dict(self.facts),
            "children": [child.to_dict() for child in self.children],
        }  # fmt: skip

    def lines(self, depth: int = 0) -> Iterator[str]:
        """Yield the tree as text, two blanks a level."""
        yield f"{'  ' * depth}{self.label}"
        for child in self.children:
            yield from child.lines(depth + 1)


def trace(address: str, source: Source) -> TraceNode:
    """Return the lineage tree of an address.

    Parameters
    ----------
    address : str
        An output of a reduction, a reduction, a channel, a sweep or a record.
    source : Source

    Raises
    ------
    BadRequest
        The text is no address, or one that has no lineage.
    UnknownAddress
        Nothing has that address.
    """
    try:
        parsed = parse_address(address)
    except ValueError as error:
        raise BadRequest(str(error)) from None
    return _Tracer(source).node(parsed, ())


def trace_step(reduction: str, number: int, source: Source) -> TraceNode:
    """Return the lineage tree of one step of a reduction, as a sentence of a report cites it.

    Parameters
    ----------
    reduction : str
        Address of the reduction.
    number : int
        Number of the step, from 1.
    source : Source

    Raises
    ------
    BadRequest
        The text is no address of a reduction.
    UnknownAddress
        The reduction is not there, or has fewer steps.
    """
    try:
        parsed = parse_address(reduction)
    except ValueError as error:
        raise BadRequest(str(error)) from None
    document = source.reduction(parsed.text)
    if not 1 <= number <= len(document.steps):
        raise UnknownAddress(
            f"{reduction} has no step {number}", expected=f"a number from 1 to {len(document.steps)}"
        )
    return _Tracer(source).step(document, document.steps[number - 1], ())


class _Tracer:
    """Walks down; what was shown in full once is shown by name the next time, so that a tree stays a page."""

    def __init__(self, source: Source) -> None:
        self.source = source
        self.shown: set[str] = set()

    def node(self, address: Address, path: tuple[str, ...]) -> TraceNode:
        """Return the tree below an address."""
        if address.text in path:
            raise BadRequest(f"{address.text} rests on itself: {' -> '.join(path)}")
        path = (*path, address.text)
        match address.kind:
            case "output":
                return self._output(address, path)
            case "reduction":
                document = self.source.reduction(address.text)
                children = tuple(
                    self.node(parse_address(f"{address.text}#{entry.name}"), path)
                    for entry in document.outputs
                    if entry.rows is None
                )
                return TraceNode(
                    address.text,
                    "reduction",
                    f"{address.text} by plan {document.plan.address}",
                    {"plan_digest": document.plan_digest},
                    children,
                )
            case "channel" | "item":
                return self._sweep(address, path)
            case "record":
                return self._record(address, path)
        raise BadRequest(
            f"{address.text} has no lineage",
            expected="an output, a reduction, a channel, a sweep or a record",
        )

    def _output(self, address: Address, path: tuple[str, ...]) -> TraceNode:
        document = self.source.reduction(address.reduction or "")
        entry = next((each for each in document.outputs if each.name == address.part), None)
        if entry is None:
            raise UnknownAddress(
                f"{address.reduction} has no output {address.part}",
                expected=", ".join(each.name for each in document.outputs),
            )
        facts: dict[str, JsonValue] = {
            "digest": entry.digest,
            "quantity": entry.quantity,
            "unit": entry.unit,
            "scale": entry.scale,
            "value": entry.value,
            "uncertainty": entry.uncertainty,
        }
        label = f"{address.text} = {_shown(entry)}"
        if address.text in self.shown:
            return TraceNode(address.text, _kind(entry), f"{label} (see above)", facts)
        self.shown.add(address.text)
        return TraceNode(
            address.text,
            _kind(entry),
            label,
            facts,
            (self.step(document, document.steps[entry.step - 1], path),),
        )

    def step(self, document: ReductionDocument, step: StepRecord, path: tuple[str, ...]) -> TraceNode:
        """Return the tree below a step."""
        children = []
        for port, entry in step.inputs.items():
            try:
                parsed = parse_address(entry.address)
            except ValueError:
                parsed = None
            if parsed is not None and parsed.kind in ("output", "channel", "record"):
                children.append(self.node(parsed, path))
            else:
                value = "" if entry.value is None else f" = {entry.value.value} {entry.value.unit}"
                children.append(
                    TraceNode(
                        entry.address, "value", f"{port}: {entry.address}{value}", {"digest": entry.digest}
                    )
                )
        label = f"step {step.number} {step.name}.{step.version}: {step.sentence}"
        return TraceNode(
            f"{document.address} step {step.number}",
            "step",
            label,
            {"parameters": step.parameters, "version": step.version},
            tuple(children),
        )

    def _sweep(self, address: Address, path: tuple[str, ...]) -> TraceNode:
        accession, entry = accession_of(self.source, address.sweep or "")
        if address.part is None:
            return TraceNode(
                address.text,
                "sweep",
                f"{address.text}, {entry.kind}, {entry.rows} rows",
                {"accession": accession.address},
                _raw(accession, entry),
            )
        channel = next((each for each in entry.channels if each.name == address.part), None)
        if channel is None:
            raise UnknownAddress(
                f"{address.sweep} has no channel {address.part}",
                expected=", ".join(each.name for each in entry.channels),
            )
        label = f"{address.text}, {channel.quantity} in {channel.unit}, sha256 {channel.digest[:12]}"
        records = [
            self._record(parse_address(each), path)
            for each in (channel.calibration, channel.thermometer)
            if each is not None
        ]
        raw = () if address.text in self.shown else _raw(accession, entry)
        self.shown.add(address.text)
        return TraceNode(
            address.text, "channel", label, {"digest": channel.digest, "unit": channel.unit}, (*records, *raw)
        )

    def _record(self, address: Address, path: tuple[str, ...]) -> TraceNode:
        record = self.source.record(address.text)
        digest = self.source.digest(address.text)
        kind = type(record).__name__.lower()
        return TraceNode(
            address.text,
            "record",
            f"{address.text}, {kind}, sha256 {digest[:12]}",
            {"digest": digest, "record": kind},
            self._origin(record, path),
        )

    def _origin(self, record: AnyRecord, path: tuple[str, ...]) -> tuple[TraceNode, ...]:
        """Return the reduction that a calibration was made from, traced by its coefficients, or that it is not here."""
        made_from = record.made_from if isinstance(record, Calibration) else None
        if made_from is None:
            return ()
        try:
            document = self.source.reduction(made_from)
        except UnknownAddress:
            return (TraceNode(made_from, "reduction", f"{made_from}, not in this archive"),)
        planned = next((step for step in document.plan.step if step.use == "calibration-fit"), None)
        if planned is None or "coefficients" not in planned.give:
            return (self.node(parse_address(made_from), path),)
        return (self.node(parse_address(f"{made_from}#{planned.give['coefficients']}"), path),)


def _kind(entry: OutputEntry) -> str:
    return "result" if entry.rows is None else "array"


def _shown(entry: OutputEntry) -> str:
    if entry.rows is not None:
        return f"{entry.rows} rows of {entry.quantity} in {entry.unit}, sha256 {entry.digest[:12]}"
    if entry.value is None:
        return entry.verdict or "no value"
    spread = "" if entry.uncertainty is None else f" +/- {entry.uncertainty:.2g}"
    return f"{entry.value:.8g}{spread} {entry.unit}" + (f" on {entry.scale}" if entry.scale else "")


def _raw(accession: AccessionDocument, entry: SweepEntry) -> tuple[TraceNode, ...]:
    digests = {raw.name: raw for raw in accession.raw_files}
    found = []
    for name in entry.files:
        raw = digests.get(name)
        first = entry.first_lines.get(name)
        lines = "" if first is None else f", data from line {first}"
        digest = "digest not recorded" if raw is None else f"sha256 {raw.sha256}"
        facts: dict[str, JsonValue] = {
            "sha256": None if raw is None else raw.sha256,
            "first_line": first,
            "size": None if raw is None else raw.size,
        }
        found.append(
            TraceNode(
                f"{accession.address}:{name}",
                "raw-file",
                f"{accession.address}:{name}{lines}, {digest}",
                facts,
            )
        )
    return tuple(found)

"""What rests on a thing: lineage read forwards, from a raw file, record, plan, sweep or result to all that came of it."""

from __future__ import annotations

from collections.abc import Iterable

from archive.errors import BadRequest, UnknownAddress
from archive.index import SearchQuery
from archive.lab.source import LabSource
from archive.reduction.trace import TraceNode
from schemas.address import Address, parse_address
from schemas.lineage import AccessionDocument, OutputEntry, ReductionDocument, SweepEntry

__all__ = ["affected", "forward"]


def forward(source: LabSource, text: str) -> TraceNode:
    """Return the tree of everything that rests on an address.

    Parameters
    ----------
    source : LabSource
    text : str
        A raw file, accession, sweep, dose, channel, record, plan, reduction, array or result; a name without revision stands
        for all revisions.

    Returns
    -------
    TraceNode
        The children of a node rest on it. What was told in full once is told by name the next time.

    Raises
    ------
    BadRequest
        If the text is no address.
    UnknownAddress
        If the archive does not hold it.
    """
    try:
        address = parse_address(text)
    except ValueError as error:
        raise BadRequest(str(error)) from None
    walk = _Forward(source)
    while True:
        before = sum(map(len, walk.touched.values()))
        tree = walk.node(address)
        # A reduction may be reached by several ways; it is told with what any of them touches.
        if sum(map(len, walk.touched.values())) == before:
            return tree
        walk.shown.clear()


class _Forward:
    """Walks up; each reduction and sweep is told in full once."""

    def __init__(self, source: LabSource) -> None:
        self.source = source
        self.shown: set[str] = set()
        self.touched: dict[str, set[str]] = {}

    def node(self, address: Address) -> TraceNode:
        """Return the tree of what rests on an address."""
        ways = {
            "raw": self._raw,
            "accession": self._of_accession,
            "item": self._item,
            "channel": self._channel,
            "reduction": self._whole_reduction,
            "output": self._output,
            "record": self._record_or_plan,
            "name": self._name,
        }
        return ways[address.kind](address)

    def _name(self, address: Address) -> TraceNode:
        if self.source.index.accessions(address.head):
            documents = self.source.accessions(address.head)
            children = tuple(self._of_accession(parse_address(each.address)) for each in documents)
            label = f"{address.text}, cooldown of {len(documents)} accessions"
            return TraceNode(address.text, "cooldown", label, {}, children)
        revisions = sorted({row.address for row in self.source.index.records(name=address.head)})
        if not revisions:
            raise UnknownAddress(f"there is no cooldown or record {address.text} in this archive")
        label = f"{address.text}, {len(revisions)} revisions"
        return TraceNode(address.text, "record", label, {}, tuple(map(self._record, revisions)))

    def _of_accession(self, address: Address) -> TraceNode:
        document = self._accession(address.text)
        # A later cooldown may use what this one described.
        children = [self._sweep(document, entry) for entry in document.sweeps]
        children += [self._record(entry.address) for entry in document.records]
        label = f"{address.text}, accession of {document.cooldown}"
        return TraceNode(address.text, "accession", label, {}, (*children, *self._reductions([address.text])))

    def _channel(self, address: Address) -> TraceNode:
        document = self.source.holding(address.head, address.item or "")
        entry = next(each for each in document.sweeps if each.name == address.item)
        if all(channel.name != address.part for channel in entry.channels):
            raise UnknownAddress(
                f"{address.sweep} has no channel {address.part}",
                expected=", ".join(channel.name for channel in entry.channels),
            )
        return TraceNode(address.text, "channel", address.text, {}, self._reductions([address.text]))

    def _whole_reduction(self, address: Address) -> TraceNode:
        document = self.source.reduction(address.text)
        return self._reduction(document, {entry.name for entry in document.outputs})

    def _accession(self, address: str) -> AccessionDocument:
        if address not in {row.address for row in self.source.index.accessions()}:
            raise UnknownAddress(f"there is no accession {address} in this archive")
        return self.source.accession(address)

    def _raw(self, address: Address) -> TraceNode:
        accession = f"{address.head}.a{address.number}"
        document = self._accession(accession)
        raw = next((each for each in document.raw_files if each.name == address.raw), None)
        if raw is None:
            raise UnknownAddress(
                f"{accession} holds no file {address.raw}",
                expected=f"one of: {', '.join(each.name for each in document.raw_files[:12])}",
            )
        if raw.role == "sheet":
            children: tuple[TraceNode, ...] = (self.node(parse_address(accession)),)
        else:
            children = tuple(
                self._sweep(document, entry) for entry in document.sweeps if raw.name in entry.files
            )
        label = f"{address.text}, sha256 {raw.sha256}"
        return TraceNode(address.text, "raw-file", label, {"sha256": raw.sha256, "size": raw.size}, children)

    def _item(self, address: Address) -> TraceNode:
        for document in reversed(self.source.accessions(address.head)):
            for entry in document.sweeps:
                if entry.name == address.item:
                    return self._sweep(document, entry)
            if any(dose.name == address.item for dose in document.doses):
                return self._dose(address, document)
        raise UnknownAddress(f"there is no sweep or dose {address.text} in this archive")

    def _dose(self, address: Address, document: AccessionDocument) -> TraceNode:
        """Return what rests on a dose: every amount in the cell from it on."""
        names = [dose.name for dose in document.doses]
        later = set(names[names.index(address.item or "") :])
        nodes = []
        for entry in document.sweeps:
            if entry.after_dose in later or address.item in entry.doses:
                for row in self.source.index.reductions(sweep=f"{document.cooldown}/{entry.name}"):
                    reduction = self.source.reduction(row.address)
                    touched = affected(reduction, [document.address], port="gas")
                    nodes += [self._reduction(reduction, touched)] if touched else []
        label = f"{address.text}, dose that {len(nodes)} reductions count in their amounts"
        return TraceNode(address.text, "dose", label, {}, tuple(nodes))

    def _sweep(self, document: AccessionDocument, entry: SweepEntry) -> TraceNode:
        address = f"{document.cooldown}/{entry.name}"
        label = f"{address}, {entry.kind}, {entry.rows} rows, of {document.address}"
        if address in self.shown:
            return TraceNode(address, "sweep", f"{label} (see above)")
        self.shown.add(address)
        return TraceNode(address, "sweep", label, {"accession": document.address}, self._of_sweep(address))

    def _of_sweep(self, address: str) -> tuple[TraceNode, ...]:
        # A reduction of the sweep may take nothing but facts of the sheet; it rests on the sweep all the same.
        own = [row.address for row in self.source.index.reductions(sweep=address)]
        nodes = [
            self._reduction(document, {entry.name for entry in document.outputs})
            for document in map(self.source.reduction, own)
        ]
        others = [each for each in self.source.index.dependents(address) if each not in set(own)]
        return (*nodes, *self._reductions([address], among=others))

    def _record_or_plan(self, address: Address) -> TraceNode:
        if self.source.index.records(name=address.text):
            return self._record(address.text)
        own = [row.address for row in self.source.index.reductions(plan=address.text)]
        if not own:
            raise UnknownAddress(
                f"there is no record {address.text} in this archive, and no reduction by such a plan"
            )
        nodes = tuple(
            self._reduction(document, {entry.name for entry in document.outputs})
            for document in map(self.source.reduction, own)
        )
        return TraceNode(address.text, "plan", f"{address.text}, plan of {len(own)} reductions", {}, nodes)

    def _record(self, address: str) -> TraceNode:
        row = next((each for each in self.source.index.records(name=address)), None)
        kind = "record" if row is None else row.kind
        if address in self.shown:
            return TraceNode(address, "record", f"{address}, {kind} (see above)")
        self.shown.add(address)
        # What was measured in a cell, or with a thermometer, rests on it even where no step took a number from it.
        query = {"cell": SearchQuery(cell=address), "thermometer": SearchQuery(thermometer=address)}.get(kind)
        rows = [] if query is None else self.source.index.search(query)
        sweeps = tuple(self.node(parse_address(each.address)) for each in rows)
        return TraceNode(
            address, "record", f"{address}, {kind}", {"record": kind}, (*sweeps, *self._reductions([address]))
        )

    def _output(self, address: Address) -> TraceNode:
        document = self.source.reduction(address.reduction or "")
        entry = next((each for each in document.outputs if each.name == address.part), None)
        if entry is None:
            raise UnknownAddress(
                f"{address.reduction} has no output {address.part}",
                expected=", ".join(each.name for each in document.outputs),
            )
        touched = affected(document, [address.text]) - {entry.name}
        return TraceNode(
            address.text, "result" if entry.rows is None else "array", f"{address.text}{_value(entry)}", {},
            (*self._results(document, touched), *self._dependents(document, {entry.name, *touched})),
        )  # fmt: skip

    def _reductions(self, taken: Iterable[str], among: list[str] | None = None) -> tuple[TraceNode, ...]:
        """Reductions that took one of these addresses or a part of it, each with what is affected in it."""
        taken = list(taken)
        found = (
            among
            if among is not None
            else sorted({each for one in taken for each in self.source.index.dependents(one)})
        )
        nodes = []
        for address in found:
            document = self.source.reduction(address)
            nodes.append(self._reduction(document, affected(document, taken)))
        return tuple(nodes)

    def _reduction(self, document: ReductionDocument, touched: set[str]) -> TraceNode:
        label = f"{document.address} by plan {document.plan.address}"
        touched = self.touched[document.address] = touched | self.touched.get(document.address, set())
        if document.address in self.shown:
            return TraceNode(document.address, "reduction", f"{label} (see above)")
        self.shown.add(document.address)
        return TraceNode(
            document.address, "reduction", f"{label}, {_counted(document, touched)}", {"affected": [*sorted(touched)]},
            (*self._results(document, touched), *self._dependents(document, touched)),
        )  # fmt: skip

    @staticmethod
    def _results(document: ReductionDocument, touched: set[str]) -> tuple[TraceNode, ...]:
        return tuple(
            TraceNode(
                f"{document.address}#{entry.name}", "result", f"{document.address}#{entry.name}{_value(entry)}",
                {
                    "quantity": entry.quantity, "value": entry.value, "uncertainty": entry.uncertainty,
                    "unit": entry.unit, "scale": entry.scale,
                },
            )
            for entry in document.outputs
            if entry.rows is None and entry.name in touched
        )  # fmt: skip

    def _dependents(self, document: ReductionDocument, touched: set[str]) -> tuple[TraceNode, ...]:
        taken = [f"{document.address}#{name}" for name in sorted(touched)]
        return (*self._reductions(taken), *self._made(document, touched)) if taken else ()

    def _made(self, document: ReductionDocument, touched: set[str]) -> tuple[TraceNode, ...]:
        """Return the calibration records whose coefficients this reduction found, with all that used them."""
        fits = [step for step in document.steps if step.name == "calibration-fit"]
        if not any(touched.intersection(step.outputs) for step in fits):
            return ()
        rows = self.source.index.records(kind="calibration")
        return tuple(
            self._record(row.address) for row in rows if row.content.get("made_from") == document.address
        )


def affected(document: ReductionDocument, taken: Iterable[str], *, port: str | None = None) -> set[str]:
    """Names of the outputs of a reduction that rest on any of some addresses.

    Parameters
    ----------
    document : ReductionDocument
    taken : iterable of str
        Addresses of sweeps, channels, records or outputs; a sweep stands for its channels, a name for its revisions.
    port : str, optional
        Count only what steps took by this input of theirs.
    """
    wanted = tuple(taken)
    touched: set[str] = set()
    for step in document.steps:
        for name, entry in step.inputs.items():
            inner = entry.address.removeprefix(f"{document.address}#")
            asked = port in (None, name) and any(_stands_for(each, entry.address) for each in wanted)
            if inner in touched or asked:
                touched.update(step.outputs)
                break
    names = {f"{document.address}#{entry.name}" for entry in document.outputs}
    # An output asked for by name is itself affected.
    touched |= {each.partition("#")[2] for each in wanted if each in names}
    # An input that no step names (a fact that a channel was prepared with) may touch all of it.
    named = {entry.address for step in document.steps for entry in step.inputs.values()}
    if port is None and any(
        _stands_for(each, entry.address)
        for each in wanted
        for entry in document.inputs
        if entry.address not in named
    ):
        touched = {entry.name for entry in document.outputs}
    return touched


def _stands_for(asked: str, address: str) -> bool:
    return address == asked or address.startswith((f"{asked}#", f"{asked}:")) or (
        "." not in asked and "/" not in asked and address.startswith(f"{asked}.r")
    )  # fmt: skip


def _counted(document: ReductionDocument, touched: set[str]) -> str:
    results = sum(entry.rows is None and entry.name in touched for entry in document.outputs)
    arrays = sum(entry.rows is not None and entry.name in touched for entry in document.outputs)
    return f"{results} results and {arrays} arrays"


def _value(entry: OutputEntry) -> str:
    if entry.rows is not None:
        return f", {entry.rows} rows in {entry.unit}"
    if entry.value is None:
        return f": {entry.verdict or 'no value'}"
    spread = "" if entry.uncertainty is None else f" +/- {entry.uncertainty:.2g}"
    return f" = {entry.value:.8g}{spread} {entry.unit}" + (f" on {entry.scale}" if entry.scale else "")

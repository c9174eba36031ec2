"""What the archive knows of a thing, by its address, as JSON-able content."""

from __future__ import annotations

import json
from dataclasses import asdict
from typing import Any

from archive.errors import UnknownAddress
from archive.lab.effective import EffectiveSource
from archive.lab.marks import marks_of
from archive.lab.reducing import plans
from archive.lab.source import LabSource, key_of
from archive.reduction.budget import budget
from schemas.address import Address, parse_address
from schemas.base import Record
from schemas.lineage import AccessionDocument, OutputEntry, ReductionDocument, SweepEntry

__all__ = ["show"]

# Cooldowns that a sentence names, the latest ones.
_NAMED = 12


def show(source: LabSource, text: str) -> dict[str, Any]:
    """Content of whatever an address names, with `address` and `what`.

    Raises
    ------
    UnknownAddress
        If the archive holds no such thing; the message says what is near.
    """
    try:
        address = parse_address(text)
    except ValueError as error:
        raise UnknownAddress(str(error)) from None
    shown = {
        "name": _name,
        "accession": _accession,
        "raw": _raw,
        "item": _item,
        "channel": _channel,
        "reduction": _reduction,
        "output": _output,
        "record": _record,
        "amendment": _act,
        "withdrawal": _act,
    }[address.kind](source, address)
    return {"address": text, "what": shown["what"], **marks_of(source, address), **shown}


def _plain(record: Record) -> dict[str, Any]:
    content: dict[str, Any] = json.loads(record.model_dump_json(exclude_none=True))
    return content


def _read(source: LabSource, cooldown: str) -> list[AccessionDocument]:
    """Accessions of a cooldown as they are to be read; withdrawn ones too, since whatever has an address is shown."""
    return EffectiveSource(source, withdrawn_too=True).accessions(cooldown)


def _name(source: LabSource, address: Address) -> dict[str, Any]:
    documents = _read(source, address.head)
    if not documents:
        return _record(source, address)
    newest = documents[-1]
    return {
        "what": "cooldown",
        "begin": None if newest.sheet.begin is None else newest.sheet.begin.isoformat(),
        "end": None if newest.sheet.end is None else newest.sheet.end.isoformat(),
        "purpose": newest.sheet.purpose,
        "outcome": newest.sheet.outcome,
        "cell": newest.sheet.cell,
        "cryostat": newest.sheet.cryostat,
        "gas_end": _plain(newest.sheet.gas_end),
        "accessions": [document.address for document in documents],
        "amendments": [row.address for row in source.index.amendments(address.head)],
        "sweeps": [f"{address.head}/{row.name}" for row in source.index.sweeps(address.head, withdrawn=True)],
        "doses": [_plain(dose) for dose in newest.doses],
        "reductions": [
            row.address for row in source.index.reductions(cooldown=address.head, newest_only=True)
        ],
        "findings": [_plain(finding) for finding in newest.findings],
        "cautions": list(newest.cautions),
    }


def _accession(source: LabSource, address: Address) -> dict[str, Any]:
    if not source.store.contains(key_of(address.text)):
        raise UnknownAddress(f"there is no accession {address.text} in this archive")
    document = source.accession(address.text)
    sha256, size = source.index.sealed_files()[key_of(address.text)]
    content = _plain(document)
    content.pop("sheet")
    return {"what": "accession", "sha256": sha256, "size": size, **content}


def _raw(source: LabSource, address: Address) -> dict[str, Any]:
    accession = address.text.partition(":")[0]
    _accession(source, parse_address(accession))
    for entry in source.accession(accession).raw_files:
        if entry.name == address.raw:
            return {"what": "raw file", "accession": accession, **_plain(entry)}
    names = ", ".join(entry.name for entry in source.accession(accession).raw_files[:10])
    raise UnknownAddress(f"{accession} holds no raw file {address.raw}", expected=f"one of: {names}, ...")


def _entry(source: LabSource, address: Address) -> tuple[AccessionDocument, SweepEntry]:
    for document in reversed(_read(source, address.head)):
        for entry in document.sweeps:
            if entry.name == address.item:
                return document, entry
    raise UnknownAddress(
        f"there is no sweep {address.sweep} in this archive", remedy="list them with: stillroom search"
    )


def _item(source: LabSource, address: Address) -> dict[str, Any]:
    documents = _read(source, address.head)
    for dose in documents[-1].doses if documents else ():
        if dose.name == address.item:
            written = next(each for each in documents[-1].sheet.dose if each.name == dose.name)
            return {"what": "dose", **_plain(dose), "sheet": _plain(written)}
    document, entry = _entry(source, address)
    written_sweep = next(each for each in document.sheet.sweep if each.name == entry.name)
    reductions = source.index.reductions(sweep=f"{address.head}/{address.item}")
    results = source.index.results(sweep=f"{address.head}/{address.item}", withdrawn=True)
    return {
        "what": "sweep",
        "accession": document.address,
        **_plain(entry),
        "sheet": _plain(written_sweep),
        "reductions": [row.address for row in reductions],
        "results": [
            {
                "address": f"{row.reduction}#{row.name}",
                "value": row.value,
                "uncertainty": row.uncertainty,
                "unit": row.unit,
                "verdict": row.verdict,
                **({"withdrawn": True} if row.withdrawn else {}),
                **({"rests_on_withdrawn": True} if row.flagged else {}),
            }
            for row in results
        ],
        "findings": [
            _plain(finding)
            for finding in documents[-1].findings
            if finding.place is not None and finding.place.split("#")[0] == entry.name
        ],
    }


def _channel(source: LabSource, address: Address) -> dict[str, Any]:
    document, entry = _entry(source, address)
    for channel in entry.channels:
        if channel.name == address.part:
            return {
                "what": "channel",
                "accession": document.address,
                "sweep": address.sweep,
                "rows": entry.rows,
                **_plain(channel),
            }
    names = ", ".join(channel.name for channel in entry.channels)
    raise UnknownAddress(f"{address.sweep} has no channel {address.part}", expected=f"one of: {names}")


def _reduction(source: LabSource, address: Address) -> dict[str, Any]:
    document = source.reduction(address.text)
    return {"what": "reduction", **_plain(document)}


def _output(source: LabSource, address: Address) -> dict[str, Any]:
    document = source.reduction(address.reduction or "")
    output = _named(document, address)
    step = document.steps[output.step - 1]
    return {
        "what": "result" if output.rows is None else "array",
        "reduction": document.address,
        "plan": document.plan.address,
        **_plain(output),
        "sentence": step.sentence,
        "sources": [_plain(entry) for entry in document.sources if entry.name in output.shared],
        **_uncertainty(document, output),
    }


def _uncertainty(document: ReductionDocument, output: OutputEntry) -> dict[str, Any]:
    """Budget of a result, and what a Monte Carlo run found of it."""
    content: dict[str, Any] = {}
    rows = budget(document, output)
    if rows:
        content["budget"] = [
            {**asdict(row), "stated": None if row.stated is None else _plain(row.stated)} for row in rows
        ]
    run = document.monte_carlo
    found = None if run is None else next((each for each in run.results if each.name == output.name), None)
    if run is not None and found is not None:
        content["monte_carlo"] = {**_plain(run), "results": [_plain(found)]}
    return content


def _named(document: ReductionDocument, address: Address) -> OutputEntry:
    for output in document.outputs:
        if output.name == address.part:
            return output
    names = ", ".join(output.name for output in document.outputs)
    raise UnknownAddress(f"{document.address} has no output {address.part}", expected=f"one of: {names}")


def _act(source: LabSource, address: Address) -> dict[str, Any]:
    key = key_of(address.text)
    if not source.store.contains(key):
        raise UnknownAddress(f"there is no {address.kind} {address.text} in this archive")
    sha256, size = source.index.sealed_files()[key]
    content = _plain(source.document(key))
    # How sweeps are found from now on is for the index; the differences say it to people.
    content.pop("entries", None)
    return {"what": address.kind, "sha256": sha256, "size": size, **content}


def _record(source: LabSource, address: Address) -> dict[str, Any]:
    record = source.find_record(address.text)
    if record is not None:
        rows = source.index.records(name=address.head)
        return {
            "what": next(row.kind for row in rows),
            **_plain(record),
            "revisions": sorted(row.address for row in rows),
        }
    fitting = [each for each in plans(source) if address.text in (each.name, each.address)]
    if fitting:
        return {"what": "plan", **_plain(max(fitting, key=lambda each: each.revision))}
    revisions = source.index.records(name=address.head)
    if revisions:
        held = ", ".join(sorted(row.address for row in revisions))
        raise UnknownAddress(f"there is no {address.text} in this archive", expected=f"one of: {held}")
    known = source.cooldowns()
    more = f" and {len(known) - _NAMED} more" if len(known) > _NAMED else ""
    hint = f"cooldowns here: {', '.join(known[-_NAMED:])}{more}" if known else "this archive is empty"
    raise UnknownAddress(f"there is nothing at {address.text} in this archive", expected=hint)

"""Rows of one sealed file's document.

Rules
-----
* What is written depends on the document alone, never on the order in which files are recorded, nor on the clock.
* A value whose quantity or unit `schemas` does not know has no SI value: it is listed, and no search by number finds it.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

from sqlalchemy import Connection, delete, update

from archive.index import queries, tables
from archive.index.acts import add_replaced_records
from archive.index.rows import add_rows, seal_row, si_value
from archive.index.searchable import searchable_text
from schemas.address import parse_address
from schemas.finding import Finding
from schemas.lineage import AccessionDocument, OutputEntry, ReductionDocument, SweepEntry, Value

__all__ = ["add_accession", "add_reduction", "clear"]

# Fields whose columns bear their names.
_SWEEP = {
    "kind",
    "cell",
    "substrate",
    "sample",
    "empty_cell",
    "after_dose",
    "begin",
    "end",
    "direction",
    "rows",
}
_CHANNEL = {
    *("name", "quantity", "unit", "ucum", "description", "scale", "thermometer", "calibration"),
    *("low", "high", "missing", "use", "digest"),
}
_DOSE = {"name", "at", "act", "counted", "method"}
_STEP = {"number", "name", "version", "sentence", "parameters", "begin", "end"}
_OUTPUT = {
    *("name", "quantity", "unit", "ucum", "description", "step", "scale", "rows", "value", "uncertainty"),
    *("verdict", "digest"),
}


def clear(connection: Connection) -> None:
    """Take every row out of every table."""
    for table in reversed(tables.Base.metadata.sorted_tables):
        connection.execute(delete(table))


def add_accession(
    connection: Connection, document: AccessionDocument, *, key: str, sha256: str, size: int
) -> None:
    """Add the rows of an accession; nothing when they are there already.

    Parameters
    ----------
    connection : Connection
        In a writing transaction.
    document : AccessionDocument
        What the sealed file says about itself.
    key, sha256 : str
        Name and digest of the sealed file.
    size : int
        Its bytes.

    Raises
    ------
    DamagedFile
        If the index holds this file with another digest or size.
    """
    if not seal_row(connection, document.address, "accession", key=key, sha256=sha256, size=size):
        return
    _tell_cooldown(connection, document)
    add_rows(
        connection,
        tables.Accession,
        [
            {
                "address": document.address,
                "cooldown": document.cooldown,
                "number": document.number,
                "key": key,
                "accessioned": document.accessioned,
                "supplements": document.supplements,
                "sheet_file": document.sheet_file,
                "differences": list(document.differences),
                "stillroom": document.software.stillroom,
            }
        ],
    )
    held = {"accession": document.address}
    add_rows(
        connection,
        tables.RawFile,
        (
            {**held, "name": raw.name, "sha256": raw.sha256, "size": raw.size, "role": raw.role}
            for raw in document.raw_files
        ),
    )
    add_rows(connection, tables.Record, _record_rows(document))
    add_rows(connection, tables.Sweep, (_sweep_row(document, entry) for entry in document.sweeps))
    add_rows(
        connection,
        tables.SweepThermometer,
        (
            {**held, "sweep": entry.name, "position": position, "thermometer": thermometer}
            for entry in document.sweeps
            for position, thermometer in enumerate(entry.thermometers)
        ),
    )
    add_rows(
        connection,
        tables.Channel,
        (
            {**held, "sweep": entry.name, "position": position, **channel.model_dump(include=_CHANNEL)}
            for entry in document.sweeps
            for position, channel in enumerate(entry.channels)
        ),
    )
    add_rows(connection, tables.Dose, _dose_rows(document))
    add_rows(connection, tables.Finding, _finding_rows(key, 0, document.findings))


def add_reduction(
    connection: Connection, document: ReductionDocument, *, key: str, sha256: str, size: int
) -> None:
    """Add the rows of a reduction; nothing when they are there already.

    Parameters and errors are those of `add_accession`. The accession that it rests on need not be recorded: it may be
    the damaged one.
    """
    if not seal_row(connection, document.address, "reduction", key=key, sha256=sha256, size=size):
        return
    address = parse_address(document.address)
    if connection.execute(queries.cooldown_newest(document.cooldown)).first() is None:
        add_rows(connection, tables.Cooldown, [{"name": document.cooldown}])
    plan = document.plan
    if connection.execute(queries.plan_known(plan.address, document.plan_digest)).first() is None:
        add_rows(
            connection,
            tables.Plan,
            [
                {
                    "address": plan.address,
                    "digest": document.plan_digest,
                    "name": plan.name,
                    "revision": plan.revision,
                    "title": plan.title,
                    # Defaults are left out, so that a field which a later version adds changes no row.
                    "content": plan.model_dump(mode="json", exclude_defaults=True),
                }
            ],
        )
    add_rows(
        connection,
        tables.Reduction,
        [
            {
                "address": document.address,
                "key": key,
                "cooldown": document.cooldown,
                "sweep": address.sweep,
                "plan": address.plan,
                "number": document.number,
                "plan_address": plan.address,
                "plan_digest": document.plan_digest,
                "supersedes": document.supersedes,
                "begin": document.begin,
                "end": document.end,
                "stillroom": document.software.stillroom,
            }
        ],
    )
    held = {"reduction": document.address}
    add_rows(connection, tables.ReductionInput, _input_rows(document))
    add_replaced_records(connection, document)
    add_rows(
        connection,
        tables.Step,
        ({**held, **step.model_dump(include=_STEP)} for step in document.steps),
    )
    headline = {name: place for place, name in enumerate(plan.headline)}
    add_rows(
        connection,
        tables.Output,
        (
            {**held, **_output_row(output, position, headline)}
            for position, output in enumerate(document.outputs)
        ),
    )
    add_rows(connection, tables.Finding, _finding_rows(key, 0, document.findings))
    for step in document.steps:
        add_rows(connection, tables.Finding, _finding_rows(key, step.number, step.findings))


def _tell_cooldown(connection: Connection, document: AccessionDocument) -> None:
    sheet = document.sheet
    told = {
        "newest": document.number,
        "begin": sheet.begin,
        "end": sheet.end,
        "outcome": sheet.outcome,
        "purpose": sheet.purpose,
        "next_step": sheet.next_step,
        "cryostat": sheet.cryostat,
        "cell": sheet.cell,
        "licence": sheet.licence,
    }
    known = connection.execute(queries.cooldown_newest(document.cooldown)).first()
    if known is None:
        add_rows(connection, tables.Cooldown, [dict(name=document.cooldown, **told)])
    elif known.newest is None or known.newest < document.number:
        connection.execute(
            update(tables.Cooldown).where(tables.Cooldown.name == document.cooldown).values(**told)
        )


def _record_rows(document: AccessionDocument) -> Iterable[dict[str, Any]]:
    for record in document.records:
        address = parse_address(record.address)
        yield {
            "accession": document.address,
            "address": record.address,
            "name": address.head,
            "revision": address.number,
            "kind": record.kind,
            "digest": record.digest,
            "content": record.content,
        }


def _sweep_row(document: AccessionDocument, entry: SweepEntry) -> dict[str, Any]:
    coverage, coverage_uncertainty = si_value(entry.coverage, "coverage")
    scales = [value.scale for value in (entry.temperature_low, entry.temperature_high) if value is not None]
    scales += [channel.scale for channel in entry.channels if channel.use]
    return {
        "accession": document.address,
        "name": entry.name,
        "address": f"{document.cooldown}/{entry.name}",
        "cooldown": document.cooldown,
        "number": document.number,
        **entry.model_dump(include=_SWEEP),
        "amount_mol": si_value(entry.amount, "amount")[0],
        "coverage_mol_per_m2": coverage,
        "coverage_uncertainty_mol_per_m2": coverage_uncertainty,
        "temperature_low_K": si_value(entry.temperature_low, "temperature")[0],
        "temperature_high_K": si_value(entry.temperature_high, "temperature")[0],
        "scale": next((scale for scale in scales if scale is not None), None),
        "text": searchable_text(document, entry),
    }


def _dose_rows(document: AccessionDocument) -> Iterable[dict[str, Any]]:
    for position, dose in enumerate(document.doses):
        amount, amount_uncertainty = si_value(dose.amount, "amount")
        running, running_uncertainty = si_value(dose.running_amount, "amount")
        coverage, coverage_uncertainty = si_value(dose.running_coverage, "coverage")
        yield {
            "accession": document.address,
            "position": position,
            **dose.model_dump(include=_DOSE),
            "amount_mol": amount,
            "amount_uncertainty_mol": amount_uncertainty,
            "running_amount_mol": running,
            "running_amount_uncertainty_mol": running_uncertainty,
            "running_coverage_mol_per_m2": coverage,
            "running_coverage_uncertainty_mol_per_m2": coverage_uncertainty,
        }


def _finding_rows(key: str, step: int, findings: Iterable[Finding]) -> Iterable[dict[str, Any]]:
    for position, finding in enumerate(findings):
        yield {
            "key": key,
            "step": step,
            "position": position,
            "code": finding.code,
            "severity": finding.severity,
            "what": finding.what,
            "place": finding.place,
            "waived": finding.waived is not None,
            "content": finding.model_dump(mode="json", exclude_defaults=True),
        }


def _input_rows(document: ReductionDocument) -> Iterable[dict[str, Any]]:
    for position, entry in enumerate(document.inputs):
        value = entry.value
        yield {
            "reduction": document.address,
            "position": position,
            "address": entry.address,
            "role": entry.role,
            "digest": entry.digest,
            "value": None if value is None else value.value,
            "uncertainty": None if value is None else value.uncertainty,
            "unit": None if value is None else value.unit,
            "scale": None if value is None else value.scale,
        }


def _output_row(output: OutputEntry, position: int, headline: Mapping[str, int]) -> dict[str, Any]:
    value, uncertainty = si_value(
        Value(value=output.value, uncertainty=output.uncertainty, unit=output.unit), output.quantity
    )
    return {
        "position": position,
        "headline": headline.get(output.name),
        **output.model_dump(include=_OUTPUT),
        "value_si": value,
        "uncertainty_si": uncertainty,
    }

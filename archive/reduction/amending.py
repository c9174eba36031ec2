"""An accession as it is to be read: its sheet with the amendments that count, its records in the revisions that hold.

The sealed accession stays as it is. What is made here is a document of the same form with other values in it: the sheet's
fields that amendments change, rows left out, records put in the place of others, and what follows from these, namely the
gas ledger and what is known of each sweep.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Sequence

from pydantic import ValidationError

from archive.errors import BadRequest
from archive.reduction.amended_entries import Replace, amended_entry
from archive.reduction.field_paths import Content, changed_content, value_at
from archive.reduction.ledger import gas_ledger
from archive.reduction.record_kinds import record_entry
from archive.reduction.rows_meant import digest_of_rows
from archive.reduction.sheet_of_sweep import sheet_of_sweep
from schemas.acts import AmendmentDocument, Change, LeftOutRows
from schemas.address import parse_address
from schemas.cooldown import CooldownSheet
from schemas.lineage import AccessionDocument, AnyRecord, DoseEntry
from schemas.substrate import Sample, Substrate
from schemas.time_faults import time_fault

__all__ = ["Find", "amended_accession", "bears_on"]

Find = Callable[[str], AnyRecord | None]
"""Record by address, or the newest revision of a name; None if there is none."""


def amended_accession(
    accession: AccessionDocument, amendments: Sequence[AmendmentDocument], *, replace: Replace, find: Find
) -> AccessionDocument:
    """Accession as it is to be read.

    Parameters
    ----------
    accession : AccessionDocument
        As sealed.
    amendments : sequence of AmendmentDocument
        Those that count, in order of number.
    replace : callable
        Address of the revision that holds in the place of one that is named; the same address where nothing does.
    find : callable
        Records.

    Raises
    ------
    BadRequest
        If the sheet with its amendments is no sheet any more, or its doses cannot be added up.
    """
    sheet = _amended_sheet(accession, amendments)
    entries = tuple(
        amended_entry(accession, sheet, entry, amendments, replace=replace, find=find)
        for entry in accession.sweeps
    )
    if sheet is accession.sheet and entries == accession.sweeps:
        return accession
    found = accession.model_copy(update={"sheet": sheet, "sweeps": entries})
    doses = _ledger(accession, found, find)
    if doses is not accession.doses:
        entries = tuple(
            amended_entry(accession, sheet, entry, amendments, replace=replace, find=find, doses=doses)
            for entry in accession.sweeps
        )
        found = found.model_copy(update={"sweeps": entries, "doses": doses})
    return found.model_copy(update={"records": (*accession.records, *_more_records(found, find))})


def _amended_sheet(accession: AccessionDocument, amendments: Sequence[AmendmentDocument]) -> CooldownSheet:
    sealed: Content = accession.sheet.model_dump(mode="json")
    content = sealed
    for amendment in amendments:
        older = accession.number <= (parse_address(amendment.rests_on).number or 0)
        for change in amendment.change:
            if _is_meant(sealed, change, older=older):
                content = changed_content(content, change)
        for left in amendment.left_out:
            content = _without_rows(accession, content, left)
    if content is sealed:
        return accession.sheet
    try:
        return CooldownSheet.model_validate_json(json.dumps(content))
    except ValidationError as error:
        fault = error.errors(include_url=False)[0]
        place = ".".join(str(part) for part in fault["loc"])
        of_time = time_fault(fault["type"])
        said = str(fault.get("ctx", {}).get("error", fault["msg"])) if of_time is None else "; ".join(of_time)
        raise BadRequest(
            f"the sheet of {accession.address} with its amendments "
            f"({', '.join(each.address for each in amendments)}) is no sheet: {said}",
            field=place or None,
            remedy="correct the amendment; one that is sealed is withdrawn with: stillroom withdraw ADDRESS",
        ) from None


def _is_meant(sealed: Content, change: Change, *, older: bool) -> bool:
    """Whether a change is about a sheet: a later one that says something else has the last word."""
    try:
        said = value_at(sealed, change)
    except ValueError:
        return False
    return older or said == change.was


def _without_rows(accession: AccessionDocument, content: Content, left: LeftOutRows) -> Content:
    entry = next((each for each in accession.sweeps if each.name == left.sweep), None)
    if entry is None or left.data not in (None, digest_of_rows(entry)):
        return content
    more = {"channel": None, "low": None, "high": None, "rows": list(left.rows), "reason": left.reason}
    sweeps = [
        {**each, "left_out": [*each["left_out"], more]} if each["name"] == left.sweep else each
        for each in content["sweep"]
    ]
    return {**content, "sweep": sweeps}


def _ledger(sealed: AccessionDocument, found: AccessionDocument, find: Find) -> tuple[DoseEntry, ...]:
    """The gas ledger, made anew when anything that it rests on is read otherwise."""
    before, after = _gas(sealed, find), _gas(found, find)
    if before == after or not found.sheet.dose:
        return sealed.doses
    _, _, _, sample, substrate = after
    area = substrate.area if isinstance(substrate, Substrate) else None
    try:
        return gas_ledger(
            found.sheet, sample=sample if isinstance(sample, Sample) else None, area=area
        ).entries
    except ValueError as error:
        raise BadRequest(
            f"the doses of {found.address} cannot be added up as amended: {error}",
            remedy="correct the amendment",
        ) from None


def _gas(
    accession: AccessionDocument, find: Find
) -> tuple[object, object, object, AnyRecord | None, AnyRecord | None]:
    """What the ledger rests on: doses, metering volumes, gauges, the gas, and the area of the run's cell."""
    sheet = accession.sheet
    at = {each.sample for each in accession.sweeps if each.sample is not None}
    stated = None if sheet.sample is None else find(sheet.sample)
    sample = next((find(each) for each in sorted(at) if _same(each, sheet.sample)), stated)
    cells = {each.cell: each.substrate for each in accession.sweeps if _same(each.cell, sheet.cell)}
    substrate = next((find(each) for each in cells.values() if each is not None), None)
    return sheet.dose, sheet.doser, sheet.gauge, sample, substrate


def _same(one: str | None, other: str | None) -> bool:
    return one is not None and other is not None and one.partition(".r")[0] == other.partition(".r")[0]


def _more_records(found: AccessionDocument, find: Find) -> list[object]:
    held = {each.address for each in found.records}
    named: dict[str, None] = {}
    for entry in found.sweeps:
        addresses = [entry.cell, entry.substrate, entry.sample, *entry.thermometers]
        addresses += [channel.calibration for channel in entry.channels]
        named |= {each: None for each in addresses if each is not None and each not in held}
    records = [find(each) for each in sorted(named)]
    return [record_entry(each) for each in records if each is not None]


def bears_on(before: AccessionDocument, after: AccessionDocument) -> list[str]:
    """Names of the sweeps that two readings of one accession tell otherwise.

    Parameters
    ----------
    before, after : AccessionDocument
        The same accession without and with an amendment.
    """
    entries = {each.name: each for each in after.sweeps}
    return [
        entry.name
        for entry in before.sweeps
        if (entry, sheet_of_sweep(before.sheet, entry.name))
        != (entries[entry.name], sheet_of_sweep(after.sheet, entry.name))
    ]

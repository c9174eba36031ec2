"""An amendment of a sealed cooldown: checked against it, its effect worked out, sealed."""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator
from datetime import datetime
from pathlib import Path

from archive.errors import ArchiveError
from archive.intake.act_sheets import read_amendment
from archive.intake.thresholds import Thresholds
from archive.lab.act_outcomes import ActOutcome
from archive.lab.amendment_checks import AmendmentCheck
from archive.lab.checking_again import new_findings
from archive.lab.effective import EffectiveSource
from archive.lab.source import LabSource
from archive.lab.stale import newly_stale
from archive.reduction.amending import bears_on
from archive.reduction.software import software
from schemas.acts import AmendmentDocument, Difference
from schemas.differences import differences
from schemas.lineage import AccessionDocument, SweepEntry, Value
from schemas.quantity import Quantity
from schemas.uncertain_text import in_preferred_unit

__all__ = ["amend", "sequence_of"]

Seal = Callable[[AmendmentDocument, str, bytes], None]


def amend(
    source: LabSource,
    path: Path,
    *,
    by: str | None,
    clock: Callable[[], datetime],
    seal: Seal | None,
    thresholds: Thresholds,
) -> ActOutcome:
    """Amendment that a sheet describes; see `Archive.amend`.

    Parameters
    ----------
    source : LabSource
    path : Path
        The sheet.
    by : str, optional
        Role of the person, where the sheet does not say.
    clock : callable
    seal : callable or None
        Seals the document with the sheet's name and bytes; None: only show what it would do.
    thresholds : Thresholds
        Limits of the checks, which are run again.
    """
    reading = read_amendment(path)
    sheet = reading.sheet
    if sheet is None:
        return ActOutcome("refused", findings=reading.findings)
    check = AmendmentCheck(source, reading, sheet, by)
    findings = tuple(check.faults())
    if findings:
        return ActOutcome("refused", findings=findings)
    rows = source.index.amendments(sheet.cooldown)
    number = max((row.number for row in rows), default=0) + 1
    document = AmendmentDocument(
        format="stillroom-amendment/1",
        address=f"{sheet.cooldown}.m{number}",
        cooldown=sheet.cooldown,
        number=number,
        sequence=sequence_of(source, sheet.cooldown),
        rests_on=check.accession.address,
        because=sheet.because,
        by=check.by or "",
        made=clock(),
        change=check.changes(),
        calibration=check.calibrations(),
        use=check.uses(),
        left_out=check.rows_left_out(),
        sheet_file=reading.file,
        software=software(),
    )
    try:
        document = _with_effect(source, document)
    except ArchiveError as problem:
        refused = _refused_change(source, document)
        wrong = None if refused is None else sheet.change[refused].value
        said = reading.fault(
            problem.what, *(("change", 0) if refused is None else ("change", refused, "value")),
            field=problem.field if refused is None else f"change[{refused + 1}].value",
            found=None if wrong is None else json.dumps(wrong, ensure_ascii=False)[:80], remedy="correct the amendment",
        )  # fmt: skip
        return ActOutcome("refused", findings=(said,))
    if not document.sweeps and not document.differences:
        said = reading.fault(
            "nothing is read otherwise with this amendment", remedy="the sheet says all of it already"
        )
        return ActOutcome("refused", findings=(said,))
    before, after = EffectiveSource(source), EffectiveSource(source, extra=document)
    raised = new_findings(before, after, sheet.cooldown, thresholds)
    document = document.model_copy(update={"findings": raised})
    resting = tuple(newly_stale(source, document))
    if seal is not None:
        seal(document, reading.file, reading.data)
    return ActOutcome(
        "shown" if seal is None else "sealed",
        document.address,
        differences=document.differences,
        sweeps=document.sweeps,
        stale=resting,
        document=document,
        raised={sheet.cooldown: raised},
    )


def sequence_of(source: LabSource, cooldown: str) -> int:
    """Place that the next amendment or withdrawal takes among those of a cooldown, from 1."""
    withdrawals = source.index.withdrawals(counting=False)
    made = [row for row in withdrawals if row.cooldown == cooldown]
    return len(source.index.amendments(cooldown)) + len(made) + 1


def _refused_change(source: LabSource, document: AmendmentDocument) -> int | None:
    """Which change of an amendment is refused alone, too, from 0; None if it is all of them together."""
    for number, change in enumerate(document.change):
        alone = {"change": (change,), "calibration": (), "use": (), "left_out": ()}
        try:
            _with_effect(source, document.model_copy(update=alone))
        except ArchiveError:
            return number
    return None


def _with_effect(source: LabSource, document: AmendmentDocument) -> AmendmentDocument:
    """The amendment with what follows from it: sweeps it bears on, what differs, how they are found from now on."""
    before = EffectiveSource(source).accessions(document.cooldown)
    after = EffectiveSource(source, extra=document).accessions(document.cooldown)
    holders = {entry.name: accession.address for accession in after for entry in accession.sweeps}
    found: list[str] = []
    entries: list[SweepEntry] = []
    said: list[Difference] = []
    for old, new in zip(before, after, strict=True):
        names = [name for name in bears_on(old, new) if holders[name] == new.address]
        found += [f"{document.cooldown}/{name}" for name in names]
        entries += [entry for entry in new.sweeps if entry.name in names]
        said += [each for each in _differences(old, new, names) if each not in said]
    return document.model_copy(
        update={
            "sweeps": tuple(sorted(found)),
            "entries": tuple(entries),
            "differences": tuple(said),
            "doses": after[-1].doses,
        }
    )


def _differences(old: AccessionDocument, new: AccessionDocument, sweeps: list[str]) -> Iterator[Difference]:
    yield from differences(old.sheet.model_dump(mode="json"), new.sheet.model_dump(mode="json"))
    yield from _ledger_differences(old, new)
    entries = {each.name: each for each in new.sweeps}
    for entry in old.sweeps:
        if entry.name in sweeps:
            told = (_of_entry(entry), _of_entry(entries[entry.name]))
            for each in differences(*told):
                yield each.model_copy(update={"field": f"{entry.name}.{each.field}"})


def _ledger_differences(old: AccessionDocument, new: AccessionDocument) -> Iterator[Difference]:
    doses = {each.name: each for each in new.doses}
    for dose in old.doses:
        now = doses.get(dose.name)
        if now is not None and now.amount != dose.amount:
            yield Difference(
                field=f"{dose.name}.amount",
                before=_value(dose.amount, "amount"),
                after=_value(now.amount, "amount"),
            )


def _of_entry(entry: SweepEntry) -> dict[str, object]:
    return {
        "cell": entry.cell,
        "substrate": entry.substrate,
        "sample": entry.sample,
        "calibration": {each.name: each.calibration for each in entry.channels},
        "thermometer": {each.name: each.thermometer for each in entry.channels},
        "amount": _value(entry.amount, "amount"),
        "coverage": _value(entry.coverage, "coverage"),
    }


def _value(value: Value | None, kind: str) -> str | None:
    if value is None or value.value is None:
        return None
    stated = Quantity(value=value.value, unit=value.unit, kind=kind, uncertainty=value.uncertainty)
    return in_preferred_unit(stated).format()

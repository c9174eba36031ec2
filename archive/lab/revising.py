"""A new revision of a record or plan, outside a cooldown: checked, compared with the one before, sealed."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from datetime import datetime
from pathlib import Path
from typing import Literal

from archive.errors import ArchiveError
from archive.intake.act_sheets import ActReading, read_revision
from archive.intake.checks.calibrations import differing_fields
from archive.intake.thresholds import Thresholds
from archive.lab.act_outcomes import ActOutcome
from archive.lab.calibrating import record_as_made
from archive.lab.checking_again import findings_of_revision
from archive.lab.journaling import acting_role
from archive.lab.reducing import plans
from archive.lab.source import LabSource
from archive.lab.stale import newly_stale
from archive.reduction.digest import record_digest
from archive.reduction.performing import step_parameters
from archive.reduction.record_kinds import record_kind
from archive.reduction.software import software
from archive.reduction.steps import step_named
from schemas.acts import RevisionDocument, RevisionSheet
from schemas.cooldown import Records
from schemas.differences import differences
from schemas.finding import Finding
from schemas.lineage import AnyRecord, RecordKind
from schemas.plan import Plan
from schemas.thermometer import Calibration

__all__ = ["revise"]

Seal = Callable[[RevisionDocument, str, bytes], None]

_NOT_COMPARED = ("name", "revision")


def revise(
    source: LabSource,
    path: Path,
    *,
    by: str | None,
    clock: Callable[[], datetime],
    seal: Seal | None,
    thresholds: Thresholds,
) -> ActOutcome:
    """Revision that a sheet describes; see `Archive.revise`.

    Parameters
    ----------
    source : LabSource
    path : Path
        The sheet, or a plan file.
    by : str, optional
        Role of the person, where the sheet does not say.
    clock : callable
    seal : callable or None
        Seals the document with the sheet's name and bytes; None: only show what it would do.
    thresholds : Thresholds
        Limits of the checks, which are run again on the cooldowns that are read otherwise.
    """
    reading = read_revision(path)
    if reading.sheet is None:
        return ActOutcome("refused", findings=reading.findings)
    check = _Check(source, reading, reading.sheet, by)
    findings = tuple(check.faults())
    before = check.newest
    found = (
        ()
        if before is None
        else tuple(
            differences(
                before.model_dump(mode="json"), check.thing.model_dump(mode="json"), leave_out=_NOT_COMPARED
            )
        )
    )
    address, previous = check.thing.address, None if before is None else before.address
    if findings:
        return ActOutcome("refused", address, findings, previous, found)
    document = RevisionDocument(
        format="stillroom-revision/1",
        address=address,
        kind=check.kind,
        digest=record_digest(check.thing),
        content=check.thing.model_dump(mode="json"),
        supersedes=reading.sheet.supersedes,
        because=reading.sheet.because or check.thing.changed or "first revision",
        by=check.by or "",
        made=clock(),
        previous=previous,
        differences=found,
        sheet_file=reading.file,
        software=software(),
    )
    if not isinstance(check.thing, Plan):
        raised = findings_of_revision(source, document, check.thing, thresholds)
        document = document.model_copy(update={"findings": raised})
    resting = tuple(newly_stale(source, document))
    if seal is not None:
        seal(document, reading.file, reading.data)
    state = "shown" if seal is None else "sealed"
    return ActOutcome(state, address, (), previous, found, (), resting, document, document.findings)  # type: ignore[arg-type]


class _Check:
    """What a revision sheet holds, and what the archive says to it."""

    def __init__(
        self, source: LabSource, reading: ActReading[RevisionSheet], sheet: RevisionSheet, by: str | None
    ) -> None:
        self.source, self.reading, self.sheet = source, reading, sheet
        self.by = by or sheet.by or acting_role()
        self.thing, self.kind, self.path = _thing(sheet, bare=sheet.plan is not None and sheet.by is None)
        self.known: list[AnyRecord] | list[Plan] = self._known()

    def _known(self) -> list[AnyRecord] | list[Plan]:
        if self.kind == "plan":
            return [plan for plan in plans(self.source) if plan.name == self.thing.name]
        rows = self.source.index.records(name=self.thing.name)
        return [self.source.record(row.address) for row in rows]

    @property
    def newest(self) -> AnyRecord | Plan | None:
        """The newest revision that is known."""
        return max(self.known, key=lambda each: each.revision, default=None)

    def faults(self) -> Iterator[Finding]:
        """Everything that keeps the sheet from becoming a revision."""
        fault = self.reading.fault
        if self.by is None:
            yield fault("it is not said by whom", "by", remedy='write by = "data steward" or give --by ROLE')
        if self.newest is not None and not (self.sheet.because or self.thing.changed):
            yield fault(
                "it is not said why", *self.path, "changed",
                remedy="write because = \"...\" or, in the record, changed = \"...\"",
            )  # fmt: skip
        yield from self._number()
        yield from self._kind()
        yield from self._supersedes()
        yield from self._references()
        if isinstance(self.thing, Plan):
            yield from self._steps(self.thing)
        if isinstance(self.thing, Calibration) and self.thing.made_from is not None:
            yield from self._origin(self.thing)

    def _number(self) -> Iterator[Finding]:
        newest = self.newest
        if newest is None or self.thing.revision > newest.revision:
            return
        same = next((each for each in self.known if each.revision == self.thing.revision), None)
        what = (
            f"{self.thing.address} is in the archive already"
            if same is not None
            else f"{newest.address} is newer than {self.thing.address}"
        )
        yield self.reading.fault(
            what, *self.path, "revision", found=str(self.thing.revision),
            expected=f"{newest.revision + 1} or more",
            remedy=f"make it revision {newest.revision + 1} and say what changed",
        )  # fmt: skip

    def _kind(self) -> Iterator[Finding]:
        rows = self.source.index.records(name=self.thing.name)
        others = sorted({row.kind for row in rows} - {self.kind})
        if self.kind != "plan" and any(plan.name == self.thing.name for plan in plans(self.source)):
            others.append("plan")
        if others:
            yield self.reading.fault(
                f"{self.thing.name} is the name of a {others[0]} already", *self.path, "name",
                remedy=f"give the {self.kind} another name",
            )  # fmt: skip

    def _supersedes(self) -> Iterator[Finding]:
        stated = self.sheet.supersedes
        if stated is None:
            return
        known = sorted(each.address for each in self.known if each.revision < self.thing.revision)
        if stated not in known:
            yield self.reading.fault(
                f"{self.thing.address} cannot supersede {stated}", "supersedes", found=stated,
                expected=f"one of: {', '.join(known) or 'nothing, since there is no earlier revision'}",
            )  # fmt: skip

    def _references(self) -> Iterator[Finding]:
        for name in ("substrate", "thermometer"):
            stated = getattr(self.thing, name, None)
            if isinstance(stated, str) and self.source.find_record(stated) is None:
                yield self.reading.fault(
                    f"there is no {name} {stated} in this archive", *self.path, name, found=stated,
                    remedy=f"revise or ingest the {name} first",
                )  # fmt: skip

    def _origin(self, written: Calibration) -> Iterator[Finding]:
        made = record_as_made(self.source, written)
        if not isinstance(made, Calibration):
            yield self.reading.fault(
                f"this archive cannot say that {written.made_from} found it: {made}", *self.path, "made_from",
                found=written.made_from, remedy="reduce the calibration sweep first, or leave made_from out",
            )  # fmt: skip
        elif differing := differing_fields(written, made):
            yield self.reading.fault(
                f"it is not what {written.made_from} found: {', '.join(differing)}", *self.path, "made_from",
                remedy=f"take the output of `stillroom calibration {written.made_from}` as it is, or leave made_from out",
            )  # fmt: skip

    def _steps(self, plan: Plan) -> Iterator[Finding]:
        for number, planned in enumerate(plan.step):
            try:
                step = step_named(planned.use, planned.version)
                step_parameters(step, planned.set, place=f"plan {plan.name}")
            except ArchiveError as problem:
                yield self.reading.fault(
                    problem.what, *self.path, "step", number, remedy=problem.remedy,
                    expected=problem.expected, found=problem.found,
                )  # fmt: skip


def _thing(
    sheet: RevisionSheet, *, bare: bool
) -> tuple[AnyRecord | Plan, RecordKind | Literal["plan"], tuple[str | int, ...]]:
    """The one thing of a sheet, its kind, and where it stands."""
    if sheet.plan is not None:
        return sheet.plan, "plan", () if bare else ("plan",)
    for kind in Records.model_fields:
        for record in getattr(sheet.record, kind):
            return record, record_kind(record), ("record", kind, 0)
    raise ValueError("a revision sheet holds one thing")

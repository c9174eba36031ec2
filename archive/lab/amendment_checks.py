"""What the archive says to an amendment sheet: every fault at once, each with its line."""

from __future__ import annotations

from collections.abc import Iterator
from functools import cached_property

from archive.intake.act_sheets import ActReading
from archive.lab.journaling import acting_role
from archive.lab.source import LabSource
from archive.reduction.field_paths import check_path, value_at
from archive.reduction.record_kinds import record_kind
from archive.reduction.rows_meant import digest_of_rows
from schemas.acts import AmendmentSheet, Change, LeftOutRows, UseCalibration, UseRecord
from schemas.finding import Finding
from schemas.lineage import AccessionDocument, AnyRecord, SweepEntry
from schemas.thermometer import Calibration

__all__ = ["AmendmentCheck"]

_EXCHANGED = ("cell", "substrate", "sample", "thermometer")


class AmendmentCheck:
    """An amendment sheet beside the cooldown that it amends.

    Parameters
    ----------
    source : LabSource
    reading : ActReading
    sheet : AmendmentSheet
        That of the reading.
    by : str, optional
        Role of the person, where the sheet does not say.
    """

    def __init__(
        self,
        source: LabSource,
        reading: ActReading[AmendmentSheet],
        sheet: AmendmentSheet,
        by: str | None,
    ) -> None:
        self.source, self.reading, self.sheet = source, reading, sheet
        self.by = by or sheet.by or acting_role()
        self._withdrawn = {row.target: row.sentence() for row in source.index.withdrawals()}
        self._accessions = [
            each for each in source.accessions(sheet.cooldown) if each.address not in self._withdrawn
        ]

    @property
    def accession(self) -> AccessionDocument:
        """The newest accession; only to be asked for when the archive has the cooldown."""
        return self._accessions[-1]

    @cached_property
    def entries(self) -> dict[str, SweepEntry]:
        """Every sweep as the newest accession that has it holds it."""
        return {entry.name: entry for accession in self._accessions for entry in accession.sweeps}

    def faults(self) -> Iterator[Finding]:
        """Everything that keeps the sheet from becoming an amendment."""
        if self.by is None:
            yield self.reading.fault(
                "it is not said by whom", "by", remedy='write by = "data steward" or give --by ROLE'
            )
        if not self._accessions:
            known = ", ".join(self.source.cooldowns()) or "none yet"
            yield self.reading.fault(
                f"there is no cooldown {self.sheet.cooldown} in this archive", "cooldown",
                found=self.sheet.cooldown, expected=f"one of: {known}",
            )  # fmt: skip
            return
        for number, change in enumerate(self.sheet.change):
            yield from self._change(number, change)
        for number, said in enumerate(self.sheet.calibration):
            yield from self._calibration(number, said)
        for number, use in enumerate(self.sheet.use):
            yield from self._use(number, use)
        for number, left in enumerate(self.sheet.left_out):
            yield from self._left_out(number, left)

    def _change(self, number: int, change: Change) -> Iterator[Finding]:
        content = self.accession.sheet.model_dump(mode="json")
        try:
            check_path(change, self.sheet.cooldown)
            value_at(content, change)
        except ValueError as problem:
            place, _, what = str(problem).partition(": ")
            if place not in ("address", "field"):
                place, what = "field", str(problem)
            yield self.reading.fault(what, "change", number, place, field=f"change[{number + 1}].{place}")

    def _calibration(self, number: int, said: UseCalibration) -> Iterator[Finding]:
        place = ("calibration", number)
        name = said.thermometer.partition(".r")[0]
        record = self._named(said.use)
        yield from self._usable(record, said.use, *place)
        if record is not None and not isinstance(record, Calibration):
            yield self.reading.fault(
                f"{said.use} is a {record_kind(record)}, no calibration", *place, "use", found=said.use
            )
        elif isinstance(record, Calibration) and record.thermometer.partition(".r")[0] != name:
            yield self.reading.fault(
                f"{record.address} calibrates {record.thermometer}, not {said.thermometer}", *place, "use"
            )
        for sweep in said.sweeps:
            yield from self._sweep(sweep, *place, "sweeps")
        read_by = {
            (each.thermometer or "").partition(".r")[0]
            for entry in self.entries.values()
            for each in entry.channels
            if not said.sweeps or entry.name in said.sweeps
        } - {""}
        if name not in read_by:
            yield self.reading.fault(
                f"no channel here reads {said.thermometer}", *place, "thermometer",
                expected=f"one of: {', '.join(sorted(read_by)) or 'none'}",
            )  # fmt: skip

    def _use(self, number: int, said: UseRecord) -> Iterator[Finding]:
        place = ("use", number)
        old, new = self._named(said.instead_of), self._named(said.use)
        yield from self._usable(new, said.use, *place)
        used = {
            address
            for entry in self.entries.values()
            for address in (entry.cell, entry.substrate, entry.sample, *entry.thermometers)
            if address is not None
        }
        stated = {said.instead_of, None if old is None else old.address}
        if not any(each in stated or each.partition(".r")[0] in stated for each in used):
            yield self.reading.fault(
                f"no sweep here uses {said.instead_of}", *place, "instead_of", found=said.instead_of,
                expected=f"one of: {', '.join(sorted(used))}",
            )  # fmt: skip
        elif old is not None and new is not None and record_kind(old) != record_kind(new):
            yield self.reading.fault(
                f"{said.use} is a {record_kind(new)}, and {said.instead_of} a {record_kind(old)}",
                *place,
                "use",
            )
        if old is not None and record_kind(old) not in _EXCHANGED:
            yield self.reading.fault(
                f"a {record_kind(old)} is not exchanged so", *place, "instead_of",
                remedy="for a calibration write [[calibration]] with thermometer and use",
            )  # fmt: skip

    def _usable(self, record: AnyRecord | None, reference: str, *place: str | int) -> Iterator[Finding]:
        if record is None:
            yield self.reading.fault(
                f"there is no record {reference} in this archive", *place, "use", found=reference,
                remedy="bring it in first: stillroom revise",
            )  # fmt: skip
        elif record.address in self._withdrawn:
            yield self.reading.fault(
                f"{record.address} is withdrawn: {self._withdrawn[record.address]}", *place, "use"
            )

    def _left_out(self, number: int, left: LeftOutRows) -> Iterator[Finding]:
        place = ("left_out", number)
        yield from self._sweep(left.sweep, *place, "sweep")
        rows = self.entries[left.sweep].rows if left.sweep in self.entries else None
        first, last = left.rows
        if rows is not None and not 1 <= first <= last <= rows:
            yield self.reading.fault(
                f"{left.sweep} has no such rows", *place, "rows", found=f"{first} to {last}",
                expected=f"first and last row, from 1 to {rows}",
            )  # fmt: skip

    def _sweep(self, name: str, *place: str | int) -> Iterator[Finding]:
        if name not in self.entries:
            yield self.reading.fault(
                f"there is no sweep {name} in {self.sheet.cooldown}", *place, found=name,
                expected=f"one of: {', '.join(sorted(self.entries))}",
            )  # fmt: skip

    def _named(self, reference: str) -> AnyRecord | None:
        return self.source.find_record(reference)

    def changes(self) -> tuple[Change, ...]:
        """Changes with what the sheet says now; only without faults."""
        content = self.accession.sheet.model_dump(mode="json")
        return tuple(each.model_copy(update={"was": value_at(content, each)}) for each in self.sheet.change)

    def calibrations(self) -> tuple[UseCalibration, ...]:
        """Calibrations by address."""
        return tuple(
            each.model_copy(update={"use": self.source.record(self._address(each.use)).address})
            for each in self.sheet.calibration
        )

    def uses(self) -> tuple[UseRecord, ...]:
        """Records by address; what they stand for stays as it is written."""
        return tuple(each.model_copy(update={"use": self._address(each.use)}) for each in self.sheet.use)

    def _address(self, reference: str) -> str:
        record = self._named(reference)
        return reference if record is None else record.address

    def rows_left_out(self) -> tuple[LeftOutRows, ...]:
        """Rows left out, each with the digest of the rows that were meant."""
        return tuple(
            each.model_copy(update={"data": digest_of_rows(self.entries[each.sweep])})
            for each in self.sheet.left_out
        )

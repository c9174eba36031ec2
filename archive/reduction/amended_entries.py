"""What is known of a sweep, as it follows from an amended sheet and from the records that hold."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence

import numpy as np

from archive.errors import ArchiveError
from archive.reduction.thermometry_steps import calibrated_temperature
from schemas.acts import AmendmentDocument
from schemas.cooldown import CooldownSheet
from schemas.lineage import AccessionDocument, AnyRecord, ChannelEntry, DoseEntry, SweepEntry, Value
from schemas.quantity import unit_factor
from schemas.sweep import Channel, Sweep
from schemas.thermometer import Calibration
from schemas.units import ucum

__all__ = ["Replace", "amended_entry"]

Replace = Callable[[str], str]

_Find = Callable[[str], AnyRecord | None]


def amended_entry(
    accession: AccessionDocument,
    sheet: CooldownSheet,
    entry: SweepEntry,
    amendments: Sequence[AmendmentDocument],
    *,
    replace: Replace,
    find: _Find,
    doses: Sequence[DoseEntry] | None = None,
) -> SweepEntry:
    """Entry of a sweep under an amended sheet.

    Parameters
    ----------
    accession : AccessionDocument
        As sealed.
    sheet : CooldownSheet
        As amended.
    entry : SweepEntry
        As sealed.
    amendments, replace, find
        As in `archive.reduction.amending.amended_accession`.
    doses : sequence of DoseEntry, optional
        The gas ledger, if it is another one than that of the accession.
    """
    old = next((each for each in accession.sheet.sweep if each.name == entry.name), None)
    new = next((each for each in sheet.sweep if each.name == entry.name), None)
    if old is None or new is None:
        return entry
    holder = _Holder(amendments, entry.name, replace, find)
    named = _named_records(accession.sheet, old, sheet, new, entry, holder)
    channels = _channels(accession.sheet.channels_of(old), sheet.channels_of(new), entry, holder)
    changes: dict[str, object] = {
        "kind": new.kind,
        "empty_cell": new.empty_cell,
        "after_dose": new.after_dose,
        "doses": new.doses,
        "direction": new.direction,
        "channels": channels,
        "thermometers": tuple(
            sorted({each.thermometer for each in channels if each.thermometer and each.use})
        ),
        **named,
        **_temperatures(old, new, sheet, entry, channels, find),
    }
    if doses is not None or (new.empty_cell, new.after_dose, new.gas) != (
        old.empty_cell,
        old.after_dose,
        old.gas,
    ):
        changes |= _held(new, accession.doses if doses is None else doses)
    return entry.model_copy(
        update={name: value for name, value in changes.items() if value != getattr(entry, name)}
    )


class _Holder:
    """Which record holds for one sweep: what amendments say, then what revisions do."""

    def __init__(
        self, amendments: Sequence[AmendmentDocument], sweep: str, replace: Replace, find: _Find
    ) -> None:
        self._replace, self._find = replace, find
        self._uses: dict[str, str] = {}
        self._calibrations: dict[str, str] = {}
        for amendment in amendments:
            for each in amendment.use:
                self._uses[each.instead_of] = each.use
            for said in amendment.calibration:
                if not said.sweeps or sweep in said.sweeps:
                    self._calibrations[said.thermometer.partition(".r")[0]] = said.use

    def record(self, address: str) -> str:
        """Address of the revision that holds for an address."""
        name = address.partition(".r")[0]
        return self._replace(self._uses.get(address, self._uses.get(name, address)))

    def resolved(self, reference: str | None) -> str | None:
        """Address that a reference of the amended sheet stands for."""
        record = None if reference is None else self._find(reference)
        return None if record is None else self.record(record.address)

    def calibration(self, thermometer: str | None, address: str | None) -> str | None:
        """Address of the calibration that holds for a reading."""
        name = (thermometer or "").partition(".r")[0]
        if not name and address is not None:
            record = self._find(address)
            name = record.thermometer.partition(".r")[0] if isinstance(record, Calibration) else ""
        found = self._calibrations.get(name, address)
        return None if found is None else self.record(found)

    def substrate_of(self, cell: str | None, before: str | None) -> str | None:
        """Address of the substrate inside a cell; the one before where the cell names no revision of it."""
        named = getattr(None if cell is None else self._find(cell), "substrate", None)
        if named is None:
            return None
        if before is not None and named == before.partition(".r")[0]:
            return self.record(before)
        return self.resolved(named)


def _named_records(
    old_sheet: CooldownSheet,
    old: Sweep,
    sheet: CooldownSheet,
    new: Sweep,
    entry: SweepEntry,
    holder: _Holder,
) -> dict[str, str | None]:
    cell, sample = entry.cell, entry.sample
    renamed = old_sheet.cell_of(old) != sheet.cell_of(new)
    cell = holder.resolved(sheet.cell_of(new)) if renamed else (cell and holder.record(cell))
    if (old.sample or old_sheet.sample) != (new.sample or sheet.sample):
        sample = holder.resolved(new.sample or sheet.sample)
    elif sample is not None:
        sample = holder.record(sample)
    if cell == entry.cell:
        substrate = None if entry.substrate is None else holder.record(entry.substrate)
    else:
        substrate = holder.substrate_of(cell, entry.substrate)
    return {"cell": cell, "substrate": substrate, "sample": sample}


def _channels(
    old: dict[str, Channel], new: dict[str, Channel], entry: SweepEntry, holder: _Holder
) -> tuple[ChannelEntry, ...]:
    found = []
    for channel in entry.channels:
        before, said = old.get(channel.name), new.get(channel.name)
        if before is None or said is None:
            found.append(channel)
            continue
        unit = "s" if said.quantity == "instant" else (said.unit or "1")
        thermometer, calibration = channel.thermometer, channel.calibration
        if said.thermometer != before.thermometer:
            thermometer = holder.resolved(said.thermometer)
        elif thermometer is not None:
            thermometer = holder.record(thermometer)
        if said.calibration != before.calibration:
            calibration = holder.resolved(said.calibration)
        changes: dict[str, object] = {
            "quantity": said.quantity,
            "unit": unit,
            "ucum": ucum(unit),
            "description": said.description,
            "scale": said.scale,
            "use": said.use,
            "thermometer": thermometer,
            "calibration": holder.calibration(thermometer, calibration),
        }
        found.append(channel.model_copy(update=changes))
    return tuple(found)


def _temperatures(
    old: Sweep,
    new: Sweep,
    sheet: CooldownSheet,
    entry: SweepEntry,
    channels: Sequence[ChannelEntry],
    find: _Find,
) -> dict[str, Value]:
    """Ends of the temperature range where a calibration or the bath's temperature is read otherwise."""
    bath = new.bath_temperature
    if bath is not None and bath != old.bath_temperature:
        value = Value(value=bath.si, unit="K", scale=bath.scale or sheet.temperature_scale)
        return {"temperature_low": value, "temperature_high": value}
    before = {each.name: each for each in entry.channels}
    for channel in channels:
        if channel.calibration in (None, before[channel.name].calibration) or not channel.use:
            continue
        ends = list(_ends(channel, find(channel.calibration or "")))
        if len(ends) == 2 and (new.thermometer in (None, channel.name)):
            low, high = sorted(ends, key=lambda each: each.value or 0.0)
            return {"temperature_low": low, "temperature_high": high}
    return {}


def _ends(channel: ChannelEntry, calibration: AnyRecord | None) -> Iterator[Value]:
    if not isinstance(calibration, Calibration) or channel.low is None or channel.high is None:
        return
    try:
        factor = unit_factor(calibration.reading_unit, channel.quantity)
        readings = (
            np.array([channel.low, channel.high]) * unit_factor(channel.unit, channel.quantity) / factor
        )
        found = calibrated_temperature(calibration, readings, factor)
    except (ValueError, ArchiveError):
        return
    # A reading outside the calibration has no temperature; the sealed range then stays.
    for value in found.tolist():
        if np.isfinite(value):
            yield Value(value=value, unit="K", scale=calibration.scale)


def _held(sweep: Sweep, doses: Sequence[DoseEntry]) -> dict[str, Value | None]:
    """Helium amount and coverage during a sweep, from the ledger line of its last dose; as at ingest."""
    if sweep.gas != "helium":
        return {"amount": None, "coverage": None}
    if sweep.empty_cell:
        return {"amount": Value(value=0.0, unit="mol"), "coverage": Value(value=0.0, unit="mol/m^2")}
    entry = next((each for each in doses if each.name == sweep.after_dose), None)
    if entry is None:
        return {"amount": None, "coverage": None}
    return {"amount": entry.running_amount, "coverage": entry.running_coverage}

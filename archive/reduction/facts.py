"""The sweep that is reduced, with everything the sheet and the records say of it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from archive.errors import BadRequest, UnknownAddress
from archive.reduction.source import Source
from schemas.address import parse_address
from schemas.gas import DeadVolume, Dose, Doser, Gauge
from schemas.lineage import AccessionDocument, AnyRecord, ChannelEntry, SweepEntry
from schemas.sweep import Channel, Sweep

__all__ = ["GasBook", "SweepFacts", "accession_of", "sweep_facts"]


@dataclass(frozen=True)
class GasBook:
    """What a sheet says about its gas, and which doses one sweep has seen.

    Attributes
    ----------
    cooldown : str
    doses : tuple of Dose
        All doses of the sheet, in order of time.
    dosers, gauges, dead_volumes : tuple
    admitted : str or None
        Last dose before the sweep; None when the sweep is itself a run of doses.
    during : tuple of str
        Doses admitted during the sweep.
    """

    cooldown: str
    doses: tuple[Dose, ...]
    dosers: tuple[Doser, ...] = ()
    gauges: tuple[Gauge, ...] = ()
    dead_volumes: tuple[DeadVolume, ...] = ()
    admitted: str | None = None
    during: tuple[str, ...] = ()


@dataclass(frozen=True)
class SweepFacts:
    """One sweep of one accession.

    Attributes
    ----------
    address : str
    accession : AccessionDocument
        The newest one that holds the sweep.
    entry : SweepEntry
        The sweep as stored.
    sweep : Sweep
        The sweep as the sheet describes it.
    channels : mapping of str to Channel
        As the sheet describes them.
    cell, substrate, sample : record or None
    """

    address: str
    accession: AccessionDocument
    entry: SweepEntry
    sweep: Sweep
    channels: Mapping[str, Channel]
    cell: AnyRecord | None
    substrate: AnyRecord | None
    sample: AnyRecord | None

    @property
    def cooldown(self) -> str:
        """Name of the cooldown."""
        return self.accession.cooldown

    def stored(self, channel: str) -> ChannelEntry:
        """Return the entry of a channel by name."""
        for entry in self.entry.channels:
            if entry.name == channel:
                return entry
        names = ", ".join(entry.name for entry in self.entry.channels)
        raise BadRequest(
            f"sweep {self.address} has no channel {channel!r}",
            expected=f"one of {names}",
            remedy="name a channel of the sweep in the plan, or describe the column in the sheet and supplement the cooldown",
        )

    @property
    def gas_book(self) -> GasBook:
        """What the sheet says about its gas."""
        sheet = self.accession.sheet
        return GasBook(
            cooldown=self.cooldown,
            doses=tuple(sorted(sheet.dose, key=lambda dose: (dose.at, dose.name))),
            dosers=sheet.doser,
            gauges=sheet.gauge,
            dead_volumes=sheet.dead_volume,
            admitted=None if self.sweep.empty_cell else self.sweep.after_dose,
            during=self.sweep.doses,
        )


def accession_of(source: Source, sweep_address: str) -> tuple[AccessionDocument, SweepEntry]:
    """Return the newest accession that holds a sweep, and its entry there.

    Raises
    ------
    BadRequest
        The text is no address of a sweep.
    UnknownAddress
        No accession of that cooldown holds it.
    """
    try:
        address = parse_address(sweep_address)
    except ValueError as error:
        raise BadRequest(str(error)) from None
    if address.kind != "item" or address.item is None:
        raise BadRequest(
            f"{sweep_address} is not the address of a sweep", expected="an address such as 2026-03/s017"
        )
    for accession in reversed(source.accessions(address.head)):
        for entry in accession.sweeps:
            if entry.name == address.item:
                return accession, entry
    raise UnknownAddress(
        f"no accession of cooldown {address.head} holds a sweep {address.item}",
        remedy=f"see `stillroom show {address.head}` for what it holds",
    )


def sweep_facts(source: Source, sweep_address: str) -> SweepFacts:
    """Return a sweep with what the sheet and the records say of it.

    Raises
    ------
    BadRequest, UnknownAddress
        As in `accession_of`.
    """
    accession, entry = accession_of(source, sweep_address)
    sweep = next(each for each in accession.sheet.sweep if each.name == entry.name)
    return SweepFacts(
        address=sweep_address,
        accession=accession,
        entry=entry,
        sweep=sweep,
        channels=accession.sheet.channels_of(sweep),
        cell=None if entry.cell is None else source.record(entry.cell),
        substrate=None if entry.substrate is None else source.record(entry.substrate),
        sample=None if entry.sample is None else source.record(entry.sample),
    )

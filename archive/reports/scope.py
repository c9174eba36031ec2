"""What an appendix is about: the reductions asked for, those they rest on, and the cells, substrates and sweeps behind them."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from functools import cached_property

from archive.errors import UnknownAddress
from archive.reports.holdings import Holdings, Taken
from archive.reports.numbers import shown_output
from archive.reports.view import CooldownView
from schemas.cell import Cell
from schemas.lineage import OutputEntry, ReductionDocument, StepRecord
from schemas.substrate import Substrate
from schemas.thermometer import Calibration

__all__ = ["Scope"]


class Scope:
    """The reductions of an appendix, with everything behind them.

    Parameters
    ----------
    views : sequence of CooldownView
    addresses : sequence of str
        Reductions asked for; those they rest on are added where the views hold them.

    Raises
    ------
    UnknownAddress
        No view holds one of the reductions.
    """

    def __init__(self, views: Sequence[CooldownView], addresses: Sequence[str]) -> None:
        self.cooldowns = {view.newest.cooldown: Holdings(view) for view in views}
        self._known = {each.address: each for view in views for each in view.reductions}
        for address in addresses:
            if address not in self._known:
                raise UnknownAddress(
                    f"no reduction {address} is at hand",
                    expected="the address of a reduction of these cooldowns",
                )
        self.asked = tuple(dict.fromkeys(addresses))

    @cached_property
    def reductions(self) -> tuple[ReductionDocument, ...]:
        """Those asked for and those they rest on; what others rest on comes first."""
        found: dict[str, ReductionDocument] = {}

        def add(address: str) -> None:
            document = self._known.get(address)
            if document is None or address in found:
                return
            for entry in document.inputs:
                add(entry.address.partition("#")[0])
            found.setdefault(address, document)

        for address in self.asked:
            add(address)
        return tuple(found.values())

    @cached_property
    def not_held(self) -> tuple[str, ...]:
        """Reductions that were rested on and are in no view."""
        inputs = (entry.address.partition("#")[0] for each in self.reductions for entry in each.inputs)
        return tuple(dict.fromkeys(each for each in inputs if "@" in each and each not in self._known))

    def holdings_of(self, reduction: ReductionDocument) -> Holdings:
        """Return the cooldown of a reduction."""
        return self.cooldowns[reduction.cooldown]

    def taken_of(self, reduction: ReductionDocument) -> Taken:
        """Return the sweep of a reduction."""
        name = reduction.sweep.partition("/")[2]
        found = next((each for each in self.holdings_of(reduction).sweeps if each.sheet.name == name), None)
        if found is None:
            raise UnknownAddress(
                f"no sheet at hand describes {reduction.sweep}, which {reduction.address} reduces"
            )
        return found

    def cell_of(self, reduction: ReductionDocument) -> str:
        """Return the address of the cell of a reduction, "" where none is recorded."""
        entry = self.taken_of(reduction).entry
        return "" if entry is None or entry.cell is None else entry.cell

    @cached_property
    def used(self) -> tuple[tuple[Holdings, Taken], ...]:
        """Every sweep that is reduced here, once."""
        found: dict[str, tuple[Holdings, Taken]] = {}
        for reduction in self.reductions:
            found.setdefault(reduction.sweep, (self.holdings_of(reduction), self.taken_of(reduction)))
        return tuple(found.values())

    @cached_property
    def runs(self) -> tuple[Holdings, ...]:
        """Cooldowns with a sweep in use."""
        names = dict.fromkeys(each.cooldown for each in self.reductions)
        return tuple(self.cooldowns[name] for name in names)

    def _records(self, attribute: str) -> dict[str, object]:
        found: dict[str, object] = {}
        for held, taken in self.used:
            address = None if taken.entry is None else getattr(taken.entry, attribute)
            record = held.named(address)
            if record is not None:
                found.setdefault(record.address, record)
        return found

    @cached_property
    def cells(self) -> tuple[Cell, ...]:
        """Cell revisions in use."""
        return tuple(self._records("cell").values())  # type: ignore[arg-type]

    @cached_property
    def substrates(self) -> tuple[Substrate, ...]:
        """Substrate revisions in use."""
        return tuple(each for each in self._records("substrate").values() if isinstance(each, Substrate))

    @cached_property
    def calibrations(self) -> tuple[Calibration, ...]:
        """Calibrations that a step of the reductions used."""
        found: dict[str, Calibration] = {}
        for reduction in self.reductions:
            for entry in reduction.inputs:
                record = self.holdings_of(reduction).records.get(entry.address.partition("#")[0])
                if isinstance(record, Calibration):
                    found.setdefault(record.address, record)
        return tuple(found.values())

    def steps(self, *names: str) -> Iterator[tuple[ReductionDocument, StepRecord]]:
        """Yield the steps of some names, or all."""
        for reduction in self.reductions:
            for step in reduction.steps:
                if not names or step.name in names:
                    yield reduction, step

    def output(self, *names: str) -> Iterator[tuple[ReductionDocument, OutputEntry]]:
        """Yield scalar outputs of some names that have a value."""
        for reduction in self.reductions:
            for each in reduction.outputs:
                if each.name in names and each.rows is None and each.value is not None:
                    yield reduction, each

    @cached_property
    def experiments(self) -> tuple[str, ...]:
        """Kinds of experiment: TO, FS, PG, HC, TS."""
        kinds = {each.kind for each in self.cells}
        sweeps = {taken.sheet.kind for _, taken in self.used}
        pores = any(each.pore_diameter is not None for each in self.substrates)
        rules = (
            ("TO", "torsional-oscillator" in kinds),
            ("FS", bool(sweeps & {"isotherm"}) or "adsorption-cell" in kinds),
            ("PG", pores),
            ("HC", "calorimeter" in kinds or "heat-capacity" in sweeps),
            ("TS", "third-sound-ring" in kinds),
        )
        return tuple(name for name, holds in rules if holds)

    def text(self, output: OutputEntry) -> str:
        """Return an output as plain text."""
        return shown_output(output).plain

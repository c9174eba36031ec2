"""What finds and shows: nothing here writes."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any

from archive.errors import UnknownAddress
from archive.index import SearchQuery
from archive.lab.opened import Opened
from archive.lab.views import RowList
from schemas.address import parse_address

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from archive.index import (
        AccessionRow,
        CellUse,
        CooldownRow,
        FindingRow,
        RecordRow,
        ReductionRow,
        ResultRow,
        SweepRow,
    )
    from archive.lab.curves.chart import Asked, Chart, Outline
    from archive.lab.life import Life, Rests
    from archive.lab.plan_figure import PlanFigure
    from archive.lab.plane import PlaneState
    from archive.lab.views import ReductionView, Result, SweepView
    from archive.reduction.calibration_comparison import Drift
    from archive.reduction.facts import SweepFacts
    from archive.reduction.trace import TraceNode
    from archive.reports import CooldownView
    from archive.reports.plane_view import PlaneAxis, PlaneView, Window
    from schemas.lineage import ReductionDocument
    from schemas.thermometer import Calibration

__all__ = ["Looking"]


class Looking(Opened):
    """Search, plane, tables, arrays, charts, lineage, life stories."""

    # Finding and showing ------------------------------------------------------------------------------------------

    def search(self, query: SearchQuery) -> RowList[SweepRow]:
        """Sweeps that a query finds."""
        return RowList(self._index.search(query))

    def plane(
        self,
        query: SearchQuery | None = None,
        *,
        axis: PlaneAxis = "coverage",
        state: PlaneState = "any",
        window: Window | None = None,
        everything: bool = False,
        most: int | None = None,
    ) -> PlaneView:
        """Sweeps as bars over temperature, transitions as points, the universal jump as lines; see `archive.lab.plane.plane`.

        Parameters
        ----------
        query : SearchQuery, optional
            Which sweeps; else all that are not withdrawn.
        axis : {"coverage", "pressure", "cell"}
            What stands against temperature.
        state : {"any", "reduced", "not reduced", "stale", "withdrawn"}
        window : Window, optional
            Part of the plane, in SI; else all sweeps but for a few that lie far from all others.
        everything : bool
            Those few, too.
        most : int, optional
            Bars, and points, that are told one by one; of more, strips of bars are told.
        """
        from archive.lab.plane import plane

        return plane(
            self._source, query or SearchQuery(), axis=axis, state=state, window=window, everything=everything, most=most
        )  # fmt: skip

    def plane_figure(self, view: PlaneView, *, kind: str = "pdf") -> bytes:
        """Figure of the plane for a talk, as PDF or SVG."""
        from archive.reports.plane_figure import plane_figure

        return plane_figure(view, kind=kind)

    def cells_and_substrates(self) -> list[CellUse]:
        """Every pair of cell and substrate that a sweep names, and since when."""
        from archive.lab.plane_lines import cell_uses

        return cell_uses(self._index)

    def cooldowns(self) -> RowList[CooldownRow]:
        """All cooldowns."""
        return RowList(self._index.cooldowns())

    def cooldown_names(self) -> list[str]:
        """Names of all cooldowns."""
        return self._index.cooldown_names()

    def result_quantities(self, name: str) -> list[str]:
        """Quantities that results of a name have, also those of reductions that do not count any more."""
        return self._index.result_quantities(name)

    def accessions(self, cooldown: str | None = None) -> list[AccessionRow]:
        """All accessions, or those of one cooldown."""
        return self._index.accessions(cooldown)

    def records(self, name: str | None = None, kind: str | None = None) -> list[RecordRow]:
        """Cells, substrates, thermometers, ... with their revisions."""
        return self._index.records(name=name, kind=kind)

    def cooldown(self, name: str) -> CooldownView:
        """What was taken in of a cooldown and said of it since, as it is to be read; its reductions have answers of their own.

        Raises
        ------
        UnknownAddress
            If there is none.
        """
        from archive.lab import reporting

        return reporting.view(self._source, self.name, name, reductions=False)

    def findings(self, address: str) -> list[FindingRow]:
        """Findings of an accession or a reduction."""
        return self._index.findings(address=address)

    def finding_counts(self) -> list[tuple[str, str, bool, int]]:
        """Severity and code of findings, whether they are waived, and how many there are of each."""
        return self._index.finding_counts()

    def sweep_row(self, address: str) -> SweepRow:
        """What the index knows of a sweep, in its newest version.

        Raises
        ------
        UnknownAddress
            If there is none.
        """
        row = self._index.sweep(address)
        if row is None:
            raise UnknownAddress(f"there is no sweep {address} in this archive")
        return row

    def sweeps(self, cooldown: str, *, withdrawn: bool = False) -> RowList[SweepRow]:
        """Sweeps of a cooldown by name, each in its newest version; withdrawn ones too, marked, if asked for."""
        return RowList(self._index.sweeps(cooldown, withdrawn=withdrawn))

    def reductions(
        self, *, cooldown: str | None = None, sweep: str | None = None, newest_only: bool = False
    ) -> list[ReductionRow]:
        """Reductions by sweep, plan and number; withdrawn ones are marked."""
        return self._index.reductions(cooldown=cooldown, sweep=sweep, newest_only=newest_only)

    def results(
        self,
        name: str | None = None,
        *,
        cooldown: str | None = None,
        sweep: str | None = None,
        withdrawn: bool = False,
    ) -> RowList[ResultRow]:
        """Scalar results of current reductions, as a table; withdrawn ones too, marked, if asked for."""
        return RowList(self._index.results(name=name, cooldown=cooldown, sweep=sweep, withdrawn=withdrawn))

    def statistics(self) -> dict[str, int]:
        """Counts of what the archive holds."""
        return self._index.statistics()

    def sweep(self, address: str) -> SweepView:
        """Channels of a sweep as stored: arrays by name, with their units beside them; see `archive.lab.views.ArrayView`.

        Parameters
        ----------
        address : str
            Such as `2026-03/s017`.
        """
        from archive.lab.viewing import sweep_view

        return sweep_view(self._source, address)

    def reduction(self, address: str) -> ReductionView:
        """Arrays of a reduction by name, with uncertainties and units beside them, and its results."""
        from archive.lab.viewing import reduction_view

        return reduction_view(self._source, address)

    def result(self, address: str) -> Result:
        """One number with uncertainty and unit, by an address such as `2026-03/s017@film-transition.2#T_KT`."""
        from archive.lab.viewing import result

        return result(self._source, address)

    def _repr_html_(self) -> str:
        from archive.lab.viewing import archive_html

        return archive_html(self.name, str(self.root), self.statistics(), self.cooldowns())

    def array(self, address: str) -> NDArray[np.float64]:
        """Array that an address names: a channel of a sweep or an output of a reduction, in its stored unit."""
        parsed = parse_address(address)
        if parsed.part is None:
            raise UnknownAddress(
                f"{address} names no channel or output", expected="an address that ends in #NAME"
            )
        return self._source.values(parsed.reduction or parsed.sweep or "", parsed.part)

    def show(self, address: str) -> dict[str, Any]:
        """Everything the archive knows of a thing, as JSON-able content with `address` and `what`."""
        from archive.lab import showing

        return showing.show(self._source, address)

    def chart(self, asked: Asked) -> Chart:
        """Curves of a sweep or a reduction and of others laid over, thinned to what can be seen; see `archive.lab.curves`."""
        from archive.lab.curves.chart import chart

        return chart(self._source, asked)

    def chart_outline(self, asked: Asked) -> Outline:
        """What a chart is made of and what is to be said of it, without reading its numbers."""
        from archive.lab.curves.chart import outline

        return outline(self._source, asked)

    def shown_csv(self, asked: Asked) -> Iterator[str]:
        """Rows that a chart shows, all of them, as pieces of CSV."""
        from archive.lab.curves.taking import csv_blocks

        return csv_blocks(self._source, asked)

    def shown_hdf5(self, asked: Asked, path: Path) -> None:
        """Write the rows that a chart shows, all of them, as an HDF5 file that describes itself."""
        from archive.lab.curves.taking import hdf5_file

        hdf5_file(self._source, asked, path)

    def plan_figure(self, address: str, *, kind: str = "svg") -> PlanFigure:
        """Figure that the plan of a reduction has, as SVG or PDF, with its caption; or why there is none."""
        from archive.lab.plan_figure import plan_figure

        return plan_figure(self._source, address, kind=kind)

    def sweep_facts(self, address: str) -> SweepFacts:
        """A sweep with what its sheet and the records say of it, as it is to be read: amended, shown even if withdrawn."""
        from archive.lab.curves.columns import facts_of

        return facts_of(self._source, address)

    def reduction_document(self, address: str) -> ReductionDocument:
        """What the sealed file of a reduction says about itself."""
        return self._source.reduction(address)

    def marks(self, address: str) -> dict[str, Any]:
        """What was said of a thing after it was sealed: withdrawn, amended, superseded, resting on something withdrawn."""
        from archive.lab.marks import marks_of

        return marks_of(self._source, parse_address(address))

    def sweep_picture(self, facts: SweepFacts, *, link: Callable[[str], str | None]) -> str | None:
        """A sweep, its current reductions and what these took, as SVG; None where nothing is reduced."""
        from archive.lab.lineage_pictures import sweep_picture

        return sweep_picture(self._source, facts, link=link)

    def lineage_picture(
        self, address: str, *, forward: bool = False, link: Callable[[str], str | None]
    ) -> str:
        """Lineage of a thing down to raw files, or forward to all that rests on it, as SVG."""
        from archive.lab.lineage_pictures import lineage_picture

        return lineage_picture(self._source, address, forwards=forward, link=link)

    def trace(self, address: str, *, forward: bool = False) -> TraceNode:
        """Lineage of a result, array, sentence or figure down to raw files and lines; or forward, to all that rests on it."""
        from archive.lab.forward import forward as lineage_forward
        from archive.lab.marks import marked
        from archive.lab.tracing import backward

        found = lineage_forward(self._source, address) if forward else backward(self._source, address)
        return marked(self._source, found)

    def calibration(
        self, reduction: str, *, name: str | None = None, revision: int | None = None
    ) -> Calibration:
        """Calibration record that a reduction found, as a new record or the next revision of one; see `calibrating`."""
        from archive.lab import calibrating

        return calibrating.made_calibration(self._source, reduction, name=name, revision=revision)

    def calibration_drift(self, thermometer: str) -> list[Drift]:
        """Each calibration of a thermometer held against the one before it."""
        from archive.lab import calibrating

        return calibrating.calibration_drift(self._source, thermometer)

    def calibrations_against_last(self, thermometer: str) -> tuple[tuple[Calibration, ...], list[Drift]]:
        """Every calibration of a thermometer, oldest first, and the last one held against each before it."""
        from archive.lab import calibrating

        return calibrating.calibrations_against_last(self._source, thermometer)

    def life(self, name: str) -> Life:
        """Life story of a cell, substrate, thermometer, calibration, sample, cryostat or plan over all cooldowns."""
        from archive.lab.life import life

        return life(self._source, name)

    def resting(self, address: str) -> Rests:
        """Reductions that rest on a revision of a record or plan, directly or through others, up to 300 of them."""
        from archive.lab.life import resting

        return resting(self._source, address)

"""class Archive: open, check, ingest, reduce, find, show, trace, report.

Everything that commands, notebooks and tests do to an archive goes through here. Writing is done under the archive's
lock; reading needs none, since sealed files never change.
"""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import contextmanager, nullcontext, suppress
from datetime import UTC, datetime
from functools import partial
from pathlib import Path
from types import TracebackType
from typing import TYPE_CHECKING, Any, Self

from archive.errors import ArchiveBusy, ArchiveError, BadRequest, UnknownAddress
from archive.index import Index, SearchQuery
from archive.index.engine import for_reading_only
from archive.intake.settings import SETTINGS_NAME, Settings, read_settings, settings_text
from archive.lab.journaling import AFTERWARDS, Acts
from archive.lab.place import find_root, made, make_root, unmade
from archive.lab.source import LabSource, key_of
from archive.lab.views import RowList
from archive.store.durable import archive_lock
from archive.store.interface import SealedFile
from archive.store.local import open_store
from archive.store.staging import sweep_staging
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
        WithdrawalRow,
    )
    from archive.index.acts import ActDocument
    from archive.lab import exchanging
    from archive.lab.act_outcomes import ActOutcome, WithdrawOutcome
    from archive.lab.comparing import Comparison
    from archive.lab.curves.chart import Asked, Chart, Outline
    from archive.lab.keeping import MirrorOutcome
    from archive.lab.life import Life, Rests
    from archive.lab.outcomes import CheckReport, IngestOutcome, ReduceOutcome, ReplayReport
    from archive.lab.plan_figure import PlanFigure
    from archive.lab.plane import PlaneState
    from archive.lab.stale import Stale
    from archive.lab.views import ReductionView, Result, SweepView
    from archive.reduction.calibration_comparison import Drift
    from archive.reduction.facts import SweepFacts
    from archive.reduction.monte_carlo import Request
    from archive.reduction.trace import TraceNode
    from archive.reports import CooldownView
    from archive.reports.plane_view import PlaneAxis, PlaneView, Window
    from archive.store.interface import Damage
    from archive.store.journal import Entry
    from archive.store.local import LocalStore
    from archive.store.mend import Mended
    from schemas.lineage import ReductionDocument
    from schemas.plan import Plan
    from schemas.thermometer import Calibration

__all__ = ["Archive"]

Progress = Callable[[str], None]
Clock = Callable[[], datetime]


def _quiet(sentence: str) -> None:
    """Say nothing."""


def _uncounted(done: int, of: int, what: str) -> None:
    """Say nothing."""


def _now() -> datetime:
    return datetime.now(UTC).replace(microsecond=0)


class Archive:
    """One laboratory's archive.

    Use `Archive.create` or `Archive.open`; as a context manager it closes its index.

    Attributes
    ----------
    root : Path
        Folder of the archive.
    settings : Settings
        What `stillroom.toml` says.
    notices : list of str
        What opening found and put in order, as sentences.

    Examples
    --------
    >>> import tempfile
    >>> with tempfile.TemporaryDirectory() as folder, Archive.create(Path(folder) / "lab", name="Cold room") as lab:
    ...     lab.name, lab.cooldowns()
    ('Cold room', [])
    """

    def __init__(self, root: Path, settings: Settings, store: LocalStore, index: Index, clock: Clock) -> None:
        self.root = root
        self.settings = settings
        self.notices: list[str] = []
        self._store = store
        self._index = index
        self._clock = clock
        self._source = LabSource(store, index)
        self._acts = Acts(root, clock)

    # Opening and closing ------------------------------------------------------------------------------------------

    @classmethod
    def create(
        cls, root: Path, *, name: str | None = None, index: str | None = None, clock: Clock = _now
    ) -> Archive:
        """Make a new archive.

        Parameters
        ----------
        root : Path
            Folder to make it in; it may exist if it is empty.
        name : str, optional
            Name of the archive; the folder's name if left out.
        index : str, optional
            Address of the index; a SQLite file in the folder if left out.

        Raises
        ------
        BadRequest
            If the folder holds something already.
        """
        root = root.resolve()
        if (root / SETTINGS_NAME).exists():
            raise BadRequest(
                "there is an archive here already", file=str(root), remedy="use it, or name another folder"
            )
        try:
            settings = Settings.model_validate(
                {"name": name or root.name, **({"index": index} if index else {})}
            )
        except ValueError:
            raise BadRequest(
                "an archive cannot have this name or index",
                found=repr((name or root.name)[:80]),
                expected="text of at most 20000 characters",
                remedy="give it another with --name",
            ) from None
        make_root(root)
        with archive_lock(root):
            if (root / SETTINGS_NAME).exists():
                raise BadRequest("another process has just made an archive here", file=str(root))
            unmade(root, settings)
            try:
                made(root, settings, settings_text(settings.name, index))
                begun = Acts(root, clock)
                begun.done("init", settings.name)
                begun.enter()
            except BaseException:
                unmade(root, settings)
                raise
        return cls.open(root, clock=clock)

    @classmethod
    def open(
        cls, start: Path | str | None = None, *, read_only: bool = False, clock: Clock = _now
    ) -> Archive:
        """Open an archive.

        Parameters
        ----------
        start : Path, optional
            Folder of the archive; else `STILLROOM_ARCHIVE`, else the current folder and its parents are looked at.
        read_only : bool
            Only look: the database itself refuses writes, and what an interruption left is not put in order.

        Raises
        ------
        NotAnArchive
            If there is none.
        BadRequest
            If it is to be read only and an older Stillroom wrote its index.
        """
        root = find_root(None if start is None else Path(start))
        settings = read_settings(root)
        # A copy on a read-only medium, or another person's archive, can be read all the same.
        # So it can when the disk is full: whoever only looks is not kept out by that.
        index = Index.open(settings.index_address(root), read_only=read_only or for_reading_only(root))
        archive = cls(root, settings, open_store(root), index, clock)
        try:
            if not read_only:
                archive._put_in_order()
        except BaseException:
            index.close()
            raise
        return archive

    def close(self) -> None:
        """Close the index."""
        self._index.close()

    def __enter__(self) -> Self:
        """Enter a `with` block."""
        return self

    def __exit__(
        self, kind: type[BaseException] | None, value: BaseException | None, trace: TracebackType | None
    ) -> None:
        """Close at the end of a `with` block."""
        self.close()

    @property
    def name(self) -> str:
        """Name of the archive."""
        return self.settings.name

    def _put_in_order(self) -> None:
        """Sweep what an interrupted writer left, and complete the index from sealed files it does not know."""
        if not os.access(self.root, os.W_OK):
            return
        recorded = self._index.sealed_files()
        unknown = set(self._store.keys()) - set(recorded)
        staged = any((self.root / "staging").iterdir()) if (self.root / "staging").is_dir() else False
        if not unknown and not staged and not self._acts.behind(len(recorded)):
            return
        try:
            with archive_lock(self.root, wait_s=0.0):
                self.notices += sweep_staging(self.root)
                known = set(self._index.sealed_files())
                for key in sorted(self._store.keys(), key=_by_age(self._store)):
                    if key not in known:
                        self._complete(key)
                self._acts.enter()
                self._enter_missing()
        except ArchiveBusy:
            self.notices.append("another process is writing; what it has not finished is not shown yet")
        except (ArchiveError, OSError) as problem:
            # Reading needs none of this: whoever only looks is not kept out by a full disk.
            self.notices.append(f"what an interruption left could not be put in order yet: {problem}")

    def _complete(self, key: str) -> None:
        """Record a sealed file whose index rows an interruption cost, if the file is whole."""
        damage = self._store.verify(key)
        if damage:
            self.notices.append(f"{key} is sealed but not in the index, and it is damaged: {damage[0].what}")
            return
        try:
            self._record(self._store.describe(key), note=AFTERWARDS)
        except ArchiveError as problem:
            self.notices.append(f"{key} is sealed, but cannot be recorded in the index: {problem}")
            return
        self.notices.append(f"{key} had been sealed but not indexed; its rows were made from the file itself")

    def _enter_missing(self) -> None:
        recorded = {key: SealedFile(key, *row) for key, row in self._index.sealed_files().items()}
        if self._acts.behind(len(recorded)):
            order = sorted(set(recorded) & set(self._store.keys()), key=_by_age(self._store))
            count = self._acts.caught_up(recorded, self._source.document, order)
            self.notices += [f"{count} acts were entered in the journal afterwards"] if count else []

    def _record(self, sealed: SealedFile, *, note: str | None = None) -> None:
        document = self._source.document(sealed.key)
        self._index.record(document, key=sealed.key, sha256=sealed.sha256, size=sealed.size)
        self._acts.sealed(document, sealed, note=note)

    @contextmanager
    def _writing(self) -> Iterator[None]:
        with archive_lock(self.root):
            self.notices += sweep_staging(self.root)
            try:
                yield
            finally:
                self._acts.enter()

    # Coming in ----------------------------------------------------------------------------------------------------

    def check(self, folder: Path | str, *, progress: Progress = _quiet) -> CheckReport:
        """All findings on a cooldown folder, with the archive's records and thresholds; nothing is stored."""
        from archive.lab.checking import check_folder

        return check_folder(
            Path(folder), thresholds=self.settings.thresholds, source=self._source, progress=progress
        )

    def ingest(self, folder: Path | str, *, progress: Progress = _quiet) -> IngestOutcome:
        """Take a cooldown folder into the archive, whole or not at all.

        Returns
        -------
        IngestOutcome
            `ingested`; `supplement` if files changed or came in addition; `already` if nothing differs; `refused`
            if a finding is an error, and then nothing was stored.

        Raises
        ------
        ArchiveBusy
            If another process is writing.
        """
        from archive.intake import ingest as intake_ingest
        from archive.intake.examine import examined
        from archive.lab.checking import earlier_runs, folder_report, require_folder
        from archive.lab.outcomes import CheckReport, IngestOutcome
        from archive.reduction.software import software

        folder = Path(folder)
        require_folder(folder)
        thresholds = self.settings.thresholds
        with self._writing():
            outcome = intake_ingest.ingest(
                folder,
                store=self._store,
                earlier=self._source.accessions,
                archived=self._source.find_record,
                examine=lambda reading: intake_ingest.Examination(
                    *examined(reading, thresholds, earlier=earlier_runs(self._source, reading))
                ),
                clock=self._clock,
                software=software(),
                progress=progress,
            )
            if outcome.document is not None and outcome.sealed is not None:
                self._source.remember(outcome.sealed.key, outcome.document)
                self._record(outcome.sealed)
        reading = outcome.reading
        report = (
            CheckReport(outcome.findings, outcome.cautions)
            if reading is None
            else folder_report(reading, outcome.findings, outcome.cautions)
        )
        return IngestOutcome(outcome.state, outcome.address, report, outcome.differences)

    # Reducing -----------------------------------------------------------------------------------------------------

    def plans(self) -> list[Plan]:
        """Shipped plans and those that reductions of this archive used."""
        from archive.lab import reducing

        return reducing.plans(self._source)

    def reduce(
        self,
        cooldown: str,
        *,
        plan: str | Path | None = None,
        sweep: str | None = None,
        monte_carlo: Request | None = None,
        jobs: int = 1,
        executor: str | None = None,
        progress: Progress = _quiet,
    ) -> list[ReduceOutcome]:
        """Carry out plans on the sweeps of a cooldown, in an order in which each finds what it rests on.

        Parameters
        ----------
        cooldown : str
            Name of the cooldown, or the address of one of its sweeps.
        plan : str or Path, optional
            Name of a shipped plan, or a plan file; else every plan that applies.
        sweep : str, optional
            Name of one sweep; else all.
        monte_carlo : Request, optional
            Repeat each plan with drawn inputs and seal what that finds with the reduction.
        jobs : int
            Processes that compute; what is sealed does not depend on it.
        executor : str, optional
            ``dask://HOST:PORT`` of a cluster whose workers compute instead.

        Returns
        -------
        list of ReduceOutcome
            One per sweep and plan, in the order carried out; a problem stands in the outcome and stops no other.
        """
        from archive.lab import reducing
        from archive.lab.crew import Crew

        # Trials may take an hour: they run without the lock, which is taken to seal.
        with self._writing() if monte_carlo is None else nullcontext():
            return reducing.reduce(
                self._source,
                cooldown,
                plan=plan,
                sweep=sweep,
                clock=self._clock,
                seal=self._seal_reduction if monte_carlo is None else self._seal_alone,
                progress=progress,
                crew=Crew(self.root, jobs, executor),
                request=monte_carlo,
            )

    def _seal_alone(
        self, document: ReductionDocument, arrays: Mapping[str, tuple[NDArray[Any], dict[str, str]]]
    ) -> None:
        with self._writing():
            self._seal_reduction(document, arrays)

    def _seal_reduction(
        self, document: ReductionDocument, arrays: Mapping[str, tuple[NDArray[Any], dict[str, str]]]
    ) -> None:
        with self._store.writer(document.address) as writer:
            for path, (values, attributes) in arrays.items():
                writer.array(path, values, attributes)
            writer.document(document.model_dump_json(indent=1))
            sealed = writer.seal()
        self._source.remember(sealed.key, document)
        self._record(sealed)

    # Afterwards ---------------------------------------------------------------------------------------------------

    def stale(self, cooldown: str | None = None) -> list[Stale]:
        """Current reductions that rest on something read otherwise now, those that others rest on first."""
        from archive.lab.stale import stale

        return stale(self._source, cooldown=cooldown)

    def reduce_stale(
        self,
        cooldown: str | None = None,
        *,
        monte_carlo: Request | None = None,
        jobs: int = 1,
        executor: str | None = None,
        progress: Progress = _quiet,
    ) -> list[ReduceOutcome]:
        """Make stale reductions anew with the newest revisions that hold; see `archive.lab.renewing.reduce_stale`."""
        from archive.lab.crew import Crew
        from archive.lab.renewing import reduce_stale

        with self._writing():
            return reduce_stale(
                self._source, cooldown, clock=self._clock, seal=self._seal_reduction, progress=progress,
                crew=Crew(self.root, jobs, executor), request=monte_carlo,
            )  # fmt: skip

    def revise(self, sheet: Path | str, *, by: str | None = None, dry_run: bool = False) -> ActOutcome:
        """Add the revision of a record or plan that a sheet describes, outside a cooldown; or show what it would do."""
        from archive.lab.revising import revise

        with nullcontext() if dry_run else self._writing():
            seal = None if dry_run else self._seal_act
            return revise(
                self._source, Path(sheet), by=by, clock=self._clock, seal=seal,
                thresholds=self.settings.thresholds,
            )  # fmt: skip

    def amend(self, sheet: Path | str, *, by: str | None = None, dry_run: bool = False) -> ActOutcome:
        """Add the amendment of a sealed cooldown that a sheet describes; or show what it would do."""
        from archive.lab.amending import amend

        with nullcontext() if dry_run else self._writing():
            seal = None if dry_run else self._seal_act
            return amend(
                self._source, Path(sheet), by=by, clock=self._clock, seal=seal,
                thresholds=self.settings.thresholds,
            )  # fmt: skip

    def withdraw(self, address: str, *, why: str, by: str | None = None) -> WithdrawOutcome:
        """Mark something as not to be used any more; it stays, and what rests on it is flagged."""
        from archive.lab.withdrawing import withdraw

        with self._writing():
            return withdraw(self._source, address, why=why, by=by, clock=self._clock, seal=self._seal_act)

    def withdrawals(self) -> list[WithdrawalRow]:
        """What is withdrawn, why and by whom."""
        return self._index.withdrawals()

    def flagged(self) -> dict[str, tuple[str, ...]]:
        """Reductions that rest on something withdrawn, each with the addresses of what that is."""
        return self._index.flagged()

    def _seal_act(self, document: ActDocument, name: str = "", content: bytes = b"") -> None:
        with self._store.writer(key_of(document.address)) as writer:
            if name:
                writer.raw(name, [content], media_type="application/toml")
            writer.document(document.model_dump_json(indent=1))
            sealed = writer.seal()
        self._source.remember(sealed.key, document)
        self._record(sealed)

    def replay(self, address: str) -> ReplayReport:
        """Compute a reduction again from raw and compare it with what was sealed."""
        from archive.lab import reducing

        return reducing.replay(self._source, address, clock=self._clock)

    def replay_all(
        self,
        *,
        jobs: int = 1,
        executor: str | None = None,
        progress: Callable[[int, int, str], None] | None = None,
    ) -> Iterator[tuple[str, ReplayReport | ArchiveError]]:
        """Every reduction computed again by some processes; see `archive.lab.replaying.replay_all`."""
        from archive.lab.crew import Crew
        from archive.lab.replaying import replay_all

        return replay_all(
            self._source, clock=self._clock, crew=Crew(self.root, jobs, executor), progress=progress
        )

    def compare(self, first: str, second: str) -> Comparison:
        """Two reductions side by side: parameters, inputs, results with the significance of their change, arrays."""
        from archive.lab.comparing import compare

        return compare(self._source, first, second)

    def compare_figure(self, found: Comparison, *, kind: str = "pdf") -> bytes:
        """Figure of a comparison, as PDF or SVG."""
        from archive.lab import reporting

        return reporting.comparison(self._source, found, kind=kind)

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

    # Telling ------------------------------------------------------------------------------------------------------

    def run_sheet(self, cooldown: str, *, paper: str = "a4") -> dict[str, bytes]:
        """Run sheet of a cooldown as HTML, PDF and JSON, by file name."""
        from archive.lab import reporting

        return reporting.run_sheet(self._source, self.name, cooldown, paper=paper)

    def appendix(
        self, addresses: Sequence[str], *, title: str | None = None, level: str = "section"
    ) -> dict[str, bytes]:
        """Methods appendix behind cooldowns, sweeps or reductions: LaTeX, bibliography, figures, by file name."""
        from archive.lab import reporting

        return reporting.appendix(self._source, self.name, addresses, title=title, level=level)

    def write_reports(
        self, files: dict[str, bytes], target: Path | str, *, of: Sequence[str] = ()
    ) -> list[Path]:
        """Write reports into a folder and enter that in the journal; each file whole or not at all, and when one fails, those written are named.

        Parameters
        ----------
        files : dict of str to bytes
            Contents by name below the folder.
        target : Path
        of : sequence of str
            Addresses of what they tell, for the journal; left out: the names of the files.
        """
        from archive.lab.report_files import manifest_digest, written_reports

        written = written_reports(files, Path(target))
        self._given_away("report", of or sorted(files), manifest_digest(files), f"{len(files)} files")
        return written

    # Exchanging ---------------------------------------------------------------------------------------------------

    def provenance(self, address: str, *, notation: str = "json") -> exchanging.Provenance:
        """Provenance in the terms of W3C PROV, as `json` (PROV-JSON) or `provn` (PROV-N): a cooldown, or what lies behind a thing."""
        from archive.lab import exchanging

        return exchanging.provenance(self._source, address, notation=notation)

    def export(
        self,
        addresses: Sequence[str],
        target: Path | str,
        *,
        reports: bool = True,
        appendix: bool = False,
        progress: Callable[[int, int, str], None] = _uncounted,
    ) -> exchanging.ExportOutcome:
        """Write a package of some addresses, or of the whole archive when none is named, with all that they rest on."""
        from archive.lab import exchanging
        from archive.reduction.software import software

        if self.root in (place := Path(target).resolve(), *place.parents):
            raise BadRequest(
                "a package cannot lie in the archive itself", file=str(target), remedy="name another folder"
            )
        outcome = exchanging.export(
            self._source, self._store, addresses, Path(target), deposit=self.settings.exchange, archive_name=self.name,
            software=f"Stillroom {software().stillroom}", now=self._clock(), reports=reports, appendix=appendix, progress=progress,
        )  # fmt: skip
        what = outcome.asked or (f"all of {self.name}",)
        self._given_away(
            "export", what, outcome.sha256, f"{outcome.number} files, {len(outcome.files)} of them sealed"
        )
        return outcome

    def _given_away(self, act: str, of: Sequence[str], sha256: str, note: str) -> None:
        """Enter in the journal what left the archive, with the digest of the list of what it consists of."""
        if not os.access(self.root, os.W_OK):
            self.notices.append(
                f"the journal does not tell of this {act}: the archive cannot be written to here"
            )
            return
        try:
            with archive_lock(self.root):
                self._acts.done(act, ", ".join(of), sha256=sha256, note=note)
                self._acts.enter()
        except ArchiveBusy:
            self.notices.append(
                f"the journal does not tell of this {act}: another process was writing all the while"
            )

    def import_package(
        self,
        folder: Path | str,
        *,
        dry_run: bool = False,
        progress: Callable[[int, int, str], None] = _uncounted,
    ) -> exchanging.ImportOutcome:
        """Take a package that `export` made into this archive, byte for byte: all of it or nothing."""
        from archive.lab import exchanging

        with self._writing(), self._acts.entered_as("import"):
            return exchanging.taken_in(
                self._source, self._store, Path(folder), record=self._record, dry=dry_run, progress=progress
            )

    # Keeping ------------------------------------------------------------------------------------------------------

    def fixity(
        self, *, enter: bool = False, progress: Callable[[int, int, str], None] | None = None
    ) -> list[Damage]:
        """Re-read everything and name what is damaged, missing or stray; index, journal and settings too.

        Parameters
        ----------
        enter : bool
            Whether the outcome is entered in the journal, where the archive can be written to.
        progress : callable, optional
        """
        from archive.lab.index_check import index_damage
        from archive.store.fixity import fixity

        recorded = self._recorded()
        damage = fixity(self._store, recorded, progress)
        hurt = {each.key for each in damage if each.kind != "stray"}
        damage += index_damage(self._index, self._store, recorded, hurt)
        damage += self._acts.damage({key: sealed.sha256 for key, sealed in recorded.items()})
        if enter and os.access(self.root, os.W_OK):
            faults = sum(each.kind != "stray" for each in damage)
            self._acts.done("fixity", self.name, note=f"{len(recorded)} sealed files read, {faults} faults")
            with suppress(ArchiveBusy), archive_lock(self.root, wait_s=0.0):
                self._acts.enter()
        return damage

    def mend(
        self, other: Path | str, *, progress: Callable[[int, int, str], None] | None = None
    ) -> list[Mended]:
        """Bring damaged or missing sealed files back from another copy of the archive; see `archive.store.mend`."""
        from archive.lab import keeping

        with self._writing():
            hurt = {each.key for each in self.fixity() if each.kind != "stray"}
            outcomes = keeping.mend(
                self._store,
                [sealed for key, sealed in self._recorded().items() if key in hurt],
                Path(other),
                progress=progress,
            )
            for each in outcomes:
                if each.mended:
                    self._acts.done("mend", each.key, note=each.why)
        return outcomes

    def mirror(
        self,
        target: Path | str,
        *,
        thorough: bool = False,
        progress: Callable[[int, int, str], None] | None = None,
    ) -> MirrorOutcome:
        """Bring a mirror of this archive in another folder up to date; see `archive.lab.keeping.mirror`."""
        from archive.lab import keeping

        return keeping.mirror(
            self._store,
            self.settings,
            self._recorded,
            Path(target),
            snapshot=self._index.snapshot,
            entered=partial(self._mirror_entered, Path(target)),
            thorough=thorough,
            progress=progress,
        )

    def _mirror_entered(self, target: Path, note: str) -> None:
        self._acts.done("mirror", str(target.resolve()), note=note)
        try:
            self._acts.enter()
        except BadRequest as problem:
            # A full disk is a reason to mirror, not to refuse it.
            self.notices.append(f"the journal does not tell of this mirror: {problem}")

    def _recorded(self) -> dict[str, SealedFile]:
        return {key: SealedFile(key, *row) for key, row in self._index.sealed_files().items()}

    def journal(self) -> list[Entry]:
        """All acts on this archive, oldest first: who by role, when, what, by which version of Stillroom."""
        return list(self._acts.journal.entries())

    @classmethod
    def rebuild_index(
        cls, start: Path | str | None = None, *, progress: Callable[[int, int, str], None] | None = None
    ) -> dict[str, int]:
        """Make the index anew from the sealed files alone; a damaged or lost index is set aside, not overwritten.

        Returns
        -------
        dict
            Counts of what the new index holds.

        Raises
        ------
        DamagedFile
            If a sealed file is damaged; the old index stays.
        """
        from archive.lab import reducing

        root = find_root(None if start is None else Path(start))
        settings = read_settings(root)
        counts = reducing.rebuilt_index(
            root, settings.index_address(root), open_store(root), progress=progress
        )
        acts = Acts(root, _now)
        acts.done("rebuild-index", settings.name)
        with archive_lock(root):
            acts.enter()
        return counts


def _by_age(store: LocalStore) -> Callable[[str], tuple[bool, float, str]]:
    """Order in which sealed files can be recorded: accessions before reductions, older before newer."""
    return lambda key: ("@" in key, store.path(key).stat().st_mtime, key)

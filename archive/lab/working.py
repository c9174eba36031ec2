"""What adds to an archive: cooldowns that come in, their reductions, and what is said of them afterwards."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from contextlib import nullcontext
from pathlib import Path
from typing import TYPE_CHECKING, Any

from archive.errors import ArchiveError
from archive.lab.opened import Opened
from archive.lab.source import key_of

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from archive.index import WithdrawalRow
    from archive.index.acts import ActDocument
    from archive.lab.act_outcomes import ActOutcome, WithdrawOutcome
    from archive.lab.comparing import Comparison
    from archive.lab.outcomes import CheckReport, IngestOutcome, ReduceOutcome, ReplayReport
    from archive.lab.stale import Stale
    from archive.reduction.monte_carlo import Request
    from schemas.lineage import ReductionDocument
    from schemas.plan import Plan

__all__ = ["Working"]

Progress = Callable[[str], None]


def _quiet(sentence: str) -> None:
    """Say nothing."""


class Working(Opened):
    """Check, ingest, reduce, revise, amend, withdraw, replay, compare."""

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

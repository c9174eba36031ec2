"""What an index answers: plain rows, each answer from one state of the database."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any, Literal

from sqlalchemy import Engine
from sqlalchemy.engine import URL

from archive.errors import BadRequest
from archive.index import act_queries, queries, sweep_queries
from archive.index.act_answers import AmendmentRow, InputRow, RevisionRow, WithdrawalRow
from archive.index.answers import (
    AccessionRow,
    CooldownRow,
    DoseRow,
    FindingRow,
    RawFileRow,
    RecordRow,
    ReductionRow,
    ResultRow,
    SearchQuery,
    SweepResult,
    SweepRow,
)
from archive.index.engine import (
    index_name,
    reading,
)
from archive.index.flags import flagged
from archive.index.life_answers import LifeResult, Resting, Use
from archive.index.life_queries import Role, life_results, resting_reductions, uses
from archive.index.plane_answers import CellUse, PlaneResult, PlaneSweep, Span
from archive.index.plane_queries import (
    cells_and_substrates,
    dosed_spans,
    plane_results,
    plane_spans,
    plane_sweeps,
    record_contents,
    sealed_count,
)
from archive.index.sweep_rows import results_of, sweep_rows

__all__ = ["Looking"]

_LARGEST = 2**63 - 1  # the largest integer of SQLite and of a bigint of PostgreSQL


class Looking:
    """The questions to an open index."""

    def __init__(self, engine: Engine, url: URL) -> None:
        self._engine = engine
        self._url = url

    def sealed_files(self, *, under: str = "") -> dict[str, tuple[str, int]]:
        """SHA-256 and size of every sealed file, by key; of those alone whose key begins with `under`, such as `2026-03/`."""
        with reading(self._engine, self._url) as connection:
            found = connection.execute(queries.sealed_files(under))
            return {row.key: (row.sha256, row.size) for row in found}

    def finding_counts(self) -> list[tuple[str, str, bool, int]]:
        """Severity and code of findings, whether they are waived, and how many there are of each."""
        with reading(self._engine, self._url) as connection:
            return [tuple(row) for row in connection.execute(queries.finding_counts())]

    def search(self, query: SearchQuery) -> list[SweepRow]:
        """Sweeps that satisfy a search, each once, in its newest version.

        Raises
        ------
        BadRequest
            If the query asks for something that cannot be: a time without offset, a negative limit, an unknown order.
        """
        if query.sort not in sweep_queries.SORTS:
            raise BadRequest(
                "sweeps cannot be sorted so",
                field="sort",
                found=str(query.sort),
                expected=", ".join(sweep_queries.SORTS),
            )
        for field, number in (("limit", query.limit), ("offset", query.offset)):
            if number is not None and not 0 <= number <= _LARGEST:
                raise BadRequest(
                    "a search cannot count so", field=field, found=str(number), expected=f"0 to {_LARGEST}"
                )
        last = None if query.after is None else self.sweep(query.after)
        if query.after is not None and last is None:
            raise BadRequest(
                "the list cannot go on behind a sweep that is not there",
                field="after",
                found=query.after[:200],
                remedy="begin the list anew",
            )
        with reading(self._engine, self._url) as connection:
            amended = connection.execute(sweep_queries.anything_amended()).first() is not None
            if connection.execute(sweep_queries.anything_withdrawn()).first() is None:
                # Not to be asked of each sweep anew.
                query = replace(query, withdrawn=True)
            if (
                not amended
                and sweep_queries.walks(query)
                and connection.execute(sweep_queries.many(query)).first()
            ):
                found = sweep_rows(connection, sweep_queries.walked(query, last=last))
                # Fewer may be the end of the list, or those without a date are still to come.
                if len(found) == query.limit:
                    return found
            return sweep_rows(connection, sweep_queries.search(query, amended=amended, last=last))

    def plane_sweeps(
        self,
        query: SearchQuery,
        *,
        cells: Sequence[str] | None = None,
        between: tuple[float, float] | None = None,
    ) -> list[PlaneSweep]:
        """All sweeps that satisfy a search, by coverage and address, in slim rows; its order and limit do not count.

        Parameters
        ----------
        query : SearchQuery
        cells, between : optional
            All cells that there are, to ask only for coverages between two ends or, without ends, for sweeps that state none.
        """
        asked = plane_sweeps(
            query, amended=self._is_amended(), anything_withdrawn=bool(self.withdrawals()), cells=cells, between=between
        )  # fmt: skip
        with reading(self._engine, self._url) as connection:
            return list(map(PlaneSweep._make, connection.execute(asked).all()))

    def stamp(self) -> tuple[str, int]:
        """What tells one state of this index from every other: its address, and how many files it knows."""
        with reading(self._engine, self._url) as connection:
            return index_name(self._url), int(connection.execute(sealed_count()).scalar_one())

    def record_contents(self, addresses: Sequence[str]) -> dict[str, dict[str, Any]]:
        """Content of some records, by address; those that are not there are left out."""
        with reading(self._engine, self._url) as connection:
            rows = connection.execute(record_contents(addresses)).all()
        return {row.address: row.content for row in rows}

    def plane_results(
        self,
        names: Sequence[str],
        *,
        low: float | None = None,
        high: float | None = None,
        headline: bool = True,
    ) -> list[PlaneResult]:
        """Results of some names between two values, of current reductions, in SI, by sweep and reduction."""
        with reading(self._engine, self._url) as connection:
            asked = plane_results(names, low=low, high=high, headline=headline)
            return list(map(PlaneResult._make, connection.execute(asked).all()))

    def sweep_results(self, addresses: Sequence[str]) -> dict[str, list[SweepResult]]:
        """Results of the newest reductions of some sweeps, headline ones first, by sweep."""
        with reading(self._engine, self._url) as connection:
            return results_of(connection, addresses)

    def spans(self, quantity: str) -> list[Span]:
        """Range of each channel in use of one quantity kind, by sweep; the newest version of each sweep."""
        with reading(self._engine, self._url) as connection:
            return [Span(*row) for row in connection.execute(plane_spans(quantity))]

    def cells_and_substrates(self) -> list[CellUse]:
        """Every pair of cell and substrate that a sweep names, by name, and when the first such sweep began."""
        with reading(self._engine, self._url) as connection:
            return [CellUse(*row) for row in connection.execute(cells_and_substrates())]

    def dosed_spans(self) -> list[Span]:
        """Range of coverage over the doses taken during each sweep that states no coverage itself, by sweep."""
        with reading(self._engine, self._url) as connection:
            return [Span(*row) for row in connection.execute(dosed_spans())]

    def sweeps(self, cooldown: str, *, withdrawn: bool = False) -> list[SweepRow]:
        """Sweeps of a cooldown by name, each as the newest accession that has it holds it; withdrawn ones if asked for."""
        asked = sweep_queries.sweeps(cooldown=cooldown, amended=self._is_amended(), withdrawn_too=withdrawn)
        return self._sweeps(asked)

    def sweeps_of_accession(self, accession: str) -> list[SweepRow]:
        """Sweeps by name as one accession holds them, older versions too."""
        return self._sweeps(sweep_queries.sweeps(accession=accession))

    def sweep(self, address: str) -> SweepRow | None:
        """Return the newest version of a sweep; None when the index has none."""
        asked = sweep_queries.sweeps(address=address, amended=self._is_amended(), withdrawn_too=True)
        return next(iter(self._sweeps(asked)), None)

    def accessions(self, cooldown: str | None = None) -> list[AccessionRow]:
        """Return accessions by cooldown and number."""
        return [
            AccessionRow(**{**row, "differences": tuple(row["differences"])})
            for row in self._mappings(queries.accessions(cooldown))
        ]

    def cooldowns(self) -> list[CooldownRow]:
        """Cooldowns by begin."""
        return [CooldownRow(**row) for row in self._mappings(queries.cooldowns())]

    def cooldown_names(self) -> list[str]:
        """Names of all cooldowns, without their counts."""
        return [str(row["name"]) for row in self._mappings(queries.cooldown_names())]

    def plans(self) -> list[dict[str, Any]]:
        """Content of every plan that a reduction followed."""
        return [row["content"] for row in self._mappings(queries.plans())]

    def result_quantities(self, name: str) -> list[str]:
        """Quantities that scalar results of a name have, also those of reductions that do not count any more."""
        return [str(row["quantity"]) for row in self._mappings(queries.result_quantities(name))]

    def records(self, name: str | None = None, kind: str | None = None) -> list[RecordRow]:
        """Return records by kind, name and revision; `name` is a name (all revisions) or an address (`TO-4.r2`)."""
        return [RecordRow(**row) for row in self._mappings(queries.records(name, kind))]

    def reductions(
        self,
        *,
        cooldown: str | None = None,
        sweep: str | None = None,
        plan: str | None = None,
        step: str | None = None,
        newest_only: bool = False,
    ) -> list[ReductionRow]:
        """Reductions by sweep, plan and number.

        Parameters
        ----------
        cooldown : str, optional
            Name of the cooldown.
        sweep : str, optional
            Address of the sweep.
        plan : str, optional
            Name or address of the plan.
        step : str, optional
            Name of a step that it must have taken.
        newest_only : bool
            Leave out those that a later or superseding one replaces.
        """
        asked = queries.reductions(
            cooldown=cooldown, sweep=sweep, plan=plan, step=step, newest_only=newest_only
        )
        return [ReductionRow(**row) for row in self._mappings(asked)]

    def results(
        self,
        *,
        name: str | None = None,
        cooldown: str | None = None,
        sweep: str | None = None,
        newest_only: bool = True,
        withdrawn: bool = False,
    ) -> list[ResultRow]:
        """Scalar results by sweep, plan, number and place in the plan; parameters as for `reductions`.

        Withdrawn ones are left out unless they are asked for; what rests on something withdrawn is flagged.
        """
        asked = queries.results(
            name=name,
            cooldown=cooldown,
            sweep=sweep,
            newest_only=newest_only,
            amended=self._is_amended(),
            withdrawn_too=withdrawn,
        )
        resting = self.flagged()
        return [ResultRow(**row, flagged=row["reduction"] in resting) for row in self._mappings(asked)]

    def raw_files(self, *, sha256: str | None = None, cooldown: str | None = None) -> list[RawFileRow]:
        """Raw files by accession and name."""
        asked = queries.raw_files(sha256=sha256, cooldown=cooldown)
        return [
            RawFileRow(address=f"{row['accession']}:{row['name']}", **row) for row in self._mappings(asked)
        ]

    def doses(self, cooldown: str) -> list[DoseRow]:
        """Return the gas ledger of a cooldown, in order, as its newest accession with doses holds it."""
        return [
            DoseRow(address=f"{cooldown}/{row['name']}", **row)
            for row in self._mappings(queries.doses(cooldown))
        ]

    def findings(
        self, *, address: str | None = None, code: str | None = None, severity: str | None = None
    ) -> list[FindingRow]:
        """Return findings of accessions and reductions; `address` is that of one of them."""
        asked = queries.findings(address=address, code=code, severity=severity)
        return [FindingRow(**row) for row in self._mappings(asked)]

    def dependents(self, address: str) -> list[str]:
        """Addresses of the reductions that took something from an address, or from a part or revision of it."""
        return [row["reduction"] for row in self._mappings(queries.dependents(address))]

    def withdrawals(self, *, counting: bool = True) -> list[WithdrawalRow]:
        """Withdrawals by target and number; those that were themselves withdrawn only if `counting` is False."""
        asked = act_queries.withdrawals(counting=counting)
        return [WithdrawalRow(**row) for row in self._mappings(asked)]

    def amendments(self, cooldown: str | None = None) -> list[AmendmentRow]:
        """Return amendments by cooldown and number, withdrawn ones too."""
        return [AmendmentRow(**row) for row in self._mappings(act_queries.amendments(cooldown))]

    def amended_sweeps(self) -> dict[str, tuple[str, ...]]:
        """Addresses of the amendments that bear on a sweep and count, by sweep."""
        found: dict[str, tuple[str, ...]] = {}
        for row in self._mappings(act_queries.amendments_of_sweeps()):
            found[row["sweep"]] = (*found.get(row["sweep"], ()), row["amendment"])
        return found

    def revisions(self, name: str | None = None) -> list[RevisionRow]:
        """Revisions of records and plans that came in outside a cooldown, by kind, name and number."""
        return [RevisionRow(**row) for row in self._mappings(act_queries.revisions(name))]

    def replaced_records(self, cooldown: str | None = None) -> dict[tuple[str, str], tuple[str, str]]:
        """What current reductions took instead of what the sheet names.

        Returns
        -------
        dict
            By cooldown and the address that the sheet names: the address taken, and the last reduction that took it.
        """
        rows = self._mappings(act_queries.replaced_records(cooldown))
        return {(row["cooldown"], row["instead_of"]): (row["address"], row["reduction"]) for row in rows}

    def current_replacements(self) -> dict[str, dict[str, str]]:
        """Return what each current reduction took instead of something: by reduction, what was named by what was taken."""
        found: dict[str, dict[str, str]] = {}
        for row in self._mappings(act_queries.replaced_records()):
            found.setdefault(row["reduction"], {})[row["address"]] = row["instead_of"]
        return found

    def sweep_holders(self) -> dict[str, str]:
        """Newest accession that holds a sweep and is not withdrawn, by the sweep's address."""
        return {row["address"]: row["accession"] for row in self._mappings(sweep_queries.sweeps())}

    def current_inputs(self) -> list[InputRow]:
        """Return what the current reductions took from outside themselves, by reduction."""
        return [InputRow(**row) for row in self._mappings(act_queries.inputs())]

    def resting_on(self, address: str) -> list[str]:
        """Reductions that took something from a thing or a part of it, or followed it if it is a plan; not those behind."""
        return [row["address"] for row in self._mappings(act_queries.resting_on(address))]

    def life_results(
        self, role: Literal["cell", "substrate"], name: str, results: Sequence[str]
    ) -> list[LifeResult]:
        """Headline results of some names that current reductions found of a cell's or a substrate's sweeps, in order of time."""
        amended = self._is_amended()
        with reading(self._engine, self._url) as connection:
            asked = life_results(role, name, results, amended=amended)
            return list(map(LifeResult._make, connection.execute(asked).all()))

    def uses(self, role: Role, name: str) -> list[Use]:
        """Cooldowns with the revisions of a thing that their sweeps name, in order of time."""
        amended = self._is_amended()
        with reading(self._engine, self._url) as connection:
            return list(map(Use._make, connection.execute(uses(role, name, amended=amended)).all()))

    def resting_reductions(self, address: str, *, most: int) -> list[Resting]:
        """Reductions that took a record, or followed it if it is a plan, up to so many; older and withdrawn ones are marked."""
        with reading(self._engine, self._url) as connection:
            return list(map(Resting._make, connection.execute(resting_reductions(address, most)).all()))

    def flagged(self) -> dict[str, tuple[str, ...]]:
        """Reductions that rest on something withdrawn, each with the addresses of what that is."""
        with reading(self._engine, self._url) as connection:
            return flagged(connection)

    def _is_amended(self) -> bool:
        return bool(self._mappings(sweep_queries.anything_amended()))

    def statistics(self) -> dict[str, int]:
        """Return counts of what the archive holds (sweeps once each), and bytes."""
        return {name: int(value) for name, value in self._mappings(queries.statistics())[0].items()}

    def _mappings(self, query: queries.Query) -> list[dict[str, Any]]:
        with reading(self._engine, self._url) as connection:
            return [_columns(row) for row in connection.execute(query).mappings()]

    def _sweeps(self, query: queries.Query) -> list[SweepRow]:
        with reading(self._engine, self._url) as connection:
            return sweep_rows(connection, query)


def _columns(row: Any) -> dict[str, Any]:
    return {str(name): value for name, value in row.items()}

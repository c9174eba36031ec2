"""The index: what a search needs to know of every sealed file, in relational tables.

Rules
-----
* The index is derivable: `rebuild` from the sealed files gives, row for row, what recording them one by one gave.
* Every write is one transaction; a reader sees one state throughout.
* Nothing in here opens a sealed file; documents come in, plain rows go out.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Iterable, Iterator, Sequence
from contextlib import closing, contextmanager, suppress
from dataclasses import replace
from itertools import zip_longest
from pathlib import Path
from types import TracebackType
from typing import Any, Literal, Self

from sqlalchemy import Connection, Engine, Table
from sqlalchemy.engine import URL

from archive.errors import BadRequest, DamagedFile, MissingFile
from archive.index import act_queries, queries
from archive.index.act_answers import AmendmentRow, InputRow, RevisionRow, WithdrawalRow
from archive.index.acts import ActDocument, add_act
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
    REBUILD,
    WAIT_SECONDS,
    connected,
    engine_of,
    for_reading_only,
    index_name,
    index_url,
    reading,
    sqlite_address,
    translated,
    writing,
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
from archive.index.record import add_accession, add_reduction, clear
from archive.index.revision import make, raise_to_head
from archive.index.sweep_rows import results_of, sweep_rows
from archive.index.tables import Base
from schemas.lineage import AccessionDocument, ReductionDocument

__all__ = ["Document", "Entry", "Index"]

_LARGEST = 2**63 - 1  # the largest integer of SQLite and of a bigint of PostgreSQL

Document = AccessionDocument | ReductionDocument | ActDocument
"""What a sealed file says about itself."""

Entry = tuple[str, str, int, Document]
"""Key, SHA-256, size and document of one sealed file."""


class Index:
    """An open index; made by `create` or `open`, and a context manager that closes it.

    Every method raises `ArchiveBusy` when another process writes for longer than the wait, and `DamagedFile` when the
    database is not one any more.
    """

    def __init__(self, engine: Engine, url: URL) -> None:
        self._engine = engine
        self._url = url

    @classmethod
    def create(cls, url: str, *, wait: float = WAIT_SECONDS) -> Self:
        """Return a new, empty index.

        Parameters
        ----------
        url : str
            `sqlite:///folder/index.sqlite3` (the folder must exist) or `postgresql+psycopg://...`.
        wait : float
            Longest wait for another writer, in seconds.

        Raises
        ------
        BadRequest
            If an index is there already, or the address is none.
        """
        place = index_url(url)
        if place.get_backend_name() == "sqlite":
            folder = Path(str(place.database)).absolute().parent
            if not folder.is_dir():
                raise MissingFile(
                    "the folder for the index is not there", file=str(folder), remedy="make the folder first"
                )
        engine = engine_of(place, read_only=False, new=True, wait=wait)
        with _disposed_on_failure(engine):
            make(engine, place)
        return cls(engine, place)

    @classmethod
    def passing(cls, folder: Path) -> Self:
        """Return a new index that is to be held against another one and then goes with its folder.

        Notes
        -----
        Its tables are made by the models, which the migrations equal and which need no Alembic.
        """
        place = index_url(f"sqlite:///{folder / 'index.sqlite3'}")
        engine = engine_of(place, read_only=False, new=True)
        with _disposed_on_failure(engine), connected(engine, place, writes=True) as connection:
            Base.metadata.create_all(connection, checkfirst=False)
        return cls(engine, place)

    @classmethod
    def open(cls, url: str, *, read_only: bool = False, wait: float = WAIT_SECONDS) -> Self:
        """Return an index that is there; one of an older revision is copied beside (SQLite) and raised.

        Parameters
        ----------
        url : str
            As for `create`.
        read_only : bool
            Open it so that the database itself refuses writes.
        wait : float
            Longest wait for another writer, in seconds.

        Raises
        ------
        MissingFile
            If it is not there.
        DamagedFile
            If its file is no database.
        BadRequest
            If a newer Stillroom wrote it, or it must be raised but is opened for reading only.
        """
        place = index_url(url)
        if place.get_backend_name() == "sqlite" and not (file := Path(index_name(place))).is_file():
            if file.exists():
                raise DamagedFile("the index is not a file", file=str(file), remedy=REBUILD)
            raise MissingFile("the index is not there", file=str(file), remedy=REBUILD)
        engine = engine_of(place, read_only=read_only, wait=wait)
        with _disposed_on_failure(engine):
            raise_to_head(engine, place, read_only=read_only)
        return cls(engine, place)

    @staticmethod
    def set_aside(url: str) -> Path | None:
        """Path to which an SQLite index is moved, so that a new one can be created; None when there is none to move.

        Notes
        -----
        For a damaged index, before `stillroom rebuild-index`; nobody may have it open. Its write-ahead log goes along.
        A PostgreSQL index cannot be set aside from here.
        """
        place = index_url(url)
        if place.get_backend_name() != "sqlite":
            raise BadRequest(
                "an index in PostgreSQL cannot be set aside", remedy="give `index` another database"
            )
        path = Path(str(place.database))
        if not path.exists():
            return None
        number = 1
        while (aside := path.with_name(f"{path.name}.set-aside-{number}")).exists():
            number += 1
        for suffix in ("-wal", "-shm"):
            if (beside := path.with_name(path.name + suffix)).exists():
                beside.rename(path.with_name(aside.name + suffix))
        return path.rename(aside)

    def snapshot(self, path: Path) -> bool:
        """Copy the index into a new file as it is at one moment; False for an index that is no SQLite file.

        Parameters
        ----------
        path : Path
            A name that is free.
        """
        if self._url.get_backend_name() != "sqlite":
            return False
        file = Path(str(self._url.database)).absolute()
        mode = "ro" if for_reading_only(file.parent) else "rw"
        path.touch(mode=0o666)  # SQLite itself would leave the group out, whatever the umask says
        # SQLite's own copy holds what still stands in the write-ahead log; a copy of the file alone would not.
        with (
            translated(self._url),
            closing(sqlite3.connect(sqlite_address(file, mode=mode), uri=True)) as source,
            closing(sqlite3.connect(path)) as target,
        ):
            source.backup(target)
        return True

    def close(self) -> None:
        """Let go of every connection."""
        self._engine.dispose()

    def __enter__(self) -> Self:
        """Return this index."""
        return self

    def __exit__(
        self, kind: type[BaseException] | None, fault: BaseException | None, trace: TracebackType | None
    ) -> None:
        """Close this index."""
        self.close()

    def record_accession(self, document: AccessionDocument, *, key: str, sha256: str, size: int) -> None:
        """Record a sealed accession; nothing changes when the same file is recorded already.

        Parameters
        ----------
        document : AccessionDocument
            What the file says about itself.
        key, sha256 : str
            Its name in the store and its digest.
        size : int
            Its bytes.

        Raises
        ------
        DamagedFile
            If the key is recorded with other bytes, or the document contradicts itself or the index.
        """
        with writing(self._engine, self._url) as connection:
            add_accession(connection, document, key=key, sha256=sha256, size=size)

    def record_reduction(self, document: ReductionDocument, *, key: str, sha256: str, size: int) -> None:
        """Record a sealed reduction; as `record_accession`."""
        with writing(self._engine, self._url) as connection:
            add_reduction(connection, document, key=key, sha256=sha256, size=size)

    def record_act(self, document: ActDocument, *, key: str, sha256: str, size: int) -> None:
        """Record a sealed revision, amendment or withdrawal; as `record_accession`."""
        with writing(self._engine, self._url) as connection:
            add_act(connection, document, key=key, sha256=sha256, size=size)

    def record(self, document: Document, *, key: str, sha256: str, size: int) -> None:
        """Record a sealed file of any kind; as `record_accession`."""
        if isinstance(document, AccessionDocument):
            self.record_accession(document, key=key, sha256=sha256, size=size)
        elif isinstance(document, ReductionDocument):
            self.record_reduction(document, key=key, sha256=sha256, size=size)
        else:
            self.record_act(document, key=key, sha256=sha256, size=size)

    def rebuild(self, entries: Iterable[Entry]) -> None:
        """Make all rows anew; when anything fails, also in `entries`, the old rows stay.

        Parameters
        ----------
        entries : iterable of (key, sha256, size, document)
            Every sealed file, in any order; they are taken one at a time.
        """
        with writing(self._engine, self._url) as connection:
            clear(connection)
            _add_all(connection, entries)

    def rehearse(self, entries: Iterable[Entry]) -> None:
        """Raise what recording sealed files would raise, and keep nothing of it.

        Parameters
        ----------
        entries : iterable of (key, sha256, size, document)
            In the order of recording.
        """
        with suppress(_RehearsedError), writing(self._engine, self._url) as connection:
            _add_all(connection, entries)
            raise _RehearsedError

    def rows(self) -> dict[str, list[tuple[Any, ...]]]:
        """Every row of every table, by key: equal indexes give equal rows, whatever the engine."""
        with reading(self._engine, self._url) as connection:
            return {
                name: [tuple(row) for row in connection.execute(queries.all_rows(table))]
                for name, table in sorted(Base.metadata.tables.items())
            }

    def faults(self) -> list[str]:
        """What the database itself finds wrong with its pages and its search trees; PostgreSQL has no such check."""
        if self._url.get_backend_name() != "sqlite":
            return []
        with reading(self._engine, self._url) as connection:
            said = [str(row[0]) for row in connection.exec_driver_sql("PRAGMA integrity_check(20)")]
        return [] if said == ["ok"] else said

    def disagreements(self, other: Index) -> list[str]:
        """What another index has otherwise, one sentence for each table that differs; rows are read one by one.

        Raises
        ------
        DamagedFile
            If a row of either cannot be read.
        """
        found = []
        with reading(self._engine, self._url) as one, reading(other._engine, other._url) as two:
            for name, table in sorted(Base.metadata.tables.items()):
                query = queries.all_rows(table)
                pairs = zip_longest(
                    map(tuple, one.execution_options(yield_per=1000).execute(query)),
                    map(tuple, two.execution_options(yield_per=1000).execute(query)),
                )
                first = next(((mine, its) for mine, its in pairs if mine != its), None)
                if first is not None:
                    found.append(f"table {name}: {_unequal(table, *first)}")
        return found

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
        if query.sort not in queries.SORTS:
            raise BadRequest(
                "sweeps cannot be sorted so",
                field="sort",
                found=str(query.sort),
                expected=", ".join(queries.SORTS),
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
            amended = connection.execute(queries.anything_amended()).first() is not None
            if connection.execute(queries.anything_withdrawn()).first() is None:
                # Not to be asked of each sweep anew.
                query = replace(query, withdrawn=True)
            if not amended and queries.walks(query) and connection.execute(queries.many(query)).first():
                found = sweep_rows(connection, queries.walked(query, last=last))
                # Fewer may be the end of the list, or those without a date are still to come.
                if len(found) == query.limit:
                    return found
            return sweep_rows(connection, queries.search(query, amended=amended, last=last))

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
        asked = queries.sweeps(cooldown=cooldown, amended=self._is_amended(), withdrawn_too=withdrawn)
        return self._sweeps(asked)

    def sweeps_of_accession(self, accession: str) -> list[SweepRow]:
        """Sweeps by name as one accession holds them, older versions too."""
        return self._sweeps(queries.sweeps(accession=accession))

    def sweep(self, address: str) -> SweepRow | None:
        """Return the newest version of a sweep; None when the index has none."""
        asked = queries.sweeps(address=address, amended=self._is_amended(), withdrawn_too=True)
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
        return {row["address"]: row["accession"] for row in self._mappings(queries.sweeps())}

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
        return bool(self._mappings(queries.anything_amended()))

    def statistics(self) -> dict[str, int]:
        """Return counts of what the archive holds (sweeps once each), and bytes."""
        return {name: int(value) for name, value in self._mappings(queries.statistics())[0].items()}

    def _mappings(self, query: queries.Query) -> list[dict[str, Any]]:
        with reading(self._engine, self._url) as connection:
            return [_columns(row) for row in connection.execute(query).mappings()]

    def _sweeps(self, query: queries.Query) -> list[SweepRow]:
        with reading(self._engine, self._url) as connection:
            return sweep_rows(connection, query)


class _RehearsedError(Exception):
    """Ends the transaction of a rehearsal, so that nothing of it is kept."""


def _add_all(connection: Connection, entries: Iterable[Entry]) -> None:
    for key, sha256, size, document in entries:
        if isinstance(document, AccessionDocument):
            add_accession(connection, document, key=key, sha256=sha256, size=size)
        elif isinstance(document, ReductionDocument):
            add_reduction(connection, document, key=key, sha256=sha256, size=size)
        else:
            add_act(connection, document, key=key, sha256=sha256, size=size)


def _unequal(table: Table, mine: tuple[Any, ...] | None, its: tuple[Any, ...] | None) -> str:
    """What the first two unequal rows of a table tell."""
    row = mine if its is None else its
    key = (
        ", ".join(str(row[table.columns.keys().index(column.name)]) for column in table.primary_key)
        if row
        else ""
    )
    if mine is None or its is None:
        return f"the row of {key} is {'missing' if mine is None else 'one too many'}"
    columns = [name for name, a, b in zip(table.columns.keys(), mine, its, strict=True) if a != b]
    return f"the row of {key} differs in {', '.join(columns)}"


@contextmanager
def _disposed_on_failure(engine: Engine) -> Iterator[None]:
    try:
        yield
    except BaseException:
        engine.dispose()
        raise


def _columns(row: Any) -> dict[str, Any]:
    return {str(name): value for name, value in row.items()}

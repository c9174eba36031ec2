"""Packages that leave an archive and come into one, and the provenance of one address.

The exchange is imported where it is used: a search has no need of it.
"""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from datetime import datetime
from functools import lru_cache
from pathlib import Path
from typing import TYPE_CHECKING, Literal

from archive.errors import ArchiveError, BadRequest, DamagedFile, UnknownAddress
from archive.index import Document
from archive.lab import reporting
from archive.lab.reducing import plans
from archive.lab.source import LabSource, document_of, key_of
from archive.store.adopting import Adoption, adoption
from archive.store.interface import SealedFile
from archive.store.local import LocalStore
from schemas.address import parse_address
from schemas.base import Record
from schemas.deposit import Deposit
from schemas.finding import Finding

if TYPE_CHECKING:
    from archive.exchange.bag_reading import Bag
    from archive.exchange.contents import PackageDocument, PackedFile
    from archive.exchange.sealed_document import SealedDocument

__all__ = ["ExportOutcome", "ImportOutcome", "Provenance", "export", "provenance", "taken_in"]

Count = Callable[[int, int, str], None]
_KEPT = 512
"""Documents kept in memory; each is some hundred kilobytes, and an archive may hold many."""


@dataclass(frozen=True)
class Provenance:
    """Provenance of an address: the text, and where the recorded times or names contradict each other."""

    text: str
    contradictions: tuple[str, ...] = ()


@dataclass(frozen=True)
class ExportOutcome:
    """A package that was written.

    Attributes
    ----------
    path : Path
        The bag.
    asked : tuple of str
        Addresses asked for; none for a whole archive.
    files : dict of str to str
        Address of each sealed file in it: why it is there.
    size, number : int
        Bytes and files of the payload.
    missing : tuple of str
        What is not stated and therefore not in it, each with the place where it can be stated.
    sha256 : str
        Digest of its `manifest-sha256.txt`, which holds that of every file of the payload; the journal keeps it.
    swept : tuple of str
        What an export that was stopped had left beside it and was removed, as sentences.
    """

    path: Path
    asked: tuple[str, ...]
    files: dict[str, str]
    size: int
    number: int
    missing: tuple[str, ...] = ()
    sha256: str = ""
    swept: tuple[str, ...] = ()

    @property
    def also(self) -> dict[str, str]:
        """Files that nobody asked for, and what rests on each."""
        from archive.exchange.closure import ASKED

        return {address: because for address, because in self.files.items() if because != ASKED}


@dataclass(frozen=True)
class ImportOutcome:
    """What an import did: `imported`, `already`, `refused`, or `would-import` when nothing was to be written.

    Attributes
    ----------
    taken : tuple of str
        Addresses that were, or would be, taken in.
    held : tuple of str
        Addresses that the archive held already, byte for byte.
    findings : tuple of Finding
        Why the package was refused; nothing of it was stored then.
    damaged : bool
        Whether bytes are not what they were, rather than that the package is none.
    """

    state: Literal["imported", "already", "refused", "would-import"]
    taken: tuple[str, ...] = ()
    held: tuple[str, ...] = ()
    findings: tuple[Finding, ...] = ()
    damaged: bool = False


def _reader(source: LabSource) -> Callable[[str], Record]:
    """Document of a key, of which the last ones read are kept."""

    @lru_cache(maxsize=_KEPT)
    def read(key: str) -> Record:
        return document_of(key, source.store.document(key))

    return read


def _sealed(source: LabSource, asked: Sequence[str], *, whole: bool) -> list[SealedDocument]:
    from archive.exchange.closure import ASKED, Holdings, behind, closure
    from archive.exchange.sealed_document import SealedDocument

    recorded = source.index.sealed_files()
    read = _reader(source)
    holdings = Holdings(recorded.keys(), read)
    chosen = behind(dict.fromkeys(sorted(recorded), ASKED), holdings) if whole else closure(asked, holdings)
    return [SealedDocument(key, *recorded[key], read, because) for key, because in chosen.items()]


# Provenance -----------------------------------------------------------------------------------------------------------


def provenance(source: LabSource, address: str, *, notation: str) -> Provenance:
    """Provenance of a cooldown, or of what lies behind a sweep, reduction or result; see `Archive.provenance`."""
    from archive.exchange.prov_checks import violations
    from archive.exchange.prov_lineage import Lineage
    from archive.exchange.prov_notations import prov_json, prov_n
    from archive.exchange.prov_selection import lying_behind

    if notation not in ("json", "provn"):
        raise BadRequest("provenance is written as json or provn", found=notation)
    sealed = _sealed(source, [address], whole=False)
    lineage = Lineage(sealed)
    document = lineage.document
    if parse_address(address).kind != "name":
        identifier = lineage.identifier(address)
        if identifier is None:
            raise UnknownAddress(
                f"there is nothing at {address} in this archive",
                remedy=f"look with: stillroom show {address}",
            )
        document = lying_behind(document, identifier)
    text = prov_json(document) if notation == "json" else prov_n(document)
    return Provenance(text, tuple(violations(document)))


# Leaving --------------------------------------------------------------------------------------------------------------


def export(
    source: LabSource,
    store: LocalStore,
    asked: Sequence[str],
    target: Path,
    *,
    deposit: Deposit,
    archive_name: str,
    software: str,
    now: datetime,
    reports: bool,
    appendix: bool,
    progress: Count,
) -> ExportOutcome:
    """Package of some addresses, or of all when none is named; see `Archive.export`."""
    from archive.exchange.bag_reading import blocks_of
    from archive.exchange.packing import Origin, packed

    sealed = _sealed(source, asked, whole=not asked)
    if not sealed:
        raise BadRequest("this archive is empty; there is nothing to export")
    about, size, number, swept = packed(
        target,
        asked,
        sealed,
        deposit=deposit,
        origin=Origin(archive_name, software, now),
        blocks=lambda key: blocks_of(store.path(key)),
        text=store.document,
        raw=store.raw,
        reports=_reports(source, archive_name, asked, sealed, reports=reports, appendix=appendix),
        progress=progress,
    )
    files = {each.address: each.because for each in sealed}
    sha256 = hashlib.sha256((target / "manifest-sha256.txt").read_bytes()).hexdigest()
    return ExportOutcome(target, tuple(asked), files, size, number, about.missing, sha256, swept)


def _reports(
    source: LabSource,
    archive_name: str,
    asked: Sequence[str],
    sealed: Sequence[SealedDocument],
    *,
    reports: bool,
    appendix: bool,
) -> dict[str, bytes]:
    """Run sheets of the cooldowns that are in the package whole, told from what it holds alone; the appendix if asked for."""
    from archive.exchange.closure import ASKED
    from archive.reports import run_sheet_html, run_sheet_json, run_sheet_pdf

    found: dict[str, bytes] = {}
    keys = {each.key for each in sealed}
    cooldowns = sorted({each.key.partition("/")[0] for each in sealed if each.because == ASKED})
    for cooldown in cooldowns if reports else ():
        if (asked and cooldown not in asked) or not source.accessions(cooldown):
            continue
        seen = reporting.view(source, archive_name, cooldown)
        within = replace(
            seen,
            sealed={key: held for key, held in seen.sealed.items() if key in keys},
            reductions=tuple(each for each in seen.reductions if each.address in keys),
        )
        name = f"run-sheet-{cooldown}"
        found |= {
            f"{name}.html": run_sheet_html(within).encode(),
            f"{name}.pdf": run_sheet_pdf(within),
            f"{name}.json": run_sheet_json(within).encode(),
        }
    if appendix:
        reduced = {key.partition("/")[0] for key in keys if "@" in key}
        named = asked or [cooldown for cooldown in cooldowns if cooldown in reduced]
        files = reporting.appendix(source, archive_name, named, title=None, level="section") if named else {}
        found |= {f"appendix/{name}": content for name, content in files.items()}
    return found


# Coming in ------------------------------------------------------------------------------------------------------------


def taken_in(
    source: LabSource,
    store: LocalStore,
    folder: Path,
    *,
    record: Callable[[SealedFile], None],
    dry: bool,
    progress: Count,
) -> ImportOutcome:
    """Package taken into the archive, all of it or nothing; the archive's lock is held; see `Archive.import_package`.

    Parameters
    ----------
    record : callable
        Records a sealed file in the index.
    dry : bool
        Find out everything and write nothing.
    """
    from archive.exchange.bag_reading import read_bag
    from archive.exchange.unpacking import account

    progress(0, 1, "reading the package")
    bag = read_bag(folder)
    package = None
    if not bag.findings:
        try:
            package = account(bag)
        except DamagedFile as problem:
            bag.findings.append(_finding("package-account", problem))
    if package is None:
        return _refused(bag.findings)
    fresh, held = _against(source, bag, package)
    if bag.findings:
        return _refused(bag.findings)
    if not fresh:
        return ImportOutcome("already", held=tuple(held))
    with adoption(store) as adopted:
        findings = _adopted(source, bag, fresh, adopted, progress)
        if findings:
            return _refused(findings)
        taken = tuple(each.address for each in fresh)
        if dry:
            return ImportOutcome("would-import", taken, tuple(held))
        progress(len(fresh), len(fresh), "sealing")
        for sealed in adopted.seal():
            record(sealed)
    return ImportOutcome("imported", taken, tuple(held))


def _refused(findings: Sequence[Finding]) -> ImportOutcome:
    from archive.exchange.bag_reading import DAMAGE_CODES

    ordered = tuple(sorted(findings, key=lambda finding: finding.order))
    return ImportOutcome(
        "refused", findings=ordered, damaged=any(each.code in DAMAGE_CODES for each in ordered)
    )


def _finding(code: str, problem: ArchiveError, file: str | None = None) -> Finding:
    return Finding(
        code=code, severity="error", what=problem.what, file=file or problem.file, field=problem.field,
        expected=problem.expected, found=problem.found, remedy=problem.remedy,
    )  # fmt: skip


def _against(source: LabSource, bag: Bag, package: PackageDocument) -> tuple[list[PackedFile], list[str]]:
    """Files that the archive has not, and addresses that it has; a name taken by other bytes is a finding."""
    recorded = source.index.sealed_files()
    folded = {key.casefold(): key for key in recorded}
    fresh: list[PackedFile] = []
    held: list[str] = []
    for each in package.files:
        near = folded.get(each.key.casefold())
        if near is None and not source.store.contains(each.key):
            fresh.append(each)
        elif near == each.key and recorded[near] == (each.sha256, each.size):
            held.append(each.address)
        else:
            bag.blame(
                "package-conflict", "the archive holds another file under this name", f"data/{each.path}", place=each.address,
                expected=f"sha256 {recorded[near][0]}" if near is not None else "a file that is recorded in the index",
                found=f"sha256 {each.sha256}",
                remedy="neither is overwritten: find out which of both is the laboratory's own; keep the package beside the archive",
            )  # fmt: skip
    return fresh, held


def _adopted(
    source: LabSource, bag: Bag, fresh: Sequence[PackedFile], adopted: Adoption, progress: Count
) -> list[Finding]:
    """Everything wrong with the files in staging."""
    from archive.exchange.bag_reading import blocks_of
    from archive.exchange.closure import Holdings
    from archive.exchange.meanings import content_faults, plan_faults, record_faults
    from archive.exchange.unpacking import document_faults, unmet_needs

    findings: list[Finding] = []
    for done, each in enumerate(fresh):
        progress(done, len(fresh), each.key)
        try:
            adopted.take(
                SealedFile(each.key, each.sha256, each.size), blocks_of(bag.folder / "data" / each.path)
            )
        except DamagedFile as problem:
            findings.append(_finding("bag-file-damaged", problem, f"data/{each.path}"))
    progress(len(fresh), len(fresh), "checking every sealed file")
    paths = {each.key: f"data/{each.path}" for each in fresh}
    findings += [
        Finding(
            code="bag-file-damaged", severity="error", what=damage.what, file=paths[damage.key], field=damage.dataset,
            expected=damage.expected, found=damage.found,
        )
        for damage in adopted.damage()
    ]  # fmt: skip
    if findings:
        return findings
    documents: dict[str, Document] = {}
    for key in paths:
        try:
            documents[key] = document_of(key, adopted.document(key))
        except DamagedFile as problem:
            findings.append(_finding("package-document", problem, paths[key]))
            continue
        findings += document_faults(key, documents[key], adopted.digests(key))
        findings += _misplaced(key, documents[key], paths[key])
    # Digests under which records were sealed here; not made anew, since a later version may know more fields.
    sealed = {row.address: row.digest for row in source.index.records()}
    findings += content_faults(documents)
    if not findings:
        findings += record_faults(documents, sealed.get)
        known = [*plans(source), *source.own_plans(withdrawn_too=True)]
        findings += plan_faults(documents, {plan.address: plan for plan in known})
    if not findings:
        read = _reader(source)
        together = Holdings(
            {*source.index.sealed_files(), *documents},
            lambda key: documents[key] if key in documents else read(key),
        )
        findings += unmet_needs(documents, together)
    return findings or _rehearsed(source, fresh, documents)


def _misplaced(key: str, document: Document, file: str) -> list[Finding]:
    try:
        if key_of(document.address) == key:
            return []
    except ValueError:
        pass
    return [
        Finding(
            code="package-document", severity="error", what="a file of this name holds another document", file=file,
            found=document.address,
        )
    ]  # fmt: skip


def _rehearsed(
    source: LabSource, fresh: Sequence[PackedFile], documents: dict[str, Document]
) -> list[Finding]:
    """What the index would say against the documents; better asked before anything is sealed."""
    try:
        source.index.rehearse((each.key, each.sha256, each.size, documents[each.key]) for each in fresh)
    except DamagedFile as problem:
        return [_finding("package-document", problem)]
    return []

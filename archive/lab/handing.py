"""What leaves an archive and what keeps it: reports, packages, fixity, mirror, mending, the journal."""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from contextlib import suppress
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING

from archive.errors import ArchiveBusy, BadRequest
from archive.intake.settings import read_settings
from archive.lab.journaling import Acts
from archive.lab.opened import Opened, now
from archive.lab.place import find_root
from archive.store.durable import archive_lock
from archive.store.interface import SealedFile
from archive.store.local import open_store

if TYPE_CHECKING:
    from archive.lab import exchanging
    from archive.lab.keeping import MirrorOutcome
    from archive.store.interface import Damage
    from archive.store.journal import Entry
    from archive.store.mend import Mended

__all__ = ["Handing"]


def _uncounted(done: int, of: int, what: str) -> None:
    """Say nothing."""


class Handing(Opened):
    """Reports, packages, provenance; fixity, mend, mirror, rebuild."""

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
        acts = Acts(root, now)
        acts.done("rebuild-index", settings.name)
        with archive_lock(root):
            acts.enter()
        return counts

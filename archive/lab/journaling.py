"""What is entered in the journal of an archive, and when.

An act is entered when its sealed file is in the index; what an interruption kept from being entered is entered at the next
opening, from the sealed files themselves, and says so.
"""

from __future__ import annotations

import hashlib
import os
from collections.abc import Callable, Iterable, Iterator, Mapping
from contextlib import contextmanager
from datetime import datetime
from pathlib import Path
from typing import Any

from archive.errors import BadRequest
from archive.intake.settings import SETTINGS_NAME, settings_without_index
from archive.reduction.software import software
from archive.store.interface import Damage, SealedFile
from archive.store.journal import Act, Journal

__all__ = ["AFTERWARDS", "UNKNOWN_ROLE", "Acts", "acting_role"]

UNKNOWN_ROLE = "role not stated"
AFTERWARDS = "entered afterwards, from the sealed file"

_ACTS = {
    "stillroom-reduction/1": "reduce",
    "stillroom-revision/1": "revise",
    "stillroom-amendment/1": "amend",
    "stillroom-withdrawal/1": "withdraw",
}


def acting_role() -> str | None:
    """Role of whom is at work, from `STILLROOM_ROLE`; None if it is not set."""
    return os.environ.get("STILLROOM_ROLE", "").strip()[:200] or None


class Acts:
    """The acts of one archive: gathered while it is written to, and entered together.

    Parameters
    ----------
    root : Path
        Folder of the archive.
    clock : callable
    """

    def __init__(self, root: Path, clock: Callable[[], datetime]) -> None:
        self.journal = Journal(root)
        self._settings = root / SETTINGS_NAME
        self._clock = clock
        self._gathered: list[Act] = []
        self._as: str | None = None

    def sealed(self, document: Any, sealed: SealedFile, *, note: str | None = None) -> None:
        """Gather the act that a sealed file stands for."""
        self._gathered.append(_act_of(document, sealed, self._as, note))

    def done(
        self,
        act: str,
        what: str,
        *,
        by: str | None = None,
        sha256: str | None = None,
        note: str | None = None,
    ) -> None:
        """Gather an act that seals nothing, such as `mend`, or `export` with the digest of what was given away."""
        self._gathered.append(Act(act, what, by or acting_role() or UNKNOWN_ROLE, sha256=sha256, note=note))

    @contextmanager
    def entered_as(self, act: str) -> Iterator[None]:
        """Enter what is sealed meanwhile as one act, such as `import`."""
        self._as = act
        try:
            yield
        finally:
            self._as = None

    def enter(self) -> None:
        """Enter what was gathered.

        Raises
        ------
        BadRequest
            If the journal cannot be written; what was done is done, and is entered at the next opening.
        """
        gathered, self._gathered = self._gathered, []
        try:
            self.journal.append(
                gathered, at=self._clock(), stillroom=software().stillroom, settings=self._settings_digest()
            )
        except OSError as error:
            raise BadRequest(
                f"the journal cannot be written: {error.strerror}",
                file=str(self.journal.path),
                remedy="free space, or correct the permissions; what was sealed is sealed, and the next opening enters it",
            ) from error

    def damage(self, recorded: Mapping[str, str]) -> list[Damage]:
        """Return what is wrong with the journal, and whether the settings are those of the last act."""
        last = self.journal.last()
        found = self.journal.damage(recorded)
        if last is not None and last.settings not in (None, self._settings_digest()):
            found.append(
                Damage(
                    SETTINGS_NAME, "stray", "the settings are not those of the last act; if nobody changed them, compare them with a copy",
                    expected=last.settings, found=self._settings_digest(),
                )
            )  # fmt: skip
        return found

    def _settings_digest(self) -> str | None:
        if not self._settings.is_file():
            return None
        return hashlib.sha256(settings_without_index(self._settings.parent)).hexdigest()

    def behind(self, count: int) -> bool:
        """Whether the journal tells of fewer sealed files than there are."""
        last = self.journal.last()
        return (0 if last is None else last.sealed) < count

    def caught_up(
        self, sealed: Mapping[str, SealedFile], document: Callable[[str], Any], order: Iterable[str]
    ) -> int:
        """Gather and enter what is sealed and not entered yet; return how many acts that were."""
        known = self.journal.entered_keys()
        missing = [key for key in order if key in sealed and key not in known]
        for key in missing:
            self.sealed(document(key), sealed[key], note=AFTERWARDS)
        self.enter()
        return len(missing)


def _act_of(document: Any, sealed: SealedFile, act: str | None, note: str | None) -> Act:
    told = act or _ACTS.get(document.format)
    if told is None:
        told = "ingest" if getattr(document, "number", 1) == 1 else "supplement"
    # Whoever imports a file need not be one of those whom its document names.
    named = None if act is not None else getattr(document, "by", None) or _operators(document)
    by = acting_role() or named or UNKNOWN_ROLE
    return Act(told, document.address, by, sealed.key, sealed.sha256, note)


def _operators(document: Any) -> str | None:
    """Who ran the cooldown, by role; whoever ingests it without saying more is taken to be one of them."""
    sheet = getattr(document, "sheet", None)
    return None if sheet is None else ", ".join(sheet.operators)

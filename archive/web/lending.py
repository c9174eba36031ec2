"""Open archives, lent to one worker at a time.

Rules
-----
* An archive is opened for reading only, and never used by two threads at once.
* What an archive remembers of the files it read grows; after a number of loans it is closed and opened anew.
"""

from __future__ import annotations

from pathlib import Path
from threading import Lock

from archive.lab import Archive

__all__ = ["Lending"]

_MOST_LOANS = 500


class Lending:
    """Open archives of one folder; `take` and `give_back` may be called from any thread."""

    def __init__(self, root: Path) -> None:
        self.root = root
        self._lock = Lock()
        self._idle: list[tuple[Archive, int]] = []
        self._loans: dict[int, int] = {}

    def take(self) -> Archive:
        """Return an archive that nobody else has.

        Raises
        ------
        ArchiveError
            If it cannot be opened.
        """
        with self._lock:
            lab, loans = self._idle.pop() if self._idle else (None, 0)
        lab = Archive.open(self.root, read_only=True) if lab is None else lab
        with self._lock:
            self._loans[id(lab)] = loans + 1
        return lab

    def give_back(self, lab: Archive, *, sound: bool = True) -> None:
        """Take an archive back; one that met a fault, or has been lent often, is closed."""
        with self._lock:
            loans = self._loans.pop(id(lab))
            keep = sound and loans < _MOST_LOANS
            if keep:
                self._idle.append((lab, loans))
        if not keep:
            lab.close()

    def close(self) -> None:
        """Close what is not lent."""
        with self._lock:
            idle, self._idle = self._idle, []
        for lab, _ in idle:
            lab.close()

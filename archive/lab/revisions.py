"""Which revision of a record holds in a cooldown, and why.

Rules, in this order:

1. The sheet names a revision, or an amendment names another one in its place.
2. A revision that says it supersedes that one holds in its place, and so on along the line.
3. A newer revision that a reduction of the cooldown took when it was renewed stays in force for the cooldown.
4. When the newest is asked for (`reduce --stale`), the newest revision that can hold for the cooldown does: one whose first
   day of validity is not after the cooldown's end. A revision that came in with the sheet of another cooldown and names no
   first day holds from that cooldown's begin on; one that supersedes another holds in the place of that one alone.

A withdrawn revision takes nobody's place.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import date

from archive.index import RecordRow
from archive.lab.source import LabSource
from schemas.acts import RevisionDocument

__all__ = ["Holding", "Revisions"]


@dataclass(frozen=True)
class Holding:
    """The revision that holds, and why it is not the one named; no reason when it is."""

    address: str
    because: str | None = None


class Revisions:
    """The revisions of one archive at one moment.

    Parameters
    ----------
    source : LabSource
    newest : bool
        Whether the newest revision is asked for.
    pinned : mapping, optional
        Revisions that a recorded reduction took in the place of others, by name; nothing else then counts.
    extra : RevisionDocument, optional
        A revision that is not sealed yet, to see what it would do.
    """

    def __init__(
        self,
        source: LabSource,
        *,
        newest: bool = False,
        pinned: Mapping[str, Holding] | None = None,
        extra: RevisionDocument | None = None,
    ) -> None:
        self._newest, self._pinned = newest, pinned
        self.withdrawn = {row.target: row.sentence() for row in source.index.withdrawals()}
        self._superseding: dict[str, tuple[str, str]] = {}
        self._by_name: dict[str, list[RecordRow]] = {}
        if pinned is not None:
            return
        for row in source.index.revisions():
            if row.counts and row.supersedes is not None:
                self._superseding[row.supersedes] = (row.address, row.because)
        self._carried = source.index.replaced_records()
        for record in source.index.records():
            self._by_name.setdefault(record.name, []).append(record)
        if extra is not None:
            self._add(extra)
        self._times = {row.name: (row.begin, row.end) for row in source.index.cooldowns()}

    def holding(self, cooldown: str, address: str) -> Holding:
        """Revision that holds in a cooldown where a sheet or an amendment names `address`."""
        if self._pinned is not None:
            return self._pinned.get(address.partition(".r")[0], Holding(address))
        found = self._superseded(address)
        if self._newest:
            return self._newer(cooldown, found)
        return self._kept(cooldown, address, found)

    def _add(self, extra: RevisionDocument) -> None:
        name, _, number = extra.address.partition(".r")
        if extra.supersedes is not None:
            self._superseding[extra.supersedes] = (extra.address, extra.because)
        if extra.kind != "plan":
            row = RecordRow(
                name, int(number), extra.kind, extra.address, extra.digest, dict(extra.content), None
            )
            self._by_name.setdefault(name, []).append(row)

    def _superseded(self, address: str) -> Holding:
        found, seen = Holding(address), {address}
        while found.address in self._superseding:
            new, because = self._superseding[found.address]
            if new in seen:
                break
            seen.add(new)
            found = Holding(new, f"{new} supersedes {found.address}: {because}")
        return found

    def _newer(self, cooldown: str, found: Holding) -> Holding:
        name, _, number = found.address.partition(".r")
        replacing = {new for new, _ in self._superseding.values()}
        able = [
            row
            for row in self._by_name.get(name, ())
            if row.revision > int(number or 0)
            and row.address not in self.withdrawn
            and row.address not in replacing
            and self.can_hold(row, cooldown)
        ]
        if not able:
            return found
        best = max(able, key=lambda row: row.revision)
        return Holding(best.address, f"{best.address} is the newest revision that holds for {cooldown}")

    def _kept(self, cooldown: str, address: str, found: Holding) -> Holding:
        taken, reduction = self._carried.get((cooldown, address), ("", ""))
        same = taken.partition(".r")[0] == found.address.partition(".r")[0]
        if same and taken not in self.withdrawn and _number(taken) > _number(found.address):
            return Holding(taken, f"{taken} has been taken since {reduction}")
        return found

    def can_hold(self, row: RecordRow, cooldown: str) -> bool:
        """Whether a revision's first day of validity is not after a cooldown's end; what is not dated is not excluded."""
        begin, end = self._times.get(cooldown, (None, None))
        first, last = self._first_day(row, cooldown), end or begin
        return first is None or last is None or first <= last.date()

    def _first_day(self, row: RecordRow, cooldown: str) -> date | None:
        stated = row.content.get("valid_from")
        if stated is not None:
            return date.fromisoformat(stated)
        came_with = (row.accession or "").rpartition(".a")[0]
        if came_with in ("", cooldown):
            return None
        begin = self._times.get(came_with, (None, None))[0]
        return None if begin is None else begin.date()


def _number(address: str) -> int:
    return int(address.partition(".r")[2] or 0)

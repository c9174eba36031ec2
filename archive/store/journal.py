"""The journal of an archive: one line for each act, each line holding the digest of the line before it.

Rules
-----
* Lines are only ever appended, under the archive's lock, and synced before the act is reported.
* A line is JSON with sorted keys; its digest is the SHA-256 of its bytes without the line end. `own` in it is the digest of
  the same line without `own`, so that a flipped bit in the last line is seen too.
* What an interruption left of a line is taken off by the next writer, whose line holds the digest of what it took off.
* The journal tells; it decides nothing. What an archive holds is what its sealed files say.
"""

from __future__ import annotations

import contextlib
import hashlib
import json
import os
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path
from typing import Any, BinaryIO

from archive.errors import DamagedFile
from archive.store.durable import append_lines
from archive.store.interface import Damage

__all__ = ["BEGINNING", "JOURNAL_NAME", "Act", "Entry", "Journal"]

JOURNAL_NAME = "journal.jsonl"
BEGINNING = "0" * 64
"""What stands in the first line in place of the digest of the line before it."""

_TAIL = 1 << 16
_LONGEST = 1 << 20


@dataclass(frozen=True)
class Act:
    """One act, as it is to be entered.

    Parameters
    ----------
    act : str
        What was done, one word such as ``ingest``.
    what : str
        The address or place it was done to.
    by : str
        The role of whom.
    key, sha256 : str, optional
        The sealed file that came of it, with its digest; of what left the archive, the digest of its list of files alone.
    note : str, optional
        What else there is to say.
    """

    act: str
    what: str
    by: str
    key: str | None = None
    sha256: str | None = None
    note: str | None = None


@dataclass(frozen=True)
class Entry:
    """One line of the journal, as it stands there.

    Parameters
    ----------
    number : int
        From 1.
    at : str
        When, RFC 3339.
    act : Act
    stillroom : str
        Version that did it.
    before : str
        Digest of the line before.
    sealed : int
        How many sealed files have been entered, this one included.
    digest : str
        Digest of this line.
    settings : str or None
        Digest of the settings then.
    """

    number: int
    at: str
    act: Act
    stillroom: str
    before: str
    sealed: int
    digest: str
    settings: str | None = None


class Journal:
    """The journal beside an archive.

    Parameters
    ----------
    root : Path
        Folder of the archive.
    """

    def __init__(self, root: Path) -> None:
        self.path = root / JOURNAL_NAME

    def last(self) -> Entry | None:
        """Return the last whole line; None where there is none.

        Notes
        -----
        Reads only the end of the file, so that it may be asked at every opening.
        """
        return next((entry for line in reversed(self._end()[0]) if (entry := _read(line)) is not None), None)

    def entries(self) -> Iterator[Entry]:
        """Yield the entries in order; lines that are none are passed over (`damage` names them)."""
        for line in self._lines():
            entry = _read(line)
            if entry is not None:
                yield entry

    def append(
        self, acts: Sequence[Act], *, at: datetime, stillroom: str, settings: str | None = None
    ) -> None:
        """Enter acts at the end and bring them to the disk; the caller holds the archive's lock.

        Parameters
        ----------
        acts : sequence of Act
        at : datetime
        stillroom : str
            Version that did them.
        settings : str, optional
            Digest of the archive's settings then.

        Raises
        ------
        OSError
            If they cannot be written; then at most a part of a line is left, which the next writer takes off.
        """
        if not acts:
            return
        whole, torn = self._end()
        last = next((entry for line in reversed(whole) if (entry := _read(line)) is not None), None)
        number, sealed = (0, 0) if last is None else (last.number, last.sealed)
        before = _digest(whole[-1]) if whole else BEGINNING
        lines: list[bytes] = []
        for act in acts:
            number += 1
            sealed += act.key is not None
            content: dict[str, Any] = {
                "n": number, "at": at.isoformat(), "act": act.act, "what": act.what, "by": act.by,
                "stillroom": stillroom, "before": before, "sealed": sealed,
                **({} if settings is None else {"settings": settings}),
                **{name: value for name in ("key", "sha256", "note") if (value := getattr(act, name)) is not None},
            }  # fmt: skip
            if torn and not lines:
                content["torn"] = _digest(torn)
            line = _line({**content, "own": _digest(_line(content))})
            before = _digest(line)
            lines.append(line + b"\n")
        append_lines(self.path, b"".join(lines), cut=len(torn))

    def damage(self, recorded: Mapping[str, str]) -> list[Damage]:
        """Return what is wrong with the chain, and where it and the recorded sealed files tell different things.

        Parameters
        ----------
        recorded : mapping of str to str
            Digest of each sealed file that the index records, by key.
        """
        found: list[Damage] = []
        before, number, sealed = BEGINNING, 0, 0
        entered: dict[str, str] = {}
        spoilt: list[int] = []
        for place, line in enumerate(self._lines(), 1):
            entry = _read(line)
            if entry is None:
                spoilt.append(place)
            else:
                sealed += entry.act.key is not None
                if entry.before != before:
                    found.append(
                        _damaged(
                            f"line {place} does not hold the digest of the line before it: that line, or lines before this one, "
                            "were changed or taken out",
                            expected=before, found=entry.before,
                        )
                    )  # fmt: skip
                elif (entry.number, entry.sealed) != (number + 1, sealed):
                    found.append(_damaged(f"line {place} does not count on from the line before it"))
                number, sealed = entry.number, entry.sealed
                if entry.act.key is not None and entry.act.sha256 is not None:
                    entered[entry.act.key] = entry.act.sha256
            before = _digest(line)
        if spoilt:
            where = (
                f"line {spoilt[0]} is"
                if len(spoilt) == 1
                else f"{len(spoilt)} lines, the first of them line {spoilt[0]}, are"
            )
            found.insert(0, _damaged(f"{where} not as written"))
        for key in sorted(entered):
            if key not in recorded:
                found.append(
                    Damage(key, "missing", "the journal tells of this sealed file, and the index does not")
                )
            elif recorded[key] != entered[key]:
                found.append(
                    Damage(
                        key, "damaged", "the index records another digest than the journal", expected=entered[key],
                        found=recorded[key],
                    )
                )  # fmt: skip
        if entered or recorded:
            found += [
                Damage(
                    JOURNAL_NAME, "damaged", f"no line tells of {key}: lines were taken out, or not written"
                )
                for key in sorted(set(recorded) - set(entered))
            ]
        return found

    def entered_keys(self) -> set[str]:
        """Return the keys of all sealed files that the journal tells of."""
        return {entry.act.key for entry in self.entries() if entry.act.key is not None}

    def _opened(self) -> BinaryIO:
        if self.path.exists() and not self.path.is_file():
            # A pipe would be waited for without end.
            raise DamagedFile(
                "this is not a plain file", file=str(self.path), remedy="bring the journal back from a copy"
            )
        return self.path.open("rb")

    def _lines(self) -> Iterator[bytes]:
        with contextlib.suppress(FileNotFoundError), self._opened() as stream:
            while line := stream.readline(_LONGEST):
                if line.endswith(b"\n"):
                    yield line[:-1]
                elif len(line) == _LONGEST:
                    yield line

    def _end(self) -> tuple[list[bytes], bytes]:
        """Return whole lines near the end, and what stands after the last line end."""
        try:
            with self._opened() as stream:
                size = stream.seek(0, os.SEEK_END)
                start = max(0, size - _TAIL)
                stream.seek(start)
                text = stream.read()
        except FileNotFoundError:
            return [], b""
        *lines, torn = text.split(b"\n")
        return (lines[1:] if start else lines), torn


def _line(content: Mapping[str, Any]) -> bytes:
    return json.dumps(content, sort_keys=True, ensure_ascii=False).encode()


def _digest(line: bytes) -> str:
    return hashlib.sha256(line).hexdigest()


def _read(line: bytes) -> Entry | None:
    try:
        content = json.loads(line)
        own = content.pop("own")
        if own != _digest(_line(content)) or line != _line({**content, "own": own}):
            return None
        return Entry(
            number=int(content["n"]), at=str(content["at"]),
            act=Act(
                str(content["act"]), str(content["what"]), str(content["by"]), content.get("key"), content.get("sha256"),
                content.get("note"),
            ),
            stillroom=str(content["stillroom"]), before=str(content["before"]), sealed=int(content["sealed"]),
            digest=_digest(line), settings=content.get("settings"),
        )  # fmt: skip
    except (ValueError, KeyError, TypeError, AttributeError, RecursionError):
        return None


def _damaged(what: str, *, expected: str | None = None, found: str | None = None) -> Damage:
    return Damage(JOURNAL_NAME, "damaged", what, expected=expected, found=found)

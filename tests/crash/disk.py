"""A disk that may lose its power: what a list of system calls leaves on it, when nothing but the synced is sure.

Rules, stricter than those of any file system in use:

- `fsync` of a file makes its bytes sure, not its name; `fsync` of a folder makes the names in it sure.
- Of what was not synced, any part may be there, in any order: a write may be lost, be there in its first sectors only, or
  have left zeros; a name given or taken may have been kept or not. A rename is kept whole or not at all.
- The shared memory of SQLite (`-shm`) is never kept: it is written through memory, unseen here, and made anew by whoever
  opens the database first.

References
----------
.. [1] IEEE Std 1003.1-2017, `fsync`: "all data for the open file descriptor ... transferred"; nothing is said about names.
.. [2] T. S. Pillai et al., "All File Systems Are Not Created Equal: On the Complexity of Crafting Crash-Consistent
   Applications", OSDI 2014.
"""

from __future__ import annotations

import os
import re
from collections.abc import Callable, Iterable
from dataclasses import dataclass, field
from itertools import count
from pathlib import Path

__all__ = ["Chance", "Disk", "Everything", "NewestName", "Power", "SyncedOnly"]

_SECTOR = 512
_LINE = re.compile(r"(\w+)\((.*)\) += (-?\d+)(?:<(.*?)>)?")
_ARGUMENT = re.compile(
    r'[, ]*(?:"((?:\\x[0-9a-f]{2})*)"|(\d+)<((?:\\x[0-9a-f]{2})*)>|(AT_FDCWD)<[^>]*>|([^, ][^,]*))'
)


@dataclass
class _Inode:
    sure: bytearray = field(default_factory=bytearray)
    pending: list[tuple[int, bytes | None]] = field(
        default_factory=list
    )  # a place and bytes, or a length and None


@dataclass(frozen=True)
class _Name:
    """A change of names: `path` leads to the inode from now on, or to nothing."""

    path: str
    inode: int | None
    source: str | None = None  # of a rename: the name that goes


class Everything:
    """The disk of a process that was killed: the system goes on and forgets nothing."""

    def keeps(self, *, newest: bool = False) -> bool:
        """Return whether a change of names is kept."""
        return True

    def kept(self, place: int, data: bytes) -> bytes:
        """Return what is kept of a write."""
        return data


class SyncedOnly:
    """The worst disk: nothing is kept that was not synced."""

    def keeps(self, *, newest: bool = False) -> bool:
        """Return whether a change of names is kept."""
        return False

    def kept(self, place: int, data: bytes) -> bytes:
        """Return what is kept of a write."""
        return b""


class NewestName:
    """A disk that was busy with the last thing only: the newest name was kept, those before it were not; all bytes are there."""

    def keeps(self, *, newest: bool = False) -> bool:
        """Return whether a change of names is kept."""
        return newest

    def kept(self, place: int, data: bytes) -> bytes:
        """Return what is kept of a write."""
        return data


class Chance:
    """Any part is kept, as drawn."""

    def __init__(self, draw: Callable[[], float]) -> None:
        self._draw = draw

    def keeps(self, *, newest: bool = False) -> bool:
        """Return whether a change of names is kept."""
        return self._draw() < 0.5

    def kept(self, place: int, data: bytes) -> bytes:
        """Return what is kept of a write: nothing, all, its first sectors, or zeros in its place."""
        drawn = self._draw()
        if drawn < 0.3:
            return b""
        if drawn < 0.7:
            return data
        if drawn < 0.9:
            sectors = int(self._draw() * (len(data) // _SECTOR + 1))
            return data[: max(0, sectors * _SECTOR - place % _SECTOR)]
        return bytes(len(data))


Power = SyncedOnly | NewestName | Chance | Everything
"""What becomes of what was not synced."""


class Disk:
    """What lies below some folders, and what of it is sure.

    Parameters
    ----------
    folders : iterable of Path
        What is below them now is sure.
    """

    def __init__(self, folders: Iterable[Path]) -> None:
        self._inodes: dict[int, _Inode] = {}
        self._folders = [str(folder) for folder in folders]
        self._live: dict[str, int] = {}
        self._pending: list[_Name] = []
        self._numbers = count(1_000_000)
        known: dict[int, int] = {}
        for top in map(Path, self._folders):
            for path in [top, *top.rglob("*")] if top.is_dir() else []:
                number = known.setdefault(path.stat().st_ino, len(known) + 1)
                self._live[str(path)] = -number if path.is_dir() else number
                if path.is_file():
                    self._inodes[number] = _Inode(bytearray(path.read_bytes()))
        self._sure = dict(self._live)

    def call(self, line: str) -> bool:
        """Carry out one line of a list; return whether it changed something here."""
        told = _LINE.match(line)
        if told is None or told[3].startswith("-"):
            return False
        name, result = told[1], int(told[3])
        arguments = [_argument(found) for found in _ARGUMENT.finditer(told[2])]
        arguments = [each for each in arguments if each != "AT_FDCWD"]
        paths = [each for each in arguments if isinstance(each, str) and self._is_here(each)]
        if not paths:
            return False
        return self._carried_out(name, paths, arguments, result)

    def _carried_out(self, name: str, paths: list[str], arguments: list[str | bytes], result: int) -> bool:
        path = paths[0]
        match name:
            case "open" | "openat" | "creat":
                return self._opened(path, str(arguments))
            case "pwrite64":
                self._write(path, int(arguments[3]), _bytes(arguments[1])[:result])
            case "write":
                self._write(path, self._end(path), _bytes(arguments[1])[:result])
            case "ftruncate":
                self._cut(path, int(arguments[1]))
            case "fsync" | "fdatasync":
                self._synced(path)
            case "link" | "linkat":
                self._named(_Name(paths[1], self._live[path]))
            case "rename" | "renameat" | "renameat2":
                self._named(_Name(paths[1], self._live[path], source=path))
            case "unlink" | "unlinkat" | "rmdir":
                self._named(_Name(path, None))
            case "mkdir" | "mkdirat":
                self._named(_Name(path, -1))
            case "chmod" | "fchmod" | "fchmodat":
                return False
            case _:
                raise AssertionError(name)
        return True

    def _is_here(self, path: str) -> bool:
        return any(path == top or path.startswith(top + "/") for top in self._folders)

    def _opened(self, path: str, how: str) -> bool:
        if path not in self._live:
            if "O_CREAT" not in how:
                return False
            number = next(self._numbers)
            self._inodes[number] = _Inode()
            self._named(_Name(path, number))
            return True
        if "O_TRUNC" in how:
            self._cut(path, 0)
            return True
        return False

    def _inode(self, path: str) -> _Inode | None:
        # A file without a name that is still open: what is written to it is lost in any case.
        number = self._live.get(path)
        return None if number is None else self._inodes.get(number)

    def _write(self, path: str, place: int, data: bytes) -> None:
        if (inode := self._inode(path)) is not None:
            inode.pending.append((place, data))

    def _cut(self, path: str, length: int) -> None:
        if (inode := self._inode(path)) is not None:
            inode.pending.append((length, None))

    def _end(self, path: str) -> int:
        inode = self._inode(path)
        return 0 if inode is None else len(_content(inode, None))

    def _synced(self, path: str) -> None:
        inode = self._inode(path)
        if inode is not None:
            inode.sure = _content(inode, None)
            inode.pending.clear()
            return
        rest = []
        for change in self._pending:
            if os.path.dirname(change.path) == path:  # noqa: PTH120 - paths of a list, not of this machine
                _apply(change, self._sure)
            else:
                rest.append(change)
        self._pending = rest

    def _named(self, change: _Name) -> None:
        _apply(change, self._live)
        self._pending.append(change)

    def laid(self, target: Path, power: Power) -> None:
        """Lay what is left when the power goes now into a folder, with the paths below the parent of the first folder."""
        names = dict(self._sure)
        for change in self._pending:
            if power.keeps(newest=change is self._pending[-1]):
                _apply(change, names)
        origin = Path(self._folders[0]).parent
        laid: dict[int, Path] = {}
        for path in sorted(names):
            number, place = names[path], target / Path(path).relative_to(origin)
            if not place.parent.is_dir() or path.endswith("-shm"):
                continue
            if number < 0:
                place.mkdir()
                continue
            if number in laid:
                place.hardlink_to(laid[number])
            else:
                laid[number] = place
                place.write_bytes(_content(self._inodes[number], power))


def _apply(change: _Name, names: dict[str, int]) -> None:
    if change.source is not None:
        names.pop(change.source, None)
        below = [
            path for path in names if path.startswith(f"{change.source}/")
        ]  # what is in a folder goes with it
        names.update({change.path + path.removeprefix(change.source): names.pop(path) for path in below})
    if change.inode is None:
        names.pop(change.path, None)
    else:
        names[change.path] = change.inode


def _content(inode: _Inode, power: Power | None) -> bytearray:
    """Return the bytes of a file when everything is kept (no power given), or what power leaves."""
    content = bytearray(inode.sure)
    for place, data in inode.pending:
        if data is None:
            if power is None or power.keeps():
                del content[place:]
                content += bytes(place - len(content))
            continue
        kept = data if power is None else power.kept(place, data)
        if kept:
            content += bytes(max(0, place - len(content)))
            content[place : place + len(kept)] = kept
    return content


def _argument(found: re.Match[str]) -> str | bytes:
    text, _, opened, here, plain = found.groups()
    if text is not None:
        raw = bytes.fromhex(text.replace("\\x", ""))
        return raw.decode() if raw.startswith(b"/") and b"\x00" not in raw else raw
    if opened is not None:
        return bytes.fromhex(opened.replace("\\x", "")).decode()
    return "AT_FDCWD" if here else str(plain).strip()


def _bytes(argument: str | bytes) -> bytes:
    return argument.encode() if isinstance(argument, str) else argument

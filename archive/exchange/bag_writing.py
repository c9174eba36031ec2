"""Writing a bag: beside the place where it is to stand, read back, synced, and given its name at the end.

::

    bagit.txt  bag-info.txt
    manifest-sha256.txt     manifest-sha512.txt       every file below data, in both
    tagmanifest-sha256.txt  tagmanifest-sha512.txt    every file above
    data/...

References
----------
.. [1] J. Kunze et al., The BagIt File Packaging Format (V1.0), RFC 8493, October 2018.
"""

from __future__ import annotations

import hashlib
import re
import secrets
import shutil
from collections.abc import Iterable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path

from archive.errors import ArchiveError, BadRequest, DamagedFile
from archive.exchange.bag_names import encoded, look_alikes, path_fault
from archive.store import durable
from schemas.visible_text import visible

__all__ = ["ALGORITHMS", "BagWriter", "new_bag"]

ALGORITHMS = ("sha256", "sha512")
_DECLARATION = "BagIt-Version: 1.0\nTag-File-Character-Encoding: UTF-8\n"
_BLOCK = 1 << 20
_UNFINISHED = re.compile(r"\..{1,100}\.[0-9a-f]{8}\.partial")
_PART = re.compile(r"data|bagit\.txt|bag-info\.txt|(?:tag)?manifest-sha(?:256|512)\.txt")


@contextmanager
def new_bag(target: Path) -> Iterator[BagWriter]:
    """Return a context that yields a writer of a bag, and leaves nothing of it unless `BagWriter.finish` was called.

    Parameters
    ----------
    target : Path
        Where the bag is to stand: a name that is free, or an empty folder, in a folder that is there.

    Raises
    ------
    BadRequest
        If something stands there, or nothing can be written there.
    """
    if not target.parent.is_dir():
        raise BadRequest(
            "the folder for the bag is not there", file=str(target.parent), remedy="make the folder first"
        )
    if target.is_symlink() or (target.exists() and (not target.is_dir() or any(target.iterdir()))):
        raise BadRequest(
            "this name is taken", file=str(target), expected="a new or an empty folder", remedy="name another"
        )
    swept = _swept(target.parent)
    try:
        with durable.folder_in_hand(
            lambda: target.parent / f".{target.name[:100]}.{secrets.token_hex(4)}.partial"
        ) as beside:
            try:
                yield BagWriter(beside, target, swept)
            finally:
                shutil.rmtree(beside, ignore_errors=True)  # after finishing, nothing of that name is left
    except OSError as error:
        raise _unwritable(target, error) from error


def _swept(folder: Path) -> tuple[str, ...]:
    """Remove what writers of bags left in a folder that were stopped, and return a sentence about each."""
    return tuple(
        sentence for path in sorted(folder.glob(".*.partial")) if (sentence := _removed(path)) is not None
    )


def _removed(path: Path) -> str | None:
    if not _UNFINISHED.fullmatch(path.name) or path.is_symlink() or not path.is_dir():
        return None
    with durable.unheld(path) as left:
        # Named as only an unfinished bag is, and with nothing in it but the parts of one.
        if not left or any(not _PART.fullmatch(each.name) for each in path.iterdir()):
            return None
        number = sum(each.is_file() for each in path.rglob("*"))
        shutil.rmtree(path, ignore_errors=True)
    what = "could not be removed; remove it by hand" if path.exists() else "was removed"
    return f"{path}: the writing of a package had not finished; what there was of it (files: {number}) {what}"


def _unwritable(target: Path, error: OSError) -> ArchiveError:
    return BadRequest(
        f"the package cannot be written: {error.strerror or error}",
        file=str(target),
        remedy="free space, or correct the permissions of the folder; nothing stands under this name",
    )


@dataclass
class BagWriter:
    """A bag being written.

    Attributes
    ----------
    folder : Path
        Where it lies while it is written.
    target : Path
        Where it is to stand.
    swept : tuple of str
        What writers that were stopped had left beside it, as sentences.
    """

    folder: Path
    target: Path
    swept: tuple[str, ...] = ()
    _payload: dict[str, tuple[int, dict[str, str]]] = field(default_factory=dict)

    @property
    def files(self) -> dict[str, tuple[int, str]]:
        """Size and SHA-256 of the payload files so far, by path below ``data/``."""
        return {
            path.removeprefix("data/"): (size, digests["sha256"])
            for path, (size, digests) in self._payload.items()
        }

    @property
    def octets(self) -> tuple[int, int]:
        """Bytes and number of payload files so far: RFC 8493, Payload-Oxum."""
        return sum(size for size, _ in self._payload.values()), len(self._payload)

    def add(self, path: str, blocks: Iterable[bytes], *, sha256: str | None = None) -> None:
        """Write one payload file.

        Parameters
        ----------
        path : str
            Below ``data/``.
        blocks : iterable of bytes
            Its content.
        sha256 : str, optional
            The digest that it must have.

        Raises
        ------
        BadRequest
            If the path cannot be held.
        DamagedFile
            If it has another digest.
        """
        whole = f"data/{path}"
        if (fault := path_fault(whole)) is not None or whole in self._payload:
            raise BadRequest(f"the path {fault or 'is taken'}", file=path)
        place = self.folder / whole
        place.parent.mkdir(parents=True, exist_ok=True)
        size, digests = _written(place, blocks)
        if sha256 is not None and digests["sha256"] != sha256:
            raise DamagedFile(
                "the bytes are not those that were sealed; nothing was exported",
                file=path,
                expected=sha256,
                found=digests["sha256"],
                remedy="run: stillroom fixity; then restore the file from a copy",
            )
        self._payload[whole] = size, digests

    def finish(self, info: Sequence[tuple[str, str]]) -> None:
        """Write the tag files, read everything back, sync it, and give the bag its name.

        Parameters
        ----------
        info : sequence of (label, value)
            What `bag-info.txt` says beside Payload-Oxum.

        Raises
        ------
        DamagedFile
            If the disk gives back other bytes than it was given.
        """
        for one, other in look_alikes(self._payload):
            raise BadRequest("two paths are the same on some file systems", found=f"{one} and {other}")
        size, number = self.octets
        tags = {
            "bagit.txt": _DECLARATION,
            "bag-info.txt": _info([*info, ("Payload-Oxum", f"{size}.{number}")]),
            **{f"manifest-{name}.txt": _manifest(self._payload, name) for name in ALGORITHMS},
        }
        described = {name: _written(self.folder / name, [text.encode()]) for name, text in tags.items()}
        last = {f"tagmanifest-{name}.txt": _manifest(described, name).encode() for name in ALGORITHMS}
        described |= {name: _written(self.folder / name, [text]) for name, text in last.items()}
        for path, (_, digests) in sorted((self._payload | described).items()):
            durable.sync_file(self.folder / path)
            if durable.file_digest(self.folder / path)[0] != digests["sha256"]:
                raise DamagedFile(
                    "the disk gave back other bytes than it was given", file=str(self.folder / path)
                )
        for folder in sorted({self.folder, *(self.folder / path for path in _folders(self._payload))}):
            durable.sync_folder(folder)
        durable.take_folder_name(self.folder, self.target)


def _folders(paths: Iterable[str]) -> set[str]:
    return {
        "/".join(parts[:depth])
        for path in paths
        for parts in [path.split("/")]
        for depth in range(1, len(parts))
    }


def _written(place: Path, blocks: Iterable[bytes]) -> tuple[int, dict[str, str]]:
    made = {name: hashlib.new(name) for name in ALGORITHMS}
    size = 0
    with place.open("xb") as stream:
        for block in blocks:
            stream.write(block)
            size += len(block)
            for digest in made.values():
                digest.update(block)
    return size, {name: digest.hexdigest() for name, digest in made.items()}


def _manifest(files: Mapping[str, tuple[int, dict[str, str]]], name: str) -> str:
    return "".join(f"{files[path][1][name]}  {encoded(path)}\n" for path in sorted(files))


def _info(lines: Sequence[tuple[str, str]]) -> str:
    # A value is one line here: a line end in it would begin a new element.
    return "".join(f"{label}: {' '.join(visible(value).split())}\n" for label, value in lines)

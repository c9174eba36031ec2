"""Reading a bag that came from elsewhere: everything wrong with it is found before a byte of it is used.

Rules
-----
* Nothing is followed: links, devices, paths that leave the folder, files to be fetched. Such a bag is refused.
* Complete and valid in the strict sense of RFC 8493: every payload file is in every manifest, all digests are compared.
* Cheap checks come first; bytes are read only when names are as promised, and sizes not far off.
* Every fault is a finding, and all are told at once.

References
----------
.. [1] J. Kunze et al., The BagIt File Packaging Format (V1.0), RFC 8493, October 2018, sections 2, 3 and 5.
"""

from __future__ import annotations

import hashlib
import os
import re
import stat
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from archive.errors import BadRequest, DamagedFile, NotAnArchive
from archive.exchange.bag_names import decoded, look_alikes, path_fault
from archive.exchange.bag_writing import ALGORITHMS
from schemas.finding import Finding

__all__ = ["DAMAGE_CODES", "Bag", "BagLimits", "blocks_of", "read_bag"]

DAMAGE_CODES = frozenset({"bag-file-damaged", "bag-file-missing", "bag-size"})
"""Findings that say that bytes are not what they were, rather than that the bag is none."""

_DECLARATION = re.compile(
    r"BagIt-Version: ([0-9]+\.[0-9]+)(?:\r\n|\r|\n)Tag-File-Character-Encoding: (\S+)(?:\r\n|\r|\n)?"
)
_MANIFEST = re.compile(r"(tag)?manifest-([A-Za-z0-9-]+)\.txt")
_LINE = re.compile(r"([0-9A-Fa-f]+)[ \t]+(\S.*)")
_OXUM = re.compile(r"([0-9]{1,18})\.([0-9]{1,9})")
_TAG_LIMIT = 64 << 20
_BLOCK = 1 << 20
_LITTLE = 64 << 20
_LENGTHS = {name: hashlib.new(name).digest_size * 2 for name in ALGORITHMS}


@dataclass(frozen=True)
class BagLimits:
    """How much of a bag is looked at at all.

    Attributes
    ----------
    files : int
        Files and folders, so that a bag cannot fill memory with names.
    """

    files: int = 200_000


@dataclass
class Bag:
    """A bag as far as it could be read.

    Attributes
    ----------
    folder : Path
    payload : dict of str to (int, dict)
        Size, and digest by algorithm, of each file below ``data``, by its path in the bag.
    info : list of (str, str)
        What `bag-info.txt` says.
    findings : list of Finding
        Everything that is wrong; the bag may be used only if this is empty.
    """

    folder: Path
    payload: dict[str, tuple[int, dict[str, str]]] = field(default_factory=dict)
    info: list[tuple[str, str]] = field(default_factory=list)
    findings: list[Finding] = field(default_factory=list)

    def blame(
        self, code: str, what: str, file: str | None = None, *, line: int | None = None, **more: Any
    ) -> None:
        """Add a finding of error level."""
        self.findings.append(Finding(code=code, severity="error", what=what, file=file, line=line, **more))


def read_bag(folder: Path, limits: BagLimits | None = None) -> Bag:
    """Return a bag with everything that is wrong with it.

    Parameters
    ----------
    folder : Path
        The bag.
    limits : BagLimits, optional

    Raises
    ------
    NotAnArchive
        If there is no such folder.
    """
    if folder.is_symlink() or not folder.is_dir():
        raise NotAnArchive("there is no such folder", file=str(folder), expected="the folder of a package")
    bag = Bag(folder)
    sizes = _listed(bag, limits or BagLimits())
    if bag.findings:
        return bag
    for one, other in look_alikes(sizes):
        bag.blame("bag-look-alike", "some file systems take this for another path", other, found=one)
    _declaration(bag, sizes)
    tables = _manifests(bag, sizes)
    _info(bag, sizes)
    if not bag.findings or _little_more(bag, sizes):
        _complete(bag, sizes, tables)
        if not bag.findings or _little_more(bag, sizes):
            _valid(bag, sizes, tables)
    bag.findings.sort(key=lambda finding: finding.order)
    return bag


def blocks_of(path: Path) -> Iterator[bytes]:
    """Yield a file's bytes in blocks, without following a link."""
    try:
        descriptor = os.open(path, os.O_RDONLY | getattr(os, "O_NOFOLLOW", 0) | getattr(os, "O_NONBLOCK", 0))
    except OSError as error:
        raise DamagedFile("the file cannot be read", file=str(path), found=error.strerror) from error
    with os.fdopen(descriptor, "rb") as stream:
        if not stat.S_ISREG(os.fstat(descriptor).st_mode):
            raise BadRequest("this is not a file", file=str(path))
        while block := stream.read(_BLOCK):
            yield block


def _listed(bag: Bag, limits: BagLimits) -> dict[str, int]:
    """Return the size of every file by its path, and name what should not be there at all."""
    sizes: dict[str, int] = {}
    waiting, seen = [""], 0
    while waiting:
        below = waiting.pop()
        try:
            entries = sorted(os.scandir(bag.folder / below), key=lambda entry: entry.name)
        except OSError as error:
            bag.blame("bag-unreadable", "the folder cannot be read", below or ".", found=error.strerror)
            continue
        for entry in entries:
            path = f"{below}/{entry.name}" if below else entry.name
            seen += 1
            if seen > limits.files:
                bag.blame("bag-too-large", f"the bag holds more than {limits.files} files and folders")
                return sizes
            if (fault := path_fault(path)) is not None:
                bag.blame("bag-path", f"the path {fault}", ascii(path)[1:-1])
            elif entry.is_symlink():
                bag.blame("bag-link", "a link; a bag holds files and folders only", path)
            elif entry.is_dir(follow_symlinks=False):
                waiting.append(path)
            elif entry.is_file(follow_symlinks=False):
                sizes[path] = entry.stat(follow_symlinks=False).st_size
            else:
                bag.blame("bag-device", "neither a file nor a folder", path)
    return sizes


def _text(bag: Bag, name: str, sizes: Mapping[str, int]) -> str | None:
    if sizes[name] > _TAG_LIMIT:
        bag.blame("bag-too-large", f"a tag file of more than {_TAG_LIMIT >> 20} MB is not read", name)
        return None
    try:
        text = b"".join(blocks_of(bag.folder / name)).decode("utf-8")
    except UnicodeDecodeError as error:
        bag.blame("bag-encoding", "the file is not UTF-8, which the bag declares", name, found=error.reason)
        return None
    except (DamagedFile, BadRequest) as error:
        bag.blame("bag-unreadable", error.what, name, found=error.found)
        return None
    if text.startswith("\ufeff"):
        bag.blame("bag-encoding", "the file begins with a byte order mark", name)
        return None
    return text


def _declaration(bag: Bag, sizes: Mapping[str, int]) -> None:
    if "bagit.txt" not in sizes:
        bag.blame("bag-declaration", "there is no bagit.txt; this folder is no bag", "bagit.txt")
        return
    text = _text(bag, "bagit.txt", sizes)
    if text is None:
        return
    match = _DECLARATION.fullmatch(text)
    if match is None or match[1] != "1.0" or match[2].upper() != "UTF-8":
        bag.blame(
            "bag-declaration", "the declaration is not that of a bag this program takes", "bagit.txt",
            expected="BagIt-Version: 1.0 and Tag-File-Character-Encoding: UTF-8", found=ascii(text[:120]),
        )  # fmt: skip


def _manifests(bag: Bag, sizes: Mapping[str, int]) -> dict[str, dict[str, str]]:
    """Return digest by path for every manifest, by its file name."""
    tables: dict[str, dict[str, str]] = {}
    if "fetch.txt" in sizes:
        bag.blame(
            "bag-fetch", "the bag wants files to be fetched from elsewhere; that is never done", "fetch.txt"
        )
    for name in sorted(name for name in sizes if "/" not in name):
        match = _MANIFEST.fullmatch(name)
        if match is None:
            continue
        if match[2] not in ALGORITHMS:
            bag.blame(
                "bag-algorithm", "digests of this kind prove nothing here", name,
                found=match[2], expected=" and ".join(ALGORITHMS),
            )  # fmt: skip
            continue
        text = _text(bag, name, sizes)
        if text is not None:
            tables[name] = _manifest(bag, name, text, algorithm=match[2], tags=match[1] is not None)
    for kind in ("manifest", "tagmanifest"):
        if not any(name.startswith(f"{kind}-") for name in tables):
            bag.blame("bag-manifest", f"there is no {kind} with digests", f"{kind}-sha512.txt")
    return tables


def _manifest(bag: Bag, name: str, text: str, *, algorithm: str, tags: bool) -> dict[str, str]:
    found: dict[str, str] = {}
    for number, line in enumerate(re.split(r"\r\n|\r|\n", text.rstrip("\r\n")), 1):
        match = _LINE.fullmatch(line)
        if match is None or len(match[1]) != _LENGTHS[algorithm]:
            bag.blame("bag-manifest", "not a digest and a path", name, line=number, found=ascii(line[:120]))
            continue
        try:
            path = decoded(match[2])
        except ValueError as error:
            bag.blame("bag-path", str(error), name, line=number, found=ascii(match[2][:200]))
            continue
        fault = path_fault(path)
        if fault is None and path.startswith("data/") == tags:
            fault = "does not belong into this manifest"
        if fault is not None or path in found:
            bag.blame(
                "bag-path", f"the path {fault or 'stands here twice'}", name, line=number, found=ascii(path)
            )
        found[path] = match[1].lower()
    return found


def _info(bag: Bag, sizes: Mapping[str, int]) -> None:
    if "bag-info.txt" not in sizes:
        bag.blame("bag-info", "there is no bag-info.txt, which says how much the bag holds", "bag-info.txt")
        return
    text = _text(bag, "bag-info.txt", sizes)
    if text is None:
        return
    for number, line in enumerate(re.split(r"\r\n|\r|\n", text.rstrip("\r\n")), 1):
        label, colon, value = line.partition(":")
        if line.startswith((" ", "\t")) and bag.info:
            bag.info[-1] = bag.info[-1][0], f"{bag.info[-1][1]} {line.strip()}"
        elif colon and label.strip():
            bag.info.append((label.strip(), value.strip()))
        else:
            bag.blame(
                "bag-info", "not a label and a value", "bag-info.txt", line=number, found=ascii(line[:120])
            )
    stated = [value for label, value in bag.info if label.lower() == "payload-oxum"]
    payload = [size for path, size in sizes.items() if path.startswith("data/")]
    found = f"{sum(payload)}.{len(payload)}"
    if len(stated) != 1 or _OXUM.fullmatch(stated[0]) is None:
        bag.blame(
            "bag-info",
            "the bag must say once how much it holds: Payload-Oxum",
            "bag-info.txt",
            found=", ".join(stated) or None,
        )
    elif stated[0] != found:
        bag.blame(
            "bag-size",
            "the bag holds more or less than it says: bytes and files",
            "bag-info.txt",
            expected=stated[0],
            found=found,
        )


def _little_more(bag: Bag, sizes: Mapping[str, int]) -> bool:
    """Whether nothing is wrong but the size, and not by so much that reading on to name the files would be a trap."""
    if any(finding.code not in DAMAGE_CODES | {"bag-file-unlisted"} for finding in bag.findings):
        return False
    stated = next(value for label, value in bag.info if label.lower() == "payload-oxum")
    payload = sum(size for path, size in sizes.items() if path.startswith("data/"))
    return payload <= int(stated.partition(".")[0]) + _LITTLE


def _complete(bag: Bag, sizes: Mapping[str, int], tables: Mapping[str, Mapping[str, str]]) -> None:
    payload = {path for path in sizes if path.startswith("data/")}
    manifests = {name for name in sizes if _MANIFEST.fullmatch(name)}
    tags = set(sizes) - payload - {name for name in manifests if name.startswith("tag")}
    for name, table in sorted(tables.items()):
        there = tags if name.startswith("tag") else payload
        for path in sorted(set(table) - there):
            bag.blame("bag-file-missing", "a file that the manifest names is not there", path, field=name)
        for path in sorted(there - set(table)):
            bag.blame("bag-file-unlisted", "a file that the manifest does not name", path, field=name)


def _valid(bag: Bag, sizes: Mapping[str, int], tables: Mapping[str, Mapping[str, str]]) -> None:
    for path in sorted(sizes):
        made = {name: hashlib.new(name) for name in ALGORITHMS}
        size = 0
        try:
            for block in blocks_of(bag.folder / path):
                size += len(block)
                for digest in made.values():
                    digest.update(block)
        except (DamagedFile, BadRequest) as error:
            bag.blame("bag-unreadable", error.what, path, found=error.found)
            continue
        found = {name: digest.hexdigest() for name, digest in made.items()}
        for name, table in sorted(tables.items()):
            algorithm = name.rpartition("-")[2].removesuffix(".txt")
            if path in table and table[path] != found[algorithm]:
                bag.blame(
                    "bag-file-damaged",
                    "the bytes are not those that the manifest promises",
                    path,
                    field=name,
                    expected=table[path],
                    found=found[algorithm],
                )
        if path.startswith("data/"):
            bag.payload[path] = size, found

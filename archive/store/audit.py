"""What a sealed file may be made of; looked at before any of its data are read.

A file that was damaged or exchanged could point the reader at other files or at code: external and soft links,
external storage, virtual datasets, filters from plug-ins, types that need unpickling. None of these is followed: links
are looked at by kind, and a dataset's layout, type and filters before its values. With no foreign filter left, HDF5
has no reason to load a plug-in.
"""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any

import h5py

__all__ = ["READ_ERRORS", "datasets", "mark_faults", "structure_faults", "text_of"]

_SIGNATURE = b"\x89HDF\r\n\x1a\n"
_FILTERS = {1: "deflate", 2: "shuffle", 3: "fletcher32"}
_DEPTH_LIMIT = 40
_OBJECT_LIMIT = 1_000_000
# How h5py speaks of damage, depending on where HDF5 stumbles.
READ_ERRORS = (OSError, RuntimeError, KeyError, ValueError, TypeError, SystemError, MemoryError)


def mark_faults(path: Path) -> list[str]:
    """Return what is wrong with the first bytes: not HDF5, not superblock 3, not closed.

    References
    ----------
    HDF5 File Format Specification, version 3.0, section II.A: byte 8 is the superblock's version, byte 11 its
    consistency flags, which are zero after an orderly close.
    """
    with path.open("rb") as stream:
        head = stream.read(12)
    if len(head) < 12 or head[:8] != _SIGNATURE:
        return ["the file does not begin as an HDF5 file"]
    faults = []
    if head[8] != 3:
        faults.append(f"the superblock has version {head[8]}, not 3")
    if head[11] != 0:
        faults.append(f"the file was not closed by its writer (consistency flags {head[11]})")
    return faults


def structure_faults(file: h5py.File) -> list[tuple[str, str]]:
    """Return what the file should not be made of, as pairs of path and sentence."""
    faults: list[tuple[str, str]] = []
    for path, node in _nodes(file, faults):
        if isinstance(node, h5py.Dataset):
            faults += [(path, sentence) for sentence in _dataset_faults(node)]
    return faults


def datasets(file: h5py.File) -> Iterator[tuple[str, h5py.Dataset]]:
    """Yield each dataset that can be reached, with its path."""
    for path, node in _nodes(file, []):
        if isinstance(node, h5py.Dataset):
            yield path, node


def _nodes(file: h5py.File, faults: list[tuple[str, str]]) -> Iterator[tuple[str, Any]]:
    """Yield what hard links lead to, each once; what cannot be followed goes to `faults`."""
    waiting: list[tuple[str, h5py.Group, int]] = [("", file, 0)]
    seen = {h5py.h5o.get_info(file.id).addr}
    while waiting:
        folder, group, depth = waiting.pop(0)
        try:
            names = list(group)
        except READ_ERRORS as error:
            faults.append((folder or "/", f"the group cannot be listed: {error}"))
            continue
        for name in names:
            path = f"{folder}/{name}" if folder else name
            try:
                node = _followed(group, name)
                if node is None:
                    faults.append((path, "not a plain link; sealed files hold nothing else"))
                    continue
                address = h5py.h5o.get_info(node.id).addr
            except READ_ERRORS as error:
                faults.append((path, f"it cannot be opened: {error}"))
                continue
            if address in seen or depth > _DEPTH_LIMIT or len(seen) > _OBJECT_LIMIT:
                faults.append((path, "reached twice, too deep, or one of too many objects"))
                continue
            seen.add(address)
            yield path, node
            if isinstance(node, h5py.Group):
                waiting.append((path, node, depth + 1))


def _followed(group: h5py.Group, name: str) -> Any:
    if type(group.get(name, getlink=True)) is not h5py.HardLink:
        return None
    return group[name]


def _dataset_faults(dataset: h5py.Dataset) -> list[str]:
    faults = []
    try:
        plan = dataset.id.get_create_plist()
        if dataset.external or dataset.is_virtual:
            return ["its data lie in another file"]
        foreign = [plan.get_filter(i)[0] for i in range(plan.get_nfilters())]
        foreign = [code for code in foreign if code not in _FILTERS]
        if foreign:
            faults.append(f"it needs filter {foreign[0]}, which not every HDF5 build has")
        if dataset.shape != () and not (dataset.chunks and dataset.fletcher32):
            faults.append("it has no checksums")
        kind = dataset.dtype
        if kind.kind not in "fiuS" or kind.subdtype is not None:
            faults.append(f"it holds values of type {kind}, neither numbers nor text of fixed length")
        faults += _size_faults(dataset)
    except READ_ERRORS as error:
        faults.append(f"its description cannot be read: {error}")
    return faults


def _size_faults(dataset: h5py.Dataset) -> list[str]:
    # Deflate packs at most 1032:1 (RFC 1951: 258 bytes in 2 bits), so a claim beyond that is not data but a trap.
    stored = dataset.id.get_storage_size()
    if dataset.chunks and dataset.nbytes > 1100 * max(stored, 1024):
        return [f"it claims {dataset.nbytes} bytes and stores {stored}"]
    return []


def text_of(value: object) -> str:
    """Return an attribute's text, whether HDF5 kept it with fixed or variable length."""
    return value.decode("utf-8") if isinstance(value, bytes) else str(value)

"""Chunks of a dataset: how large, how packed, and written in which order.

Every chunk passes shuffle (where that helps), deflate and Fletcher's checksum, the three filters that every HDF5 build
reads. They are applied here and the result is handed to HDF5 as it stands, because the deflate of `isal` packs 1 MB of
measured numbers in 1.4 ms where zlib needs 15 ms (measured on one core, level 1 against level 4); the stream is an
ordinary zlib stream. It also means that chunks lie in the file in the order they were written, whatever the library's
cache would have done, and that several are packed at once while one is written.

Whether a dataset is shuffled is decided on its first chunk, which is packed both ways: numbers that came from decimal
text repeat in whole, and pack to a third without shuffle where they need half with it; smooth numbers and integers pack
better with it.

References
----------
.. [1] HDF5 File Format Specification, version 3.0, section IV.A.2.l (filter pipeline message).
.. [2] J. G. Fletcher, "An arithmetic checksum for serial transmissions", IEEE Trans. Commun. 30, 247 (1982).
"""

from __future__ import annotations

import hashlib
import itertools
from collections import deque
from concurrent.futures import Executor, Future
from typing import Any

import h5py
import numpy as np
from isal import isal_zlib
from numpy.typing import NDArray

__all__ = ["CHUNK_BYTES", "ChunkStream", "fitted_chunks", "fletcher32", "mark", "write_whole"]

# A damaged byte costs one chunk and a reader fetches whole ones: large enough to pack well, small enough to lose.
CHUNK_BYTES = 262_144
_LEVEL = 1
_AHEAD = 4  # chunks of a dataset that are being packed before the oldest is written
_LINE = 512  # bytes that are summed side by side
_SKIP_DEFLATE = 0b01  # bit n of a chunk's filter mask: filter n was not applied [1]


def fletcher32(data: bytes) -> int:
    """Return Fletcher's 32-bit checksum of `data` as HDF5 computes it.

    Parameters
    ----------
    data : bytes
        Taken as big-endian 16-bit words; an odd last byte is the high half of a word.

    Returns
    -------
    int
        The weighted sum in the upper, the plain sum in the lower 16 bits, both modulo 65535. HDF5 folds carries
        instead of dividing, so that a sum that is a multiple of 65535 is 65535 and only all-zero data give zero.

    Examples
    --------
    >>> hex(fletcher32(b"abcde"))  # sums 0x6162 + 0x6364 + 0x6500, and of the sums so far
    '0x4ff029c7'
    """
    words = np.frombuffer(data + b"\x00" * (-len(data) % _LINE), dtype="<u2").reshape(-1, _LINE // 2)
    if not words.any():
        return 0
    # A word times 256 is, modulo 65535, the word with its bytes exchanged; so the sums of little-endian words, which a
    # processor adds fastest, need this factor only at the end. Places within a line and places of lines are summed apart.
    in_line = words.sum(axis=0, dtype=np.uint64) % np.uint64(65535)
    of_line = words.sum(axis=1, dtype=np.uint64)
    plain = int(of_line.sum())
    places = int((in_line * np.arange(len(in_line), dtype=np.uint64)).sum())
    lines = np.arange(len(of_line), dtype=np.uint64) % np.uint64(65535)
    places += len(in_line) * int((of_line % np.uint64(65535) * lines).sum())
    weighted = 256 * ((len(data) + 1) // 2 * plain - places) % 65535 or 65535
    return weighted << 16 | (256 * plain % 65535 or 65535)


def fitted_chunks(shape: tuple[int, ...], itemsize: int) -> tuple[int, ...]:
    """Return a chunk shape for a whole array: all of it if it is small, else the last axes first.

    Examples
    --------
    >>> fitted_chunks((10, 3), 8), fitted_chunks((1000, 1000), 8), fitted_chunks((0,), 8)
    ((10, 3), (32, 1000), (1,))
    """
    room = max(1, CHUNK_BYTES // itemsize)
    chunks: list[int] = []
    for length in reversed(shape):
        chunks.append(max(1, min(length, room)))
        room //= chunks[-1]
    return tuple(reversed(chunks))


def _packed(data: bytes, width: int) -> tuple[bytes, int]:
    """Return a chunk after all filters, and its filter mask; `width` is 1 where shuffle is none of them."""
    mask = 0
    shuffled = data
    if width > 1:
        shuffled = np.frombuffer(data, dtype=np.uint8).reshape(-1, width).T.tobytes()
    packed = isal_zlib.compress(shuffled, _LEVEL)
    if len(packed) >= len(shuffled):  # packed already, as many raw files are
        packed = shuffled
        mask = _SKIP_DEFLATE << int(width > 1)
    return packed + fletcher32(packed).to_bytes(4, "little"), mask


def _better_width(first: bytes, dtype: np.dtype[Any]) -> int:
    """Return the width at which a dataset is shuffled, 1 for not at all, by how its first chunk packs."""
    # Shuffling text would only scatter its words.
    width = 1 if dtype.kind == "S" else dtype.itemsize
    if width == 1 or len(isal_zlib.compress(first, _LEVEL)) < len(_packed(first, width)[0]) - 4:
        return 1
    return width


def _created(
    group: h5py.Group,
    name: str,
    dtype: np.dtype[Any],
    *,
    shape: tuple[int, ...],
    chunks: tuple[int, ...],
    grows: bool,
    shuffle: bool,
) -> h5py.Dataset:
    text = dtype.kind == "S"
    return group.create_dataset(
        name,
        shape=shape,
        # HDF5 takes no chunk longer than an axis that cannot grow, and none of length zero.
        maxshape=tuple(None if grows or length == 0 else length for length in shape),
        dtype=h5py.string_dtype("utf-8", dtype.itemsize) if text else dtype,
        chunks=chunks,
        shuffle=shuffle,
        compression="gzip",
        compression_opts=4,
        fletcher32=True,
        track_times=False,
    )


def mark(node: h5py.Group | h5py.Dataset, name: str, text: str | list[str]) -> None:
    """Set an attribute that the store itself relies on, as text of fixed length.

    Notes
    -----
    Fixed-length text lies in the object header, which has a checksum. Variable-length text is friendlier (h5py returns
    it as `str`) and is used for what people read, but it lies in a heap without any: a flipped bit there made HDF5
    2.0.0 loop for ever. So nothing that is needed to verify a file may lie there.
    """
    encoded = np.array([part.encode("utf-8") for part in ([text] if isinstance(text, str) else text)])
    values = encoded[0] if isinstance(text, str) else encoded
    node.attrs.create(name, values, dtype=h5py.string_dtype("utf-8", max(1, encoded.dtype.itemsize)))


def write_whole(group: h5py.Group, name: str, data: NDArray[Any]) -> h5py.Dataset:
    """Write an array of known shape and return its dataset, with its digest as attribute ``sha256``.

    Parameters
    ----------
    group, name
        Where; groups on the way are made.
    data : ndarray
        Numbers in little-endian order or NUL-padded UTF-8 text, C order.

    Notes
    -----
    A single number cannot be chunked in HDF5. It is kept inside its object header, which has a checksum of its own.
    """
    if data.ndim == 0:
        return _written_scalar(group, name, data)
    chunks = fitted_chunks(data.shape, data.dtype.itemsize)
    counts = [-(-length // chunk) for length, chunk in zip(data.shape, chunks, strict=True)]
    dataset, width = None, 1
    for place in itertools.product(*map(range, counts)):
        offset = tuple(i * chunk for i, chunk in zip(place, chunks, strict=True))
        part = data[tuple(slice(o, o + chunk) for o, chunk in zip(offset, chunks, strict=True))]
        content = _full(part, chunks).tobytes()
        if dataset is None:
            width = _better_width(content, data.dtype)
            dataset = _created(
                group, name, data.dtype, shape=data.shape, chunks=chunks, grows=False, shuffle=width > 1
            )
        packed, mask = _packed(content, width)
        dataset.id.write_direct_chunk(offset, packed, mask)
    if dataset is None:
        dataset = _created(
            group, name, data.dtype, shape=data.shape, chunks=chunks, grows=False, shuffle=False
        )
    mark(dataset, "sha256", hashlib.sha256(data.tobytes()).hexdigest())
    return dataset


def _full(part: NDArray[Any], chunks: tuple[int, ...]) -> NDArray[Any]:
    """Return a chunk of full size; the last of an axis is filled up with zeros."""
    if part.shape == chunks:
        return part
    full = np.zeros(chunks, dtype=part.dtype)
    full[tuple(slice(0, length) for length in part.shape)] = part
    return full


def _written_scalar(group: h5py.Group, name: str, data: NDArray[Any]) -> h5py.Dataset:
    folder, _, leaf = name.rpartition("/")
    parent = group.require_group(folder) if folder else group
    text = data.dtype.kind == "S"
    dtype = h5py.string_dtype("utf-8", data.dtype.itemsize) if text else data.dtype
    layout = h5py.h5p.create(h5py.h5p.DATASET_CREATE)
    layout.set_layout(h5py.h5d.COMPACT)
    layout.set_obj_track_times(False)
    space = h5py.h5s.create(h5py.h5s.SCALAR)
    kind = h5py.h5t.py_create(np.dtype(dtype), logical=True)
    dataset = h5py.Dataset(h5py.h5d.create(parent.id, leaf.encode(), kind, space, layout))
    dataset.id.write(h5py.h5s.ALL, h5py.h5s.ALL, np.ascontiguousarray(data), kind)
    mark(dataset, "sha256", hashlib.sha256(data.tobytes()).hexdigest())
    return dataset


class ChunkStream:
    """A one-dimensional dataset of unknown length, written chunk by chunk.

    Parameters
    ----------
    group, name
        Where; groups on the way are made.
    dtype : numpy dtype
        Little-endian numbers or NUL-padded text.
    packers : concurrent.futures.Executor, optional
        Threads that pack chunks while others are taken and written; without, each is packed as it comes.

    Notes
    -----
    What reaches the file depends on the values alone, never on how they were cut into blocks or on who was quicker: data
    that fit one chunk become a dataset of fixed length with a chunk of just that length, longer data one that can grow,
    and a chunk is written when so many more have been taken, whether it was packed long before or not.
    """

    def __init__(
        self, group: h5py.Group, name: str, dtype: np.dtype[Any], *, packers: Executor | None = None
    ) -> None:
        self._group, self._name, self._dtype = group, name, dtype
        self._chunk = max(1, CHUNK_BYTES // dtype.itemsize)
        self._waiting: list[NDArray[Any]] = []
        self._waiting_rows = 0
        self._dataset: Any = None
        self._width = 1
        self._packers = packers
        self._packing: deque[tuple[int, int, Future[tuple[bytes, int]]]] = deque()
        self._digest = hashlib.sha256()
        self._taken = 0

    @property
    def rows(self) -> int:
        """Return the number of values taken so far."""
        return self._taken + self._waiting_rows

    def append(self, values: NDArray[Any]) -> None:
        """Take more values of the stream's own dtype."""
        while self._waiting_rows + len(values) > self._chunk:
            room = self._chunk - self._waiting_rows
            self._hold(values[:room])
            self._take()
            values = values[room:]
        self._hold(values)

    def _hold(self, values: NDArray[Any]) -> None:
        if len(values):
            # A copy: the caller may reuse its buffer.
            self._waiting.append(np.array(values, dtype=self._dtype))
            self._waiting_rows += len(values)

    def _held(self) -> NDArray[Any]:
        held, self._waiting, self._waiting_rows = self._waiting, [], 0
        if len(held) == 1:
            return held[0]
        return np.concatenate(held) if held else np.empty(0, dtype=self._dtype)

    def _take(self) -> None:
        """Let what waits be packed, and write what was taken long enough ago."""
        values = self._held()
        content = _full(values, (self._chunk,)).tobytes()
        self._digest.update(values.data)
        if self._dataset is None:
            self._width = _better_width(content, self._dtype)
            self._dataset = _created(
                self._group,
                self._name,
                self._dtype,
                shape=(0,),
                chunks=(self._chunk,),
                grows=True,
                shuffle=self._width > 1,
            )
        start, self._taken = self._taken, self._taken + len(values)
        if self._packers is None:
            self._write(start, self._taken, _packed(content, self._width))
            return
        self._packing.append((start, self._taken, self._packers.submit(_packed, content, self._width)))
        while len(self._packing) > _AHEAD:
            self._write_next()

    def _write_next(self) -> None:
        start, stop, packing = self._packing.popleft()
        self._write(start, stop, packing.result())

    def _write(self, start: int, stop: int, chunk: tuple[bytes, int]) -> None:
        self._dataset.resize((stop,))
        self._dataset.id.write_direct_chunk((start,), *chunk)

    def finish(self) -> h5py.Dataset:
        """Write what is left and return the dataset, with its digest as attribute ``sha256``."""
        if self._dataset is None:
            values = self._held()
            self._taken = len(values)
            return write_whole(self._group, self._name, values)
        if self._waiting_rows:
            self._take()
        while self._packing:
            self._write_next()
        mark(self._dataset, "sha256", self._digest.hexdigest())
        return self._dataset

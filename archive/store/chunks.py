"""Chunks of a dataset: how large, how packed, and written in which order.

Every chunk passes shuffle (for numbers wider than a byte), deflate and Fletcher's checksum, the three filters that
every HDF5 build reads. They are applied here and the result is handed to HDF5 as it stands, because the deflate of
`isal` packs 1 MB of measured numbers in 25 ms where zlib needs 170 ms (measured on one core, level 2 against level 4,
files 7 % larger); the stream is an ordinary zlib stream. It also means that chunks lie in the file in the order they
were written, whatever the library's cache would have done.

References
----------
.. [1] HDF5 File Format Specification, version 3.0, section IV.A.2.l (filter pipeline message).
.. [2] J. G. Fletcher, "An arithmetic checksum for serial transmissions", IEEE Trans. Commun. 30, 247 (1982).
"""

from __future__ import annotations

import hashlib
import itertools
from typing import Any

import h5py
import numpy as np
from isal import isal_zlib
from numpy.typing import NDArray

__all__ = ["CHUNK_BYTES", "ChunkStream", "fitted_chunks", "fletcher32", "mark", "write_whole"]

# A damaged byte costs one chunk and a reader fetches whole ones: large enough to pack well, small enough to lose.
CHUNK_BYTES = 262_144
_LEVEL = 2
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
    words = np.frombuffer(data + b"\x00" * (len(data) % 2), dtype=">u2").astype(np.uint64)
    if not words.any():
        return 0
    # Weights are reduced as well: products stay below 2**32, and 2**32 of them fit 64 bits.
    weights = np.arange(len(words), 0, -1, dtype=np.uint64) % np.uint64(65535)
    plain = int(words.sum()) % 65535 or 65535
    weighted = int((words * weights).sum()) % 65535 or 65535
    return weighted << 16 | plain


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


def _packed(data: bytes, itemsize: int) -> tuple[bytes, int]:
    """Return a chunk after all filters, and its filter mask."""
    mask = 0
    shuffled = data
    if itemsize > 1:
        shuffled = np.frombuffer(data, dtype=np.uint8).reshape(-1, itemsize).T.tobytes()
    packed = isal_zlib.compress(shuffled, _LEVEL)
    if len(packed) >= len(shuffled):  # packed already, as many raw files are
        packed = shuffled
        mask = _SKIP_DEFLATE << int(_shuffles(itemsize))
    return packed + fletcher32(packed).to_bytes(4, "little"), mask


def _shuffles(itemsize: int) -> bool:
    return itemsize > 1


def _created(
    group: h5py.Group,
    name: str,
    dtype: np.dtype[Any],
    *,
    shape: tuple[int, ...],
    chunks: tuple[int, ...],
    grows: bool,
) -> h5py.Dataset:
    text = dtype.kind == "S"
    return group.create_dataset(
        name,
        shape=shape,
        # HDF5 takes no chunk longer than an axis that cannot grow, and none of length zero.
        maxshape=tuple(None if grows or length == 0 else length for length in shape),
        dtype=h5py.string_dtype("utf-8", dtype.itemsize) if text else dtype,
        chunks=chunks,
        shuffle=_shuffles(_shuffle_width(dtype)),
        compression="gzip",
        compression_opts=4,
        fletcher32=True,
        track_times=False,
    )


def _shuffle_width(dtype: np.dtype[Any]) -> int:
    # Shuffling text would only scatter its words.
    return 1 if dtype.kind == "S" else dtype.itemsize


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
    dataset = _created(group, name, data.dtype, shape=data.shape, chunks=chunks, grows=False)
    counts = [-(-length // chunk) for length, chunk in zip(data.shape, chunks, strict=True)]
    for place in itertools.product(*map(range, counts)):
        offset = tuple(i * chunk for i, chunk in zip(place, chunks, strict=True))
        part = data[tuple(slice(o, o + chunk) for o, chunk in zip(offset, chunks, strict=True))]
        full = np.zeros(chunks, dtype=data.dtype)
        full[tuple(slice(0, length) for length in part.shape)] = part
        packed, mask = _packed(full.tobytes(), _shuffle_width(data.dtype))
        dataset.id.write_direct_chunk(offset, packed, mask)
    mark(dataset, "sha256", hashlib.sha256(data.tobytes()).hexdigest())
    return dataset


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

    Notes
    -----
    What reaches the file depends on the values alone, never on how they were cut into blocks: data that fit one chunk
    become a dataset of fixed length with a chunk of just that length, longer data one that can grow.
    """

    def __init__(self, group: h5py.Group, name: str, dtype: np.dtype[Any]) -> None:
        self._group, self._name, self._dtype = group, name, dtype
        self._chunk = max(1, CHUNK_BYTES // dtype.itemsize)
        self._waiting: list[NDArray[Any]] = []
        self._waiting_rows = 0
        self._dataset: h5py.Dataset | None = None
        self._digest = hashlib.sha256()
        self._written = 0

    @property
    def rows(self) -> int:
        """Return the number of values taken so far."""
        return self._written + self._waiting_rows

    def append(self, values: NDArray[Any]) -> None:
        """Take more values of the stream's own dtype."""
        while self._waiting_rows + len(values) > self._chunk:
            room = self._chunk - self._waiting_rows
            self._hold(values[:room])
            self._write()
            values = values[room:]
        self._hold(values)

    def _hold(self, values: NDArray[Any]) -> None:
        if len(values):
            self._waiting.append(
                np.array(values, dtype=self._dtype)
            )  # a copy: the caller may reuse its buffer
            self._waiting_rows += len(values)

    def _write(self) -> None:
        values = np.concatenate(self._waiting) if self._waiting else np.empty(0, dtype=self._dtype)
        self._waiting, self._waiting_rows = [], 0
        if self._dataset is None:
            self._dataset = _created(
                self._group, self._name, self._dtype, shape=(0,), chunks=(self._chunk,), grows=True
            )
        start, stop = self._written, self._written + len(values)
        self._dataset.resize((stop,))
        full = np.zeros(self._chunk, dtype=self._dtype)
        full[: len(values)] = values
        packed, mask = _packed(full.tobytes(), _shuffle_width(self._dtype))
        self._dataset.id.write_direct_chunk((start,), packed, mask)
        self._digest.update(values.tobytes())
        self._written = stop

    def finish(self) -> h5py.Dataset:
        """Write what is left and return the dataset, with its digest as attribute ``sha256``."""
        if self._dataset is None:
            values = np.concatenate(self._waiting) if self._waiting else np.empty(0, dtype=self._dtype)
            self._waiting = []
            return write_whole(self._group, self._name, values)
        if self._waiting_rows:
            self._write()
        mark(self._dataset, "sha256", self._digest.hexdigest())
        return self._dataset

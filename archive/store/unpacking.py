"""Rows of a dataset out of its chunks, unpacked here and several at once.

HDF5 finds the chunks and hands them out as they lie in the file; checksum, deflate and shuffle are undone here, because the
inflate of `isal` takes half the time of zlib's, and HDF5 lets in one thread at a time. A dataset that is packed in any
other way than sealed files are is read by HDF5 itself.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Iterator
from concurrent.futures import Executor, Future, ThreadPoolExecutor
from typing import Any, cast

import h5py
import numpy as np
from isal import isal_zlib
from numpy.typing import NDArray

from archive.store.chunks import fletcher32
from archive.store.cores import usable_cores

__all__ = ["parts_of", "rows_of"]

_PIPELINES = (
    [h5py.h5z.FILTER_DEFLATE, h5py.h5z.FILTER_FLETCHER32],
    [h5py.h5z.FILTER_SHUFFLE, h5py.h5z.FILTER_DEFLATE, h5py.h5z.FILTER_FLETCHER32],
)
_INFLATE_FAULT = cast("type[Exception]", isal_zlib.error)
_FEW = 4  # so many chunks are unpacked sooner than threads are started
_AHEAD = 8  # chunks that are being unpacked before the first is taken


def rows_of(dataset: h5py.Dataset, start: int | None = None, stop: int | None = None) -> NDArray[Any]:
    """Return all rows of a dataset, or those from `start` to before `stop`, counted as in slices.

    Raises
    ------
    OSError
        If a chunk has another checksum than its own, or does not unpack to its size; HDF5 raises others, too.
    """
    if not _plainly_packed(dataset):
        whole = dataset.shape == () or (start is None and stop is None)
        return np.asarray(dataset[()] if whole else dataset[start:stop])
    first, last, _ = slice(start, stop).indices(dataset.shape[0])
    values = np.empty(max(0, last - first), dtype=dataset.dtype)
    chunks = -(-len(values) // dataset.chunks[0])
    if chunks <= _FEW:
        _fill(values, _parts(dataset, first, last, None))
        return values
    with ThreadPoolExecutor(min(chunks, usable_cores()), "stillroom-unpacking") as workers:
        _fill(values, _parts(dataset, first, last, workers))
    return values


def _fill(values: NDArray[Any], parts: Iterator[NDArray[Any]]) -> None:
    done = 0
    for part in parts:
        values[done : done + len(part)] = part
        done += len(part)


def parts_of(dataset: h5py.Dataset, workers: Executor | None) -> Iterator[NDArray[Any]]:
    """Yield all rows of a dataset part by part, in order; `workers` unpack what comes next.

    Raises
    ------
    OSError
        As of `rows_of`.
    """
    if _plainly_packed(dataset):
        few = dataset.shape[0] <= dataset.chunks[0]
        yield from _parts(dataset, 0, dataset.shape[0], None if few else workers)
    elif dataset.shape == () or dataset.size == 0:
        yield np.asarray(dataset[()])
    else:
        step = dataset.chunks[0] if dataset.chunks else dataset.shape[0]
        for start in range(0, dataset.shape[0], step):
            yield dataset[start : start + step]


def _plainly_packed(dataset: h5py.Dataset) -> bool:
    if len(dataset.shape) != 1 or not dataset.chunks or dataset.dtype.kind not in "fiuS":
        return False
    plan = dataset.id.get_create_plist()
    return [plan.get_filter(k)[0] for k in range(plan.get_nfilters())] in _PIPELINES


def _parts(dataset: h5py.Dataset, first: int, last: int, workers: Executor | None) -> Iterator[NDArray[Any]]:
    length, dtype, shuffled = dataset.chunks[0], dataset.dtype, dataset.shuffle
    waiting: deque[tuple[int, Future[NDArray[Any]]]] = deque()
    for place in range(first // length * length, last, length):
        mask, stored = dataset.id.read_direct_chunk((place,))
        if workers is None:
            yield _unpacked(stored, mask, length, dtype, shuffled)[max(0, first - place) : last - place]
            continue
        waiting.append((place, workers.submit(_unpacked, stored, mask, length, dtype, shuffled)))
        if len(waiting) > _AHEAD:
            begin, unpacking = waiting.popleft()
            yield unpacking.result()[max(0, first - begin) : last - begin]
    for begin, unpacking in waiting:
        yield unpacking.result()[max(0, first - begin) : last - begin]


def _unpacked(stored: bytes, mask: int, length: int, dtype: np.dtype[Any], shuffled: bool) -> NDArray[Any]:  # noqa: FBT001 - for threads
    """Return the values of a chunk as it lies in the file."""
    deflate, checksum = int(shuffled), int(shuffled) + 1  # which bit of the mask says that it was left out
    size = length * dtype.itemsize
    content = stored
    if not mask >> checksum & 1:
        content = stored[:-4]
        if fletcher32(content) != int.from_bytes(stored[-4:], "little"):
            message = "a chunk is damaged: its checksum is another"
            raise OSError(message)
    if not mask >> deflate & 1:
        try:
            # A byte more than there should be, so that a chunk which unpacks to more is found, and no larger.
            content = isal_zlib.decompressobj().decompress(content, size + 1)
        except _INFLATE_FAULT as error:
            message = f"a chunk is damaged: {error}"
            raise OSError(message) from error
    if len(content) != size:
        message = f"a chunk is damaged: it unpacks to {len(content)} bytes or more, expected {size}"
        raise OSError(message)
    if shuffled and not mask & 1:
        # Shuffle is a table of bytes turned over: all first bytes, then all second ones.
        return np.frombuffer(content, np.uint8).reshape(dtype.itemsize, length).T.copy().view(dtype)[:, 0]
    return np.frombuffer(content, dtype)

"""How a sealed file is laid out in HDF5, and the writing of one.

::

    /                    attributes: format, key
    /document            the JSON metadata document, one UTF-8 string
    /raw/<name>          a raw file's bytes; attributes: file_name, media_type, size, sha256
    /<group>/<column>    channels of a table; attributes: units, ucum, quantity, description, ..., sha256
    /<path>              small arrays

Superblock version 3 (``libver`` v110): older bounds have no mark for a file that was not closed, newer ones cannot be
read by the HDF5 1.10 tools that many machines have. No time stamps and a fixed order, so that equal input gives equal
bytes (with equal versions of HDF5 and of the compressor). ``sha256`` of a dataset is that of its stored values
(little-endian, C order; text NUL-padded UTF-8) and does not depend on any compressor.

References
----------
.. [1] HDF5 File Format Specification, version 3.0.
.. [2] HDF5 Dimension Scale Specification, The HDF Group.
"""

from __future__ import annotations

import contextlib
import re
from collections.abc import Iterable, Iterator, Mapping, Sequence
from concurrent.futures import Executor, ThreadPoolExecutor
from pathlib import Path
from typing import Any

import h5py
import numpy as np
from numpy.typing import NDArray

from archive.errors import ArchiveError, BadRequest
from archive.store.audit import text_of
from archive.store.blocks import (
    checked_array,
    checked_attributes,
    checked_block,
    checked_columns,
    checked_text,
    column_attributes,
)
from archive.store.chunks import ChunkStream, mark, write_whole
from archive.store.cores import usable_cores
from archive.store.interface import Column, TableWriter
from archive.store.names import checked_raw_name

__all__ = ["FORMAT", "SealedTableWriter", "SealedWriter", "writing"]

FORMAT = "stillroom sealed file 1"


@contextlib.contextmanager
def writing(path: Path) -> Iterator[None]:
    """Return a context that turns a failed write to disk into a sentence."""
    try:
        yield
    except (OSError, RuntimeError, ValueError, KeyError) as error:
        # HDF5 tells the same failed write in several ways, the more so when it closes a file.
        if not isinstance(error, OSError) and "errno = " not in str(error):
            raise
        raise ArchiveError(
            "the archive could not be written to; nothing of this file was kept",
            file=str(path),
            found=_system_message(getattr(error, "strerror", None) or str(error)),
            remedy="make room or mend the disk, then try again",
        ) from error


def _system_message(text: str) -> str:
    """Return what the system said, out of what HDF5 made of it: buffers, descriptors and offsets help nobody."""
    said = re.search(r"error message = '([^']+)'", text)
    return said[1] if said else text


class SealedTableWriter:
    """A table of a sealed file being written.

    Notes
    -----
    Text waits in memory until the end, because its width is not known before; numbers go to disk chunk by chunk.
    """

    def __init__(
        self,
        file: h5py.File,
        path: Path,
        group: str,
        columns: tuple[Column, ...],
        index: str | None,
        packers: Executor,
    ) -> None:
        self._path, self._group, self._columns, self._index = path, group, columns, index
        self._node = file.create_group(group, track_order=True)
        mark(self._node, "columns", [column.name for column in columns])
        if index is not None:
            mark(self._node, "index", index)
        kinds = {"float64": np.dtype("<f8"), "int64": np.dtype("<i8")}
        self._streams = {
            column.name: ChunkStream(self._node, column.name, kinds[column.dtype], packers=packers)
            for column in columns
            if column.dtype != "str"
        }
        self._texts: dict[str, list[NDArray[Any]]] = {c.name: [] for c in columns if c.dtype == "str"}
        self._rows = 0
        self._open = True

    @property
    def rows(self) -> int:
        """Return the number of rows appended so far."""
        return self._rows

    def append(self, block: Mapping[str, NDArray[Any]]) -> None:
        """Append rows: one array of equal length for each column."""
        if not self._open:
            raise BadRequest("the table is closed", field=self._group)
        stored = checked_block(self._group, self._columns, block)
        with writing(self._path):
            for name, values in stored.items():
                if name in self._texts:
                    self._texts[name].append(values)
                else:
                    self._streams[name].append(values)
        self._rows += len(next(iter(stored.values())))

    def finish(self) -> dict[str, str]:
        """Write what is left, set attributes and scales, and return each dataset's digest by its path."""
        self._open = False
        datasets: dict[str, h5py.Dataset] = {}
        for column in self._columns:
            if column.dtype == "str":
                values = np.concatenate([np.empty(0, dtype="S1"), *self._texts[column.name]])
                datasets[column.name] = write_whole(self._node, column.name, values)
            else:
                datasets[column.name] = self._streams[column.name].finish()
            for name, value in column_attributes(column, self._columns).items():
                datasets[column.name].attrs[name] = value
        self._node.attrs["rows"] = self._rows
        self._attach(datasets)
        return {f"{self._group}/{name}": text_of(d.attrs["sha256"]) for name, d in datasets.items()}

    def _attach(self, datasets: Mapping[str, h5py.Dataset]) -> None:
        if self._index is None:
            return
        scale = datasets[self._index]
        scale.make_scale(self._index)
        for name, dataset in datasets.items():
            if name != self._index:  # a scale has no scale [2]
                dataset.dims[0].label = self._index
                dataset.dims[0].attach_scale(scale)


class SealedWriter:
    """One sealed file being written at `path`; what becomes of it there is the store's business.

    Parameters
    ----------
    path : Path
        A path where nothing lies yet.
    key : str
        Written into the file, so that it can say what it is when it is found somewhere else.
    jobs : int, optional
        Threads that pack; as many as this process may use processors if left out. The bytes do not depend on it.
    """

    def __init__(self, path: Path, key: str, *, jobs: int | None = None) -> None:
        self.path, self.key = path, key
        self._tables: list[SealedTableWriter] = []
        self._digests: dict[str, str] = {}
        self._documented = False
        self._open = True
        self._packers = ThreadPoolExecutor(jobs or usable_cores(), "stillroom-packing")
        with writing(path):
            self._file = h5py.File(
                path, "x", libver=("v110", "v110"), track_order=True, track_times=False, locking="best-effort"
            )
            mark(self._file, "format", FORMAT)
            mark(self._file, "key", key)

    def raw(self, name: str, blocks: Iterable[bytes], *, media_type: str = "application/octet-stream") -> str:
        """Keep a raw file's bytes verbatim and return their SHA-256."""
        path = f"raw/{checked_raw_name(name)}"
        self._require_free(path)
        attributes = checked_attributes(path, {"file_name": name, "media_type": media_type})
        stream = ChunkStream(self._file, path, np.dtype("u1"), packers=self._packers)
        for block in blocks:  # outside `writing`: what fails here is the source, not the archive
            with writing(self.path):
                stream.append(np.frombuffer(block, dtype=np.uint8))
        with writing(self.path):
            dataset = stream.finish()
            for attribute, value in (attributes | {"size": stream.rows}).items():
                dataset.attrs[attribute] = value
            self._digests[path] = text_of(dataset.attrs["sha256"])
        return self._digests[path]

    def table(self, group: str, columns: Sequence[Column], *, index: str | None = None) -> TableWriter:
        """Return a writer for channels of equal length; `index` names the column the others stand against."""
        checked = checked_columns(group, columns, index=index)
        self._require_free(group)
        with writing(self.path):
            table = SealedTableWriter(self._file, self.path, group, checked, index, self._packers)
        self._tables.append(table)
        return table

    def array(self, path: str, data: NDArray[Any], attributes: Mapping[str, str | float | int]) -> None:
        """Keep a small array whole."""
        values = checked_array(path, data)
        checked = checked_attributes(path, attributes)
        self._require_free(path)
        with writing(self.path):
            dataset = write_whole(self._file, path, values)
            self._digests[path] = text_of(dataset.attrs["sha256"])
            for name, value in checked.items():
                dataset.attrs[name] = value

    def document(self, text: str) -> None:
        """Keep the JSON metadata document; once, and never left out."""
        self._require_free("document")
        encoded = checked_text(text, field="document")
        if not encoded:
            raise BadRequest("the document is empty", field="document")
        with writing(self.path):
            dataset = write_whole(self._file, "document", np.array([encoded]))
            dataset.attrs["media_type"] = "application/json"
            self._digests["document"] = text_of(dataset.attrs["sha256"])
        self._documented = True

    def finish(self) -> dict[str, str]:
        """Close the file and return the digest of each dataset by its path."""
        self._require_open()
        if not self._documented:
            raise BadRequest("a sealed file needs its document", field="document", file=self.key)
        with writing(self.path):
            for table in self._tables:
                self._digests |= table.finish()
            self._open = False
            self._file.close()
        self._packers.shutdown()
        return self._digests

    def close(self) -> None:
        """Let go of the file, whatever state it is in; it is to be thrown away."""
        self._open = False
        self._packers.shutdown(cancel_futures=True)
        # On a full disk HDF5 cannot flush and says so in several ways; the file is removed all the same.
        with contextlib.suppress(OSError, RuntimeError, ValueError):
            self._file.close()

    def _require_open(self) -> None:
        if not self._open:
            raise BadRequest("the file is sealed or abandoned; it takes nothing more", field="writer")

    def _require_free(self, path: str) -> None:
        """Refuse a path that is taken, or that runs through a table or dataset."""
        self._require_open()
        parts = path.split("/")
        for depth in range(1, len(parts) + 1):
            node = self._file.get("/".join(parts[:depth]))
            if node is None:
                return
            if depth == len(parts) or isinstance(node, h5py.Dataset) or "columns" in node.attrs:
                break
        raise BadRequest("this path of the file is taken", file=self.key, field=path)

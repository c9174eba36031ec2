"""The reference store: what a store means, in plain Python, for tests.

It shares the rules about names and values with `archive.store.local` and nothing else, so that the two can be compared.
"""

from __future__ import annotations

import contextlib
import hashlib
import json
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from archive.errors import AlreadySealed, BadRequest, MissingFile, UnknownAddress
from archive.store.blocks import (
    checked_array,
    checked_attributes,
    checked_block,
    checked_columns,
    checked_text,
    column_attributes,
    sha256_of,
)
from archive.store.interface import Attributes, Column, Damage, SealedFile, TableWriter, Writer
from archive.store.names import checked_key, checked_raw_name

__all__ = ["MemoryStore"]


@dataclass
class _File:
    """What a sealed file holds: values and attributes by path, and the columns of each table."""

    values: dict[str, NDArray[Any]] = field(default_factory=dict)
    attributes: dict[str, Attributes] = field(default_factory=dict)
    tables: dict[str, list[str]] = field(default_factory=dict)

    def canonical(self) -> bytes:
        """Return bytes that are equal if and only if the contents are."""
        parts = [json.dumps([self.attributes, self.tables], sort_keys=True).encode()]
        for path in sorted(self.values):
            values = self.values[path]
            parts += [f"\n{path} {values.dtype} {values.shape}\n".encode(), values.tobytes()]
        return b"".join(parts)


class _MemoryTable:
    def __init__(self, group: str, columns: tuple[Column, ...]) -> None:
        self.group, self.columns = group, columns
        self._blocks: list[dict[str, NDArray[Any]]] = []
        self._open = True

    @property
    def rows(self) -> int:
        return sum(len(block[self.columns[0].name]) for block in self._blocks)

    def append(self, block: Mapping[str, NDArray[Any]]) -> None:
        if not self._open:
            raise BadRequest("the table is closed", field=self.group)
        stored = checked_block(self.group, self.columns, block)
        self._blocks.append({name: values.copy() for name, values in stored.items()})

    def finish(self) -> dict[str, NDArray[Any]]:
        self._open = False
        empty = {"float64": "<f8", "int64": "<i8", "str": "S1"}
        return {
            column.name: np.concatenate(
                [np.empty(0, dtype=empty[column.dtype]), *(block[column.name] for block in self._blocks)]
            )
            for column in self.columns
        }


class _MemoryWriter:
    def __init__(self, files: dict[str, _File], key: str) -> None:
        self._files, self._key = files, key
        self._file = _File()
        self._file.attributes["/"] = {"key": key}
        self._tables: list[_MemoryTable] = []
        self._open = True

    def _require_free(self, path: str) -> None:
        if not self._open:
            raise BadRequest("the file is sealed or abandoned; it takes nothing more", field="writer")
        leaves = [*self._file.values, *self._file.tables]
        if any(path == leaf or path.startswith(f"{leaf}/") or leaf.startswith(f"{path}/") for leaf in leaves):
            raise BadRequest("this path of the file is taken", file=self._key, field=path)

    def _keep(self, path: str, values: NDArray[Any], attributes: Mapping[str, str | float | int]) -> None:
        self._file.values[path] = values
        self._file.attributes[path] = {**attributes, "sha256": sha256_of(values.tobytes())}

    def raw(self, name: str, blocks: Iterable[bytes], *, media_type: str = "application/octet-stream") -> str:
        path = f"raw/{checked_raw_name(name)}"
        self._require_free(path)
        attributes = checked_attributes(path, {"file_name": name, "media_type": media_type})
        data = b"".join(blocks)
        self._keep(path, np.frombuffer(data, dtype=np.uint8), {**attributes, "size": len(data)})
        return sha256_of(data)

    def table(self, group: str, columns: Sequence[Column], *, index: str | None = None) -> TableWriter:
        checked = checked_columns(group, columns, index=index)
        self._require_free(group)
        table = _MemoryTable(group, checked)
        self._tables.append(table)
        self._file.tables[group] = [column.name for column in checked]
        self._file.attributes[group] = {"columns": self._file.tables[group]}
        if index is not None:
            self._file.attributes[group]["index"] = index
        return table

    def array(self, path: str, data: NDArray[Any], attributes: Mapping[str, str | float | int]) -> None:
        values = checked_array(path, data)
        checked = checked_attributes(path, attributes)
        self._require_free(path)
        self._keep(path, values.copy(), checked)

    def document(self, text: str) -> None:
        self._require_free("document")
        encoded = checked_text(text, field="document")
        if not encoded:
            raise BadRequest("the document is empty", field="document")
        self._keep("document", np.array([encoded]), {"media_type": "application/json"})

    def seal(self) -> SealedFile:
        if not self._open:
            raise BadRequest("the file is sealed or abandoned; it takes nothing more", field="writer")
        if "document" not in self._file.values:
            raise BadRequest("a sealed file needs its document", field="document", file=self._key)
        for table in self._tables:
            for name, values in table.finish().items():
                column = next(c for c in table.columns if c.name == name)
                self._keep(f"{table.group}/{name}", values, column_attributes(column, table.columns))
            self._file.attributes[table.group]["rows"] = table.rows
        self._open = False
        if self._key in self._files:
            raise AlreadySealed(f"{self._key} is sealed already")
        self._files[self._key] = self._file
        return _described(self._key, self._file)

    def abandon(self) -> None:
        self._open = False


def _described(key: str, file: _File) -> SealedFile:
    data = file.canonical()
    return SealedFile(key, hashlib.sha256(data).hexdigest(), len(data))


class MemoryStore:
    """Sealed files that live as long as the object; see `archive.store.interface.Store`."""

    def __init__(self) -> None:
        self._files: dict[str, _File] = {}

    @contextlib.contextmanager
    def writer(self, key: str) -> Iterator[Writer]:
        """Return a context that yields a writer and abandons it unless `seal` was called."""
        if self.contains(key):
            raise AlreadySealed(f"{key} is sealed already")
        writer = _MemoryWriter(self._files, key)
        try:
            yield writer
        finally:
            writer.abandon()

    def keys(self, prefix: str = "") -> list[str]:
        """Return the keys that begin with `prefix`, sorted."""
        return sorted(key for key in self._files if key.startswith(prefix))

    def contains(self, key: str) -> bool:
        """Return whether the key is taken."""
        return checked_key(key) in self._files

    def describe(self, key: str) -> SealedFile:
        """Return size and digest of the contents."""
        return _described(key, self._file(key))

    def document(self, key: str) -> str:
        """Return the JSON metadata document."""
        return bytes(self._file(key).values["document"][0]).decode("utf-8")

    def tables(self, key: str) -> dict[str, list[str]]:
        """Return the column names of each table, by the path of its group."""
        return {group: list(names) for group, names in self._file(key).tables.items()}

    def column(self, key: str, path: str, start: int | None = None, stop: int | None = None) -> NDArray[Any]:
        """Return a copy of a column or array, or its rows from `start` to before `stop`."""
        values = self._value(key, path)
        if values.ndim:
            values = values[start:stop]
        return np.strings.decode(values, "utf-8") if values.dtype.kind == "S" else values.copy()

    def attributes(self, key: str, path: str) -> Attributes:
        """Return the attributes of a dataset or group."""
        try:
            return dict(self._file(key).attributes[path or "/"])
        except KeyError:
            raise UnknownAddress("the file holds nothing of this name", file=key, field=path) from None

    def raw_names(self, key: str) -> list[str]:
        """Return the names of the raw files, sorted."""
        paths = self._file(key).values
        return sorted(path.removeprefix("raw/") for path in paths if path.startswith("raw/"))

    def raw(self, key: str, name: str) -> Iterator[bytes]:
        """Yield a raw file's bytes in blocks."""
        yield self._value(key, f"raw/{name}").tobytes()

    def raw_digest(self, key: str, name: str) -> str:
        """Return a raw file's recorded SHA-256."""
        return str(self.attributes(key, f"raw/{name}")["sha256"])

    def verify(self, key: str, sha256: str | None = None) -> list[Damage]:
        """Return all damage found; memory does not decay, so only a wrong digest or name can be found."""
        if not self.contains(key):
            return [Damage(key, "missing", "the file is not in the archive", expected=sha256)]
        found = self.describe(key).sha256
        if sha256 not in (None, found):
            what = "the bytes are not those that were sealed"
            return [Damage(key, "damaged", what, expected=sha256, found=found)]
        return []

    def strays(self) -> list[str]:
        """Return nothing: nobody else can put things here."""
        return []

    def _file(self, key: str) -> _File:
        if not self.contains(key):
            raise MissingFile(f"{key} is not in the archive")
        return self._files[key]

    def _value(self, key: str, path: str) -> NDArray[Any]:
        try:
            return self._file(key).values[path]
        except KeyError:
            raise UnknownAddress("the file holds nothing of this name", file=key, field=path) from None

"""What a store of sealed files can do: a dozen verbs, and the few things they exchange.

Rules: a file is written once and whole; there is no overwrite and no delete; damage is never reported as absence.
Two stores keep these rules, `archive.store.local` (HDF5 files in a folder) and `archive.store.memory` (the reference,
in plain Python); one test suite runs on both.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from contextlib import AbstractContextManager
from dataclasses import dataclass
from typing import Any, Literal, Protocol

from numpy.typing import NDArray

__all__ = ["Attributes", "Column", "Damage", "SealedFile", "Store", "TableWriter", "Writer"]

Attributes = dict[str, str | int | float | list[str] | list[int] | list[float]]


@dataclass(frozen=True)
class SealedFile:
    """A file that never changes again.

    Parameters
    ----------
    key : str
        Its name in the store, ``folder/name`` without a suffix, such as ``2026-03/s017@film-transition.2``.
    sha256 : str
        Digest of all its bytes, 64 hexadecimal digits in lower case.
    size : int
        Number of bytes.
    """

    key: str
    sha256: str
    size: int


@dataclass(frozen=True)
class Column:
    """One channel of a table: what its numbers mean.

    Parameters
    ----------
    name : str
        Name within the table.
    dtype : {"float64", "int64", "str"}
        How it is stored.
    unit, ucum : str
        The unit as this trade writes it, and its code in the Unified Code for Units of Measure; both may be empty.
    quantity : str
        The quantity kind, such as ``temperature``.
    description : str
        One sentence for a reader who has nothing but the file.
    uncertainty_of : str, optional
        The column of the same table whose standard uncertainty this is.
    """

    name: str
    dtype: Literal["float64", "int64", "str"]
    unit: str
    ucum: str
    quantity: str
    description: str
    uncertainty_of: str | None = None


@dataclass(frozen=True)
class Damage:
    """One thing that is not as it was sealed.

    Parameters
    ----------
    key : str
        The sealed file, or the path below the archive of a stray file.
    kind : {"damaged", "missing", "stray"}
        Bytes changed or unreadable; recorded but not there; there but not recorded.
    what : str
        One sentence.
    dataset : str, optional
        The dataset inside the file, when the damage lies in one.
    expected, found : str, optional
        The two digests, sizes or names that differ.
    """

    key: str
    kind: Literal["damaged", "missing", "stray"]
    what: str
    dataset: str | None = None
    expected: str | None = None
    found: str | None = None


class TableWriter(Protocol):
    """A table being written, block by block."""

    @property
    def rows(self) -> int:
        """Return the number of rows appended so far."""
        ...

    def append(self, block: Mapping[str, NDArray[Any]]) -> None:
        """Append rows: one array of equal length for each column, no column more or fewer."""
        ...


class Writer(Protocol):
    """One sealed file being written; nothing of it is in the store before `seal` has returned."""

    def raw(self, name: str, blocks: Iterable[bytes], *, media_type: str = "application/octet-stream") -> str:
        """Keep a raw file's bytes verbatim and return their SHA-256."""
        ...

    def table(self, group: str, columns: Sequence[Column], *, index: str | None = None) -> TableWriter:
        """Return a writer for channels of equal length; `index` names the column the others stand against."""
        ...

    def array(self, path: str, data: NDArray[Any], attributes: Mapping[str, str | float | int]) -> None:
        """Keep a small array whole."""
        ...

    def document(self, text: str) -> None:
        """Keep the JSON metadata document, the file's description of itself; once, and never left out."""
        ...

    def seal(self) -> SealedFile:
        """Finish the file and return what it became; raises AlreadySealed if the name is taken."""
        ...

    def abandon(self) -> None:
        """Leave no trace."""
        ...


class Store(Protocol):
    """Sealed files by key.

    Notes
    -----
    Reading a key the store does not hold raises MissingFile; a path that an undamaged file does not hold raises
    UnknownAddress; anything that is there but cannot be read as it was sealed raises DamagedFile.
    """

    def writer(self, key: str) -> AbstractContextManager[Writer]:
        """Return a context that yields a writer and abandons it unless `seal` was called."""
        ...

    def keys(self, prefix: str = "") -> list[str]:
        """Return the keys that begin with `prefix`, validated and sorted."""
        ...

    def contains(self, key: str) -> bool:
        """Return whether the key is taken, by a whole file or a damaged one."""
        ...

    def describe(self, key: str) -> SealedFile:
        """Return size and digest, computed afresh from the bytes."""
        ...

    def document(self, key: str) -> str:
        """Return the JSON metadata document."""
        ...

    def tables(self, key: str) -> dict[str, list[str]]:
        """Return the column names of each table, by the path of its group."""
        ...

    def column(self, key: str, path: str, start: int | None = None, stop: int | None = None) -> NDArray[Any]:
        """Return a column or array, or its rows from `start` to before `stop`."""
        ...

    def attributes(self, key: str, path: str) -> Attributes:
        """Return the attributes of a dataset or group; links between datasets are left out."""
        ...

    def raw_names(self, key: str) -> list[str]:
        """Return the names of the raw files, sorted."""
        ...

    def raw(self, key: str, name: str) -> Iterator[bytes]:
        """Yield a raw file's bytes in blocks."""
        ...

    def raw_digest(self, key: str, name: str) -> str:
        """Return a raw file's recorded SHA-256."""
        ...

    def verify(self, key: str, sha256: str | None = None) -> list[Damage]:
        """Reread everything and return all damage found; an empty list means every byte is as sealed."""
        ...

    def strays(self) -> list[str]:
        """Return the paths of things that lie where sealed files lie and are none, sorted."""
        ...

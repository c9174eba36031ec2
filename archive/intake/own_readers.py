"""Readers of file formats that a laboratory adds for its own instruments.

Rules: they come by the entry point group `stillroom.readers`, here and nowhere else; a reader owns suffixes that nothing
else has; what it gives is checked like the arrays of any other source, and the raw bytes are kept beside it.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cache
from importlib.metadata import entry_points
from pathlib import Path
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from archive.errors import BadRequest

__all__ = ["Reader", "own_reader", "own_readers"]

_GROUP: Final = "stillroom.readers"
# Read by Stillroom itself: text tables, packed or not, and array files (`archive.intake.sources`).
_TAKEN: Final = frozenset(
    {".csv", ".tsv", ".txt", ".gz", ".npy", ".npz", ".h5", ".hdf5", ".hdf", ".he5", ".nxs", ".toml"}
)


@dataclass(frozen=True)
class Reader:
    """A reader of one file format.

    Attributes
    ----------
    name : str
        For messages and for the note that stays with what it read.
    version : int
        Rises when the same file may be read otherwise.
    suffixes : tuple of str
        Endings of file names, in lower case with the dot, such as `.lvm`.
    function : callable
        `function(path) -> mapping of column name to array`: one-dimensional arrays of numbers, of text for text
        channels, and for instants numbers of POSIX seconds or ISO 8601 text with an offset. The sheet names the columns.
        It raises ValueError with a sentence about a file that it cannot read.
    """

    name: str
    version: int
    suffixes: tuple[str, ...]
    function: Callable[[Path], Mapping[str, npt.NDArray[Any]]]
    package: str = ""
    """Name and version of the package that brings it; filled in where it is loaded."""

    def columns(self, path: Path) -> dict[str, npt.NDArray[Any]]:
        """Columns of a file.

        Raises
        ------
        ValueError
            With the sentence of whatever stopped the reader.
        """
        try:
            return {str(name): np.asarray(values) for name, values in self.function(path).items()}
        except ValueError:
            raise
        except Exception as error:  # noqa: BLE001 - foreign code may fail in any way; the other files are read all the same
            raise ValueError(f"the reader {self.name} failed: {type(error).__name__}: {error}") from None


@cache
def own_readers() -> dict[str, Reader]:
    """The laboratory's readers by suffix.

    Raises
    ------
    BadRequest
        An entry point that cannot be loaded, is no reader, or claims a suffix that is taken.
    """
    found: dict[str, Reader] = {}
    for entry in sorted(entry_points(group=_GROUP), key=lambda each: each.name):
        try:
            loaded = entry.load()
        except (ImportError, AttributeError) as error:
            raise BadRequest(
                f"the laboratory's reader {entry.name} ({entry.value}) cannot be loaded: {error}",
                remedy="mend or remove the package that brings it",
            ) from None
        if not isinstance(loaded, Reader) or not loaded.suffixes:
            raise BadRequest(f"the entry point {entry.name} of {_GROUP} is no Reader with suffixes")
        brought = "" if entry.dist is None else f"{entry.dist.name} {entry.dist.version}"
        reader = Reader(loaded.name, loaded.version, loaded.suffixes, loaded.function, brought)
        for suffix in reader.suffixes:
            _refuse(suffix, entry.name, found)
            found[suffix] = reader
    return found


def _refuse(suffix: str, name: str, found: Mapping[str, Reader]) -> None:
    if not suffix.startswith(".") or suffix != suffix.lower() or len(suffix) < 2:
        raise BadRequest(
            f"the laboratory's reader {name} claims {suffix!r}",
            expected="a suffix such as .lvm, in lower case",
        )
    if suffix in _TAKEN:
        raise BadRequest(
            f"the laboratory's reader {name} claims {suffix}, which Stillroom reads itself",
            remedy="give the files a suffix of their own",
        )
    if suffix in found:
        raise BadRequest(
            f"the laboratory's readers {found[suffix].name} and {name} both claim {suffix}",
            remedy="remove one of the packages, or let one of them claim another suffix",
        )


def own_reader(file: str) -> Reader | None:
    """Reader for a file of this name, or None if it is none of the laboratory's own formats.

    Examples
    --------
    >>> own_reader("raw/s017.csv") is None
    True
    """
    return own_readers().get(Path(file).suffix.lower())

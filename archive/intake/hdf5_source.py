"""Columns out of an HDF5 file that came from outside, read in a process of its own.

Rules: such a file is not trusted. The HDF5 library has a steady history of memory errors from malformed files, so it
runs in a child with bounded memory and time that may not write; if the child dies, the file is refused and nothing
else happens. Links are looked at before they are followed: external links, external storage and virtual data sets
could pull in any file of this computer and refuse the whole file; soft links are never followed. Only HDF5's own
filters are used and plugins are switched off (`HDF5_PLUGIN_PRELOAD=::`, HDF5 reference manual, H5PL).
"""

from __future__ import annotations

import io
import itertools
import json
import os
import subprocess
import sys
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import numpy as np
import numpy.typing as npt

if TYPE_CHECKING:  # the child needs no records, and starts in half the time without them
    from archive.intake.dialect import ColumnRequest

__all__ = ["LARGEST", "MOST_PACKED", "RefusalError", "column_of", "hdf5_columns", "row_of", "weight"]

LARGEST: Final = 1 << 30
"""Bytes that one source may unpack to, as `weight` counts them; a column of a hundred million doubles is no sweep."""

MOST_PACKED: Final = 1100
"""Deflate packs at most 1032 to 1 (zlib's technical notes, 'Maximum Compression Factor'); more was never stored."""

MOST_OBJECTS: Final = 10_000
DEEPEST: Final = 32
CHILD_SECONDS: Final = 300
# The values, the answer made of them, and what the libraries claim without using it.
_MEMORY: Final = 3 * LARGEST + (1 << 30)
# Registered identifiers of HDF5's own filters: deflate, shuffle, fletcher32, szip, nbit, scale-offset (H5Zpublic.h).
_OWN_FILTERS: Final = frozenset({1, 2, 3, 4, 5, 6})

Columns = dict[str, npt.NDArray[Any]]


class RefusalError(Exception):
    """The whole source, or a column of it, is not read; the sentence says why."""


def weight(dtype: np.dtype[Any]) -> int:
    """Return the bytes that one value comes to once it is read: a double, or text of four bytes a character.

    Examples
    --------
    >>> weight(np.dtype("i1")), weight(np.dtype("S6"))
    (8, 24)
    """
    return max(8, dtype.itemsize * (4 if dtype.kind == "S" else 1))


def hdf5_columns(path: Path, columns: Sequence[ColumnRequest]) -> tuple[Columns, dict[str, str]]:
    """Return the asked columns of an HDF5 file, and per channel why it could not be read.

    Parameters
    ----------
    path : pathlib.Path
        File from outside.
    columns : sequence of ColumnRequest
        Asked for by path of a one-dimensional data set, by path and number or field (`run/table/3`), by path and row
        (`run/table/row/3`) of a table that lies on its side, or by number or field alone if the file has one data set. A data
        set of one number without dimensions is returned as such: it holds for every row.

    Raises
    ------
    RefusalError
        If the file as a whole is not to be read, or the library failed on it.
    """
    asked = json.dumps({"path": str(path.absolute()), "columns": [[c.name, c.column] for c in columns]})
    environment = os.environ | {
        "HDF5_PLUGIN_PRELOAD": "::",
        "PYTHONPATH": os.pathsep.join(filter(None, sys.path)),
    }
    try:
        child = subprocess.run(  # our own interpreter and module, no shell
            [sys.executable, "-P", "-m", "archive.intake.hdf5_source"],
            input=asked.encode(),
            capture_output=True,
            env=environment,
            timeout=CHILD_SECONDS,
            check=False,
        )
    except subprocess.TimeoutExpired:
        raise RefusalError(f"reading it took more than {CHILD_SECONDS} s") from None
    if child.returncode:
        last = child.stderr.decode("utf-8", "backslashreplace").strip().splitlines()[-1:] or ["no message"]
        raise RefusalError(f"the HDF5 library failed on it (exit {child.returncode}: {last[0][:200]})")
    with np.load(io.BytesIO(child.stdout), allow_pickle=False) as answer:
        said = json.loads(answer["said"].tobytes())
        if said["refused"] is not None:
            raise RefusalError(said["refused"])
        read = {name: answer[key] for name, key in said["arrays"].items()}
    return read, said["faults"]


def column_of(
    shape: tuple[int, ...], names: Sequence[str] | None, rest: str | int | None
) -> str | int | None:
    """Return which field or index of an array is the asked column; None for the whole of it.

    Parameters
    ----------
    shape : tuple of int
        Of the array.
    names : sequence of str or None
        Field names of a structured array.
    rest : str, int or None
        Field name, or number from 1, or None for an array that is itself the column.

    Raises
    ------
    RefusalError
        If there is no such column, or no single one.
    """
    if len(shape) not in {1, 2} or (names and len(shape) != 1):
        raise RefusalError(f"it has {len(shape)} dimensions; a column has one, a table of numbers two")
    count = len(names) if names else 1 if len(shape) == 1 else shape[1]
    if rest is None and count != 1:
        raise RefusalError(f"it has {count} columns; ask for one of them by number or field")
    if isinstance(rest, str) and names and rest in names:
        return rest
    try:
        number = 1 if rest is None else int(rest)
    except ValueError:
        raise RefusalError(
            f"it has no field {rest}" + (f"; its fields are {', '.join(names)}" if names else "")
        ) from None
    if not 1 <= number <= count:
        raise RefusalError(f"it has {count} columns and no number {number}")
    if names:
        return names[number - 1]
    return None if len(shape) == 1 else number - 1


def row_of(shape: tuple[int, ...], names: Sequence[str] | None, rest: str | int | None) -> int | None:
    """Return which row of an array, from 0, is the asked column; None if a row was not asked for.

    Parameters
    ----------
    shape, names, rest
        As in `column_of`; a row is asked for as `row/3`, from 1.

    Raises
    ------
    RefusalError
        If the array is no table of numbers, or has no such row.

    Examples
    --------
    >>> row_of((2, 65536), None, "row/1"), row_of((65536, 2), None, 1)
    (0, None)
    """
    if not isinstance(rest, str) or not rest.startswith("row/"):
        return None
    if len(shape) != 2 or names:
        raise RefusalError("it is no table of numbers, so it has no rows that could be columns")
    number = rest.removeprefix("row/")
    if not (number.isascii() and number.isdigit() and len(number) < 20 and 1 <= int(number) <= shape[0]):
        raise RefusalError(f"it has {shape[0]} rows and no row {number[:20]}")
    return int(number) - 1


# What follows runs in the child.


def _bounded() -> None:
    """Give up memory, time and writing before the library is loaded."""
    try:
        import resource  # exists on POSIX systems only
    except ImportError:  # pragma: no cover - elsewhere the child is still a process of its own
        return
    for what, most in (
        (resource.RLIMIT_AS, _MEMORY),
        (resource.RLIMIT_CPU, CHILD_SECONDS),
        (resource.RLIMIT_CORE, 0),
    ):
        _, hard = resource.getrlimit(what)
        low = most if hard == resource.RLIM_INFINITY else min(most, hard)
        resource.setrlimit(what, (low, hard))


def _answer(asked: dict[str, Any]) -> dict[str, npt.NDArray[Any]]:
    import h5py  # only in the child, after its bounds are set

    said: dict[str, Any] = {"refused": None, "arrays": {}, "faults": {}}
    arrays: dict[str, npt.NDArray[Any]] = {}
    try:
        with h5py.File(asked["path"], "r", locking="best-effort") as file:
            tables = dict(_audited(file, h5py))
            budget = LARGEST
            for index, (name, column) in enumerate(asked["columns"]):
                try:
                    array = _column(file, h5py, tables, column, budget)
                except RefusalError as refusal:
                    said["faults"][name] = str(refusal)
                else:
                    budget -= array.size * weight(array.dtype)
                    arrays[str(index)], said["arrays"][name] = array, str(index)
    except (RefusalError, OSError, RuntimeError, ValueError, KeyError, TypeError, MemoryError) as error:
        said["refused"] = (
            str(error) if isinstance(error, RefusalError) else f"HDF5 cannot read it ({str(error)[:200]})"
        )
        arrays = {}
    return arrays | {"said": np.frombuffer(json.dumps(said).encode(), dtype=np.uint8)}


def _audited(
    group: Any, h5py: Any, prefix: str = "", count: Iterator[int] | None = None
) -> Iterator[tuple[str, Any]]:
    """Yield path and data set of everything that hard links lead to, refusing what leads out of the file."""
    count = itertools.count() if count is None else count
    if prefix.count("/") > DEEPEST:
        raise RefusalError(f"its groups are nested more than {DEEPEST} deep (or in a circle)")
    for name in group:
        # Counted over the whole walk: groups that hold each other twice would double the paths at every level.
        if next(count) >= MOST_OBJECTS:
            raise RefusalError(f"it holds more than {MOST_OBJECTS} things")
        path = f"{prefix}{name}"
        link = group.get(name, getlink=True)
        if isinstance(link, h5py.ExternalLink):
            raise RefusalError(f"{path} is a link to another file; write a file that holds its own data")
        if not isinstance(link, h5py.HardLink):
            continue
        thing = group[name]
        if isinstance(thing, h5py.Group):
            yield from _audited(thing, h5py, path + "/", count)
        elif isinstance(thing, h5py.Dataset):
            if thing.external:
                raise RefusalError(
                    f"{path} keeps its data in another file; write a file that holds its own data"
                )
            if thing.is_virtual:
                raise RefusalError(
                    f"{path} is a virtual data set made of others; write a file that holds its own data"
                )
            yield path, thing


def _column(file: Any, h5py: Any, tables: dict[str, Any], column: str | int, budget: int) -> npt.NDArray[Any]:
    path, rest = _found(file, h5py, tables, column)
    data = tables[path]
    single = data.shape == () and rest is None and not data.dtype.names
    row = row_of(data.shape or (), data.dtype.names, rest)
    which = None if single or row is not None else column_of(data.shape or (), data.dtype.names, rest)
    _require_readable(data, budget)
    dtype = data.dtype if not isinstance(which, str) else data.dtype[which]
    if h5py.check_string_dtype(dtype) is not None:
        if isinstance(which, str):
            raise RefusalError(
                "it is text in a structured data set, which is not read; write it as a data set of its own"
            )
        words = data.asstr("utf-8", "strict")
        text = words[row, :] if row is not None else words[...] if which is None else words[:, which]
        longest = max(map(len, np.ravel(text)), default=0)
        if np.size(text) * longest * 4 > budget:
            raise RefusalError(
                f"its longest text has {longest} characters, too many for its {np.size(text)} rows"
            )
        return np.asarray(text, dtype=np.str_) if single else np.asarray(text, dtype=np.str_).reshape(-1)
    if dtype.hasobject or dtype.subdtype is not None:
        raise RefusalError(
            "it holds references, sequences or arrays in its cells; only numbers and text are read"
        )
    if row is not None:
        return np.asarray(data[row, :]).reshape(-1)
    values = data[which] if isinstance(which, str) else data[...] if which is None else data[:, which]
    return np.asarray(values) if single else np.asarray(values).reshape(-1)


def _found(file: Any, h5py: Any, tables: dict[str, Any], column: str | int) -> tuple[str, str | int | None]:
    """Return the data set and what follows its path."""
    if isinstance(column, str):
        path = column.strip("/")
        if path in tables:
            return path, None
        before, _, last = path.rpartition("/")
        if before in tables:
            return before, last
        if before.endswith("/row") and before.removesuffix("/row") in tables:
            return before.removesuffix("/row"), f"row/{last}"
        parts = path.split("/")
        for end in range(1, len(parts) + 1):
            link = file.get("/".join(parts[:end]), getlink=True)
            if isinstance(link, h5py.SoftLink):
                raise RefusalError(
                    f"{'/'.join(parts[:end])} is a soft link, which is not followed; name the path {link.path}"
                )
            if link is None:
                break
    if len(tables) == 1 and (isinstance(column, int) or "/" not in column):
        return next(iter(tables)), column
    if isinstance(column, int):
        raise RefusalError(
            f"the file has {len(tables)} data sets; write path and number, such as `table/{column}`"
        )
    some = ", ".join(sorted(tables)[:8]) or "none"
    raise RefusalError(f"the file has no such data set; it has {some}{', ...' if len(tables) > 8 else ''}")


def _require_readable(data: Any, budget: int) -> None:
    values = int(data.size or 0)
    declared = values * data.dtype.itemsize
    if values * weight(data.dtype) > budget:
        raise RefusalError(
            f"it declares {declared} bytes in {values} values, more than are read ({LARGEST} bytes in all)"
        )
    stored = data.id.get_storage_size()
    if declared > (1 << 20) + MOST_PACKED * stored:
        raise RefusalError(f"it declares {declared} bytes and stores {stored}; most of it was never written")
    creation = data.id.get_create_plist()
    for index in range(creation.get_nfilters()):
        number = creation.get_filter(index)[0]
        if number not in _OWN_FILTERS:
            raise RefusalError(
                f"it is packed with filter {number}, which is not one of HDF5's own; repack it with gzip"
            )


def _main() -> None:
    _bounded()
    answer = _answer(json.load(sys.stdin))
    buffer = io.BytesIO()
    np.savez(buffer, allow_pickle=False, **answer)
    sys.stdout.buffer.write(buffer.getbuffer())


if __name__ == "__main__":
    _main()

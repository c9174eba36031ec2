"""Columns out of `.npy` and `.npz` files that came from outside.

Rules: nothing is unpickled, ever. The header of an array is held against the bytes that follow it before memory is
asked for, so that a few bytes cannot claim a terabyte.

The format is that of NumPy Enhancement Proposal 1 (Kern, 2007), versions 1.0 and 2.0.
"""

from __future__ import annotations

import io
import lzma
import math
import struct
import tokenize
import zipfile
import zlib
from collections.abc import Sequence
from pathlib import Path
from typing import Any, BinaryIO, Final

import numpy as np
import numpy.typing as npt

from archive.intake.dialect import ColumnRequest
from archive.intake.hdf5_source import (
    LARGEST,
    MOST_PACKED,
    Columns,
    RefusalError,
    column_of,
    row_of,
    weight,
)

__all__ = ["numpy_columns"]

MOST_MEMBERS: Final = 10_000
_BROKEN: Final = (
    ValueError,
    SyntaxError,
    tokenize.TokenError,
    MemoryError,
    RecursionError,
    EOFError,
    OSError,
    NotImplementedError,
    RuntimeError,
    KeyError,
    TypeError,
    zipfile.BadZipFile,
    zlib.error,
    lzma.LZMAError,
    struct.error,
    IndexError,
    AttributeError,
    OverflowError,
)


def numpy_columns(path: Path, columns: Sequence[ColumnRequest]) -> tuple[Columns, dict[str, str]]:
    """Return the asked columns of a `.npy` or `.npz` file, and per channel why it could not be read.

    Parameters
    ----------
    path : pathlib.Path
        File from outside.
    columns : sequence of ColumnRequest
        In a `.npy` file a number from 1 or a field; in a `.npz` file the name of an array, name and number or field
        (`table/3`), name and row (`table/row/3`) of a table that lies on its side, or a number or field alone if the file
        has one array. An array of one number without dimensions is returned as such: it holds for every row.

    Raises
    ------
    RefusalError
        If the file as a whole is not to be read.
    """
    try:
        with path.open("rb") as stream:
            if stream.read(2) == b"PK":
                return _from_npz(stream, columns)
            size = stream.seek(0, io.SEEK_END)
            stream.seek(0)
            table = _array(stream, size)
    except _BROKEN as error:
        raise RefusalError(f"NumPy cannot read it ({str(error)[:200]})") from None
    return _each(columns, lambda column: (table, column))


def _from_npz(stream: BinaryIO, columns: Sequence[ColumnRequest]) -> tuple[Columns, dict[str, str]]:
    with zipfile.ZipFile(stream) as bundle:
        members = {info.filename.removesuffix(".npy"): info for info in bundle.infolist()}
        if len(bundle.infolist()) > MOST_MEMBERS or len(members) != len(bundle.infolist()):
            raise RefusalError("it holds too many members, or two of one name")
        read: dict[str, npt.NDArray[Any]] = {}

        def found(column: str | int) -> tuple[npt.NDArray[Any], str | int | None]:
            name, rest = _member(members, column)
            if name not in read:
                info = members[name]
                so_far = sum(array.nbytes for array in read.values())
                if info.file_size + so_far > LARGEST:
                    raise RefusalError(
                        f"it unpacks to {info.file_size} bytes; more than {LARGEST} are not read"
                    )
                if info.file_size > (1 << 20) + MOST_PACKED * info.compress_size:
                    raise RefusalError(
                        f"it claims to unpack from {info.compress_size} to {info.file_size} bytes"
                    )
                try:
                    with bundle.open(info) as member:
                        # One byte more shows a member that is longer than its entry says.
                        content = member.read(info.file_size + 1)
                    read[name] = _array(io.BytesIO(content), len(content))
                except _BROKEN as error:
                    raise RefusalError(f"NumPy cannot read it ({str(error)[:200]})") from None
            return read[name], rest

        return _each(columns, found)


def _each(columns: Sequence[ColumnRequest], found: Any) -> tuple[Columns, dict[str, str]]:
    arrays: Columns = {}
    faults: dict[str, str] = {}
    for request in columns:
        try:
            table, rest = found(request.column)
            arrays[request.name] = _column(table, rest)
        except RefusalError as refusal:
            faults[request.name] = str(refusal)
    return arrays, faults


def _column(table: npt.NDArray[Any], rest: str | int | None) -> npt.NDArray[Any]:
    if table.ndim == 0 and rest is None and not table.dtype.names:
        return table
    row = row_of(table.shape, table.dtype.names, rest)
    if row is not None:
        return np.asarray(table[row])
    which = column_of(table.shape, table.dtype.names, rest)
    if which is None:
        return table.reshape(-1)
    column: npt.NDArray[Any] = table[which] if isinstance(which, str) else table[:, which]
    if column.ndim != 1 or column.dtype.names:
        raise RefusalError("it has an array or a record in every cell")
    return column


def _member(members: dict[str, zipfile.ZipInfo], column: str | int) -> tuple[str, str | int | None]:
    if isinstance(column, str):
        if column in members:
            return column, None
        before, _, last = column.rpartition("/")
        if before in members:
            return before, last
        if before.endswith("/row") and before.removesuffix("/row") in members:
            return before.removesuffix("/row"), f"row/{last}"
    if len(members) == 1:
        return next(iter(members)), column
    some = ", ".join(sorted(members)[:8])
    raise RefusalError(f"the file has no such array; it has {some}{', ...' if len(members) > 8 else ''}")


def _array(stream: BinaryIO, size: int) -> npt.NDArray[Any]:
    """Return one array after its header has been held against the `size` bytes of the stream."""
    version = np.lib.format.read_magic(stream)
    if version == (1, 0):
        shape, _, dtype = np.lib.format.read_array_header_1_0(stream)
    elif version == (2, 0):
        shape, _, dtype = np.lib.format.read_array_header_2_0(stream)
    else:
        raise RefusalError(
            f"its format version {version[0]}.{version[1]} is not read; keep field names to Latin letters"
        )
    if dtype.hasobject:
        raise RefusalError(
            "it holds Python objects (a pickle), which are never read; save plain numbers or text"
        )
    values = math.prod(shape)
    if values and not dtype.itemsize:
        raise RefusalError(f"it declares {values} values that take no room")
    declared = values * dtype.itemsize
    if values * weight(dtype) > LARGEST:
        raise RefusalError(
            f"it declares {declared} bytes in {values} values; more than {LARGEST} bytes are not read"
        )
    if declared != size - stream.tell():
        raise RefusalError(f"it declares {declared} bytes of data and has {size - stream.tell()}")
    stream.seek(0)
    return np.asarray(np.lib.format.read_array(stream, allow_pickle=False))
